"""An object as a batch function: arrays of some of its inputs in, arrays of its results out.

The stages of `chain/` are called just as the objects call them, with arrays where the objects have single values, at
the same tolerance, so that a batch of one gives the object's own numbers. Recipes that have no batch form yet are
rebuilt object by object: slower, the same numbers.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import quantities
from propkit.chain.accelerated import Accelerator
from propkit.errors import InputError, Problem, PropkitError
from propkit.model import paths, wall
from propkit.model.base import Calculation
from propkit.model.declare import Bounds, CustomInput, NumberInput, QuantityInput
from propkit.model.propellant_case import ROLES, PropellantCase
from propkit.physics.arrays import TANGENT
from propkit.study.batch import ENTHALPY, WALL_SIZES, Batch, Probe, has_stage

Array = npt.NDArray[np.float64]

_LARGEST_AMBIENT = 1e9


@dataclass(frozen=True, slots=True)
class Variable:
    """An input that can be varied: path, nominal SI value, SI unit, legal range and catalogue key."""

    path: str
    nominal: float
    unit: str
    low: float
    high: float
    quantity: str


def variable(target: Calculation, path: str) -> Variable:
    """Return an input of the chain of `target` as a variable.

    Parameters
    ----------
    target : Calculation
        The object.
    path : str
        Path of a numeric input, or ``case.oxidizer.enthalpy`` and ``case.fuel.enthalpy``: assigned molar enthalpies.

    Returns
    -------
    Variable
        With the whole path.

    Raises
    ------
    InputError
        For a path that is unknown, ambiguous, no number, or without a value in this recipe.
    """
    assigned = _assigned_enthalpy(target, path)
    if assigned is not None:
        return assigned
    place = paths.resolve(target, path, results=False)
    link = target.chain()[place.position]
    entry = link.declared_inputs[place.name]
    is_ambient = isinstance(entry, CustomInput) and place.name == "ambient"
    if not (isinstance(entry, QuantityInput | NumberInput) or is_ambient):
        raise InputError(Problem(place.path, "a choice", "an input that is a number", "A study varies choices."))
    if not link.has(place.name):
        raise InputError(Problem(place.path, "not part of this recipe", "an input with a value", "Give it to the object first (replace)."))
    found = link.given_or_result(place.name)
    nominal = float(found.pressure if hasattr(found, "pressure") else found)
    if not math.isfinite(nominal):
        raise InputError(Problem(place.path, f"{nominal:g}", "finite", "Give the object a finite value first."))
    low, high = (0.0, _LARGEST_AMBIENT) if is_ambient else _range(entry.bounds)
    return Variable(place.path, nominal, entry.quantity.unit, low, high, f"{link.kind}.{place.name}")


def _range(bounds: Bounds) -> tuple[float, float]:
    low = bounds.at_least if bounds.at_least is not None else -math.inf
    high = bounds.at_most if bounds.at_most is not None else math.inf
    if bounds.above is not None:
        low = math.nextafter(bounds.above, math.inf)
    if bounds.below is not None:
        high = math.nextafter(bounds.below, -math.inf)
    return low, high


def _assigned_enthalpy(target: Calculation, path: str) -> Variable | None:
    parts = path.split(".")
    if parts[-1] != ENTHALPY or len(parts) < 2 or parts[-2] not in ROLES or parts[:-2] not in ([], ["case"]):
        return None
    role = parts[-2]
    case = target.chain()[0]
    if type(case) is not PropellantCase:
        raise InputError(Problem(path, "not part of this recipe", "an input of a case with an oxidizer and a fuel"))
    propellant = case._values[role]
    stream = getattr(case.held, role)
    molar_mass = float(propellant.row.molar_mass)
    return Variable(f"case.{role}.{ENTHALPY}", float(stream.enthalpy) * molar_mass, "J/mol", -math.inf, math.inf, "molar_enthalpy")


@dataclass(frozen=True, slots=True)
class Explained:
    """Results by name, NaN where a case has none; why, by the number of the case; cases by the quick engine, and those it left."""

    results: dict[str, Array]
    reasons: dict[int, str]
    quick: int = 0
    slow: int = 0


@dataclass(frozen=True, slots=True)
class Tangents:
    """Results at one case by name, and their exact derivatives by input and result; empty where there are none."""

    values: dict[str, float]
    slopes: dict[str, dict[str, float]]


@dataclass(frozen=True)
class ChainFunction:
    """A batch function of the chain that ends in `target`; picklable.

    Parameters
    ----------
    target : Calculation
        The object whose results are wanted.
    variables : tuple of str
        Whole paths of the inputs that vary (see `variable`).
    results : tuple of str
        Names of results: bare for those of the object itself, with their prefix upstream.

    Notes
    -----
    A call takes arrays by path and gives arrays by result: NaN where a case has no solution, or is one that the
    object refuses.
    """

    target: Calculation
    variables: tuple[str, ...]
    results: tuple[str, ...]
    quick: Accelerator | None = field(default=None, repr=False, compare=False)
    template: Calculation = field(init=False, repr=False, compare=False)
    batched: bool = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        known = [variable(self.target, path) for path in self.variables]
        changed = {entry.path: entry.nominal for entry in known if not is_enthalpy(entry.path)}
        template = self.target if _all_given(self.target, changed) else self.target.replace(changed)
        object.__setattr__(self, "template", template)
        object.__setattr__(self, "batched", self._has_batch_form(template))
        if not self.batched and any(is_enthalpy(path) for path in self.variables):
            raise InputError("assigned enthalpies cannot be varied in this recipe")

    def __call__(self, inputs: Mapping[str, Array]) -> dict[str, Array]:
        """Return the results at every case."""
        return self.explained(inputs).results

    def prepared(self, sample: Mapping[str, Array], count: int) -> ChainFunction:
        """Return this function with the quick engine for a box of cases, where that serves.

        Parameters
        ----------
        sample : mapping of str to array
            Inputs of cases that span the box.
        count : int
            How many they are.
        """
        if not self.batched or type(self.template.chain()[0]) is not PropellantCase:
            return self
        with np.errstate(all="ignore"):
            probe = Probe(self.template, sample, count)
            made = probe.accelerator()
        return self if made is None else replace(self, quick=made)

    def tangents(self, nominal: Mapping[str, float]) -> Tangents:
        """Return results and derivatives, exact to rounding, at one case; an input without exact ones is left out.

        Parameters
        ----------
        nominal : mapping of str to float
            The inputs, in SI.

        Notes
        -----
        One case for each input, with a tangent in it (see `propkit.physics.arrays`): a solver carries it with one step of its
        converged matrix, every other relation as it stands. Inputs that go through tabulated data (stored temperatures, contours), results
        at a phase boundary and recipes without a batch form have none.
        """
        if not self.batched:
            return Tangents({}, {})
        scales = {path: abs(value) or 1.0 for path, value in nominal.items()}
        moved: dict[str, Any] = {
            path: value + 1j * TANGENT * scales[path] * np.array([path == other for other in nominal]) for path, value in nominal.items()
        }
        try:
            found = self.explained(moved, len(nominal)).results
        except TypeError:  # a relation that takes one number at a time has no room for a tangent
            return Tangents({}, {})
        table = np.array(list(found.values()), dtype=np.complex128)
        good: npt.NDArray[np.bool_] = np.asarray(np.isfinite(table).all(axis=0))
        slopes = {
            path: dict(zip(found, (table[:, place].imag / TANGENT / scales[path]).tolist(), strict=True))
            for place, path in enumerate(nominal)
            if good[place]
        }
        values = dict(zip(found, table[:, good.argmax()].real.tolist(), strict=True)) if good.any() else {}
        return Tangents(values, slopes)

    def explained(self, inputs: Mapping[str, Array], count: int | None = None) -> Explained:
        """Return the results at every case, and why a case has none, by its number."""
        if count is None:
            count = len(next(iter(inputs.values())))
        if not self.batched:
            return Explained(*self._one_by_one(inputs, count))
        with np.errstate(all="ignore"):
            batch = Batch(self.template, inputs, count, self.quick)
            own = f"{self.template.kind}."
            found = {}
            whole = bool(batch.good.all())
            for name in self.results:
                values = batch.results.get(own + name, batch.results.get(name))
                if values is None:
                    raise InputError(Problem(name, "not available", "a result of this recipe"))
                spread = np.broadcast_to(values, (count,))
                found[name] = spread if whole else np.where(batch.good, spread, np.nan)
            return Explained(found, batch.reasons, batch.quick_cases, batch.slow_cases)

    def _has_batch_form(self, template: Calculation) -> bool:
        """Whether the stages can take the recipe as arrays: not where a loss is estimated, or the wall itself is asked for."""
        requests = template._values.get("losses") or ()
        asked = {name.rpartition(".")[2] for name in (*self.results, *self.variables)}
        return (
            all(has_stage(link, self.variables) for link in template.chain())
            and all(entry.ratio is not None for entry in requests)
            and not asked & {*wall.WALL_RESULTS, *WALL_SIZES}
        )

    def _one_by_one(self, inputs: Mapping[str, Array], count: int) -> tuple[dict[str, Array], dict[int, str]]:
        found = {name: np.full(count, np.nan) for name in self.results}
        reasons: dict[int, str] = {}
        for place in range(count):
            try:
                made = self.template.replace({path: float(values[place]) for path, values in inputs.items()})
                row = [paths.value_of(made, name) for name in self.results]
            except PropkitError as error:
                reasons[place] = str(error)
                continue
            for name, value in zip(self.results, row, strict=True):
                found[name][place] = value
        return found, reasons


def own_results(target: Calculation) -> tuple[str, ...]:
    """Return the names of the declared results that the object has."""
    return tuple(name for name in target.declared_results if target.has(name))


def result_name(target: Calculation, path: str) -> str:
    """Return how a result is called in tables: bare where it is the object's own, with its prefix else.

    Raises
    ------
    InputError
        For a path that is unknown, ambiguous, or that this recipe does not have.
    """
    place = paths.resolve(target, path)
    link = target.chain()[place.position]
    try:
        value = link.si_of(place.name)
    except AttributeError as error:
        raise InputError(Problem(path, "not available", "a result of this recipe", str(error))) from error
    if isinstance(value, str):
        raise InputError(Problem(path, repr(value), "a result that is a number"))
    return place.name if link is target.chain()[-1] else place.path


def result_quantity(target: Calculation, name: str) -> quantities.Quantity:
    """Return the catalogue row of a result."""
    place = paths.resolve(target, name)
    return quantities.quantity(place.name.rpartition(".")[2], target.chain()[place.position].kind)


def is_enthalpy(path: str) -> bool:
    """Whether a path is the assigned molar enthalpy of a propellant."""
    return path.split(".")[-2:-1] != [] and path.split(".")[-2] in ROLES and path.endswith(f".{ENTHALPY}")


def _all_given(target: Calculation, changed: Mapping[str, float]) -> bool:
    """Whether every path is an input that the object was given, so that its recipe is already the one wanted."""
    given = {f"{link.kind}.{name}" for link in target.chain() for name in link.inputs}
    return given.issuperset(changed)


def function_of(target: Calculation, inputs: Sequence[str], results: Sequence[str] | None = None) -> ChainFunction:
    """Return the batch function of an object over paths, with the results asked for or all its own."""
    known = tuple(variable(target, path).path for path in inputs)
    names = own_results(target) if results is None else tuple(result_name(target, name) for name in results)
    return ChainFunction(target, known, names)
