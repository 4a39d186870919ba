"""Uncertainty of results from that of inputs: first order, and by trials of whole distributions.

Both work on any batch function `evaluate`: inputs as arrays by path in, results as arrays by name out, NaN where
a trial has no solution. It must be pure; for processes and clusters it must be picklable.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any, Literal, Protocol, runtime_checkable

import numpy as np
import numpy.typing as npt

from propkit.errors import ConvergenceError, InputError, Problem
from propkit.study.coverage import Stability, statistics, tolerance
from propkit.study.differences import Evaluate, Stencil, stencil
from propkit.study.evaluation import Tangents
from propkit.study.executors import BlockRun, run_blocks
from propkit.study.joint import JointInputs, Reach, check_seed

Array = npt.NDArray[np.float64]

BLOCK = 2500
"""Trials in one block."""
NOTHING = 1e-11
"""Share of a value below which a spread is rounding."""
ADAPTIVE_ROUND = 10_000
"""Trials between two looks at the tolerance: max(100/(1 - p) rounded up, 10 000), JCGM 101 clause 7.9.4 b."""
ADAPTIVE_MOST = 1_000_000
"""Trials after which an adaptive run stops whatever it has reached."""


@runtime_checkable
class Differentiable(Protocol):
    """A batch function that knows derivatives of its own."""

    def tangents(self, nominal: Mapping[str, float]) -> Tangents:
        """Return results and exact derivatives at one case; an input without exact ones is left out."""


@dataclass(frozen=True, slots=True)
class FirstOrder:
    """First-order uncertainty of several results.

    Parameters
    ----------
    paths, results : tuple of str
        Inputs and results, in the order of the arrays.
    nominal : array
        Results at the nominal inputs.
    derivatives : array, shape (results, inputs)
        Sensitivity coefficients, result per input in SI.
    covariance : array, shape (results, results)
        Covariance of the results.
    shares : array, shape (results, inputs)
        Share of each input in the variance of a result; they add up to 1, and with correlated inputs may be negative.
    exact : tuple of str
        Inputs whose sensitivity coefficients are exact, not found by differences.
    """

    paths: tuple[str, ...]
    results: tuple[str, ...]
    nominal: Array
    derivatives: Array
    covariance: Array
    shares: Array
    exact: tuple[str, ...] = ()

    @property
    def standard_uncertainty(self) -> Array:
        """Standard uncertainty of each result."""
        deviations: Array = np.sqrt(np.maximum(np.diag(self.covariance), 0.0))
        return deviations

    def bent(self, curvature: Array) -> tuple[tuple[str, str], ...]:
        """Return pairs of result and input with a curvature above a tenth that matters: first order is doubtful there."""
        share = np.abs(self.shares) > 0.01
        found = np.argwhere((curvature > 0.1) & share)
        return tuple((self.results[i], self.paths[j]) for i, j in found)


@dataclass(frozen=True, slots=True)
class Trials:
    """Results of trials (Monte Carlo).

    Parameters
    ----------
    results : tuple of str
        Names, in the order of the arrays.
    nominal, mean, standard_uncertainty, low, high : array
        At the nominal inputs; over the trials; ends of the probabilistically symmetric 95 % interval.
    samples : int
        Trials evaluated.
    valid : int
        Trials with a solution, on which the statistics rest.
    seed : int
        Seed of the run.
    values : array, shape (results, samples)
        Result of every trial; NaN where a trial has no solution.
    stability : tuple of Stability
        What an adaptive run reached, by result; empty with a fixed number of trials.
    notes : tuple of str
        What a reader should know about the run.
    reach : tuple of Reach
        Inputs that left their legal range, with counts.
    interrupted : bool
        Whether the run was stopped before its end.
    """

    results: tuple[str, ...]
    nominal: Array
    mean: Array
    standard_uncertainty: Array
    low: Array
    high: Array
    samples: int
    valid: int
    seed: int
    values: Array = field(repr=False)
    stability: tuple[Stability, ...] = ()
    notes: tuple[str, ...] = ()
    reach: tuple[Reach, ...] = ()
    interrupted: bool = False


def first_order(
    evaluate: Evaluate,
    inputs: JointInputs,
    derivatives: Mapping[str, Mapping[str, float]] | None = None,
) -> FirstOrder:
    """Return the first-order uncertainty of every result.

    Parameters
    ----------
    evaluate : callable
        Batch function: arrays by path in, arrays by result out.
    inputs : JointInputs
        Uncertain inputs.
    derivatives : mapping of result to mapping of path to float, optional
        Sensitivity coefficients where they are known exactly; others are those that `evaluate` knows itself (see
        `Differentiable`), or are found by differences.

    Returns
    -------
    FirstOrder
        Values, sensitivities, covariance and budget.

    Raises
    ------
    InputError
        When the results do not exist at the nominal inputs or, with differences, one standard uncertainty away from them.

    Notes
    -----
    u(y)² = c V cᵀ with the sensitivity coefficients c and the covariance matrix V of the inputs. Differences, where they are needed, use
    one and half a standard uncertainty to both sides (as the GUM suggests, 5.1.3 note 2), extrapolated to nothing by
    Richardson; near the end of a legal range they shrink or stay on one side.

    Source: JCGM 100:2008, 5.1.2 equation (10) and 5.2.2 equation (13).
    """
    known = evaluate.tangents(inputs.nominal) if isinstance(evaluate, Differentiable) else Tangents({}, {})
    left = tuple(path for path in inputs.paths if path not in known.slopes)
    values, slopes = known.values, known.slopes
    if left:
        values, differences = _differences(evaluate, inputs, left)
        slopes = slopes | differences
    results, nominal = tuple(values), np.array(list(values.values()))
    table = np.array([[slopes[path][name] for path in inputs.paths] for name in results])
    for place, name in enumerate(results):
        for path, value in (derivatives or {}).get(name, {}).items():
            table[place, inputs.paths.index(path)] = value
    exact = tuple(path for path in inputs.paths if path in known.slopes or _known_for(path, results, derivatives))
    return _budget(inputs, results, nominal, table, exact)


def _known_for(path: str, results: Sequence[str], derivatives: Mapping[str, Mapping[str, float]] | None) -> bool:
    return derivatives is not None and all(path in derivatives.get(name, {}) for name in results)


def _around(evaluate: Evaluate, inputs: JointInputs, paths: Sequence[str]) -> tuple[Stencil, tuple[str, ...], Array]:
    """Return a stencil about the nominal inputs in some of them, the names of the results, and the results at its points."""
    limits = np.array([inputs.bounds.get(path, (-math.inf, math.inf)) for path in paths])
    nominal = inputs.nominal
    deviations = [inputs.distributions[path].standard_uncertainty for path in paths]
    around = stencil(np.array([nominal[path] for path in paths]), np.array(deviations), limits[:, 0], limits[:, 1])
    points = {path: np.full(len(around.points), value) for path, value in nominal.items()} | around.inputs(paths)
    answers = evaluate(points)
    return around, tuple(answers), np.array([np.asarray(values, dtype=np.float64) for values in answers.values()])


def _differences(evaluate: Evaluate, inputs: JointInputs, paths: Sequence[str]) -> tuple[dict[str, float], dict[str, dict[str, float]]]:
    """Return nominal results, and derivatives by input and result, from differences."""
    around, results, table = _around(evaluate, inputs, paths)
    bad = [name for name, row in zip(results, table, strict=True) if not np.isfinite(row).all()]
    if bad:
        raise InputError(
            f"{', '.join(bad)} cannot be computed at or within one standard uncertainty of the nominal inputs; "
            "use a smaller uncertainty, or trials (samples=...), which count such cases",
            results=tuple(bad),
        )
    slopes = around.slopes(table)
    found = {path: dict(zip(results, slopes[:, place].tolist(), strict=True)) for place, path in enumerate(paths)}
    return dict(zip(results, table[:, 0].tolist(), strict=True)), found


def curvature(evaluate: Evaluate, inputs: JointInputs, linear: FirstOrder) -> Array:
    """Return what second order adds to first order over one standard uncertainty of each input [1].

    Parameters
    ----------
    evaluate, inputs
        As for `first_order`.
    linear : FirstOrder
        What that gave.

    Returns
    -------
    array, shape (results, inputs)
        Second-order over first-order effect; infinite where a result does not exist one standard uncertainty away.

    Notes
    -----
    The second derivatives are found by differences.
    """
    around, _, table = _around(evaluate, inputs, inputs.paths)
    deviations = inputs.deviations
    effect = np.abs(linear.derivatives) * deviations
    bent = 0.5 * np.abs(around.bends(table)) * deviations**2
    found = np.divide(bent, effect, out=np.zeros_like(bent), where=effect > 0.0)
    return np.where(np.isfinite(found), found, np.inf)


def _budget(inputs: JointInputs, results: tuple[str, ...], nominal: Array, slopes: Array, exact: tuple[str, ...]) -> FirstOrder:
    """Return covariance and shares."""
    deviations = inputs.deviations
    # differences leave rounding where an input has no effect
    effects = np.abs(slopes) * deviations
    floor = np.maximum(1e-9 * effects.max(axis=1), NOTHING * np.abs(nominal))
    slopes = np.where(effects > floor[:, None], slopes, 0.0)
    covariance = slopes @ inputs.covariance @ slopes.T
    variance = np.diag(covariance)[:, None]
    mixed = slopes * (slopes @ inputs.covariance)
    # both arrays are divided only where there is something to divide by
    shares = np.divide(mixed, variance, out=np.zeros_like(mixed), where=variance > 0.0)
    return FirstOrder(inputs.paths, results, nominal, slopes, covariance, shares, exact)


def monte_carlo(
    evaluate: Evaluate,
    inputs: JointInputs,
    samples: int | Literal["adaptive"],
    seed: int,
    *,
    executor: Any = None,
    progress: bool | Callable[[int, int, float], None] = True,
    block: int = BLOCK,
    illegal: Literal["refuse", "leave out"] = "refuse",
    most: int = ADAPTIVE_MOST,
    should_stop: Callable[[], bool] | None = None,
    quick: Evaluate | None = None,
) -> Trials:
    """Return the distribution of every result over trials of the inputs.

    Parameters
    ----------
    evaluate : callable
        Batch function: arrays by path in, arrays by result out, NaN where a trial has no solution.
    inputs : JointInputs
        Uncertain inputs.
    samples : int or "adaptive"
        Number of trials (at least 100), or as many as one significant digit of every standard uncertainty needs.
    seed : int
        Seed of the draws, at least 0.
    executor : executor, dask client or None
        Where the blocks run.
    progress : bool or callable
        Whether to show a bar for a run of more than a second.
    block : int
        Trials in one block.
    illegal : str
        What to do with draws outside the legal range of an input: ``"refuse"`` the run before it starts, or
        ``"leave out"`` those trials and count them.
    most : int
        Largest number of trials of an adaptive run.
    should_stop : callable, optional
        Asked between blocks; a true answer stops the run.
    quick : callable, optional
        The same function in a form that is quicker for many cases; the nominal results stay those of `evaluate`.

    Returns
    -------
    Trials
        Values, standard uncertainties and intervals.

    Raises
    ------
    InputError
        For a number of trials or a seed that is none, or draws outside a legal range.
    ConvergenceError
        When fewer than half of the trials have a solution.

    Notes
    -----
    Standard uncertainty: standard deviation over the trials (clause 7.6). Interval: probabilistically symmetric,
    from the ordered values (clause 7.7.2). Adaptive: rounds of 10 000 trials until twice the standard deviation of
    the averages over rounds of value, uncertainty and both ends is within the tolerance, for every result.

    Source: JCGM 101:2008, clauses 7.5 to 7.9.
    """
    seed = check_seed(seed)
    if illegal not in ("refuse", "leave out"):
        raise InputError(Problem("illegal", repr(illegal), "'refuse' or 'leave out'"))
    run = _Run(evaluate, quick or evaluate, inputs, seed, block, executor, progress, should_stop)
    adaptive = samples == "adaptive"
    total = _checked_samples(samples, most)
    reach = inputs.reach(seed, run.sizes(ADAPTIVE_ROUND if adaptive else total))
    if reach and illegal == "refuse":
        hint = 'use a bounded distribution (pk.Uniform, pk.Triangular) or illegal="leave out"'
        raise InputError("; ".join(map(str, reach)) + f". Nothing was run: {hint}.", reach=reach)
    if not adaptive:
        run.more(total)
        return run.trials(())
    stability: tuple[Stability, ...] = ()
    while run.asked < most and not run.stopped:
        run.more(min(ADAPTIVE_ROUND, most - run.asked))
        stability = run.stability()
        if stability and all(entry.stable for entry in stability):
            break
    return run.trials(stability)


class _Run:
    """Trials gathered round by round."""

    def __init__(
        self,
        evaluate: Evaluate,
        quick: Evaluate,
        inputs: JointInputs,
        seed: int,
        block: int,
        executor: Any,
        progress: bool | Callable[[int, int, float], None],
        should_stop: Callable[[], bool] | None,
    ) -> None:
        self.work = _Work(quick, inputs, seed)
        self.inputs = inputs
        self.seed = seed
        self.block = block
        self.options: dict[str, Any] = {"executor": executor, "progress": progress, "should_stop": should_stop}
        nominal = evaluate({path: np.array([value]) for path, value in inputs.nominal.items()})
        self.results = tuple(nominal)
        self.nominal = np.array([float(np.asarray(nominal[name])[0]) for name in self.results])
        self.values = np.empty((len(self.results), 0))
        self.rounds: list[int] = []
        self.notes: list[str] = []
        self.asked = 0
        self.blocks = 0
        self.illegal = 0
        self.stopped = False

    def sizes(self, count: int) -> list[int]:
        """Return the sizes of the blocks of `count` trials."""
        whole, rest = divmod(count, self.block)
        return [self.block] * whole + ([rest] if rest else [])

    def more(self, count: int) -> None:
        """Run `count` more trials."""
        sizes = self.sizes(count)
        blocks = [(self.blocks + place, size) for place, size in enumerate(sizes)]
        fresh = np.full((len(self.results), count), np.nan)
        filled = 0

        def keep(index: int, answer: Any) -> None:
            nonlocal filled
            values, illegal = answer
            fresh[:, filled : filled + values.shape[1]] = values
            filled += values.shape[1]
            self.illegal += illegal

        run: BlockRun = run_blocks(self.work, blocks, keep, sizes=sizes, noun="trials", **self.options)
        self.stopped = run.interrupted
        self.notes.extend(run.notes)
        self.values = np.concatenate([self.values, fresh[:, :filled]], axis=1)
        self.rounds.append(filled)
        self.asked += count
        self.blocks += len(blocks)

    def stability(self) -> tuple[Stability, ...]:
        """Return what the rounds so far have reached; empty with fewer than two."""
        if len(self.rounds) < 2 or self.stopped:
            return ()
        ends = np.cumsum([0, *self.rounds])
        parts = np.array([statistics(self.values[:, low:high]) for low, high in pairwise(ends)])
        scatter = parts.std(axis=0, ddof=1) / math.sqrt(len(parts))
        whole = statistics(self.values)[1]
        return tuple(Stability(tolerance(float(u)), float(2.0 * scatter[:, place].max())) for place, u in enumerate(whole))

    def trials(self, stability: tuple[Stability, ...]) -> Trials:
        """Return the statistics over everything that was run."""
        valid = np.isfinite(self.values).all(axis=0)
        count, samples = int(valid.sum()), self.values.shape[1]
        if samples < 2 or count < 0.5 * samples:
            if self.stopped and samples < 2:
                raise ConvergenceError("the run was interrupted before its first block ended: there is nothing to show", samples=samples)
            raise ConvergenceError(f"only {count} of {samples} trials have a solution", samples=samples, valid=count)
        mean, deviation, low, high = statistics(self.values)
        reach = self.inputs.reach(self.seed, [size for entry in self.rounds for size in self.sizes(entry)])
        notes = [*self.notes, *map(str, reach)]
        failed = samples - count - self.illegal
        if self.illegal:
            notes.append(f"{self.illegal} trials with illegal inputs are left out")
        if failed > 0:
            notes.append(f"{failed} trials have no solution and are left out")
        unstable = [name for name, entry in zip(self.results, stability, strict=False) if not entry.stable]
        if stability:
            notes.append(_reached(samples, unstable))
        return Trials(
            self.results,
            self.nominal,
            mean,
            deviation,
            low,
            high,
            samples,
            count,
            self.seed,
            self.values,
            stability,
            tuple(dict.fromkeys(notes)),
            reach,
            self.stopped,
        )


def _reached(samples: int, unstable: Sequence[str]) -> str:
    goal = "one significant digit of the standard uncertainty"
    if not unstable:
        return f"{goal} is reached for every result after {samples} trials"
    return f"{goal} is not reached for {', '.join(unstable)} after {samples} trials"


@dataclass(frozen=True, slots=True)
class _Work:
    """One block of trials: draws its inputs, leaves illegal draws out and evaluates the rest."""

    evaluate: Evaluate
    inputs: JointInputs
    seed: int

    def __call__(self, block: tuple[int, int]) -> tuple[Array, int]:
        number, size = block
        drawn = self.inputs.draw(self.seed, number, size)
        good = self.inputs.legal(drawn)
        if good.all():
            answers = self.evaluate(drawn)
            return np.array([np.asarray(values, dtype=np.float64) for values in answers.values()]), 0
        # the nominal values stand in for illegal draws, so that the shape and the work stay the same
        nominal = self.inputs.nominal
        answers = self.evaluate({path: np.where(good, values, nominal[path]) for path, values in drawn.items()})
        table = np.array([np.asarray(values, dtype=np.float64) for values in answers.values()])
        table[:, ~good] = np.nan
        return table, int(np.count_nonzero(~good))


def _checked_samples(samples: object, most: int) -> int:
    if samples == "adaptive":
        return most
    if isinstance(samples, bool) or not isinstance(samples, int | np.integer) or samples < 100:
        raise InputError(Problem("samples", repr(samples), "'adaptive' or an integer of at least 100"))
    return int(samples)
