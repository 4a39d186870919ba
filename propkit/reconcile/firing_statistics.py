"""Means of a recording with an uncertainty that knows that neighbouring samples are alike; zeros and drift."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from propkit.errors import InputError, Problem

Array = npt.NDArray[np.float64]

FEWEST = 20
"""Fewest samples of which a mean is taken."""
FEWEST_INDEPENDENT = 5.0
"""Number of independent samples below which the uncertainty of a mean is doubtful."""


@dataclass(frozen=True, slots=True)
class Mean:
    """Mean of a correlated series.

    Parameters
    ----------
    value : float
        Mean.
    standard_uncertainty : float
        Standard uncertainty of the mean, in the unit of the series.
    deviation : float
        Standard deviation of the samples.
    count : int
        Number of samples.
    independent : float
        Number of independent samples with the same standard uncertainty.
    """

    value: float
    standard_uncertainty: float
    deviation: float
    count: int
    independent: float

    @property
    def doubtful(self) -> bool:
        """Whether there are too few independent samples for the uncertainty to mean much."""
        return self.independent < FEWEST_INDEPENDENT


@dataclass(frozen=True, slots=True)
class Zero:
    """Reading of a channel that should read `expected`, before and after a firing.

    Parameters
    ----------
    before, after : Mean or None
        Readings; None where there is no such stretch.
    expected : float
        What the channel should read then.
    correction : float
        What is subtracted from readings during the firing: the mean of both zeros less the expected reading.
    standard_uncertainty : float
        Standard uncertainty of the correction: of the zeros, and of a drift that may have happened at any time.
    """

    before: Mean | None
    after: Mean | None
    expected: float
    correction: float
    standard_uncertainty: float

    @property
    def drift(self) -> float:
        """Zero after less zero before; NaN where there are not both."""
        return self.after.value - self.before.value if self.before is not None and self.after is not None else math.nan

    @property
    def drifted(self) -> bool:
        """Whether the drift is above two of its standard uncertainties."""
        if self.before is None or self.after is None:
            return False
        uncertainty = math.hypot(self.before.standard_uncertainty, self.after.standard_uncertainty)
        return abs(self.drift) > 2.0 * uncertainty


def variance_ratio(correlation: float, count: int) -> float:
    """Return the variance of a mean of a first-order autoregressive series over that of independent samples.

    Parameters
    ----------
    correlation : float
        Correlation of neighbours [1], between -1 and 1.
    count : int
        Number of samples.

    Returns
    -------
    float
        1 + 2 sum over k of (1 - k/n) rho^k [1].

    Notes
    -----
    In closed form: (1 + rho)/(1 - rho) - 2 rho (1 - rho^n)/(n (1 - rho)²).

    Source: any text on time series, for instance Box & Jenkins, Time Series Analysis (from memory).
    """
    rho = correlation
    return (1.0 + rho) / (1.0 - rho) - 2.0 * rho * (1.0 - rho**count) / (count * (1.0 - rho) ** 2)


def mean_of(values: Array, name: str = "series") -> Mean:
    """Return the mean of a correlated series with its standard uncertainty.

    Parameters
    ----------
    values : array
        Samples at equal intervals, without NaN; at least 20.
    name : str
        What it is, for error texts.

    Returns
    -------
    Mean
        Mean, standard uncertainty and number of independent samples.

    Raises
    ------
    InputError
        For too few samples.

    Notes
    -----
    u² = (s²/n)[1 + 2 sum (1 - k/n) rho_k], the sum over lags up to where the sum of two neighbouring correlations turns
    negative (initial positive sequence) and kept from rising (initial monotone sequence). Each of the m terms found
    about the series' own mean lacks the variance of that mean, so that the sum is divided by 1 - m/n.

    Source: N. F. Zhang, Calculation of the uncertainty of the mean of autocorrelated measurements, Metrologia 43 (2006)
    S276-S281; C. J. Geyer, Practical Markov chain Monte Carlo, Statistical Science 7 (1992) 473-483 (both from memory).
    """
    count = len(values)
    if count < FEWEST:
        raise InputError(Problem(name, f"{count} samples", f"at least {FEWEST} samples", "Choose a longer window."))
    mean = float(values.mean())
    departures = values - mean
    variance = float(departures @ departures) / count
    if variance <= (1e-14 * abs(mean)) ** 2:
        return Mean(mean, 0.0, 0.0, count, float(count))
    ratio = _ratio(departures, variance)
    uncertainty = math.sqrt(variance * ratio / count)
    # the scatter about the own mean lacks the scatter of that mean
    deviation = math.hypot(math.sqrt(variance), uncertainty)
    return Mean(mean, uncertainty, deviation, count, (deviation / uncertainty) ** 2)


def _ratio(departures: Array, variance: float) -> float:
    """Return n times the variance of the mean over the scatter about the own mean."""
    count = len(departures)
    correlations = autocorrelations(departures, variance)
    pairs = correlations[: 2 * (len(correlations) // 2)].reshape(-1, 2).sum(axis=1)
    negative = np.flatnonzero(pairs <= 0.0)
    kept = np.minimum.accumulate(pairs[: negative[0]] if negative.size else pairs)
    terms = 4 * len(kept) - 1
    found = 2.0 * float(kept.sum()) - 1.0
    return max(found, 1.0 / count) / (1.0 - min(terms / count, 0.5))


def autocorrelations(departures: Array, variance: float) -> Array:
    """Return the autocorrelations at lags 0, 1, ... up to half of the series, by Fourier transform."""
    count = len(departures)
    size = 1 << (2 * count - 1).bit_length()
    spectrum = np.fft.rfft(departures, size)
    products = np.fft.irfft(spectrum * np.conj(spectrum), size)[: count // 2]
    found: Array = products / (count * variance)
    return found


def zero_of(before: Array | None, after: Array | None, expected: float, name: str = "channel") -> Zero:
    """Return the zero of a channel from stretches before and after the firing.

    Parameters
    ----------
    before, after : array or None
        Samples while nothing flows, in SI; None where there are none.
    expected : float
        What the channel should read then: 0, or the ambient pressure of an absolute gauge.
    name : str
        What it is, for error texts.

    Returns
    -------
    Zero
        Correction and drift.

    Notes
    -----
    A drift between two zeros may have happened at any time: uniform between them, so that its standard uncertainty is
    the difference over the square root of 12 (JCGM 100:2008, 4.3.7).
    """
    readings = [mean_of(samples, name) if samples is not None else None for samples in (before, after)]
    known = [reading for reading in readings if reading is not None]
    if not known:
        return Zero(None, None, expected, 0.0, 0.0)
    correction = sum(reading.value for reading in known) / len(known) - expected
    own = math.sqrt(sum(reading.standard_uncertainty**2 for reading in known)) / len(known)
    drift = known[-1].value - known[0].value
    return Zero(readings[0], readings[1], expected, correction, math.hypot(own, drift / math.sqrt(12.0)))


def throat_at(
    before: tuple[float, float],
    after: tuple[float, float] | None,
    share: float,
    growth: tuple[float, float] = (0.0, 0.0),
) -> tuple[float, float]:
    """Return the hot throat diameter at a moment of the firing, with its standard uncertainty.

    Parameters
    ----------
    before, after : (diameter, standard uncertainty)
        Measured cold before and after [m]; without the second no wear is known.
    share : float
        Share of the burn that has passed at that moment [1], 0 to 1.
    growth : (share, standard uncertainty)
        Growth of the diameter while hot [1], for instance 0.002.

    Returns
    -------
    tuple of float
        Hot diameter [m] and its standard uncertainty [m].

    Notes
    -----
    Wear at a steady rate between the two measurements; that it may have come early or late is a uniform doubt of a
    quarter of the change to both sides. Common practice, no source.
    """
    cold, variance = before[0], before[1] ** 2
    if after is not None:
        change = after[0] - before[0]
        cold = before[0] + share * change
        variance = ((1.0 - share) * before[1]) ** 2 + (share * after[1]) ** 2 + (0.25 * change) ** 2 / 3.0
    hot = cold * (1.0 + growth[0])
    return hot, math.sqrt(variance * (1.0 + growth[0]) ** 2 + (cold * growth[1]) ** 2)
