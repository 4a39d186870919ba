"""The stages of a calculation: arrays and options in, arrays out.

What calls which relation in what order lives here and nowhere else. An object is a batch of one; studies,
uncertainty, reconciliation and verification call the same stages with longer arrays.
"""
