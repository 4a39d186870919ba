"""What a panel shows of one object of a chain: read from its declarations, with what only this object knows on top."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from propkit import units
from propkit.model.declare import ChoiceInput, CustomInput, FlagInput, Input, NumberInput, QuantityInput, TextInput
from propkit.panels.steps import Scale, scale_for, value_text
from propkit.report import UnitSystem

_LEADING_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)
TEMPERATURE_SPREAD = 1.2


@dataclass(frozen=True, slots=True)
class Group:
    """Inputs of which one is given: `members` by name, and the one that is given now."""

    key: str
    label: str
    members: tuple[str, ...]
    member: str


@dataclass(frozen=True, slots=True)
class Unit:
    """The unit of a control: its text, and the linear map from SI to it."""

    text: str
    factor: float = 1.0
    offset: float = 0.0

    def of(self, si: float) -> float:
        """Return an SI value in this unit."""
        return (si - self.offset) / self.factor

    def with_number(self, number: str) -> str:
        """Return a number with the unit, as it would be typed."""
        return f"{number} {self.text}" if self.text else number


def unit_named(text: str, si_unit: str) -> Unit:
    """Return the unit of a text such as ``"psia"`` for a quantity of `si_unit`."""
    if not text:
        return Unit("")
    zero, one = (units.parse(f"{number} {text}", si_unit) for number in (0, 1))
    return Unit(text, one - zero, zero)


def split_text(text: str) -> tuple[str, str] | None:
    """Return number and unit of a text, or None when it does not begin with a number."""
    match = _LEADING_NUMBER.fullmatch(text)
    return (match[1], match[2]) if match else None


class Face:
    """What a panel shows of one object: its inputs as controls, in order.

    One subclass for each kind of object says what the declarations cannot: which inputs stand back, where a slider begins
    when nothing was given, which group an input belongs to.
    """

    minor: tuple[str, ...] = ("name",)
    """Inputs that matter seldom; they stand folded away until one of them is given."""

    only_in_code: tuple[str, ...] = ()
    """Inputs that no text says; they are shown once they are given in code."""

    def __init__(self, link: Any) -> None:
        self.link = link
        self.varied: frozenset[str] = frozenset()
        """Inputs that have no value of their own in this panel: a study varies them, or displaces them."""

    @property
    def kind(self) -> str:
        """Kind of the object, the prefix of its paths."""
        return str(self.link.kind)

    @property
    def title(self) -> str:
        """Title of the object's group of controls."""
        return str(self.link.title)

    def path(self, name: str) -> str:
        """Return the path of an input."""
        return f"{self.kind}.{name}"

    def groups(self) -> tuple[Group, ...]:
        """Return the groups of alternatives, with the member that is given."""
        found = []
        for names in self.link.groups:
            given = next((name for name in names if name in self.link.inputs), names[0])
            label = " or ".join(self.link.declared_inputs[name].quantity.label for name in names)
            found.append(Group(f"{self.kind}:{names[0]}", label, tuple(names), given))
        return tuple(found)

    def hidden(self) -> frozenset[str]:
        """Return inputs that make no sense for the object as it is."""
        return frozenset()

    def fixed(self, name: str) -> bool:
        """Whether an input is shown but not edited here: what was given is no text."""
        return isinstance(self.link.inputs.get(name), Mapping | tuple | list)

    def names(self) -> Iterator[str]:
        """Yield the inputs that have a control, in the order of their declaration."""
        grouped = {name: group for group in self.groups() for name in group.members}
        skipped = {self.link.upstream_input, *self.hidden(), *self.only_in_code}
        for name in self.link.declared_inputs:
            if (name in skipped and not self.fixed(name)) or (name in grouped and grouped[name].member != name) or name in self.varied:
                continue
            yield name

    def is_minor(self, name: str) -> bool:
        """Whether an input stands folded away."""
        return name == "name" or (name in self.minor and name not in self.link.inputs)

    def choose(self, group: Group, member: str) -> dict[str, Any]:
        """Return the changes that make `member` the given one of its group, at the value it has now."""
        return {self.path(member): self.text_now(member)}

    # -- values ------------------------------------------------------------------------------------

    def declared(self, name: str) -> Input:
        """Return the declaration of an input."""
        return self.link.declared_inputs[name]  # type: ignore[no-any-return]

    def effective(self, name: str) -> float | None:
        """Return the SI value that an input has in effect, given or not; None where there is no number."""
        value = self.link._values.get(name)
        if value is None and self.link.has(name):
            value = self.link.si(name)
        if isinstance(value, bool) or not isinstance(value, int | float) or value == float("inf"):
            return None
        return float(value)

    def unit(self, name: str, system: UnitSystem) -> Unit:
        """Return the unit of a control: the one that was typed, else that of the display."""
        quantity = self.declared(name).quantity
        typed = self.link.inputs.get(name)
        if isinstance(typed, str):
            parts = split_text(typed)
            if parts is not None and quantity.unit:
                return unit_named(parts[1], quantity.unit)
        value = self.effective(name)
        shown = quantity.shown_in(system, () if value is None else (value,))
        return unit_named(units.shown_unit(shown), quantity.unit)

    def text_now(self, name: str, system: UnitSystem = "SI") -> str:
        """Return the value in effect as it could be typed; empty where there is none."""
        typed = self.link.inputs.get(name)
        if typed is not None:
            return self.typed_text(name, typed, system)
        value = self.link._values.get(name)
        if isinstance(value, str):
            return value
        number = self.effective(name)
        if number is None:
            return "infinite" if value == float("inf") else ""
        unit = self.unit(name, system)
        return unit.with_number(value_text(unit.of(number)))

    def typed_text(self, name: str, typed: Any, system: UnitSystem) -> str:
        """Return what was typed as the text field shows it: a bare SI number gets the unit of the display."""
        if isinstance(typed, str):
            return typed
        if self.fixed(name):
            return repr(typed)
        if isinstance(typed, bool) or not isinstance(typed, int | float):
            return self.link.input_text(name)  # type: ignore[no-any-return]
        quantity = self.declared(name).quantity
        if not quantity.unit:
            return f"{typed!r}"
        unit = self.unit(name, system)
        return unit.with_number(value_text(unit.of(float(typed)), 10))

    def scale(self, name: str, unit: Unit) -> Scale | None:
        """Return a slider for an input around its value in effect; None where it has no number."""
        value = self.effective(name)
        entry = self.declared(name)
        if value is None or not isinstance(entry, NumberInput | QuantityInput):
            return None
        spread = TEMPERATURE_SPREAD if entry.quantity.unit == "K" else 2.5
        return scale_for(value, entry.bounds, unit.of, spread=spread)

    def position(self, name: str, unit: Unit) -> float | None:
        """Return where the slider of an input stands, in its unit."""
        value = self.effective(name)
        return None if value is None else unit.of(value)

    def slide(self, name: str, unit: Unit, scale: Scale, position: float) -> Any:
        """Return what a slider position stands for, as it would be typed."""
        return typed_value(unit.with_number(scale.text(position)))

    def read(self, name: str, text: str, system: UnitSystem) -> Any:
        """Return the input that a typed text stands for; a bare number takes the unit that the field has."""
        entry, stripped = self.declared(name), text.strip()
        if isinstance(entry, TextInput):
            return text
        if isinstance(entry, NumberInput | QuantityInput):
            if not stripped:
                return None
            parts = split_text(stripped)
            if parts is not None and not parts[1] and entry.quantity.unit:
                return self.unit(name, system).with_number(parts[0])
        return typed_value(stripped) if stripped else None

    def choices(self, name: str) -> Mapping[str, str] | None:
        """Return the choices of an input, value to label; None where it is no choice."""
        entry = self.declared(name)
        if isinstance(entry, ChoiceInput):
            return {choice: choice for choice in entry.choices}
        return {"True": "yes", "False": "no"} if isinstance(entry, FlagInput) else None

    def choice_now(self, name: str) -> str:
        """Return the choice in effect."""
        return str(self.link._values.get(name))

    def chosen(self, name: str, choice: str) -> Any:
        """Return the input that a choice stands for."""
        return choice == "True" if isinstance(self.declared(name), FlagInput) else choice

    def suggestions(self, name: str) -> tuple[str, ...]:
        """Return texts that a field of its own kind offers."""
        return ()

    def style(self, name: str) -> str:
        """Return how an input is edited: ``choice``, ``number``, ``custom`` or ``text``."""
        if self.choices(name) is not None:
            return "choice"
        if self.fixed(name):
            return "fixed"
        entry = self.declared(name)
        if isinstance(entry, NumberInput | QuantityInput):
            return "number"
        return "custom" if isinstance(entry, CustomInput) else "text"

    def label(self, name: str) -> str:
        """Return the label of a control."""
        return self.declared(name).quantity.label

    def told(self, name: str, system: UnitSystem) -> str:
        """Return what a note beside a control of its own kind says."""
        return ""

    def placeholder(self, name: str) -> str:
        """Return what an empty field says."""
        return "not given"


def typed_value(text: str) -> Any:
    """Return a typed text as an input: a bare number as a number, so that the code reads as one would write it."""
    parts = split_text(text)
    if parts is None or parts[1]:
        return text
    number = parts[0]
    return int(number) if re.fullmatch(r"[+-]?\d+", number) else float(number)


FaceMaker = Callable[[Any], Face]
