"""The steady part of a firing: found by a stated criterion, or given and checked by it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from propkit.errors import InputError, Problem, RangeError
from propkit.reconcile.firing_inputs import stretch_of
from propkit.reconcile.firing_series import Mask, Recording
from propkit.reconcile.firing_statistics import FEWEST

Array = npt.NDArray[np.float64]

DRIFT = 0.01
"""Largest fitted change over the window, as a share of the mean."""
BAND = 0.01
"""Largest departure of a piece of the window from its mean, as a share of the mean, beyond what noise explains."""
BURNING = 0.5
"""Share of the typical high reading above which the chamber counts as burning."""
_PIECES = 160
_SHORTEST = 8


@dataclass(frozen=True, slots=True)
class Criterion:
    """When a stretch counts as steady.

    Parameters
    ----------
    drift : float
        Largest change of a straight line fitted over the window, as a share of the mean [1].
    band : float
        Largest departure of the mean of a piece from the mean of the window, as a share of it [1]; three standard
        deviations of a piece's mean are allowed on top.
    """

    drift: float = DRIFT
    band: float = BAND

    def __post_init__(self) -> None:
        problems = [
            Problem(name, f"{value!r}", "a share above 0 and at most 0.5")
            for name, value in (("drift", self.drift), ("band", self.band))
            if isinstance(value, bool) or not isinstance(value, int | float) or not 0.0 < value <= 0.5
        ]
        if problems:
            raise InputError(problems)

    def __str__(self) -> str:
        return (
            f"the longest stretch over which a straight line changes by less than {100.0 * self.drift:g} % and every "
            f"piece stays within {100.0 * self.band:g} % (and its noise) of the mean"
        )


@dataclass(frozen=True, slots=True)
class Window:
    """A stretch of a recording and how steady it is.

    Parameters
    ----------
    start, end : float
        Ends [s].
    samples : int
        Samples within.
    found : bool
        Whether it was found by the criterion (else it was given).
    drift : dict of str to float
        Channel -> change of a fitted line over the window as a share of the mean [1].
    unsteady : tuple of str
        Channels that miss the criterion in this window.
    ignition, cutoff : float
        When the burn starts and ends [s].
    criterion : Criterion
        What counts as steady.
    """

    start: float
    end: float
    samples: int
    found: bool
    drift: dict[str, float]
    unsteady: tuple[str, ...]
    ignition: float
    cutoff: float
    criterion: Criterion

    @property
    def share_of_burn(self) -> float:
        """Share of the burn that has passed at the middle of the window [1]."""
        return (0.5 * (self.start + self.end) - self.ignition) / (self.cutoff - self.ignition)


def find_window(
    recording: Recording,
    reference: str,
    channels: Sequence[str] = (),
    criterion: Criterion | None = None,
    given: tuple[float, float] | None = None,
) -> Window:
    """Return the steady window of a recording.

    Parameters
    ----------
    recording : Recording
        The recording.
    reference : str
        Channel that tells burning from not burning (the chamber pressure).
    channels : sequence of str
        Channels that must be steady; the reference always is one.
    criterion : Criterion, optional
        What counts as steady.
    given : (start, end), optional
        Window chosen by the analyst [s]; it is checked, not changed.

    Returns
    -------
    Window
        The longest steady stretch of the burn, the earliest of equals; or the given one.

    Raises
    ------
    InputError
        For a window outside the recording or with too few samples.
    RangeError
        When nothing burns, or no stretch is steady.

    Notes
    -----
    The burn is the longest stretch with the reference above half of its typical high reading (98th percentile). It is cut
    into at most 160 pieces; every run of at least eight pieces is tried. Common practice, no source.
    """
    rule = criterion or Criterion()
    ignition, cutoff = burn(recording, reference)
    watched = tuple(dict.fromkeys((reference, *channels)))
    if given is not None:
        start, end = _checked(given, recording)
        return _window(recording, watched, start, end, (ignition, cutoff), rule, found=False)
    inside = recording.within(ignition, cutoff)
    count = int(np.count_nonzero(inside))
    pieces = min(_PIECES, count // 4)
    if pieces < _SHORTEST:
        raise RangeError(
            f"the burn has {count} samples: too few to find a steady window in; give one (window=(start, end))",
            samples=count,
        )
    edges = np.linspace(ignition, cutoff, pieces + 1)
    steady = np.ones((pieces, pieces + 1), dtype=bool)
    for name in watched:
        steady &= _steady_runs(recording, name, inside, edges, rule)
    lengths = np.arange(pieces + 1)[None, :] - np.arange(pieces)[:, None]
    lengths = np.where(steady & (lengths >= _SHORTEST), lengths, 0)
    if not lengths.any():
        raise RangeError(
            f"no stretch of the burn ({ignition:g} s to {cutoff:g} s) is steady: {rule}. "
            "Give a window (window=(start, end)) or a wider criterion",
            ignition=ignition,
            cutoff=cutoff,
        )
    first, last = np.unravel_index(int(np.argmax(lengths)), lengths.shape)
    start, end = float(edges[first]), float(edges[last])
    return _window(recording, watched, start, end, (ignition, cutoff), rule, found=True)


def burn(recording: Recording, reference: str) -> tuple[float, float]:
    """Return when the longest burn starts and ends [s].

    Raises
    ------
    RangeError
        When the reference never stands clear of its typical low reading.
    """
    return max(burns(recording, reference), key=lambda ends: ends[1] - ends[0])


def burns(recording: Recording, reference: str) -> list[tuple[float, float]]:
    """Return when each burn of the recording starts and ends [s], in order of time.

    Raises
    ------
    RangeError
        When the reference never stands clear of its typical low reading.

    Notes
    -----
    A stretch without readings does not end a burn that is seen on both of its sides: the other channels tell whether it is
    steady through the stretch.
    """
    channel = recording.channels[reference]
    good = channel.good
    if np.count_nonzero(good) < FEWEST:
        raise InputError(Problem(reference, f"{np.count_nonzero(good)} good samples", f"at least {FEWEST}"))
    low, high = np.percentile(channel.values[good], [2.0, 98.0])
    idle = low if low < 0.3 * high else 0.0
    burning = np.where(good, channel.values, np.nan) > idle + BURNING * (high - idle)
    known = np.flatnonzero(good)
    before = np.clip(np.searchsorted(known, np.arange(len(good)), side="right") - 1, 0, len(known) - 1)
    after = np.clip(before + 1, 0, len(known) - 1)
    burning |= ~good & burning[known[before]] & burning[known[after]]
    if not high > 0.0 or not burning.any():
        raise RangeError(f"{reference} shows no burn: its typical readings run from {low:g} to {high:g}")
    padded = np.concatenate([[False], burning, [False]])
    starts, ends = np.flatnonzero(~padded[:-1] & padded[1:]), np.flatnonzero(padded[:-1] & ~padded[1:])
    return [(float(recording.time[k]), float(recording.time[m - 1])) for k, m in zip(starts, ends, strict=True)]


def _steady_runs(recording: Recording, name: str, inside: Mask, edges: Array, rule: Criterion) -> Mask:
    """Return for every first piece and every end whether the channel is steady over that run of pieces."""
    channel = recording.channels[name]
    use = inside & channel.good
    pieces = len(edges) - 1
    place = np.clip(np.searchsorted(edges, recording.time[use], side="right") - 1, 0, pieces - 1)
    values = channel.values[use]
    count = np.bincount(place, minlength=pieces).astype(np.float64)
    means = np.bincount(place, values, minlength=pieces) / np.maximum(count, 1.0)
    empty = count == 0.0
    means[empty] = np.interp(np.flatnonzero(empty), np.flatnonzero(~empty), means[~empty])
    # noise of a piece's mean from the differences of neighbouring pieces, which drift hardly touches
    noise = 1.4826 * float(np.median(np.abs(np.diff(means)))) / np.sqrt(2.0)
    # row: first piece; column: how many pieces follow; NaN past the last piece makes every comparison false
    runs = np.lib.stride_tricks.sliding_window_view(np.append(means, np.full(pieces, np.nan)), pieces)[:pieces]
    lengths = np.arange(1.0, pieces + 1.0)
    total, moment = np.cumsum(runs, axis=1), np.cumsum(runs * (lengths - 1.0), axis=1)
    average = total / lengths
    allowed = rule.band * np.abs(average) + 3.0 * noise
    highest, lowest = np.maximum.accumulate(runs, axis=1), np.minimum.accumulate(runs, axis=1)
    slope = (moment - total * (lengths - 1.0) / 2.0) / np.maximum((lengths**3 - lengths) / 12.0, 1.0)
    # the change of a fitted line scatters by about 3.46 noise/sqrt(pieces)
    change = rule.drift * np.abs(average) + 2.0 * 3.46 * noise / np.sqrt(lengths)
    flat = (highest - average <= allowed) & (average - lowest <= allowed) & (np.abs(slope * lengths) <= change)
    steady = np.zeros((pieces, pieces + 1), dtype=bool)
    for first in range(pieces):
        steady[first, first + 1 :] = flat[first, : pieces - first]
    return steady


def _checked(given: tuple[float, float], recording: Recording) -> tuple[float, float]:
    start, end = stretch_of("window", given)
    low, high = float(recording.time[0]), float(recording.time[-1])
    if not low <= start < end <= high:
        raise InputError(Problem("window", f"({start:g} s, {end:g} s)", f"inside the recording, {low:g} s to {high:g} s, start first"))
    count = int(np.count_nonzero(recording.within(start, end)))
    if count < FEWEST:
        raise InputError(Problem("window", f"{count} samples long", f"at least {FEWEST} samples long"))
    return start, end


def _window(
    recording: Recording,
    watched: Sequence[str],
    start: float,
    end: float,
    ends: tuple[float, float],
    rule: Criterion,
    *,
    found: bool,
) -> Window:
    inside = recording.within(start, end)
    drift = {}
    for name in watched:
        channel = recording.channels[name]
        use = inside & channel.good
        if np.count_nonzero(use) < FEWEST:
            allowed = f"at least {FEWEST} good samples in the window"
            raise InputError(Problem(name, f"{np.count_nonzero(use)} good samples", allowed, "Choose another window."))
        times = recording.time[use] - start
        slope = np.polynomial.Polynomial.fit(times, channel.values[use], 1).convert().coef
        mean = float(channel.values[use].mean())
        rate = float(slope[1]) if len(slope) > 1 else 0.0
        drift[name] = rate * (end - start) / mean if mean else 0.0
    unsteady = tuple(name for name, share in drift.items() if abs(share) > 1.5 * rule.drift)
    return Window(start, end, int(np.count_nonzero(inside)), found, drift, unsteady, *ends, rule)
