"""Declarations: each input and each result of an object is declared once, as a typed descriptor.

Validation, error texts, panels, sheets, tables, study paths and records read these declarations;
nobody types a label, unit or bound twice.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final, Self, TypeAlias, overload

from propkit import quantities, units
from propkit.errors import InputError, Problem, near_matches

if TYPE_CHECKING:
    import pint

    Quantity: TypeAlias = pint.Quantity[Any]
    QuantityLike: TypeAlias = str | float | Quantity
    NumberLike: TypeAlias = str | float | Quantity


class Required:
    """Marks an input without a default."""

    def __repr__(self) -> str:
        return "REQUIRED"

    def __reduce__(self) -> str:
        return "REQUIRED"


REQUIRED: Final = Required()


@dataclass(frozen=True, slots=True)
class Bounds:
    """Legal finite range of an input in its SI unit."""

    at_least: float | None = None
    above: float | None = None
    at_most: float | None = None
    below: float | None = None

    def problem(self, value: float, unit: str) -> str:
        """Return what is allowed, in words, when `value` is outside; else an empty text."""
        inside = (
            (self.at_least is None or value >= self.at_least)
            and (self.above is None or value > self.above)
            and (self.at_most is None or value <= self.at_most)
            and (self.below is None or value < self.below)
        )
        return "" if inside else self.text(unit)

    def text(self, unit: str) -> str:
        """Return the range in words, for instance ``above 0 Pa and at most 1e+08 Pa``."""
        # a person reads angles in degrees
        shown_in = "degree" if unit == "radian" else unit
        shown = units.shown_unit(shown_in)
        parts = [
            f"{word} {units.convert(limit, unit, shown_in):g}{f' {shown}' if shown else ''}"
            for word, limit in (
                ("at least", self.at_least),
                ("above", self.above),
                ("at most", self.at_most),
                ("below", self.below),
            )
            if limit is not None
        ]
        return " and ".join(parts)


class Declared:
    """Common part of inputs and results: a public name with its catalogue row."""

    name: str
    owner: str

    def __init__(self, *, quantity: str = "", doc: str = "") -> None:
        self._key = quantity
        self.doc = doc

    def __set_name__(self, owner: type, name: str) -> None:
        self.name = name
        self.owner = getattr(owner, "kind", "")

    @property
    def quantity(self) -> quantities.Quantity:
        """Catalogue row: symbol, unit, label, digits, definition."""
        return quantities.quantity(self._key or self.name, self.owner)


class Input(Declared):
    """An input: name, default, legal range and one-line meaning.

    Parameters
    ----------
    doc : str
        One-line meaning.
    default : object
        Value when not given; `REQUIRED` when there is none; None when it is optional.
    bounds : Bounds
        Legal range in SI.
    kw_only : bool
        Whether it is given by keyword only.
    hint : str
        What to try when the value is outside.
    infinite : bool
        Whether ``"infinite"`` is a legal value.
    """

    def __init__(
        self,
        *,
        doc: str,
        default: Any = REQUIRED,
        bounds: Bounds | None = None,
        quantity: str = "",
        kw_only: bool = True,
        hint: str = "",
        infinite: bool = False,
        group: str = "",
    ) -> None:
        super().__init__(quantity=quantity, doc=doc)
        self.default = default
        self.bounds = bounds or Bounds()
        self.kw_only = kw_only
        self.hint = hint
        self.infinite = infinite
        self.group = group

    @property
    def required(self) -> bool:
        """Whether the input must be given."""
        return self.default is REQUIRED

    def read(self, value: Any) -> Any:
        """Return the SI value of `value`; InputError with one problem when it is not legal."""
        if self.infinite and (value == "infinite" or (isinstance(value, float) and value == math.inf)):
            return math.inf
        unit = self.quantity.unit
        si = units.to_si(value, unit, self.name)
        allowed = self.bounds.problem(si, unit)
        if allowed:
            raise InputError(Problem(self.name, as_text(value), allowed, self.hint))
        return si

    def __set__(self, instance: Any, value: Any) -> None:
        raise AttributeError(f"{type(instance).__name__} is immutable; use .replace({self.name}=...) for a new one")

    def __delete__(self, instance: Any) -> None:
        raise AttributeError(f"{type(instance).__name__} is immutable")


class QuantityInput(Input):
    """An input with a unit; the attribute is a fresh quantity."""

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> Quantity: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: QuantityLike | None) -> None: ...


class NumberInput(Input):
    """A pure number; the attribute is a float."""

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> float: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: NumberLike | None) -> None: ...


class ChoiceInput(Input):
    """One of a few words."""

    def __init__(
        self,
        *,
        choices: tuple[str, ...],
        doc: str,
        default: Any = REQUIRED,
        kw_only: bool = True,
        hint: str = "",
        quantity: str = "",
    ) -> None:
        super().__init__(doc=doc, default=default, kw_only=kw_only, hint=hint, quantity=quantity)
        self.choices = choices

    def read(self, value: Any) -> Any:
        """Return the choice; InputError with near matches when it is none of them."""
        if isinstance(value, str) and value in self.choices:
            return value
        near = near_matches(value, self.choices, 1) if isinstance(value, str) else []
        hint = f"Did you mean {near[0]!r}?" if near else self.hint
        raise InputError(Problem(self.name, as_text(value), "one of " + ", ".join(map(repr, self.choices)), hint))

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> str: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: str | None) -> None: ...


class CustomInput(Input):
    """An input read by a function of its own (an ambient condition, a propellant, an upstream object).

    `reader` maps (name, value) to what the object keeps; it raises InputError. `shower` gives the attribute.
    """

    def __init__(
        self,
        *,
        doc: str,
        reader: Callable[[str, Any], Any],
        default: Any = REQUIRED,
        kw_only: bool = True,
        quantity: str = "",
    ) -> None:
        super().__init__(doc=doc, default=default, kw_only=kw_only, quantity=quantity)
        self._reader = reader

    def read(self, value: Any) -> Any:
        """Return what the object keeps of `value`."""
        return self._reader(self.name, value)

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> Any: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: Any) -> None: ...


class FlagInput(Input):
    """A yes-or-no choice."""

    def read(self, value: Any) -> Any:
        """Return the flag; only True and False are legal."""
        if isinstance(value, bool):
            return value
        raise InputError(Problem(self.name, as_text(value), "True or False"))

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> bool: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: bool) -> None: ...


class TextInput(Input):
    """Free text, such as the name of an object."""

    longest = 200

    def read(self, value: Any) -> Any:
        """Return the text; it must be a str of reasonable length without control characters."""
        if isinstance(value, str) and len(value) <= self.longest and value.isprintable():
            return value
        raise InputError(Problem(self.name, as_text(value), f"a printable text of at most {self.longest} characters"))

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> str: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)

    if TYPE_CHECKING:

        def __set__(self, instance: Any, value: str) -> None: ...


class Result(Declared):
    """A result: name, catalogue row, relation and source. The attribute is a fresh quantity, or a float.

    Parameters
    ----------
    relation : str
        Key of the relation in `propkit.physics.relations`, or of a set of conditions that an iteration satisfies.
    source : str
        Key of `propkit.sources`.
    shown : bool
        Whether the sheet lists it among the results.
    """

    def __init__(self, *, relation: str = "", source: str = "", quantity: str = "", doc: str = "", shown: bool = True) -> None:
        super().__init__(quantity=quantity, doc=doc)
        self.relation = relation
        self.source = source
        self.shown = shown

    def __set__(self, instance: Any, value: Any) -> None:
        raise AttributeError(f"{type(instance).__name__} is immutable and {self.name} is a result")


class QuantityResult(Result):
    """A result with a unit."""

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> Quantity: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)


class NumberResult(Result):
    """A result that is a pure number."""

    @overload
    def __get__(self, instance: None, owner: Any) -> Self: ...
    @overload
    def __get__(self, instance: object, owner: Any) -> float: ...
    def __get__(self, instance: Any, owner: Any) -> Any:
        return self if instance is None else instance.attribute(self.name)


def as_text(value: Any) -> str:
    """Return a value as an error text shows it, shortened."""
    text = f"{value}" if hasattr(value, "magnitude") else repr(value)
    return text if len(text) <= 60 else f"{text[:57]}..."


def as_typed(value: Any) -> Any:
    """Return what the recipe keeps of an input: text and plain numbers as they are, a quantity as text."""
    if hasattr(value, "magnitude") and hasattr(value, "units"):
        return f"{float(value.magnitude)!r} {value.units}".replace(" dimensionless", "")
    item = getattr(value, "item", None)
    if getattr(value, "shape", None) == () and item is not None:
        value = item()
    return "infinite" if isinstance(value, float) and math.isinf(value) else value
