"""An analysis of an object as the last link of its chain, so that a panel treats its settings as it treats inputs.

The settings are declared like inputs, but by the object at hand: which result is shown, along which input, from where to where.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any, ClassVar, Self

from propkit import quantities
from propkit.errors import InputError, Problem
from propkit.model.declare import Bounds, ChoiceInput, CustomInput, Input, NumberInput, QuantityInput, as_text


class NumberSetting(QuantityInput):
    """A setting that is a number with the quantity of something else: the lowest chamber pressure of a map.

    Parameters
    ----------
    name : str
        Name.
    quantity : Quantity
        Row of the catalogue that gives symbol, unit and digits.
    label, doc : str
        What a person reads, and what it means.
    value : float or None
        SI value where none is given.
    bounds : Bounds
        Legal range in SI.
    whole : bool
        Whether it must be a whole number.
    """

    def __init__(
        self,
        name: str,
        quantity: quantities.Quantity,
        label: str,
        doc: str,
        value: float | None,
        bounds: Bounds | None = None,
        *,
        whole: bool = False,
    ) -> None:
        super().__init__(doc=doc, default="" if value is None else f"{value:.6g}", bounds=bounds)
        self.name, self.owner, self.label = name, "", label
        self.value, self.whole, self._row = value, whole, quantity

    @property
    def quantity(self) -> quantities.Quantity:
        """Row of the catalogue."""
        return self._row

    def read(self, value: Any) -> Any:
        """Return the SI value; a whole number where that is wanted."""
        found = super().read(value)
        if self.whole and found != round(found):
            raise InputError(Problem(self.name, as_text(value), "a whole number"))
        return round(found) if self.whole else found


class ChoiceSetting(ChoiceInput):
    """A setting that is one of a few words; `options` maps them to what a person reads."""

    def __init__(self, name: str, label: str, doc: str, options: Mapping[str, str], value: str) -> None:
        super().__init__(choices=tuple(options), doc=doc, default=options.get(value, value))
        self.name, self.owner, self.label = name, "", label
        self.options, self.value = dict(options), value

    @property
    def quantity(self) -> quantities.Quantity:
        """A row without unit and symbol."""
        return quantities.Quantity(self.name, quantities.TEXT, "", self.label, self.doc)


Setting = NumberSetting | ChoiceSetting


class LastLink:
    """An analysis of `target` as a link of its chain: immutable, rebuilt by `replace`.

    Parameters
    ----------
    target : Calculation
        The object analysed.
    typed : mapping of str to setting
        Settings as given.

    Raises
    ------
    InputError
        Listing every setting that is not legal.
    """

    kind: ClassVar[str] = ""
    title: ClassVar[str] = ""
    upstream_input: ClassVar[str] = "target"
    groups: ClassVar[tuple[tuple[str, ...], ...]] = ()
    headline: ClassVar[tuple[str, ...]] = ()
    declared_results: ClassVar[Mapping[str, Any]] = MappingProxyType({})

    def __init__(self, target: Any, typed: Mapping[str, Any]) -> None:
        self.target = target
        self._typed = {name: value for name, value in typed.items() if value is not None}
        self._values: dict[str, Any] = {}
        self._result: Any = None
        self._kept: dict[str, Any] = {}
        self.unsettled = False
        """Whether the results held are those of a moving slider."""
        self.declared_inputs: dict[str, Input] = {}
        self.declare()
        self._typed = {name: value for name, value in self._typed.items() if name in self.declared_inputs}

    def declare(self) -> None:
        """Declare the settings, by `setting`."""
        raise NotImplementedError

    def rebuilt(self, target: Any, typed: Mapping[str, Any]) -> Self:
        """Return the same analysis of another target, with other settings."""
        raise NotImplementedError

    def tidied(self, typed: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
        """Return settings without those that a change makes meaningless."""
        return typed

    def setting(self, entry: Setting) -> Any:
        """Declare a setting and return its value."""
        typed = self._typed.get(entry.name)
        self.declared_inputs[entry.name] = entry
        self._values[entry.name] = entry.value if typed is None else entry.read(typed)
        return self._values[entry.name]

    def replace(self, changes: Mapping[str, Any]) -> Self:
        """Return the analysis with other settings or another target, by whole paths."""
        own, prefix = {}, f"{self.kind}."
        above = {path: value for path, value in changes.items() if not path.startswith(prefix)}
        own = {path.removeprefix(prefix): value for path, value in changes.items() if path.startswith(prefix)}
        target = self.target.replace(above) if above else self.target
        return self.rebuilt(target, self.tidied({**self._typed, **own}, own) if own else self._typed)

    # -- results -----------------------------------------------------------------------------------

    def solved(self) -> Any:
        """Return the results of the analysis."""
        raise NotImplementedError

    @property
    def result(self) -> Any:
        """Results, solved when they are asked for and not held."""
        if self._result is None:
            self._result = self.solved()
        return self._result

    def hold(self, result: Any) -> None:
        """Take results that were solved already, as a line of code does it."""
        self._result, self._kept, self.unsettled = result, {}, False

    def release(self) -> None:
        """Let go of the results; they are solved again when they are wanted."""
        self._result, self._kept = None, {}

    def kept(self, key: str, make: Callable[[], Any]) -> Any:
        """Return what follows from the results, made once."""
        _ = self.result
        if key not in self._kept:
            self._kept[key] = make()
        return self._kept[key]

    # -- as a link of a chain ----------------------------------------------------------------------

    def chain(self) -> tuple[Any, ...]:
        """Return the objects of the chain, this one last."""
        return (*self.target.chain(), self)

    @property
    def varied(self) -> frozenset[str]:
        """Whole paths of inputs of the chain that have no value of their own here."""
        return frozenset()

    @property
    def inputs(self) -> Mapping[str, Any]:
        """Settings as given."""
        return MappingProxyType(self._typed)

    def has(self, name: str) -> bool:
        """Whether a setting has a value."""
        return self._values.get(name) is not None

    def si(self, name: str) -> Any:
        """Return the value of a setting."""
        return self._values[name]

    @property
    def warnings(self) -> tuple[Any, ...]:
        """What to doubt about the analysis."""
        return tuple(self.result.warnings)

    def state_paths(self) -> tuple[str, ...]:
        """Return no names: an analysis has no states."""
        return ()

    def given_name(self) -> str:
        """Return the analyst's name for the object."""
        return str(self.target.given_name())

    def __eq__(self, other: object) -> bool:
        return type(self) is type(other) and self.__dict__["_typed"] == other.__dict__["_typed"] and self.target == other.__dict__["target"]

    __hash__ = None  # type: ignore[assignment]


def numeric_inputs(target: Any) -> dict[str, str]:
    """Return the inputs of a chain that are numbers with a value in this recipe, as whole path -> label."""
    found: dict[str, str] = {}
    for link in target.chain():
        for name, entry in link.declared_inputs.items():
            if isinstance(entry, QuantityInput | NumberInput) or (isinstance(entry, CustomInput) and name == "ambient"):
                value = link.given_or_result(name) if link.has(name) else None
                value = getattr(value, "pressure", value)
                if isinstance(value, int | float) and math.isfinite(value):
                    found[f"{link.kind}.{name}"] = entry.quantity.label
    return told_apart(found)


def told_apart(labels: Mapping[str, str]) -> dict[str, str]:
    """Return labels with the place behind those that would else read the same."""
    listed = list(labels.values())
    return {
        path: f"{label} ({path.rpartition('.')[0].replace('.', ' ')})" if listed.count(label) > 1 and "." in path else label
        for path, label in labels.items()
    }
