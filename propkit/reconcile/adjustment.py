"""Least-squares adjustment of figures that a model ties together.

Every figure has a value and a standard uncertainty; the model computes all of them from a few unknowns. The best
consistent set moves each figure as little as its uncertainty allows. How well each figure is checked by the others,
whether all of them can be true together, and which one is out, follow from the same matrices. Priors on unknowns are
figures like any other.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import numpy.typing as npt
from scipy import linalg, special

from propkit.errors import ConvergenceError, InputError, Problem, RangeError
from propkit.study.differences import Evaluate, stencil

Array = npt.NDArray[np.float64]
Jacobian = Callable[[dict[str, float]], Mapping[str, Mapping[str, float]]]

NOT_CHECKABLE = 0.1
"""Redundancy below which a figure counts as not checkable by the others."""
SIGNIFICANT = 0.05
"""Probability below which the figures contradict each other."""
LARGE_RESIDUAL = 1.96
"""Normalised residual above which a figure is suspect: the two-sided 5 % point of the normal distribution."""
_BLIND = 1e-6
"""What doubling an unknown moves a figure by, in standard uncertainties, below which the figure does not depend on it."""
_SHIFT = 1e-6
"""Largest last step, in standard uncertainties of the figures."""
_ITERATIONS = 60
_LENGTHS = np.array([1.0, 0.5, 0.25, 0.1, 0.03, 0.01, 0.001])


@dataclass(frozen=True, slots=True)
class Figure:
    """One quoted or measured figure.

    Parameters
    ----------
    name : str
        The figure's name, as given.
    value, uncertainty : float
        Value and standard uncertainty, in the unit of the model's result.
    result : str
        What the model calls it: a result, or the path of an unknown; the default is `name`.
    prior : bool
        Whether it is a prior on an unknown rather than a figure someone stated.
    """

    name: str
    value: float
    uncertainty: float
    result: str = ""
    prior: bool = False

    @property
    def key(self) -> str:
        """What the model calls it."""
        return self.result or self.name


@dataclass(frozen=True, slots=True)
class Unknown:
    """One unknown of the adjustment: path, first guess and legal range."""

    path: str
    start: float
    low: float = -math.inf
    high: float = math.inf


@dataclass(frozen=True, slots=True)
class Strike:
    """What follows when one figure is struck out: the global test of the rest."""

    name: str
    chi_square: float
    degrees_of_freedom: int
    p_value: float

    @property
    def restores(self) -> bool:
        """Whether the figures left are consistent."""
        return self.p_value >= SIGNIFICANT


@dataclass(frozen=True, slots=True)
class Adjustment:
    """Adjusted figures and what they say about the given ones.

    Parameters
    ----------
    figures, unknowns : tuple
        What was adjusted, in the order of the arrays.
    estimate, estimate_covariance : array
        Unknowns and their covariance.
    adjusted, adjusted_covariance : array
        Figures as the model gives them at the estimate, and their covariance.
    residual : array
        Adjusted less given figure.
    normalised : array
        Residual over its own standard deviation; NaN for a figure that no other checks.
    redundancy : array
        Variance of the residual over variance of the figure, 0 (nothing checks it) to 1.
    residual_correlation : array
        Correlation of the residuals.
    chi_square, degrees_of_freedom, p_value : float, int, float
        Global test; the probability is NaN where there is no redundancy.
    iterations : int
        Steps taken.
    on_bound : tuple of str
        Unknowns at an end of their legal range.
    """

    figures: tuple[Figure, ...]
    unknowns: tuple[Unknown, ...]
    estimate: Array
    estimate_covariance: Array
    adjusted: Array
    adjusted_covariance: Array
    residual: Array
    normalised: Array
    redundancy: Array
    residual_correlation: Array
    chi_square: float
    degrees_of_freedom: int
    p_value: float
    iterations: int
    on_bound: tuple[str, ...] = ()
    again: Callable[[str], Adjustment] | None = field(default=None, repr=False, compare=False)

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the figures."""
        return tuple(figure.name for figure in self.figures)

    @property
    def adjusted_uncertainty(self) -> Array:
        """Standard uncertainty of each adjusted figure."""
        deviations: Array = np.sqrt(np.maximum(np.diag(self.adjusted_covariance), 0.0))
        return deviations

    @property
    def checkable(self) -> npt.NDArray[np.bool_]:
        """Whether the other figures check each figure."""
        return self.redundancy >= NOT_CHECKABLE

    @property
    def consistent(self) -> bool:
        """Whether the global test finds no contradiction (without redundancy there is none to find)."""
        return not self.p_value < SIGNIFICANT

    @property
    def suspects(self) -> tuple[str, ...]:
        """Checkable figures with a large normalised residual, the largest first; empty when the figures are consistent."""
        if self.consistent:
            return ()
        size = np.where(self.checkable, np.abs(np.nan_to_num(self.normalised)), -1.0)
        order = np.argsort(-size, kind="stable")
        large = [place for place in order if size[place] > LARGE_RESIDUAL]
        return tuple(self.names[place] for place in large or order[:1] if size[place] >= 0.0)

    @property
    def twins(self) -> tuple[tuple[str, ...], ...]:
        """Groups of checkable figures whose residuals move as one: an error in one cannot be told from one in another."""
        left = [place for place, good in enumerate(self.checkable) if good]
        groups = []
        while left:
            group = [place for place in left if abs(self.residual_correlation[left[0], place]) > 0.999]
            left = [place for place in left if place not in group]
            if len(group) > 1:
                groups.append(tuple(self.names[place] for place in group))
        return tuple(groups)

    def strikes(self) -> tuple[Strike, ...]:
        """Return what striking each checkable figure out leaves, the best first; each is a new adjustment."""
        found = []
        for figure, good in zip(self.figures, self.checkable, strict=True):
            if not good or self.again is None or self.degrees_of_freedom < 2:
                continue
            try:
                rest = self.again(figure.name)
            except (ConvergenceError, InputError, RangeError):
                continue
            found.append(Strike(figure.name, rest.chi_square, rest.degrees_of_freedom, rest.p_value))
        return tuple(sorted(found, key=lambda strike: -strike.p_value))


def adjust(
    evaluate: Evaluate,
    figures: Sequence[Figure],
    unknowns: Sequence[Unknown],
    *,
    correlation: Mapping[tuple[str, str], float] | None = None,
    jacobian: Jacobian | None = None,
) -> Adjustment:
    """Return the best consistent set of figures.

    Parameters
    ----------
    evaluate : callable
        Batch model: arrays of the unknowns by path in, arrays of the results that the figures name out; NaN where
        there is no solution.
    figures : sequence of Figure
        Figures and priors, at least as many as unknowns.
    unknowns : sequence of Unknown
        What the model is free to move.
    correlation : mapping of pair of str to float, optional
        Correlation of two figures [1].
    jacobian : callable, optional
        Derivatives at one point: unknowns in, result -> path -> derivative out; differences are used without it.

    Returns
    -------
    Adjustment
        Adjusted figures, their uncertainties and tests.

    Raises
    ------
    InputError
        For fewer figures than unknowns, unknowns that the figures do not determine, or figures that cannot all be true
        inside the legal ranges; the message names them.
    RangeError
        When the model has no solution at the first guess.
    ConvergenceError
        When the iteration stalls; carries iterations and the last state.

    Notes
    -----
    Minimises (x - y)ᵀ S⁻¹ (x - y) with x = g(θ) by Gauss-Newton steps, the best of several step lengths in each.
    With J = dg/dθ: cov θ = (Jᵀ S⁻¹ J)⁻¹, cov x = J cov θ Jᵀ, cov of the residuals = S - cov x; redundancy = their
    variance over that of the figure; global test: chi-square with as many degrees of freedom as figures exceed unknowns.

    Source: VDI 2048 part 1 (correction calculation; from memory), in its parametric form as in any text on adjustment.
    """
    _check(figures, unknowns)
    solver = _Solver(evaluate, tuple(figures), tuple(unknowns), _covariance(figures, correlation or {}), jacobian)
    estimate, iterations = solver.solve()
    return solver.result(estimate, iterations, correlation or {})


class _Solver:
    def __init__(
        self,
        evaluate: Evaluate,
        figures: tuple[Figure, ...],
        unknowns: tuple[Unknown, ...],
        covariance: Array,
        jacobian: Jacobian | None,
    ) -> None:
        self.evaluate, self.figures, self.unknowns = evaluate, figures, unknowns
        self.covariance, self.jacobian = covariance, jacobian
        self.given = np.array([figure.value for figure in figures])
        self.root = np.linalg.cholesky(covariance)
        self.paths = tuple(unknown.path for unknown in unknowns)
        self.low = np.array([unknown.low for unknown in unknowns])
        self.high = np.array([unknown.high for unknown in unknowns])

    def whiten(self, values: Array) -> Array:
        """Return values in units of uncorrelated standard uncertainties."""
        whitened: Array = linalg.solve_triangular(self.root, values, lower=True)
        return whitened

    def model(self, points: Array) -> Array:
        """Return the figures at rows of unknowns, shape (figures, points)."""
        inputs = {path: points[:, place].copy() for place, path in enumerate(self.paths)}
        results = self.evaluate({path: values.copy() for path, values in inputs.items()})
        missing = [figure.name for figure in self.figures if figure.key not in results and figure.key not in inputs]
        if missing:
            raise InputError(f"the model has no result {', '.join(missing)}")
        return np.array([np.asarray(inputs.get(figure.key, results.get(figure.key)), dtype=np.float64) for figure in self.figures])

    def linearise(self, estimate: Array) -> tuple[Array, Array]:
        """Return the figures and their derivatives at the estimate."""
        steps = 1e-3 * np.where(estimate != 0.0, np.abs(estimate), 1.0)
        around = stencil(estimate, steps, self.low, self.high)
        if self.jacobian is None:
            table = self.model(around.points)
            return table[:, 0], around.slopes(table)
        table = self.model(estimate[None, :])
        known = self.jacobian(dict(zip(self.paths, map(float, estimate), strict=True)))
        slopes = np.array([[self._derivative(known, figure, path) for path in self.paths] for figure in self.figures])
        return table[:, 0], slopes

    @staticmethod
    def _derivative(known: Mapping[str, Mapping[str, float]], figure: Figure, path: str) -> float:
        if figure.key == path and figure.key not in known:
            return 1.0
        return known.get(figure.key, {}).get(path, 0.0)

    def solve(self) -> tuple[Array, int]:
        """Return the estimate and the number of steps."""
        estimate = np.clip([unknown.start for unknown in self.unknowns], self.low, self.high).astype(np.float64)
        for iteration in range(1, _ITERATIONS + 1):
            values, slopes = self.linearise(estimate)
            self._require_solution(values, slopes, estimate)
            residual = self.whiten(self.given - values)
            step, free = self._step(self.whiten(slopes), residual, estimate)
            shift = float(np.linalg.norm(self.whiten(slopes @ step)))
            if shift < _SHIFT:
                # the last step is taken where it does not lead out of the model
                self._require_legal(estimate, slopes, residual, free)
                return estimate, iteration
            chosen = self._best(estimate, step, float(residual @ residual))
            if chosen is None:
                if shift < 1e3 * _SHIFT:
                    self._require_legal(estimate, slopes, residual, free)
                    return estimate, iteration
                break
            estimate = chosen
        raise ConvergenceError(
            f"the adjustment stalled after {iteration} steps, {shift:.2g} standard uncertainties from its end; "
            "start from an object nearer to the figures",
            iterations=iteration,
            residual=shift,
            state=dict(zip(self.paths, map(float, estimate), strict=True)),
        )

    def _best(self, estimate: Array, step: Array, present: float) -> Array | None:
        """Return the best of several lengths of a step; None when none of them improves."""
        points = np.clip(estimate + _LENGTHS[:, None] * step, self.low, self.high)
        values = self.model(points)
        good = np.isfinite(values).all(axis=0)
        chi = np.full(len(points), np.inf)
        chi[good] = np.square(self.whiten(self.given[:, None] - values[:, good])).sum(axis=0)
        best = int(np.argmin(chi))
        return points[best] if chi[best] < present else None

    def _step(self, slopes: Array, residual: Array, estimate: Array) -> tuple[Array, npt.NDArray[np.bool_]]:
        """Return the Gauss-Newton step of the unknowns that no bound holds, and which those are."""
        free = np.ones(len(estimate), dtype=bool)
        while True:
            step = np.zeros(len(estimate))
            if free.any():
                step[free] = self._least_squares(slopes[:, free], residual, np.flatnonzero(free), estimate)
            held = free & (((estimate <= self.low) & (step < 0.0)) | ((estimate >= self.high) & (step > 0.0)))
            if not held.any():
                return step, free
            free &= ~held

    def _least_squares(self, slopes: Array, residual: Array, places: npt.NDArray[np.intp], estimate: Array) -> Array:
        scale = np.linalg.norm(slopes, axis=0)
        # differences leave some rounding
        effect = scale * np.where(estimate[places] != 0.0, np.abs(estimate[places]), 1.0)
        blind = [self.paths[place] for place, size in zip(places, effect, strict=True) if not size > _BLIND]
        if blind:
            raise InputError(
                f"no figure depends on {', '.join(blind)}: quote one that does, or do not free it",
                unknowns=tuple(blind),
            )
        left, sizes, right = np.linalg.svd(slopes / scale, full_matrices=False)
        if sizes[-1] < 1e-7 * sizes[0]:
            weights = np.abs(right[-1])
            mixed = [self.paths[place] for place, weight in zip(places, weights, strict=True) if weight > 0.05]
            raise InputError(
                f"the figures do not tell {' and '.join(mixed)} apart: quote another figure, or free fewer inputs",
                unknowns=tuple(mixed),
            )
        step: Array = (right.T @ ((left.T @ residual) / sizes)) / scale
        return step

    def _require_solution(self, values: Array, slopes: Array, estimate: Array) -> None:
        bad = [
            figure.name
            for figure, value, row in zip(self.figures, values, slopes, strict=True)
            if not (math.isfinite(value) and np.isfinite(row).all())
        ]
        if bad:
            where = ", ".join(f"{path} = {value:.6g}" for path, value in zip(self.paths, estimate, strict=True))
            raise RangeError(f"the model has no {', '.join(bad)} at {where}; start from another object", figures=tuple(bad))

    def _require_legal(self, estimate: Array, slopes: Array, residual: Array, free: npt.NDArray[np.bool_]) -> None:
        """Refuse figures that could only be true together outside the legal range of an unknown."""
        if free.all():
            return
        whitened = self.whiten(slopes)
        beyond = self._least_squares(whitened, residual, np.arange(len(free)), estimate)
        gain = float(np.square(whitened @ beyond).sum())
        if gain <= 16.0:
            return
        held = list(np.flatnonzero(~free))
        limits = ", ".join(f"{self.paths[place]} beyond its limit {estimate[place]:.6g}" for place in held)
        worst = [self.figures[place].name for place in np.argsort(-np.abs(residual)) if abs(residual[place]) > 2.0][:3]
        raise InputError(
            f"the figures cannot all be true: together they ask for {limits}. Furthest from what is possible: {', '.join(worst)}",
            figures=tuple(worst),
        )

    def result(self, estimate: Array, iterations: int, correlation: Mapping[tuple[str, str], float]) -> Adjustment:
        """Return the adjustment at the estimate."""
        values, slopes = self.linearise(estimate)
        # what doubling an unknown moves by less than this is rounding: the figure does not depend on it
        size = np.where(estimate != 0.0, np.abs(estimate), 1.0)
        deviations = np.sqrt(np.diag(self.covariance))
        slopes = np.where(np.abs(slopes) * size > _BLIND * deviations[:, None], slopes, 0.0)
        whitened = self.whiten(slopes)
        residual = self.given - values
        _, free = self._step(whitened, self.whiten(residual), estimate)
        scale = np.linalg.norm(whitened[:, free], axis=0)
        _, triangle = np.linalg.qr(whitened[:, free] / scale)
        inverse = np.linalg.inv(triangle) / scale[:, None]
        covariance = np.zeros((len(estimate), len(estimate)))
        covariance[np.ix_(free, free)] = inverse @ inverse.T
        adjusted_covariance = slopes @ covariance @ slopes.T
        left_over = self.covariance - adjusted_covariance
        variance = np.diag(self.covariance)
        redundancy = np.clip(np.diag(left_over) / variance, 0.0, 1.0)
        deviation = np.sqrt(redundancy * variance)
        seen = redundancy > 1e-6
        normalised = np.full(len(values), np.nan)
        normalised[seen] = -residual[seen] / deviation[seen]
        safe = np.where(seen, deviation, np.inf)
        chi_square = float(np.square(self.whiten(residual)).sum())
        freedom = len(self.figures) - int(free.sum())
        probability = float(special.chdtrc(freedom, chi_square)) if freedom > 0 else math.nan
        start = [replace(unknown, start=float(value)) for unknown, value in zip(self.unknowns, estimate, strict=True)]

        def again(struck: str) -> Adjustment:
            kept = [figure for figure in self.figures if figure.name != struck]
            pairs = {pair: value for pair, value in correlation.items() if struck not in pair}
            return adjust(self.evaluate, kept, start, correlation=pairs, jacobian=self.jacobian)

        return Adjustment(
            figures=self.figures,
            unknowns=self.unknowns,
            estimate=estimate,
            estimate_covariance=covariance,
            adjusted=values,
            adjusted_covariance=adjusted_covariance,
            residual=-residual,
            normalised=normalised,
            redundancy=redundancy,
            residual_correlation=left_over / np.outer(safe, safe),
            chi_square=chi_square,
            degrees_of_freedom=freedom,
            p_value=probability,
            iterations=iterations,
            on_bound=tuple(path for path, good in zip(self.paths, free, strict=True) if not good),
            again=again,
        )


def _check(figures: Sequence[Figure], unknowns: Sequence[Unknown]) -> None:
    if not unknowns:
        raise InputError("nothing is free to be adjusted; free at least one input")
    problems = [
        Problem(
            f"uncertainty of {figure.name}",
            f"{figure.uncertainty:g}",
            "finite and above 0",
            "A figure without doubt cannot be adjusted.",
        )
        for figure in figures
        if not (math.isfinite(figure.uncertainty) and figure.uncertainty > 0.0)
    ]
    problems += [Problem(figure.name, f"{figure.value:g}", "finite") for figure in figures if not math.isfinite(figure.value)]
    if problems:
        raise InputError(problems)
    names = [figure.name for figure in figures]
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise InputError(f"{', '.join(twice)} is given more than once")
    if len(figures) < len(unknowns):
        free = ", ".join(unknown.path for unknown in unknowns)
        raise InputError(
            f"{len(figures)} figure{'s' if len(figures) > 1 else ''} cannot determine {len(unknowns)} unknowns ({free}): quote more figures or free fewer inputs",
            figures=tuple(names),
            unknowns=tuple(unknown.path for unknown in unknowns),
        )


def _covariance(figures: Sequence[Figure], correlation: Mapping[tuple[str, str], float]) -> Array:
    names = [figure.name for figure in figures]
    matrix = np.eye(len(names))
    for (first, second), value in correlation.items():
        if first not in names or second not in names or first == second:
            raise InputError(Problem("correlation", f"given for {first!r} and {second!r}", f"between two of {', '.join(names)}"))
        if not -1.0 < value < 1.0:
            raise InputError(Problem(f"correlation of {first} and {second}", f"{value!r}", "between -1 and 1, the ends left out"))
        i, j = names.index(first), names.index(second)
        matrix[i, j] = matrix[j, i] = value
    if np.linalg.eigvalsh(matrix)[0] < 1e-12:
        raise InputError("the correlations of the figures contradict each other")
    deviations = np.array([figure.uncertainty for figure in figures])
    covariance: Array = matrix * np.outer(deviations, deviations)
    return covariance
