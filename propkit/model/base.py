"""The base of every object: immutable, its constructor is the calculation, it refers upstream only.

Everything below the model (rendering, records, panels, plots) is reached through `DOWNWARD`, the one
table of downward references.
"""

from __future__ import annotations

import importlib
import math
import threading
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, ClassVar, Self, TypeVar, dataclass_transform

from propkit import units as unit_text
from propkit.errors import InputError, NotAvailableError, Problem
from propkit.model import binding, paths
from propkit.model.declare import (
    ChoiceInput,
    CustomInput,
    Declared,
    FlagInput,
    Input,
    NumberInput,
    QuantityInput,
    Result,
    TextInput,
)
from propkit.model.doubts import Assumption, Doubt

if TYPE_CHECKING:
    import pandas as pd

    from propkit.report import Report, UnitSystem

DOWNWARD = {
    "render": "propkit.view:render",
    "record": "propkit.record:record_of",
    "record_bundle": "propkit.record:bundle_of",
    "panel": "propkit.panels:panel_of",
    "study_panel": "propkit.panels:panel_of_study",
    "uncertainty_panel": "propkit.panels:panel_of_uncertainty",
    "plot": "propkit.plots:plot_of",
    "figure": "propkit.plots.build:build",
    "study_plot": "propkit.plots.study:plot_of_study",
    "study_map": "propkit.plots.study:map_of_study",
}
"""Method -> "module:function": the only references from the model to layers below it."""

RECORD_MIME = "application/vnd.propkit.record+json"
RECORDED = ("case", "chamber", "nozzle", "performance")
"""Kinds of objects whose display carries their record, so that an executed notebook is itself verifiable."""

T = TypeVar("T")


def reach(method: str) -> Callable[..., Any]:
    """Return the function below the model that serves `method`."""
    module, _, function = DOWNWARD[method].partition(":")
    served: Callable[..., Any] = getattr(importlib.import_module(module), function)
    return served


def render(report: Report, medium: str) -> str:
    """Render a report; the view is imported when something is shown, not before."""
    return reach("render")(report, medium)  # type: ignore[no-any-return]


@dataclass(slots=True)
class Outcome:
    """What a calculation yields: eager results in SI, why others are absent, doubts, and what downstream needs."""

    results: dict[str, float] = field(default_factory=dict)
    absent: dict[str, str] = field(default_factory=dict)
    doubts: tuple[Doubt, ...] = ()
    held: Any = None


@dataclass_transform(
    kw_only_default=True,
    frozen_default=True,
    field_specifiers=(QuantityInput, NumberInput, ChoiceInput, CustomInput, FlagInput, TextInput),
)
class Calculation:
    """Base of the objects. Subclasses declare inputs and results and implement `_calculate`."""

    kind: ClassVar[str] = ""
    title: ClassVar[str] = ""
    upstream_input: ClassVar[str] = ""
    headline: ClassVar[tuple[str, ...]] = ()
    declared_inputs: ClassVar[Mapping[str, Input]] = MappingProxyType({})
    declared_results: ClassVar[Mapping[str, Result]] = MappingProxyType({})
    groups: ClassVar[tuple[tuple[str, ...], ...]] = ()

    name: TextInput = TextInput(doc="the analyst's name for the object, the title of its sheet", default="")

    if TYPE_CHECKING:
        _typed: dict[str, Any]
        _values: dict[str, Any]
        _outcome: Outcome
        _cache: dict[str, Any]
        _lock: threading.RLock

    def __init_subclass__(cls, **options: Any) -> None:
        super().__init_subclass__(**options)
        inputs: dict[str, Input] = {}
        results: dict[str, Result] = {}
        for ancestor in reversed(cls.__mro__):
            for name, entry in vars(ancestor).items():
                if isinstance(entry, Input):
                    inputs[name] = entry
                    results.pop(name, None)
                elif isinstance(entry, Result):
                    results[name] = entry
                    inputs.pop(name, None)
        hidden = getattr(cls, "undeclared", ())
        title = inputs.pop("name")
        listed = [(name, entry) for name, entry in inputs.items() if name not in hidden]
        inputs = dict(sorted(listed, key=lambda item: item[1].kw_only))
        inputs["name"] = title
        cls.declared_inputs = MappingProxyType(inputs)
        cls.declared_results = MappingProxyType(results)
        cls.__signature__ = binding.signature(inputs)  # type: ignore[attr-defined]

    if not TYPE_CHECKING:

        def __init__(self, *args: Any, **keywords: Any) -> None:
            named = binding.name_arguments(type(self).__name__, self.declared_inputs, args, keywords)
            problems: list[Problem] = []
            bound = binding.read(self.declared_inputs, named, problems)
            hold = object.__setattr__
            hold(self, "_typed", bound.typed)
            hold(self, "_values", bound.values)
            hold(self, "_cache", {})
            hold(self, "_lock", threading.RLock())
            refused = {name for name, value in bound.values.items() if value is None and named.get(name) is not None}
            problems.extend(self._check({problem.name for problem in problems} | refused))
            if problems:
                raise InputError(problems)
            hold(self, "_outcome", self._calculate())

    # -- what subclasses provide ---------------------------------------------------------------

    def _check(self, bad: set[str]) -> list[Problem]:
        """Return the problems that several inputs make together; `bad` names those already refused."""
        return []

    def _calculate(self) -> Outcome:
        raise NotImplementedError

    def subtitle(self) -> str:
        """Return one line that tells the object from others of its kind."""
        return ""

    def shows_input(self, name: str) -> bool:
        """Whether the sheet lists the input: those given and the defaults that matter."""
        return name in self._typed or self._values.get(name) is not None

    def resolved(self) -> tuple[str, ...]:
        """Return the names of inputs that were not given and follow from the others; sheets list them as results."""
        return tuple(name for group in self.groups for name in group if name not in self._typed)

    def input_text(self, name: str) -> str:
        """Return an input of a kind of its own as text."""
        return str(self._values[name])

    def typed_text(self, name: str) -> str:
        """Return an input as it was typed, as text."""
        typed = self._typed[name]
        if isinstance(typed, Calculation):
            return self.input_text(name)
        if isinstance(typed, bool):
            return "yes" if typed else "no"
        return typed if isinstance(typed, str) else f"{typed}"

    def given_name(self) -> str:
        """Return the analyst's name for the object, or an empty text."""
        return str(self._values["name"])

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return ()

    # -- immutability, equality, copies --------------------------------------------------------

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError(f"{type(self).__name__} is immutable; use .replace({name}=...) for a new one")

    def __delattr__(self, name: str) -> None:
        raise AttributeError(f"{type(self).__name__} is immutable")

    def _identity(self) -> tuple[Any, ...]:
        values = tuple((name, _hashable(self._values[name])) for name in sorted(self._typed) if name != "name")
        return (type(self).__qualname__, values)

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Calculation):
            return NotImplemented
        return type(self) is type(other) and self._identity() == other._identity()

    def __hash__(self) -> int:
        return hash(self._identity())

    def __copy__(self) -> Self:
        return self

    def __deepcopy__(self, memo: Any) -> Self:
        return self

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (type(self), dict(self._typed))

    # -- access --------------------------------------------------------------------------------

    @property
    def upstream(self) -> Calculation | None:
        """The object this one is computed from, or None."""
        return self._values.get(self.upstream_input) if self.upstream_input else None

    def chain(self) -> tuple[Calculation, ...]:
        """Return the objects from the first upstream down to this one."""
        above = self.upstream
        return (*above.chain(), self) if above is not None else (self,)

    @property
    def inputs(self) -> Mapping[str, Any]:
        """What was given, as typed: a read-only mapping."""
        return MappingProxyType(self._typed)

    @property
    def warnings(self) -> tuple[Doubt, ...]:
        """Doubts about this object and everything upstream of it."""
        above = self.upstream
        return (*(above.warnings if above is not None else ()), *self._outcome.doubts)

    @property
    def own_warnings(self) -> tuple[Doubt, ...]:
        """Doubts about this object alone."""
        return self._outcome.doubts

    @property
    def assumptions(self) -> Any:
        """Assumptions that carry the numbers, from the first object of the chain to this one."""
        return tuple(entry for link in self.chain() for entry in link._own_assumptions())

    def si(self, name: str) -> float:
        """Return an input or result as an SI float.

        Raises
        ------
        NotAvailableError
            When this recipe does not have it.
        """
        outcome = self._outcome
        if name in outcome.results:
            return outcome.results[name]
        value = self._values.get(name)
        if value is None:
            raise NotAvailableError(outcome.absent.get(name, f"{type(self).__name__} has no {name} in this recipe"), name=name)
        return value  # type: ignore[no-any-return]

    def state_paths(self) -> tuple[str, ...]:
        """Return the dotted names of results that live in the states of this object (``exit.pressure``)."""
        return ()

    def si_of(self, name: str) -> float:
        """Return an input, a result or a dotted name such as ``exit.pressure`` as an SI float."""
        state, _, quantity = name.partition(".")
        return getattr(self, state).si(quantity) if quantity else self.si(name)

    def given_or_result(self, name: str) -> Any:
        """Return what was given for an input in SI, else the result; None where this recipe has neither."""
        value = self._values.get(name) if name in self._typed else None
        return self._outcome.results.get(name, self._values.get(name)) if value is None else value

    def has(self, name: str) -> bool:
        """Whether this recipe has the input or result `name`."""
        return name in self._outcome.results or self._values.get(name) is not None

    def attribute(self, name: str) -> Any:
        """Return what reading the attribute `name` gives: a fresh quantity, a float, a text or an object."""
        entry: Declared = self.declared_inputs.get(name) or self.declared_results[name]
        value = self.si(name)
        if isinstance(entry, CustomInput):
            return self._shown_input(name, value)
        if isinstance(value, float | int) and not isinstance(value, bool):
            unit = entry.quantity.unit
            return unit_text.quantity(value, unit) if unit else float(value)
        return value

    def _shown_input(self, name: str, value: Any) -> Any:
        return value

    def kind_of(self, name: str) -> str:
        """Return ``given``, ``default`` or ``computed`` for an input or result."""
        if name in self._typed:
            return "given"
        entry = self.declared_inputs.get(name)
        return "default" if entry is not None and self._values.get(name) is not None and name not in self._outcome.results else "computed"

    @property
    def held(self) -> Any:
        """Arrays of the calculation that objects downstream continue from (not for display)."""
        return self._outcome.held

    def lazily(self, key: str, make: Callable[[], T]) -> T:
        """Return what `make` gives, computed once; safe when several threads ask."""
        with self._lock:
            if key not in self._cache:
                self._cache[key] = make()
            found: T = self._cache[key]
            return found

    # -- new objects from this one -------------------------------------------------------------

    def replace(self, changes: Mapping[str, Any] | None = None, /, **inputs: Any) -> Self:
        """Return a new object with other inputs; everything downstream of the change is rebuilt.

        Parameters
        ----------
        changes : mapping of path to value, optional
            Paths such as ``"chamber.pressure"``; any unambiguous suffix will do.
        **inputs
            Inputs of this object, or unambiguous names upstream.

        Returns
        -------
        Calculation
            The new object, of the same class.

        Raises
        ------
        InputError
            For a path that is unknown, ambiguous or no input, or a value that is not legal.
        """
        rebuilt: Self = paths.replace(self, {**(changes or {}), **inputs})
        return rebuilt

    def displaced(self, typed: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
        """Return `typed` without the members of a group that `changes` names another member of."""
        kept = dict(typed)
        for group in self.groups:
            if any(name in changes for name in group):
                for name in group:
                    kept.pop(name, None)
        return kept

    def recipe(self) -> dict[str, Any]:
        """Return a JSON-able nested mapping that `from_recipe` rebuilds this object from."""
        return {
            "object": type(self).__name__,
            "inputs": {name: _recipe_value(value) for name, value in self._typed.items()},
        }

    def as_code(self) -> str:
        """Return a runnable script that rebuilds this object and the chain above it."""
        lines = ["import propkit as pk", ""]
        names: dict[int, str] = {}
        for link in self.chain():
            lines.append(f"{link.kind} = {link._code(names)}")
            names[id(link)] = link.kind
        return "\n".join(lines) + "\n"

    def _code(self, names: Mapping[int, str]) -> str:
        parts = []
        for name, value in self._typed.items():
            text = names.get(id(value)) or code_of(value)
            parts.append(text if not self.declared_inputs[name].kw_only else f"{name}={text}")
        return f"{self._constructor}({', '.join(parts)})"

    @property
    def _constructor(self) -> str:
        return f"pk.{type(self).__name__}"

    # -- display -------------------------------------------------------------------------------

    def __repr__(self) -> str:
        return self._code({})

    def __str__(self) -> str:
        return str(self.report())

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return what the object shows, as neutral data that displays itself.

        Parameters
        ----------
        units : str
            ``"SI"`` or ``"US"`` (psia, °R, lbf, lbm/s, ft/s, inches): the display only.
        """
        from propkit.model import sheet

        return sheet.report_of(self, _unit_system(units), render)

    def to_frame(self, units: UnitSystem = "SI") -> pd.DataFrame:
        """Return inputs and results as a table: index public name; columns symbol, value, unit, kind, relation, source."""
        from propkit.model import sheet

        return sheet.frame_of(self, _unit_system(units))

    def working(self, result: str, units: UnitSystem = "SI") -> Any:
        """Return how a result came about: relation, numbers put in, value, source; or the conditions that it satisfies.

        Raises
        ------
        InputError
            For a name that is no result of this chain.
        """
        from propkit.model import working

        return working.working_of(self, result, _unit_system(units), render)

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the calculation record of the whole chain, which a reviewer can recompute."""
        return reach("record")(self, title=title, author=author, purpose=purpose, notes=notes)

    def panel(self) -> Any:
        """Return the interactive panel of this object (extra ``notebook``)."""
        return reach("panel")(self)

    def plot(self) -> Any:
        """Return a plain Bokeh figure of this object (extra ``notebook``)."""
        return reach("plot")(self)

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, Any]:
        return display_bundle(self, include, exclude)

    def figures(self, units: UnitSystem = "SI") -> tuple[Any, ...]:
        """Return the drawings of the object as neutral data."""
        return ()

    def sections(self, units: UnitSystem) -> Iterator[Any]:
        """Yield the sections of the sheet beyond inputs and results."""
        return iter(())

    def cautions(self) -> tuple[str, ...]:
        """Hazard lines of what the chain is about, each once."""
        above = self.upstream
        return above.cautions() if above is not None else ()


def display_bundle(calculation: Calculation, include: Any, exclude: Any) -> dict[str, Any]:
    """Return the sheet in several media, and the record where the object has one; a failing part is said, not hidden."""
    bundle: dict[str, Any] = dict(calculation.report()._repr_mimebundle_(include, exclude))
    if calculation.kind in RECORDED:
        bundle.update(reach("record_bundle")(calculation))
    return bundle


def code_of(value: Any) -> str:
    """Return a Python expression for an input."""
    if isinstance(value, float) and math.isinf(value):
        return repr("infinite")
    return repr(value)


def from_recipe(recipe: Mapping[str, Any]) -> Any:
    """Rebuild an object from its recipe (see `Calculation.recipe`); data only, nothing is executed."""
    from propkit.model import registry

    return registry.build(recipe)


def _recipe_value(value: Any) -> Any:
    maker = getattr(value, "recipe", None)
    if callable(maker):
        return maker()
    if isinstance(value, Mapping):
        return {key: _recipe_value(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [_recipe_value(entry) for entry in value]
    return value


def _rebuild(kind: type[Calculation], typed: dict[str, Any]) -> Calculation:
    return kind(**typed)


def _hashable(value: Any) -> Any:
    if isinstance(value, Mapping):
        return tuple(sorted((key, _hashable(entry)) for key, entry in value.items()))
    if isinstance(value, list | tuple):
        return tuple(_hashable(entry) for entry in value)
    return value


def _unit_system(units: str) -> UnitSystem:
    if units not in ("SI", "US"):
        raise InputError(Problem("units", repr(units), "'SI' or 'US'"))
    return units  # type: ignore[return-value]
