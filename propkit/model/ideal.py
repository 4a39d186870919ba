"""The loss-free values of a performance."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from propkit import quantities, units
from propkit.chain import performance as stage
from propkit.errors import NotAvailableError
from propkit.model.declare import NumberResult, QuantityResult

if TYPE_CHECKING:
    from propkit.model.performance import Performance


class IdealPerformance:
    """What the nozzle would deliver without losses: full combustion, axial flow, no friction, no lag. Immutable."""

    kind = "performance"
    __slots__ = ("_values",)

    thrust = QuantityResult()
    specific_impulse = QuantityResult()
    mass_flow = QuantityResult()
    thrust_coefficient = NumberResult()
    effective_exhaust_velocity = QuantityResult()
    thrust_vacuum = QuantityResult()
    specific_impulse_vacuum = QuantityResult()
    thrust_coefficient_vacuum = NumberResult()

    _values: Mapping[str, float]

    def __init__(self, values: Mapping[str, float]) -> None:
        object.__setattr__(self, "_values", dict(values))

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("IdealPerformance is immutable")

    def __reduce__(self) -> tuple[Any, ...]:
        return IdealPerformance, (dict(self._values),)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, IdealPerformance) and self._values == other._values

    def __hash__(self) -> int:
        return hash(tuple(self._values.items()))

    def si(self, name: str) -> float:
        """Return a value as an SI float."""
        if name not in self._values:
            raise NotAvailableError(f"the ideal performance has no {name}", name=name)
        return self._values[name]

    def attribute(self, name: str) -> Any:
        """Return what reading the attribute `name` gives."""
        unit = quantities.quantity(name, self.kind).unit
        return units.quantity(self.si(name), unit) if unit else self.si(name)

    def __repr__(self) -> str:
        return f"<IdealPerformance: thrust {self.si('thrust'):.6g} N, specific impulse {self.si('specific_impulse'):.6g} s, mass flow {self.si('mass_flow'):.6g} kg/s>"


def ideal_of(performance: Performance) -> IdealPerformance:
    """Return the loss-free values of a performance: the same hardware and ambient pressure."""
    nozzle = performance.nozzle
    found = stage.deliver(
        mass_flow=nozzle.si("mass_flow") * nozzle.chamber.si("cstar_efficiency"),
        exit_velocity=nozzle.exit.si("velocity"),
        exit_pressure=nozzle.exit.si("pressure"),
        exit_area=nozzle.si("exit_area"),
        throat_area=nozzle.si("throat_area"),
        stagnation_pressure=nozzle.chamber.si("stagnation_pressure"),
        ambient=performance.si("ambient"),
    )
    return IdealPerformance({name: float(getattr(found, name)) for name in stage.Delivery.__slots__})
