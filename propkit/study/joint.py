"""Several uncertain inputs together: correlation, seeded draws, and how far they reach beyond what is legal.

Correlated inputs are drawn through a Gaussian copula (Nataf's model): normal scores with a correlation chosen so
that the inputs themselves have the correlation asked for, whatever their distributions. Blocks of draws have
generators of their own, made from the seed and the number of the block, so that the draws do not depend on where
or in what order the blocks run.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt
from scipy import optimize, special

from propkit.errors import InputError, Problem, RangeError
from propkit.study.distributions import Resolved

Array = npt.NDArray[np.float64]
Pair = tuple[str, str]

_NODES = np.linspace(-8.0, 8.0, 321)
_WEIGHTS = np.exp(-0.5 * _NODES**2) / np.exp(-0.5 * _NODES**2).sum()


@dataclass(frozen=True, slots=True)
class Reach:
    """How far one input reaches beyond its legal range.

    Parameters
    ----------
    path : str
        Path of the input.
    probability : float
        Share of its distribution outside the legal range.
    count : int
        Trials of the run that fall outside.
    """

    path: str
    probability: float
    count: int

    def __str__(self) -> str:
        trials = "1 trial" if self.count == 1 else f"{self.count} trials"
        share = f"{100.0 * self.probability:.2g} % of its distribution"
        return f"`{self.path}` reaches illegal values: {share}, {trials} of this run"


@dataclass(frozen=True, slots=True)
class JointInputs:
    """Uncertain inputs with their correlation.

    Parameters
    ----------
    distributions : mapping of str to Resolved
        Path -> distribution in SI.
    correlation : mapping of pair of str to float
        Correlation of two inputs [1]; pairs left out are uncorrelated.
    bounds : mapping of str to (low, high)
        Legal values of an input in SI; inputs left out are unbounded.

    Raises
    ------
    InputError
        For a correlation that is no correlation, names an unknown input, or that no set of inputs can have.
    """

    distributions: Mapping[str, Resolved]
    correlation: Mapping[Pair, float] = field(default_factory=dict)
    bounds: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    matrix: Array = field(init=False)
    _mix: Array = field(init=False)

    def __post_init__(self) -> None:
        if not self.distributions:
            raise InputError("no uncertain input was given; give at least one path with a distribution")
        paths = self.paths
        matrix = np.eye(len(paths))
        scores = np.eye(len(paths))
        for (first, second), value in self.correlation.items():
            i, j = self._pair(first, second, value)
            matrix[i, j] = matrix[j, i] = value
            scores[i, j] = scores[j, i] = score_correlation(self.distributions[first], self.distributions[second], float(value))
        object.__setattr__(self, "matrix", matrix)
        object.__setattr__(self, "_mix", _root(scores, paths))

    def _pair(self, first: str, second: str, value: float) -> tuple[int, int]:
        paths = self.paths
        unknown = [path for path in (first, second) if path not in paths]
        if unknown or first == second:
            given = ", ".join(paths)
            raise InputError(
                Problem(
                    "correlation",
                    f"given for {first!r} and {second!r}",
                    f"between two of the uncertain inputs ({given})",
                )
            )
        if isinstance(value, bool) or not -1.0 <= float(value) <= 1.0:
            raise InputError(Problem(f"correlation of {first} and {second}", f"{value!r}", "between -1 and 1"))
        return paths.index(first), paths.index(second)

    @property
    def paths(self) -> tuple[str, ...]:
        """Paths of the inputs in their order."""
        return tuple(self.distributions)

    @property
    def independent(self) -> bool:
        """Whether no two inputs are correlated."""
        return bool(np.array_equal(self.matrix, np.eye(len(self.matrix))))

    @property
    def nominal(self) -> dict[str, float]:
        """Nominal value of each input."""
        return {path: entry.nominal for path, entry in self.distributions.items()}

    @property
    def deviations(self) -> Array:
        """Standard uncertainties in the order of the paths."""
        return np.array([entry.standard_uncertainty for entry in self.distributions.values()])

    @property
    def covariance(self) -> Array:
        """Covariance matrix of the inputs."""
        deviations = self.deviations
        covariance: Array = self.matrix * np.outer(deviations, deviations)
        return covariance

    def from_unit(self, unit: Array) -> dict[str, Array]:
        """Return inputs at independent uniform numbers, one column for each input (independent inputs only)."""
        if not self.independent:
            raise InputError("inputs that are correlated do not follow from independent numbers one by one")
        return {path: entry.quantile(unit[:, place]) for place, (path, entry) in enumerate(self.distributions.items())}

    def draw(self, seed: int, block: int, count: int) -> dict[str, Array]:
        """Return block number `block` of draws: path -> `count` values.

        Parameters
        ----------
        seed : int
            Seed of the run.
        block : int
            Number of the block, from 0.
        count : int
            Number of draws.

        Returns
        -------
        dict of str to array
            Values in SI; the same for the same seed, block and count, wherever it runs.
        """
        generator = np.random.Generator(np.random.PCG64(np.random.SeedSequence(seed, spawn_key=(block,))))
        scores = generator.standard_normal((count, len(self.paths)))
        if not self.independent:
            scores = scores @ self._mix.T
        return {
            path: entry.quantile(_inside(special.ndtr(scores[:, place]))) if not entry.normal else _normal_at(entry, scores[:, place])
            for place, (path, entry) in enumerate(self.distributions.items())
        }

    def legal(self, drawn: Mapping[str, Array]) -> npt.NDArray[np.bool_]:
        """Return which draws are legal in every input."""
        size = len(next(iter(drawn.values())))
        good = np.ones(size, dtype=bool)
        for path, (low, high) in self.bounds.items():
            good &= (drawn[path] >= low) & (drawn[path] <= high)
        return good

    def reach(self, seed: int, sizes: list[int]) -> tuple[Reach, ...]:
        """Return the inputs that leave their legal range in a run of blocks of these sizes, with counts."""
        shares = {path: self.distributions[path].outside(*limits) for path, limits in self.bounds.items()}
        suspects = [path for path, share in shares.items() if share > 0.0]
        counts = dict.fromkeys(suspects, 0)
        if sum(shares.values()) * sum(sizes) > 1e-6:
            for block, size in enumerate(sizes):
                drawn = self.draw(seed, block, size)
                for path in suspects:
                    low, high = self.bounds[path]
                    counts[path] += int(np.count_nonzero((drawn[path] < low) | (drawn[path] > high)))
        return tuple(Reach(path, shares[path], count) for path, count in counts.items() if count)


def score_correlation(first: Resolved, second: Resolved, wanted: float) -> float:
    """Return the correlation of normal scores that gives two inputs the correlation `wanted`.

    Parameters
    ----------
    first, second : Resolved
        The two distributions.
    wanted : float
        Correlation of the inputs themselves [1], -1 to 1.

    Returns
    -------
    float
        Correlation of their normal scores [1].

    Raises
    ------
    RangeError
        When no Gaussian copula of these distributions has that correlation.

    Notes
    -----
    Solves E[(x - mx)(y - my)]/(sx sy) = wanted with x and y as functions of normal scores; the expectation by
    the trapezoidal rule in both scores (observed values make steps, which Gauss quadrature takes badly). Normal distributions need no solution: the two correlations are one.

    Source: P.-L. Liu, A. Der Kiureghian, Multivariate distribution models with prescribed marginals and covariances,
    Probabilistic Engineering Mechanics 1 (1986) 105-112 (from memory).
    """
    if wanted == 0.0 or (first.normal and second.normal):
        return wanted

    def moments(entry: Resolved) -> tuple[float, float]:
        values = entry.quantile(_inside(special.ndtr(_NODES)))
        mean = float(_WEIGHTS @ values)
        return mean, math.sqrt(float(_WEIGHTS @ (values - mean) ** 2))

    (mean_x, deviation_x), (mean_y, deviation_y) = moments(first), moments(second)
    x = (first.quantile(_inside(special.ndtr(_NODES))) - mean_x) / deviation_x

    def excess(correlation: float) -> float:
        other = correlation * _NODES[:, None] + math.sqrt(1.0 - correlation**2) * _NODES[None, :]
        y = (second.quantile(_inside(special.ndtr(other))) - mean_y) / deviation_y
        return float(_WEIGHTS @ (x[:, None] * y) @ _WEIGHTS) - wanted

    low, high = excess(-1.0), excess(1.0)
    if low > 0.0 or high < 0.0:
        if abs(wanted) > 0.995 and min(abs(low), abs(high)) < 0.01:
            return math.copysign(1.0, wanted)
        raise RangeError(
            f"a correlation of {wanted:g} is out of reach for these distributions; "
            f"between {low + wanted:.3f} and {high + wanted:.3f} is possible",
            wanted=wanted,
        )
    return float(optimize.brentq(excess, -1.0, 1.0, xtol=1e-10))


def check_seed(seed: object) -> int:
    """Return `seed` when it is an integer of at least 0.

    Raises
    ------
    InputError
        For anything else: a run that cannot be repeated has no place in a record.
    """
    if isinstance(seed, bool) or not isinstance(seed, int | np.integer) or int(seed) < 0:
        given = "missing" if seed is None else repr(seed)
        raise InputError(
            Problem(
                "seed",
                given,
                "an integer of at least 0",
                "It is kept with the result, so that the run can be repeated.",
            )
        )
    return int(seed)


def _inside(probability: Array) -> Array:
    """Keep probabilities off 0 and 1, where quantiles are infinite."""
    tiny = float(np.finfo(np.float64).tiny)
    return np.clip(probability, tiny, 1.0 - 2.0**-53)


def _normal_at(entry: Resolved, scores: Array) -> Array:
    return entry.nominal + entry.standard_uncertainty * scores


def _root(scores: Array, paths: tuple[str, ...]) -> Array:
    """Return a matrix whose product with its transpose is `scores`."""
    values, vectors = np.linalg.eigh(scores)
    if values[0] < -1e-10:
        weights = np.abs(vectors[:, 0])
        clash = ", ".join(path for path, weight in zip(paths, weights, strict=True) if weight > 0.1)
        raise InputError(
            f"the correlations of {clash} contradict each other: no set of inputs can have them (smallest eigenvalue {values[0]:.3g})"
        )
    root: Array = vectors * np.sqrt(np.maximum(values, 0.0))
    return root
