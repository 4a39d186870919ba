"""Memos: notebooks executed and bound, records set as pages, PDF and archives."""
