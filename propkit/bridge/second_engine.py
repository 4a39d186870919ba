"""An independent solution of reservoir, throat and exit by Cantera's own equilibrium solver on the same basis.

Nothing of propkit's engine is used but the data: other start, other iteration, other search for the throat. A fresh phase
is built for each call. Cantera continues its polynomials beyond their range, so stations outside it are not compared.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, Final, Literal

import numpy as np
from scipy.optimize import brentq

from propkit.bridge.basis import Basis, atomic_weight

QUANTITIES: Final = ("pressure", "temperature", "density", "velocity", "molar_mass", "enthalpy", "entropy")
"""What is solved at each station, in SI units."""

_TIGHT: Final = 1e-10
_START_TEMPERATURE: Final = 3000.0
_PRESSURE_STEP: Final = 1e-3
_CONCERNED: Final = 1e-6
_LOWEST_LOG_PRESSURE: Final = -23.0
_LOWEST_TEMPERATURE: Final = 150.0
_HIGHEST_TEMPERATURE: Final = 6500.0


@dataclass(frozen=True, slots=True)
class SecondSolution:
    """What the second engine found.

    Parameters
    ----------
    engine : str
        Name and version of the engine.
    stations : mapping
        Station ("reservoir", "throat", "exit") -> quantity -> SI value; empty where nothing is compared.
    reason : str
        Why nothing is compared; empty otherwise.
    """

    engine: str
    stations: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    reason: str = ""

    def differences(self, ours: Mapping[str, Mapping[str, float]]) -> dict[str, dict[str, float]]:
        """Return (ours - theirs)/theirs for each station and quantity that both have.

        Parameters
        ----------
        ours : mapping
            Station -> quantity -> SI value.

        Returns
        -------
        dict
            Station -> quantity -> relative difference. A velocity of zero is left out; enthalpy and entropy are relative
            to R T/M and R/M of the station, because their zero is a convention.
        """
        found: dict[str, dict[str, float]] = {}
        for station, theirs in self.stations.items():
            mine = ours.get(station, {})
            gas_constant = theirs["pressure"] / (theirs["density"] * theirs["temperature"])
            scales = {**theirs, "enthalpy": gas_constant * theirs["temperature"], "entropy": gas_constant}
            common = [name for name in QUANTITIES if name in mine and scales[name] != 0.0]
            found[station] = {name: (mine[name] - theirs[name]) / scales[name] for name in common}
        return found


def cross_check(
    basis: Basis,
    elements: Sequence[str],
    atoms: Sequence[float],
    *,
    enthalpy: float,
    pressure: float,
    flow: Literal["shifting", "frozen"] = "shifting",
    area_ratio: float | None = None,
    exit_pressure: float | None = None,
    freeze_at: str | float = "chamber",
    inlet_pressure: float | None = None,
) -> SecondSolution:
    """Solve reservoir, throat and exit of a nozzle with Cantera.

    Parameters
    ----------
    basis : Basis
        The thermodynamic data.
    elements : sequence of str
        Chemical symbols.
    atoms : sequence of float
        Moles of atoms in a kilogram, in the order of `elements` [mol/kg].
    enthalpy : float
        Stagnation enthalpy [J/kg].
    pressure : float
        Stagnation pressure at the nozzle inlet [Pa].
    flow : {"shifting", "frozen"}
        Flow model.
    area_ratio : float, optional
        Exit area over throat area, 1 or more. One of this and `exit_pressure`.
    exit_pressure : float, optional
        Exit pressure [Pa].
    freeze_at : "chamber", "throat" or float
        Frozen flow only: where the composition freezes; a number is a supersonic area ratio.
    inlet_pressure : float, optional
        Static pressure at the nozzle inlet [Pa], whose composition frozen flow from the chamber keeps; the stagnation
        pressure when None.

    Returns
    -------
    SecondSolution
        The stations, or the reason why there are none.
    """
    import cantera

    engine = f"Cantera {cantera.__version__}"
    present = [(symbol, amount) for symbol, amount in zip(elements, atoms, strict=True) if amount > 0.0]
    try:
        solver = _Solver(basis, present, enthalpy, pressure)
        solver.reservoir()
        stations = {"reservoir": solver.station()}
        _expand(solver, stations, flow, freeze_at, inlet_pressure or pressure, area_ratio, exit_pressure)
    except (cantera.CanteraError, ValueError, RuntimeError) as error:
        text = str(error).strip("* \n").splitlines()
        return SecondSolution(engine, reason=f"Cantera's solver did not converge ({text[0] if text else 'no message'})")
    if solver.outside:
        return SecondSolution(engine, reason=f"not compared outside the range of the data ({solver.outside})")
    return SecondSolution(engine, stations)


class _Solver:
    """A Cantera phase of one case, with the reservoir it expands from."""

    def __init__(self, basis: Basis, present: Sequence[tuple[str, float]], enthalpy: float, pressure: float) -> None:
        symbols = tuple(symbol for symbol, _ in present)
        self.table = basis.table(symbols)
        self.gas = basis.cantera_solution(symbols)
        self.h0, self.p0 = enthalpy, pressure
        self.entropy = float("nan")
        self.held: Any = None
        self.outside = ""
        self.fractions = {symbol: amount * atomic_weight(symbol) for symbol, amount in present}

    def reservoir(self) -> None:
        """Solve the gas at rest."""
        self._from_atoms(_START_TEMPERATURE)
        try:
            self.gas.HP = self.h0, self.p0
            self.gas.equilibrate("HP", rtol=_TIGHT)
        except Exception:
            self._bracketed()
        self.entropy = float(self.gas.s)

    def _from_atoms(self, temperature: float) -> None:
        """Set the elements as free atoms, or as whatever species has them alone, and equilibrate."""
        self.gas.TPY = temperature, self.p0, self._start()
        self.gas.equilibrate("TP", rtol=_TIGHT)

    def _start(self) -> dict[str, float]:
        names = set(self.table.names)
        if set(self.fractions) <= names:
            return self.fractions
        single = {}
        for symbol, mass in self.fractions.items():
            column = self.table.elements.index(symbol)
            alone = np.flatnonzero(self.table.composition[:, column] == self.table.composition.sum(axis=1))
            single[self.table.names[alone[0]]] = mass
        return single

    def _bracketed(self) -> None:
        """Find the temperature of the enthalpy by a root search over (T, p) solutions."""

        def missing(temperature: float) -> float:
            self._from_atoms(temperature)
            return float(self.gas.h) - self.h0

        brentq(missing, _LOWEST_TEMPERATURE, _HIGHEST_TEMPERATURE, xtol=1e-9, rtol=1e-12)

    def move(self, log_pressure: float) -> float:
        """Go to a pressure on the isentrope; return ln of the mass flux."""
        if self.held is None:
            self.gas.SP = self.entropy, np.exp(log_pressure)
            self.gas.equilibrate("SP", rtol=_TIGHT)
        else:
            self.gas.SPY = self.entropy, np.exp(log_pressure), self.held
        square = 2.0 * (self.h0 - self.gas.h)
        return float(np.log(self.gas.density) + 0.5 * np.log(max(square, 1e-30)))

    def sonic_excess(self, log_pressure: float) -> float:
        """Return ln of u^2 over the square of the sound speed, the latter from the change of density along the isentrope."""
        logs = []
        for step in (_PRESSURE_STEP, -_PRESSURE_STEP):
            self.move(log_pressure + step)
            logs.append((float(np.log(self.gas.density)), float(self.gas.P)))
        slope = (logs[0][1] - logs[1][1]) / (np.exp(logs[0][0]) - np.exp(logs[1][0]))
        self.move(log_pressure)
        return float(np.log(2.0 * (self.h0 - self.gas.h) / slope))

    def station(self) -> dict[str, float]:
        """Return the present state, noting a species that matters outside its range."""
        gas = self.gas
        t = float(gas.T)
        far = (gas.X > _CONCERNED) & ((t < self.table.temperature_low - 1e-9) | (t > self.table.temperature_high + 1e-9))
        if far.any() and not self.outside:
            self.outside = f"{self.table.names[int(np.flatnonzero(far)[0])]} at {t:.1f} K"
        speed = float(np.sqrt(max(2.0 * (self.h0 - gas.h), 0.0)))
        return {
            "pressure": float(gas.P),
            "temperature": t,
            "density": float(gas.density),
            "velocity": speed if self.p0 * (1.0 - 1e-12) > gas.P else 0.0,
            "molar_mass": float(gas.mean_molecular_weight) * 1e-3,
            "enthalpy": float(gas.h),
            "entropy": float(gas.s),
        }


def _expand(
    solver: _Solver,
    stations: dict[str, dict[str, float]],
    flow: str,
    freeze_at: str | float,
    inlet_pressure: float,
    area_ratio: float | None,
    exit_pressure: float | None,
) -> None:
    """Add throat and exit to the stations."""
    if flow == "frozen" and freeze_at == "chamber":
        solver.move(float(np.log(inlet_pressure)))
        solver.held = solver.gas.Y.copy()
    top = float(np.log(solver.p0))
    log_throat = _root(solver.sonic_excess, top - 0.9, top - 0.35, _TIGHT)
    log_flux = solver.move(log_throat)
    stations["throat"] = solver.station()
    if flow == "frozen" and freeze_at != "chamber":
        if freeze_at != "throat":
            goal = log_flux - float(np.log(float(freeze_at)))
            solver.move(_supersonic(solver, log_throat, goal))
        solver.held = solver.gas.Y.copy()
    if area_ratio is not None:
        log_exit = _supersonic(solver, log_throat, log_flux - float(np.log(area_ratio)))
    else:
        assert exit_pressure is not None
        log_exit = float(np.log(exit_pressure))
    solver.move(log_exit)
    stations["exit"] = solver.station()


def _supersonic(solver: _Solver, log_throat: float, goal: float) -> float:
    """Return ln p below the throat at which ln of the mass flux is `goal`."""
    high, low = log_throat, log_throat - 1.0
    while solver.move(low) > goal:
        high, low = low, low - 1.5
        if low < _LOWEST_LOG_PRESSURE:
            raise ValueError("no pressure reaches the area ratio")
    if high == log_throat:
        high = _past_sonic(solver, log_throat, goal)
    return _root(lambda x: solver.move(x) - goal, low, high, 1e-13)


def _past_sonic(solver: _Solver, log_throat: float, goal: float) -> float:
    """Return a ln p just below the throat where the mass flux is still at least `goal`."""
    for step in (0.0, 0.02, 0.05, 0.1, 0.2, 0.4):
        if solver.move(log_throat - step) >= goal:
            return log_throat - step
    raise ValueError("the throat passes less than the area ratio asks for")


def _root(function: Callable[[float], float], low: float, high: float, tolerance: float) -> float:
    return float(brentq(function, low, high, xtol=tolerance, rtol=1e-14))
