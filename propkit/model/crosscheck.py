"""The second engine as an object sees it: what it solved, and how far the two engines are apart."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from propkit.bridge import second_engine
from propkit.bridge.basis import load_basis
from propkit.errors import NotAvailableError

if TYPE_CHECKING:
    from propkit.model.performance import Performance

_STATIONS = {"reservoir": "chamber", "throat": "throat", "exit": "exit"}


@dataclass(frozen=True, slots=True)
class CrossCheck:
    """An independent solution of chamber, throat and exit, beside ours.

    `stations` and `differences` map station (``chamber``, ``throat``, ``exit``) and quantity to the second engine's SI value and to
    (ours - theirs) / theirs; enthalpy and entropy relative to R T and R. `ours` holds the values compared with. `largest` is the largest of them.
    """

    engine: str
    stations: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    differences: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    ours: Mapping[str, Mapping[str, float]] = field(default_factory=dict)

    @property
    def largest(self) -> float:
        """Largest relative difference."""
        return max(abs(value) for station in self.differences.values() for value in station.values())

    def __str__(self) -> str:
        return (
            f"Second engine ({self.engine}) solved chamber, throat and exit independently: largest relative difference {self.largest:.1e}."
        )


def cross_check(performance: Performance) -> CrossCheck:
    """Return the second solution of a performance.

    Raises
    ------
    NotAvailableError
        With the reason, where the second engine does not apply or does not solve.
    """
    nozzle = performance.nozzle
    chamber = nozzle.chamber
    reason = _reason(performance)
    if reason:
        raise NotAvailableError(reason)
    held = chamber.held
    freeze_at = nozzle._values["freeze_at"] or "chamber"
    discharge = nozzle.si("discharge_coefficient")
    solution = second_engine.cross_check(
        load_basis(str(chamber.case.si("thermo_basis"))),
        held.table.elements,
        held.atoms[0].tolist(),
        enthalpy=float(held.stagnation.enthalpy[0]),
        pressure=float(held.stagnation.pressure[0]),
        flow=nozzle.flow,
        area_ratio=nozzle.si("area_ratio") / discharge,
        freeze_at=freeze_at / discharge if isinstance(freeze_at, float) else freeze_at,
        inlet_pressure=float(held.inlet.pressure[0]),
    )
    if solution.reason:
        raise NotAvailableError(solution.reason)
    ours = _ours(performance)
    differences = solution.differences(ours)
    return CrossCheck(
        solution.engine,
        {_STATIONS[name]: dict(values) for name, values in solution.stations.items()},
        {_STATIONS[name]: values for name, values in differences.items()},
        {_STATIONS[name]: values for name, values in ours.items()},
    )


def _ours(performance: Performance) -> dict[str, dict[str, float]]:
    nozzle = performance.nozzle
    rest = nozzle.chamber.held.stagnation
    ours = {"reservoir": {name: float(getattr(rest, name)[0]) for name in second_engine.QUANTITIES if name != "velocity"}}
    for name in ("throat", "exit"):
        state = getattr(nozzle, name)
        ours[name] = {entry: state.si(entry) for entry in second_engine.QUANTITIES}
    return ours


def _reason(performance: Performance) -> str:
    """Return why the second engine does not apply, or an empty text."""
    nozzle = performance.nozzle
    if nozzle.flow == "constant-property":
        return "constant-property flow is a closed form: there is no equilibrium to solve a second time"
    outside = [doubt for doubt in performance.warnings if doubt.code == "data-range"]
    if outside:
        return "a station lies outside the range of the species data, where the two engines continue the data differently"
    held: Any = nozzle.chamber.held
    if held.shares is not None:
        return "core and film are two streams; the second engine solves one"
    if held.table.condensed.any():
        return "condensed species are not in the second engine"
    if getattr(nozzle.chamber.case, "fixed_composition", None) is not None:
        return "the composition is given, not computed"
    return ""


def one_line(performance: Performance) -> str:
    """Return the outcome of the check in one line."""
    try:
        return str(performance.cross_check())
    except NotAvailableError as error:
        return f"Second engine: not compared; {error.message}."
