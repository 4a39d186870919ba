"""Recordings of a firing: reading them with their units, and flagging what is no measurement.

A table has one column of time and one column for each channel; the unit stands in the header, as in
``chamber pressure [MPa]``. Nothing is repaired: spikes, dropouts and saturated stretches are flagged sample by sample,
and what uses a channel says what it left out.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from propkit import units
from propkit.errors import InputError, Problem, StorageError, near_matches

if TYPE_CHECKING:
    import pandas as pd

Array = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

_HEADER = re.compile(r"\s*(?P<label>.*?)\s*(?:\[(?P<square>[^\]]*)\]|\((?P<round>[^)]*)\))\s*")
_NO_UNIT = ("", "-", "1")
_GAUGE = (
    "That is a gauge pressure; pressures are absolute: add the barometer reading of the test to the column, and call its unit psi or bar."
)
SPIKE = 8.0
"""Departure from the local median that makes a spike, in robust standard deviations."""
SATURATED = 5
"""Equal samples in a row at an end of the range of a channel that count as saturated."""
STUCK = 20
"""Equal samples in a row elsewhere that count as a dropout (a channel that holds its last value)."""


@dataclass(frozen=True, slots=True)
class Channel:
    """One channel: its column, unit and values in SI, with a flag for every sample that is no measurement.

    Parameters
    ----------
    name : str
        What it measures: the path or name that it is mapped to.
    column : str
        Header of its column.
    unit : str
        SI unit of `values` in pint's spelling.
    values : array
        Samples in SI; NaN where there is none.
    spikes, dropouts, saturated : array of bool
        Flags, sample by sample.
    """

    name: str
    column: str
    unit: str
    values: Array
    spikes: Mask
    dropouts: Mask
    saturated: Mask

    @property
    def good(self) -> Mask:
        """Samples that are measurements."""
        return ~(self.spikes | self.dropouts | self.saturated)

    def notes(self, where: Mask | None = None) -> tuple[str, ...]:
        """Return what is flagged, in words, over the whole recording or where `where` is true."""
        kinds = (("spikes", self.spikes), ("dropouts", self.dropouts), ("saturated samples", self.saturated))
        found = []
        for kind, flags in kinds:
            count = int(np.count_nonzero(flags if where is None else flags & where))
            if count:
                word = kind if count > 1 else {"spikes": "spike", "dropouts": "dropout"}.get(kind, "saturated sample")
                found.append(f"{self.name}: {count} {word} left out")
        return tuple(found)


@dataclass(frozen=True, slots=True)
class Recording:
    """A recording: time in seconds and the channels by name."""

    time: Array
    channels: Mapping[str, Channel]

    @property
    def interval(self) -> float:
        """Median time between samples [s]."""
        return float(np.median(np.diff(self.time)))

    def within(self, start: float, end: float) -> Mask:
        """Return the samples from `start` to `end` [s]."""
        return (self.time >= start) & (self.time <= end)


def read_recording(
    source: str | Path | pd.DataFrame,
    channels: Mapping[str, str],
    wanted_units: Mapping[str, str],
    *,
    time: str | None = None,
    full_scale: Mapping[str, tuple[float, float]] | None = None,
) -> Recording:
    """Read a recording and flag what is no measurement.

    Parameters
    ----------
    source : path or DataFrame
        A CSV file with a header line, or a table with the same headers as columns.
    channels : mapping of str to str
        Name of what is measured -> column: its whole header, or its label without the unit.
    wanted_units : mapping of str to str
        Name -> SI unit in pint's spelling.
    time : str, optional
        Column of time; without it the one column whose label is "time" or "t".
    full_scale : mapping of str to (low, high), optional
        Measuring range of a channel in SI; samples at or beyond its ends are saturated.

    Returns
    -------
    Recording
        Time from the table and channels in SI.

    Raises
    ------
    InputError
        For columns that are missing or without a unit, units of another kind, text among the numbers, or time that does
        not increase; all problems at once.
    StorageError
        When the file cannot be read.
    """
    table = _table(source)
    headers = [str(column) for column in table.columns]
    problems: list[Problem] = []
    time_header = _time_header(headers, time, problems)
    found = {name: _find(headers, column, name, problems) for name, column in channels.items()}
    if not channels:
        problems.append(Problem("channels", "empty", "a mapping of what is measured to its column"))
    moments = _column(table, time_header, "s", "time", problems) if time_header else np.array([])
    values = {
        name: _column(table, header, wanted_units.get(name, ""), name, problems) for name, header in found.items() if header is not None
    }
    _check_time(moments, problems)
    if problems:
        raise InputError(problems)
    scales = full_scale or {}
    made = {
        name: flagged(name, str(found[name]), wanted_units.get(name, ""), samples, scales.get(name)) for name, samples in values.items()
    }
    return Recording(moments, made)


def flagged(name: str, column: str, unit: str, values: Array, full_scale: tuple[float, float] | None = None) -> Channel:
    """Return a channel with its spikes, dropouts and saturated samples flagged.

    Parameters
    ----------
    name, column, unit : str
        What it measures, its column and its SI unit.
    values : array
        Samples in SI.
    full_scale : (low, high), optional
        Measuring range in SI.

    Returns
    -------
    Channel
        The channel with its flags.

    Notes
    -----
    Spike: a stretch of at most three samples more than eight robust standard deviations (75th percentile, over 101
    samples, of the departures from the running median over eleven, divided by 1.1503) away from the
    running median. Dropout: no number, an isolated fall to exactly zero, or twenty equal samples in a row. Saturated: at
    or beyond the measuring range, or five equal samples in a row at the largest or smallest value recorded.

    Source: F. R. Hampel, The influence curve and its role in robust estimation, J. American Statistical Association 69
    (1974) 383-393, for the spikes (from memory); common practice, no source, for the rest.
    """
    missing = ~np.isfinite(values)
    filled = _bridged(name, values, missing)
    runs, far = _run_lengths(filled), _far(filled)
    brief = far & (_lengths_of(far) <= 3)
    # a spike beyond the end of the range does not hide a channel that sits at that end
    usual = filled[~brief] if not brief.all() else filled
    top, bottom = filled >= usual.max(), filled <= usual.min()
    varies = bool(filled.max() > filled.min())
    saturated = (top | bottom) & (runs >= SATURATED) & varies & (filled != 0.0)
    if full_scale is not None:
        saturated |= (filled <= full_scale[0]) | (filled >= full_scale[1])
    # a fall to exactly zero between samples that are not is no pressure, flow or thrust
    zeros = (filled == 0.0) & far
    stuck = (runs >= STUCK) & ~saturated & varies & (filled != 0.0)
    dropouts = missing | zeros | stuck
    spikes = brief & ~dropouts & ~saturated
    return Channel(name, column, unit, values, spikes, dropouts, saturated & ~missing)


def _far(values: Array) -> Mask:
    from scipy import ndimage

    width = min(11, len(values) | 1)
    centre = ndimage.median_filter(values, size=width, mode="nearest")
    away = np.abs(values - centre)
    # the upper quartile, not the median: of samples that are alike many are their own running median
    scatter = ndimage.percentile_filter(away, 75.0, size=min(101, len(values) | 1), mode="nearest") / 1.1503
    floor = 1e-12 * float(np.abs(values).max()) + float(np.finfo(np.float64).tiny)
    far: Mask = away > SPIKE * np.maximum(scatter, floor)
    return far


def _bridged(name: str, values: Array, missing: Mask) -> Array:
    """Return the samples with the missing ones bridged by straight lines, for looking at their neighbours only."""
    if missing.all():
        raise InputError(Problem(name, "without any number", "a column with samples"))
    places = np.arange(len(values))
    bridged: Array = np.where(missing, np.interp(places, places[~missing], values[~missing]), values)
    return bridged


def _run_lengths(values: Array) -> npt.NDArray[np.int64]:
    """Return for every sample how many equal samples in a row it is among."""
    starts = np.flatnonzero(np.concatenate([[True], values[1:] != values[:-1]]))
    lengths = np.diff(np.append(starts, len(values)))
    return np.repeat(lengths, lengths)


def _lengths_of(flags: Mask) -> npt.NDArray[np.int64]:
    """Return for every sample the length of its run of equal flags."""
    return _run_lengths(flags.astype(np.float64))


def _table(source: Any) -> pd.DataFrame:
    import pandas as pd

    if isinstance(source, pd.DataFrame):
        table = source
    else:
        if not isinstance(source, str | Path):
            raise InputError(Problem("recording", f"{source!r}"[:60], "the path of a CSV file, or a DataFrame"))
        try:
            table = pd.read_csv(Path(source), comment="#", skipinitialspace=True)
        except OSError as error:
            raise StorageError(f"{source} cannot be read: {error.strerror or error}", path=str(source)) from error
        except (ValueError, UnicodeDecodeError) as error:
            raise InputError(f"{source} is not a table of comma-separated columns with a header line: {error}") from error
    if len(table.columns) == 1 and any(mark in str(table.columns[0]) for mark in ";\t"):
        hint = "Columns seem to be divided by semicolons or tabs: save with commas, and with decimal points."
        raise InputError(Problem("recording", "one column", "a table of comma-separated columns", hint))
    if len(table) < 10:
        raise InputError(Problem("recording", f"{len(table)} rows", "at least 10 rows"))
    return table


def split_header(header: str) -> tuple[str, str | None]:
    """Return label and unit of a header such as ``thrust [kN]``; None where it states no unit."""
    match = _HEADER.fullmatch(header)
    if match is None:
        return header.strip(), None
    unit = match["square"] if match["square"] is not None else match["round"]
    return match["label"], unit.strip()


def _find(headers: list[str], column: str, name: str, problems: list[Problem]) -> str | None:
    labels = {header: split_header(header)[0] for header in headers}
    exact = [header for header in headers if column in (header, header.strip())]
    found = exact or [header for header, label in labels.items() if label.casefold() == column.strip().casefold()]
    if len(found) == 1:
        return found[0]
    near = near_matches(column, labels.values())
    hint = f"Did you mean {' or '.join(map(repr, near))}?" if near and not found else ""
    allowed = "a column of the table" if not found else f"one column; there are {len(found)} of that name"
    problems.append(Problem(f"column of {name}", repr(column), allowed, hint))
    return None


def _time_header(headers: list[str], time: str | None, problems: list[Problem]) -> str | None:
    if time is not None:
        return _find(headers, time, "time", problems)
    found = [header for header in headers if split_header(header)[0].casefold() in ("time", "t")]
    if len(found) == 1:
        return found[0]
    given = f"the name of {len(found)} columns" if found else "not among the columns"
    problems.append(Problem("time", given, "one column named 'time [s]'", "Or name the column: time=..."))
    return None


def _column(table: pd.DataFrame, header: str, unit: str, name: str, problems: list[Problem]) -> Array:
    """Return a column in SI; problems are noted and an empty array stands in."""
    stated = split_header(header)[1]
    if stated is None:
        example = f"{header.strip()} [{units.shown_unit(unit) or '-'}]"
        problems.append(Problem(f"header of {name}", repr(header), "a label with its unit in brackets", f"For example {example!r}."))
        return np.array([])
    try:
        factor, offset = _conversion(stated, unit, name)
    except InputError as error:
        problems.extend(error.problems)
        return np.array([])
    raw = table[header]
    try:
        numbers = raw.to_numpy(dtype=np.float64, na_value=math.nan)
    except (TypeError, ValueError):
        first = next(entry for entry in raw if not _is_number(entry))
        problems.append(Problem(f"column {header!r}", f"{first!r} among its values", "numbers only (empty where there is no sample)"))
        return np.array([])
    values: Array = numbers * factor + offset
    return values


def _conversion(stated: str, unit: str, name: str) -> tuple[float, float]:
    if stated in _NO_UNIT:
        if unit:
            allowed = f"a unit such as {units.shown_unit(unit)}"
            raise InputError(Problem(f"unit of {name}", repr(stated), allowed))
        return 1.0, 0.0
    try:
        offset = units.to_si(f"0 {stated}", unit, f"unit of {name}")
    except InputError as error:
        problem = error.problems[0]
        hint = _GAUGE if "gauge" in problem.hint else problem.hint
        raise InputError(Problem(problem.name, repr(stated), f"that of {problem.allowed}", hint)) from error
    # two readings far apart keep the digits of the factor
    return (units.to_si(f"1000 {stated}", unit, f"unit of {name}") - offset) / 1000.0, offset


def _is_number(entry: Any) -> bool:
    try:
        float(entry)
    except (TypeError, ValueError):
        return False
    return True


def _check_time(moments: Array, problems: list[Problem]) -> None:
    if len(moments) < 2:
        return
    if not np.isfinite(moments).all():
        row = int(np.flatnonzero(~np.isfinite(moments))[0])
        problems.append(Problem("time", f"not a number in row {row + 1}", "a number in every row"))
        return
    backward = np.flatnonzero(np.diff(moments) <= 0.0)
    if backward.size:
        row = int(backward[0])
        problems.append(
            Problem(
                "time",
                f"{moments[row + 1]:g} s after {moments[row]:g} s in row {row + 2}",
                "increasing from row to row",
                f"It fails to in {backward.size} place{'s' if backward.size > 1 else ''}.",
            )
        )
