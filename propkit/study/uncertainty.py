"""Uncertainty of an object's results: the plan that an analyst writes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Literal

import numpy as np

from propkit.errors import InputError, Problem
from propkit.model.base import Calculation, reach
from propkit.model.declare import as_text
from propkit.study.distributions import Distribution, Normal
from propkit.study.evaluation import ChainFunction, Variable, function_of, result_name, variable
from propkit.study.joint import JointInputs, check_seed
from propkit.study.propagation import FirstOrder, first_order, monte_carlo
from propkit.study.sensitivity import sobol_indices
from propkit.study.uncertainty_result import SobolResult, UncertaintyResult

_BOX = 1000
"""Cases that span the box for which the batch function is prepared."""
_STRETCH = 1.3
"""How far those are stretched, so that the tails of later draws lie inside."""


class Uncertainty:
    """Uncertain inputs of an object, and what they make of its results: an immutable plan.

    Parameters
    ----------
    target : Calculation
        The object whose results are wanted.
    inputs : mapping of str to distribution
        Path of an input -> `Normal`, `Uniform`, `Triangular` or `Empirical`; a bare text such as ``"1 %"`` or
        ``"0.05 MPa"`` is one standard uncertainty of a normal distribution. ``case.fuel.enthalpy`` and
        ``case.oxidizer.enthalpy`` are the assigned molar enthalpies.
    correlation : mapping of pair of str to float, optional
        Correlation of two inputs [1].
    results : sequence of str, optional
        Results wanted, upstream ones with their prefix; the object's own by default.

    Raises
    ------
    InputError
        Listing every input that is wrong: paths, distributions, correlations.

    Examples
    --------
    >>> import propkit as pk
    >>> gas = pk.Chamber.from_gas(
    ...     pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2
    ... )
    >>> nozzle = pk.Nozzle(gas, area_ratio=20, throat_diameter="0.1 m")
    >>> found = pk.Uncertainty(nozzle, {"throat_diameter": "0.5 %"}, results=["mass_flow"]).run()
    >>> float(round(found.table.loc["mass_flow", "standard_uncertainty"] / found.table.loc["mass_flow", "value"], 6))
    0.01
    """

    __slots__ = ("_correlation", "_function", "_inputs", "_joint", "_target", "_variables")

    _correlation: dict[tuple[str, str], float]
    _function: ChainFunction
    _inputs: dict[str, Distribution]
    _joint: JointInputs
    _target: Calculation
    _variables: dict[str, Variable]

    def __init__(
        self,
        target: Calculation,
        inputs: Mapping[str, Distribution | str],
        correlation: Mapping[tuple[str, str], float] | None = None,
        results: Sequence[str] | None = None,
    ) -> None:
        if not isinstance(target, Calculation):
            raise InputError(Problem("target", repr(target), "a propkit object, such as a pk.Performance"))
        if not isinstance(inputs, Mapping) or not inputs:
            raise InputError(
                Problem(
                    "inputs",
                    repr(inputs),
                    "a mapping of paths to distributions",
                    'For example {"chamber.pressure": "1 %"}.',
                )
            )
        variables, given = _read(target, inputs)
        resolved = {path: entry.resolve(variables[path].nominal, variables[path].unit, path) for path, entry in given.items()}
        bounds = {path: (entry.low, entry.high) for path, entry in variables.items()}
        if results is not None:
            results = _wanted(target, results)
        pairs = _pairs(target, {} if correlation is None else correlation)
        hold = object.__setattr__
        hold(self, "_target", target)
        hold(self, "_inputs", given)
        hold(self, "_correlation", pairs)
        hold(self, "_variables", variables)
        hold(self, "_joint", JointInputs(resolved, pairs, bounds))
        hold(self, "_function", function_of(target, tuple(variables), results))

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("an Uncertainty is immutable; make another one")

    def __reduce__(self) -> tuple[Any, ...]:
        return Uncertainty, (self._target, self._inputs, self._correlation, self._function.results)

    def __repr__(self) -> str:
        listed = ", ".join(f"{path!r}: {entry!r}" for path, entry in self._inputs.items())
        return f"pk.Uncertainty({self._target.kind}, {{{listed}}})"

    @property
    def target(self) -> Calculation:
        """The object whose results are wanted."""
        return self._target

    @property
    def inputs(self) -> Mapping[str, Distribution]:
        """Distributions by whole path, as given."""
        return dict(self._inputs)

    @property
    def function(self) -> ChainFunction:
        """The batch function behind the plan."""
        return self._function

    def run(
        self,
        samples: int | Literal["adaptive"] | None = None,
        seed: int | None = None,
        *,
        executor: Any = None,
        progress: bool | Callable[[int, int, float], None] = True,
        illegal: Literal["refuse", "leave out"] = "refuse",
    ) -> UncertaintyResult:
        """Return the uncertainty of the results, in first order and, with `samples`, by trials as well.

        Parameters
        ----------
        samples : int, "adaptive" or None
            Number of trials; as many as one significant digit of every standard uncertainty needs; none.
        seed : int
            Seed of the trials, at least 0; required with `samples` and kept.
        executor : executor, dask client or None
            Where the trials run; threads of this machine by default.
        progress : bool or callable
            Whether to show a bar for a run of more than a second.
        illegal : str
            What to do with draws outside the legal range of an input: ``"refuse"`` the run beforehand, or ``"leave out"``.

        Returns
        -------
        UncertaintyResult
            Table, intervals and budget.

        Raises
        ------
        InputError
            For a number of trials or a seed that is none, or draws that reach illegal values (said beforehand, counted).
        ConvergenceError
            When too few trials have a solution.
        """
        if samples is None:
            if seed is not None:
                check_seed(seed)
            return UncertaintyResult(self, first_order(self._function, self._joint), None)
        number = check_seed(seed)
        trials = monte_carlo(
            self._function,
            self._joint,
            samples,
            number,
            executor=executor,
            progress=progress,
            illegal=illegal,
            quick=self._quick(number),
        )
        linear, reason = self._linear()
        return UncertaintyResult(self, linear, trials, reason, samples, illegal)

    def _quick(self, seed: int) -> ChainFunction:
        """Return the function prepared for the box of the trials: a first draw, stretched, inside the legal ranges."""
        nominal, bounds = self._joint.nominal, self._joint.bounds
        sample = {
            path: np.clip(nominal[path] + _STRETCH * (values - nominal[path]), *bounds[path])
            for path, values in self._joint.draw(seed, 0, _BOX).items()
        }
        return self._function.prepared(sample, _BOX)

    def _linear(self) -> tuple[FirstOrder | None, str]:
        try:
            return first_order(self._function, self._joint), ""
        except InputError as error:
            return None, str(error)

    def panel(self, result: str | None = None) -> Any:
        """Return the interactive panel: sliders for the uncertainties and inputs, the budget redrawn live (extra ``notebook``).

        Parameters
        ----------
        result : str, optional
            Result shown first; the first of the object's headline by default.
        """
        return reach("uncertainty_panel")(self, "" if result is None else result_name(self._target, result))

    def sobol(
        self,
        seed: int,
        *,
        base: int = 1024,
        executor: Any = None,
        progress: bool | Callable[[int, int, float], None] = True,
    ) -> SobolResult:
        """Return variance-based sensitivities: the share that each input makes, alone and with others.

        Parameters
        ----------
        seed : int
            Seed of the design, at least 0; kept.
        base : int
            Size of the base design, a power of 2; (inputs + 2) times as many evaluations are made.
        executor : executor, dask client or None
            Where the evaluations run.
        progress : bool or callable
            Whether to show a bar for a run of more than a second.

        Returns
        -------
        SobolResult
            Indices by result.

        Raises
        ------
        InputError, ConvergenceError, MissingExtraError
            As `propkit.study.sensitivity.sobol_indices`.
        """
        quick = self._quick(check_seed(seed))
        found = sobol_indices(quick, self._joint, seed, base=base, executor=executor, progress=progress)
        return SobolResult(self, found)


def _read(target: Calculation, inputs: Mapping[str, Distribution | str]) -> tuple[dict[str, Variable], dict[str, Distribution]]:
    """Return variables and distributions by whole path; every problem in one error."""
    problems: list[Problem] = []
    variables: dict[str, Variable] = {}
    given: dict[str, Distribution] = {}
    for path, entry in inputs.items():
        try:
            found = variable(target, path)
            if found.path in given:
                raise InputError(Problem(path, "given twice", "given once"))
            distribution = Normal(entry) if not isinstance(entry, Distribution) else entry
            distribution.resolve(found.nominal, found.unit, found.path)
        except InputError as error:
            problems.extend(error.problems or (_as_problem(path, error),))
            continue
        variables[found.path], given[found.path] = found, distribution
    if problems:
        raise InputError(problems)
    return variables, given


def _as_problem(path: str, error: InputError) -> Problem:
    return Problem(path, "not understood", "a path of a numeric input", str(error))


def _wanted(target: Calculation, results: Any) -> tuple[str, ...]:
    """Return results as tables call them; every bad name in one error."""
    if isinstance(results, str) or not isinstance(results, Sequence) or not results:
        hint = f"Write [{results!r}] for a single one." if isinstance(results, str) else ""
        raise InputError(Problem("results", as_text(results), "a list of names, one at least", hint))
    problems: list[Problem] = []
    found: list[str] = []
    for name in results:
        try:
            found.append(result_name(target, name))
        except InputError as error:
            problems.extend(error.problems or (Problem(str(name), "not understood", "a path of a result", str(error)),))
    if problems:
        raise InputError(problems)
    return tuple(dict.fromkeys(found))


def _pairs(target: Calculation, correlation: Any) -> dict[tuple[str, str], float]:
    """Return correlations by pairs of whole paths; each pair once."""
    if not isinstance(correlation, Mapping):
        raise InputError(Problem("correlation", as_text(correlation), "a mapping of pairs of paths, as {(path, path): value}"))
    found: dict[tuple[str, str], float] = {}
    for pair, value in correlation.items():
        first, second = _pair(target, pair)
        if (first, second) in found or (second, first) in found:
            raise InputError(Problem(f"correlation of {first} and {second}", "given twice", "given once"))
        if isinstance(value, bool) or not isinstance(value, int | float | np.number):
            raise InputError(Problem(f"correlation of {first} and {second}", as_text(value), "a number between -1 and 1"))
        found[first, second] = float(value)
    return found


def _pair(target: Calculation, pair: Any) -> tuple[str, str]:
    if not isinstance(pair, tuple) or len(pair) != 2:
        raise InputError(Problem("correlation", f"given for {pair!r}", "given for pairs of paths, as {(path, path): value}"))
    return variable(target, pair[0]).path, variable(target, pair[1]).path
