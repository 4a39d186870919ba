"""Distributions of uncertain inputs: what the analyst writes, and what it becomes beside a nominal value.

An analyst writes ``pk.Normal("1 %")`` before anyone knows of what; `Distribution.resolve` makes numbers of
it once nominal and unit are known. Quantiles carry everything else: a draw is a quantile of a uniform number, so
that one Gaussian copula (`propkit.study.joint`) correlates whatever kinds of distribution.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import special

from propkit import units
from propkit.errors import InputError, Problem

Array = npt.NDArray[np.float64]
ToSI = Callable[[object], float]


@dataclass(frozen=True, slots=True)
class Resolved(ABC):
    """A distribution in SI numbers: nominal value, standard uncertainty, quantiles and reach."""

    nominal: float

    @property
    @abstractmethod
    def standard_uncertainty(self) -> float:
        """Standard deviation of the distribution."""

    @property
    def mean(self) -> float:
        """Expectation of the distribution."""
        return self.nominal

    @abstractmethod
    def quantile(self, probability: Array) -> Array:
        """Return the values below which the shares `probability` lie."""

    @abstractmethod
    def below(self, value: float) -> float:
        """Return the probability of a value below `value`."""

    @property
    def normal(self) -> bool:
        """Whether the distribution is normal, so that its correlation is that of its normal score."""
        return False

    def outside(self, low: float, high: float) -> float:
        """Return the probability of a value below `low` or above `high`."""
        beyond = 0.0
        if low > -math.inf:
            beyond += self.below(low)
        if high < math.inf:
            beyond += 1.0 - self.below(math.nextafter(high, math.inf))
        return beyond


@dataclass(frozen=True, slots=True)
class _Normal(Resolved):
    deviation: float

    @property
    def standard_uncertainty(self) -> float:
        return self.deviation

    @property
    def normal(self) -> bool:
        return True

    def quantile(self, probability: Array) -> Array:
        return self.nominal + self.deviation * special.ndtri(probability)

    def below(self, value: float) -> float:
        return float(special.ndtr((value - self.nominal) / self.deviation))


@dataclass(frozen=True, slots=True)
class _Uniform(Resolved):
    half_width: float

    @property
    def standard_uncertainty(self) -> float:
        return self.half_width / math.sqrt(3.0)

    def quantile(self, probability: Array) -> Array:
        return self.nominal + self.half_width * (2.0 * probability - 1.0)

    def below(self, value: float) -> float:
        return min(1.0, max(0.0, 0.5 * (1.0 + (value - self.nominal) / self.half_width)))


@dataclass(frozen=True, slots=True)
class _Triangular(Resolved):
    half_width: float

    @property
    def standard_uncertainty(self) -> float:
        return self.half_width / math.sqrt(6.0)

    def quantile(self, probability: Array) -> Array:
        tail = np.sqrt(2.0 * np.minimum(probability, 1.0 - probability)) - 1.0
        return self.nominal + self.half_width * np.where(probability < 0.5, tail, -tail)

    def below(self, value: float) -> float:
        distance = (value - self.nominal) / self.half_width
        if distance <= 0.0:
            return 0.5 * max(0.0, 1.0 + distance) ** 2
        return 1.0 - 0.5 * max(0.0, 1.0 - distance) ** 2


@dataclass(frozen=True, slots=True)
class _Empirical(Resolved):
    values: tuple[float, ...]

    @property
    def standard_uncertainty(self) -> float:
        return float(np.std(self.values, ddof=1))

    @property
    def mean(self) -> float:
        return float(np.mean(self.values))

    def quantile(self, probability: Array) -> Array:
        count = len(self.values)
        return np.asarray(self.values)[np.minimum((probability * count).astype(np.int64), count - 1)]

    def below(self, value: float) -> float:
        return float(np.searchsorted(self.values, value, side="left")) / len(self.values)


class Distribution(ABC):
    """What an analyst writes about an uncertain input, before its nominal value is known."""

    __slots__ = ()

    def recipe(self) -> dict[str, Any]:
        """Return plain data from which a record rebuilds the distribution."""
        names = getattr(self, "__match_args__", ()) or ("samples",)
        inputs = {name: getattr(self, name) for name in names}
        return {"object": type(self).__name__, "inputs": {name: _plain(value) for name, value in inputs.items()}}

    @abstractmethod
    def resolve(self, nominal: float, unit: str, name: str = "value") -> Resolved:
        """Return the distribution in SI numbers.

        Parameters
        ----------
        nominal : float
            Nominal value [unit], the centre of the distribution.
        unit : str
            SI unit of the quantity in pint's spelling; ``""`` for a pure number.
        name : str
            Path of the input, for error texts.

        Returns
        -------
        Resolved
            The distribution in `unit`.

        Raises
        ------
        InputError
            For a spread that is not a positive, finite difference of that quantity.
        """


@dataclass(frozen=True, slots=True, repr=False)
class Normal(Distribution):
    """A normal distribution about the nominal value.

    Parameters
    ----------
    uncertainty : str, quantity or float
        Standard uncertainty, or with `k` an expanded one; ``"1 %"`` is of the nominal value, a number is in SI.
    k : float
        Coverage factor that `uncertainty` already contains [1]; 2 for an expanded uncertainty as certificates state it.
    """

    uncertainty: Any
    k: float = 1.0

    def __post_init__(self) -> None:
        k = self.k
        if isinstance(k, bool) or not isinstance(k, int | float) or not math.isfinite(k) or k <= 0.0:
            raise InputError(Problem("k", repr(k), "a finite number above 0", "1 for a standard uncertainty, 2 for an expanded one."))

    def __repr__(self) -> str:
        return f"pk.Normal({self.uncertainty!r})" if self.k == 1.0 else f"pk.Normal({self.uncertainty!r}, k={self.k:g})"

    def resolve(self, nominal: float, unit: str, name: str = "value") -> Resolved:
        """Return the distribution in SI numbers (see `Distribution.resolve`)."""
        return _Normal(nominal, spread(self.uncertainty, nominal, unit, name) / self.k)


@dataclass(frozen=True, slots=True, repr=False)
class Uniform(Distribution):
    """A uniform distribution about the nominal value.

    Parameters
    ----------
    half_width : str, quantity or float
        Largest departure from the nominal value; ``"1 %"`` is of the nominal value, a number is in SI.
    """

    half_width: Any

    def __repr__(self) -> str:
        return f"pk.Uniform({self.half_width!r})"

    def resolve(self, nominal: float, unit: str, name: str = "value") -> Resolved:
        """Return the distribution in SI numbers (see `Distribution.resolve`)."""
        return _Uniform(nominal, spread(self.half_width, nominal, unit, name))


@dataclass(frozen=True, slots=True, repr=False)
class Triangular(Distribution):
    """A symmetric triangular distribution about the nominal value.

    Parameters
    ----------
    half_width : str, quantity or float
        Largest departure from the nominal value; ``"1 %"`` is of the nominal value, a number is in SI.
    """

    half_width: Any

    def __repr__(self) -> str:
        return f"pk.Triangular({self.half_width!r})"

    def resolve(self, nominal: float, unit: str, name: str = "value") -> Resolved:
        """Return the distribution in SI numbers (see `Distribution.resolve`)."""
        return _Triangular(nominal, spread(self.half_width, nominal, unit, name))


class Empirical(Distribution):
    """Values of the input as observed, each equally likely.

    Parameters
    ----------
    samples : iterable of str, quantity or float
        At least ten values of the quantity itself, not departures from it; numbers are in SI.
    """

    __slots__ = ("samples",)

    samples: tuple[Any, ...]

    def __init__(self, samples: Iterable[Any]) -> None:
        if isinstance(samples, str) or not isinstance(samples, Iterable):
            raise InputError(Problem("samples", repr(samples), "a list of values of the quantity"))
        object.__setattr__(self, "samples", tuple(samples))
        if len(self.samples) < 10:
            raise InputError(
                Problem(
                    "samples",
                    f"{len(self.samples)} values",
                    "at least 10 values",
                    "With fewer, describe the input by a pk.Normal.",
                )
            )

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("Empirical is immutable")

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Empirical) and self.samples == other.samples

    def __hash__(self) -> int:
        return hash(("Empirical", self.samples))

    def __repr__(self) -> str:
        return f"pk.Empirical({list(self.samples)!r})"

    def __reduce__(self) -> tuple[Any, ...]:
        return Empirical, (self.samples,)

    def resolve(self, nominal: float, unit: str, name: str = "value") -> Resolved:
        """Return the distribution in SI numbers (see `Distribution.resolve`)."""
        values = sorted(units.to_si(value, unit, f"{name}[{index}]") for index, value in enumerate(self.samples))
        if values[0] == values[-1]:
            raise InputError(Problem(name, f"{len(values)} equal samples", "samples that differ"))
        return _Empirical(nominal, tuple(values))


def spread(value: object, nominal: float, unit: str, name: str = "value") -> float:
    """Return an uncertainty or half-width as a positive SI number.

    Parameters
    ----------
    value : str, quantity or float
        ``"1 %"`` (of the nominal value), ``"0.05 MPa"``, a quantity, or a number in SI.
    nominal : float
        Nominal value [unit].
    unit : str
        SI unit of the quantity in pint's spelling.
    name : str
        Path of the input, for error texts.

    Returns
    -------
    float
        The spread [unit], above 0.

    Raises
    ------
    InputError
        For a spread that is not positive, a percentage of zero, or a temperature difference in a unit with an offset.
    """
    percent = _percentage(value, name)
    if percent is not None:
        if nominal == 0.0 or not math.isfinite(nominal):
            raise InputError(
                Problem(
                    name,
                    f"{value!r} of {nominal:g}",
                    "an uncertainty in units",
                    "A percentage of this nominal value says nothing.",
                )
            )
        found = percent * abs(nominal)
    else:
        found = units.to_si(value, unit, name, difference=True)
        if unit == "K" and units.to_si(_nothing_of(value), unit, name, difference=True) != 0.0:
            raise InputError(
                Problem(
                    name,
                    f"{value}",
                    "a difference of temperatures in K or °R",
                    "Degrees with an offset do not state a difference.",
                )
            )
    if not found > 0.0:
        raise InputError(Problem(name, f"{value!r}", "an uncertainty above 0", "Leave the input out if it is certain."))
    return found


def _plain(value: Any) -> Any:
    if isinstance(value, tuple):
        return [_plain(entry) for entry in value]
    return f"{float(value.magnitude)!r} {value.units}" if hasattr(value, "magnitude") else value


def _percentage(value: object, name: str) -> float | None:
    """Return the fraction that a percentage states, or None when `value` is none."""
    if isinstance(value, str):
        text = value.strip()
        return units.to_si(text, "", name) if text.endswith(("%", "percent")) else None
    shown = str(getattr(value, "units", ""))
    return units.to_si(value, "", name) if shown in ("percent", "%") else None


def _nothing_of(value: object) -> object:
    """Return zero in the unit of `value`: not zero in SI where that unit has an offset."""
    if isinstance(value, str):
        digits = value.strip()
        start = next(
            (place for place, sign in enumerate(digits) if (sign.isalpha() and sign not in "eE") or sign == "°"),
            len(digits),
        )
        return f"0 {digits[start:]}" if start < len(digits) else 0.0
    if hasattr(value, "units"):
        return type(value)(0.0, value.units)  # type: ignore[call-arg]
    return 0.0
