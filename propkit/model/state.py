"""One flow state: what a station of the nozzle is made of."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from propkit import quantities, units
from propkit.errors import NotAvailableError
from propkit.model.declare import NumberResult, QuantityResult, Result

if TYPE_CHECKING:
    from propkit.report import UnitSystem


class State:
    """Flow state at one station: immutable, SI floats inside, fresh quantities at the attributes.

    `mach` is velocity over `sound_speed`, the sound speed of the flow model. `enthalpy` and `entropy` are per mass,
    on the scale of formation enthalpies at 298.15 K and of the 1 bar standard state.
    """

    kind = "state"
    __slots__ = ("_absent", "_values", "station")

    pressure = QuantityResult()
    temperature = QuantityResult()
    density = QuantityResult()
    velocity = QuantityResult()
    mach = NumberResult()
    sound_speed = QuantityResult()
    molar_mass = QuantityResult()
    isentropic_exponent = NumberResult()
    enthalpy = QuantityResult()
    entropy = QuantityResult()
    condensed_mass_fraction = NumberResult()

    station: str
    _values: Mapping[str, float]
    _absent: Mapping[str, str]

    def __init__(self, station: str, values: Mapping[str, float], absent: Mapping[str, str] | None = None) -> None:
        object.__setattr__(self, "station", station)
        object.__setattr__(self, "_values", dict(values))
        object.__setattr__(self, "_absent", dict(absent or {}))

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a State is immutable")

    def __eq__(self, other: object) -> bool:
        return isinstance(other, State) and self.station == other.station and self._values == other._values

    def __hash__(self) -> int:
        return hash((self.station, tuple(self._values.items())))

    def __reduce__(self) -> tuple[Any, ...]:
        return State, (self.station, dict(self._values), dict(self._absent))

    def si(self, name: str) -> float:
        """Return a property as an SI float; NotAvailableError with the reason where this flow has none."""
        if name not in self._values:
            raise NotAvailableError(self._absent.get(name, f"the {self.station} state has no {name}"), name=name)
        return self._values[name]

    def attribute(self, name: str) -> Any:
        """Return what reading the attribute `name` gives."""
        unit = quantities.quantity(name, self.kind).unit
        return units.quantity(self.si(name), unit)

    def names(self) -> tuple[str, ...]:
        """Return the names of the properties this state has."""
        return tuple(self._values)

    def as_dict(self, system: UnitSystem = "SI") -> dict[str, float]:
        """Return the properties as plain numbers, in SI base units or in the US display units."""
        if system == "SI":
            return dict(self._values)
        shown = {}
        for name, value in self._values.items():
            row = quantities.quantity(name)
            shown[name] = units.convert(value, row.unit, row.shown_in(system, (value,)))
        return shown

    def __repr__(self) -> str:
        parts = []
        for name in ("pressure", "temperature", "velocity", "mach"):
            if name in self._values:
                row = quantities.quantity(name)
                unit = row.shown_in("SI", (self._values[name],))
                shown = f"{units.convert(self._values[name], row.unit, unit):.6g} {units.shown_unit(unit)}".strip()
                parts.append(f"{name} {shown}")
        return f"<State {self.station}: {', '.join(parts)}>"


STATE_FIELDS: tuple[str, ...] = tuple(name for name, entry in vars(State).items() if isinstance(entry, Result))
"""Public names of the properties of a state, in the order of the table."""
