"""Tables of studies as files, every digit kept."""

from __future__ import annotations

import json
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from propkit.errors import MissingExtraError, StorageError

if TYPE_CHECKING:
    import pandas as pd


def write_csv(frame: pd.DataFrame, units: Mapping[str, str], target: Path) -> Path:
    """Write a table as text, the SI unit in each column's title; return where."""
    frame.columns = [f"{name} [{units[name]}]" if units.get(str(name)) else str(name) for name in frame.columns]
    try:
        frame.to_csv(target, index=True, lineterminator="\n")
    except OSError as error:
        raise StorageError(f"{target} cannot be written: {error.strerror or error}", path=str(target)) from error
    return target


def write_parquet(frame: pd.DataFrame, units: Mapping[str, str], target: Path) -> Path:
    """Write a table as Parquet, with the units in the metadata; return where."""
    try:
        import pyarrow as arrow
        from pyarrow import parquet
    except ImportError as error:
        raise MissingExtraError("pyarrow", "study", "Writing Parquet") from error
    units_text = {str(name): unit for name, unit in units.items()}
    frame.attrs = {}
    table = arrow.Table.from_pandas(frame)
    table = table.replace_schema_metadata({**(table.schema.metadata or {}), b"propkit.units": json.dumps(units_text).encode()})
    try:
        parquet.write_table(table, target)
    except OSError as error:
        raise StorageError(f"{target} cannot be written: {error.strerror or error}", path=str(target)) from error
    return target
