"""Calculation records: built, sealed, saved, loaded, verified and compared."""

from propkit.record.record import Record, bundle_of, record_of

__all__ = ["Record", "bundle_of", "record_of"]
