"""Enthalpy change and density of a propellant from the state of its row to the state it is stored or fed in.

CoolProp supplies both where it has the fluid; elsewhere the specific heat of the row does, with its range. A mixture is
the sum over its ingredients. Every doubt (a phase boundary crossed, a range left) comes back as a warning text.
"""

from __future__ import annotations

import math
from contextlib import suppress
from dataclasses import dataclass
from typing import Any

from propkit.constants import GAS_CONSTANT, REFERENCE_PRESSURE, SEA_LEVEL_PRESSURE
from propkit.data.propellant_row import PropellantRow
from propkit.errors import InputError, MissingExtraError, Problem, RangeError

_NEAR_SATURATION = 5e-3
_VANISHING_PRESSURE = 1.0
_IDEAL_UP_TO = 5e5
_TROUTON = 88.0
_EXTRAPOLATED = 1.5
_SAME_TEMPERATURE = 1e-9


@dataclass(frozen=True, slots=True)
class StoredState:
    """A propellant as it is stored or fed.

    Parameters
    ----------
    temperature, pressure : float
        The state [K], [Pa]; the pressure is the one taken where none was asked for.
    enthalpy_change : float
        From the state of the row to this one [J/mol of the row's formula].
    density : float or None
        Density there [kg/m3].
    phase : str
        "liquid" | "gas" | "supercritical" | "solid".
    warnings : tuple of str
        What to doubt.
    source : str
        How the change was found.
    """

    temperature: float
    pressure: float
    enthalpy_change: float
    density: float | None
    phase: str
    warnings: tuple[str, ...]
    source: str


def stored_state(
    row: PropellantRow, temperature: float | None = None, pressure: float | None = None, input_name: str = "temperature"
) -> StoredState:
    """Return the stored state of a propellant at an asked temperature and pressure.

    Parameters
    ----------
    row : PropellantRow
        The propellant with its own state.
    temperature : float, optional
        Temperature [K]; that of the row unless given.
    pressure : float, optional
        Absolute pressure [Pa]. Unless given: that of the row, or the vapour pressure where a liquid needs more than
        that to stay one; a gas is taken as ideal.
    input_name : str
        Name of the temperature input for the error text.

    Returns
    -------
    StoredState
        Enthalpy change [J/mol], density [kg/m3], phase, warnings and source.

    Raises
    ------
    InputError
        When neither CoolProp nor a specific heat says how this propellant changes with temperature.
    RangeError
        When CoolProp has no state there (below freezing, beyond its limits).
    MissingExtraError
        When CoolProp is needed and not installed.

    Notes
    -----
    The change is h(asked) - h(row), so a row keeps its published value at its own state.
    """
    at = row.temperature if temperature is None else float(temperature)
    same_temperature = abs(at - row.temperature) <= _SAME_TEMPERATURE * row.temperature
    if same_temperature and (pressure is None or (pressure == row.pressure and row.phase != "gas")):
        return StoredState(row.temperature, row.pressure, 0.0, row.density, row.phase, (), "the library row itself")
    if row.coolprop_fluid:
        return _from_coolprop(row, at, pressure)
    if row.heat_capacity is not None:
        return _from_heat_capacity(row, row.heat_capacity, at, pressure)
    if row.components:
        return _from_ingredients(row, at, pressure)
    if abs(at - row.temperature) <= 0.02:
        return StoredState(at, pressure or row.pressure, 0.0, row.density, row.phase, (), "the library row itself")
    raise InputError(
        Problem(
            input_name,
            f"{at:g} K for {row.name!r}",
            f"{row.temperature:g} K, the temperature of its row",
            "No specific heat of it is known here: give the propellant one (heat_capacity=), or its enthalpy at that temperature.",
        )
    )


# ---- CoolProp ---------------------------------------------------------------------------------------------------


def load_fluids() -> None:
    """Read CoolProp's library of fluids now, where CoolProp is installed; else its first use does, for seconds."""
    with suppress(ImportError):
        import CoolProp  # noqa: F401


def open_fluid(row: PropellantRow) -> Any:
    """Return CoolProp's equation of state of a row's fluid, a fresh one: it is never shared between threads."""
    try:
        from CoolProp.CoolProp import AbstractState
    except ImportError as error:
        raise MissingExtraError("CoolProp", "fluids", f"The stored state of {row.name} at another temperature or pressure") from error
    try:
        return AbstractState("HEOS", row.coolprop_fluid or "")
    except ValueError as error:
        raise InputError(
            Problem("coolprop_fluid", repr(row.coolprop_fluid), "a fluid that CoolProp knows", f"Row {row.name!r}.")
        ) from error


def _update(fluid: Any, row: PropellantRow, pair: str, first: float, second: float, at: float, pressure: float | None) -> None:
    import CoolProp

    try:
        fluid.update(getattr(CoolProp, pair), first, second)
    except ValueError as error:
        where = f"{at:g} K" if pressure is None else f"{at:g} K and {pressure / 1e5:.4g} bar"
        frozen = row.freezing_point is not None and at < row.freezing_point
        why = f"it is below the freezing point, {row.freezing_point:g} K" if frozen else f"CoolProp says: {error}"
        raise RangeError(f"{row.name} has no fluid state at {where}: {why}.", temperature=at, pressure=pressure) from error


def _reference_enthalpy(fluid: Any, row: PropellantRow) -> float:
    """Return the specific enthalpy [J/kg] on CoolProp's scale at the state of the row."""
    if row.phase == "gas":
        _update(fluid, row, "PT_INPUTS", _VANISHING_PRESSURE, row.temperature, row.temperature, None)
    elif row.saturated:
        _update(fluid, row, "QT_INPUTS", 0.0, row.temperature, row.temperature, None)
    else:
        _update(fluid, row, "PT_INPUTS", row.pressure, row.temperature, row.temperature, row.pressure)
    return float(fluid.hmass())


def _from_coolprop(row: PropellantRow, at: float, pressure: float | None) -> StoredState:
    fluid = open_fluid(row)
    reference = _reference_enthalpy(fluid, row)
    warnings = _hot_limit(row, at, float(fluid.Tmax()))
    if row.freezing_point is not None and at < row.freezing_point - 0.01:
        warnings.append(
            f"{row.name} at {at:g} K is below its freezing point ({row.freezing_point:g} K): the value is that of the "
            f"liquid, the heat of fusion is left out."
        )
    below_critical = at < fluid.T_critical()
    vapour_pressure = None
    if below_critical:
        _update(fluid, row, "QT_INPUTS", 0.0, at, at, pressure)
        vapour_pressure = float(fluid.p())
    taken, ideal = _pressure_taken(row, at, pressure, vapour_pressure, warnings)
    phase = _coolprop_state(fluid, row, at, taken, ideal, vapour_pressure)
    warnings += [] if ideal else _crossing(row, at, taken, phase)
    change = (float(fluid.hmass()) - reference) * row.molar_mass
    density = taken * row.molar_mass / (GAS_CONSTANT * at) if ideal else float(fluid.rhomass())
    kind = "ideal gas of CoolProp" if ideal else "CoolProp"
    source = f"{kind}, {row.coolprop_fluid}: enthalpy from {row.state_text} to {at:g} K and {taken / 1e5:.4g} bar"
    return StoredState(at, taken, change, density, phase, tuple(warnings), source)


def _hot_limit(row: PropellantRow, at: float, highest: float) -> list[str]:
    """Return a warning above the range of the equation of state; refuse what is far above it."""
    if at > _EXTRAPOLATED * highest:
        raise RangeError(f"{row.name} has no fluid state at {at:g} K: CoolProp has it up to {highest:g} K.", temperature=at)
    if at > highest:
        return [f"{row.name} at {at:g} K is above the range of its equation of state ({highest:g} K): extrapolated."]
    return []


def _pressure_taken(
    row: PropellantRow, at: float, pressure: float | None, vapour_pressure: float | None, warnings: list[str]
) -> tuple[float, bool]:
    """Return the pressure [Pa] of the state, and whether it is the ideal gas."""
    if pressure is not None:
        return float(pressure), False
    if row.phase == "gas":
        condensed = vapour_pressure is not None and vapour_pressure < REFERENCE_PRESSURE
        return REFERENCE_PRESSURE, not condensed
    if vapour_pressure is None:
        warnings.append(
            f"{row.name} at {at:g} K is above its critical temperature and no pressure was given: taken as an ideal "
            f"gas, the heat of vaporisation in the enthalpy. Give the pressure it is fed at."
        )
        return REFERENCE_PRESSURE, True
    if vapour_pressure > row.pressure * (1.0 + _NEAR_SATURATION):
        warnings.append(
            f"{row.name} at {at:g} K is a liquid only above {vapour_pressure / 1e5:.3g} bar: taken as the saturated "
            f"liquid. Give the pressure it is stored at."
        )
    return max(min(row.pressure, SEA_LEVEL_PRESSURE), vapour_pressure), False


def _coolprop_state(fluid: Any, row: PropellantRow, at: float, pressure: float, ideal: bool, vapour_pressure: float | None) -> str:
    """Set the fluid to the state and return its phase."""
    if ideal:
        _update(fluid, row, "PT_INPUTS", _VANISHING_PRESSURE, at, at, None)
        return "gas"
    if vapour_pressure is not None and abs(pressure / vapour_pressure - 1.0) <= _NEAR_SATURATION:
        _update(fluid, row, "QT_INPUTS", 1.0 if row.phase == "gas" else 0.0, at, at, pressure)
        return row.phase
    _update(fluid, row, "PT_INPUTS", pressure, at, at, pressure)
    if vapour_pressure is None:
        return "supercritical" if pressure > fluid.p_critical() and row.phase != "gas" else "gas"
    return "liquid" if pressure > vapour_pressure else "gas"


def _crossing(row: PropellantRow, at: float, pressure: float, phase: str) -> list[str]:
    if phase == row.phase:
        return []
    where = f"{row.name} at {at:g} K and {pressure / 1e5:.4g} bar"
    if phase == "supercritical":
        return [f"{where} is supercritical, the library row is a {row.phase}: it is no longer a liquid with a surface."]
    if phase == "gas":
        return [f"{where} is a gas, the library row is a {row.phase}: the heat of vaporisation is in the enthalpy."]
    if row.phase == "gas":
        return [f"{where} is a {phase}, the library row is a gas: the heat of condensation is in the enthalpy."]
    return [f"{where} is a {phase}, the library row is a {row.phase}: the heat of the transition is left out."]


# ---- a specific heat --------------------------------------------------------------------------------------------


def _from_heat_capacity(row: PropellantRow, specific_heat: float, at: float, pressure: float | None) -> StoredState:
    taken = row.pressure if pressure is None else float(pressure)
    warnings = _limits(row, at, pressure)
    low, high = row.heat_capacity_range or (row.temperature, row.temperature)
    if not low <= at <= high:
        warnings.append(
            f"{row.name} at {at:g} K is outside the range of its specific heat, {low:g} to {high:g} K: held constant beyond it."
        )
    density, slope = _density(row, at), row.density_slope or 0.0
    per_mass = specific_heat * (at - row.temperature)
    if density and row.phase != "gas":
        per_mass += (taken - row.pressure) / density * (1.0 + at * slope / density)
    elif row.phase == "gas":
        density = taken * row.molar_mass / (GAS_CONSTANT * at)
    kept = "" if slope or density is None or row.phase == "gas" else "; density of the row kept"
    source = f"specific heat {specific_heat:g} J/(kg K) held constant ({row.heat_capacity_source or 'of the row'}){kept}"
    return StoredState(at, taken, per_mass * row.molar_mass, density, row.phase, tuple(warnings), source)


def _density(row: PropellantRow, at: float) -> float | None:
    if row.density is None or not row.density_slope:
        return row.density
    start = row.density_temperature or row.temperature
    return max(row.density + row.density_slope * (at - start), 0.5 * row.density)


def _limits(row: PropellantRow, at: float, pressure: float | None) -> list[str]:
    """Return warnings for a state beyond the freezing or boiling point of a row without an equation of state."""
    warnings = []
    if row.freezing_point is not None and row.phase == "liquid" and at < row.freezing_point:
        warnings.append(f"{row.name} at {at:g} K is below its freezing point ({row.freezing_point:g} K): the heat of fusion is left out.")
    if row.freezing_point is not None and row.phase == "solid" and at > row.freezing_point:
        warnings.append(f"{row.name} at {at:g} K is above its melting point ({row.freezing_point:g} K): the heat of fusion is left out.")
    if row.boiling_point is None or row.phase != "liquid":
        return warnings
    boiling = vapour_pressure_estimate(row, at)
    if pressure is None and at > row.boiling_point + 0.5 and boiling > row.pressure:
        warnings.append(
            f"{row.name} at {at:g} K is above its boiling point at 1 atm ({row.boiling_point:g} K): a liquid only "
            f"under pressure, about {boiling / 1e5:.2g} bar. Taken as a liquid."
        )
    if pressure is not None and pressure < 0.9 * boiling:
        warnings.append(
            f"{row.name} at {at:g} K and {pressure / 1e5:.3g} bar is below its vapour pressure (about "
            f"{boiling / 1e5:.2g} bar): it would boil. Taken as a liquid, the heat of vaporisation is left out."
        )
    return warnings


def vapour_pressure_estimate(row: PropellantRow, temperature: float) -> float:
    """Return an estimate of the vapour pressure of a liquid.

    Parameters
    ----------
    row : PropellantRow
        A row with a boiling point, and a vapour pressure at 298.15 K where the row has one.
    temperature : float
        Temperature [K].

    Returns
    -------
    float
        Vapour pressure [Pa].

    Notes
    -----
    Clausius-Clapeyron through the boiling point; its slope from the vapour pressure at 298.15 K, else from Trouton's
    rule (entropy of vaporisation 88 J/(mol K)). Good for saying that a liquid would boil, not for more.
    """
    boiling = row.boiling_point
    if boiling is None:
        raise InputError(f"{row.name} has no boiling point in its row.")
    slope = _TROUTON / GAS_CONSTANT * boiling
    if row.vapour_pressure is not None and abs(boiling - 298.15) > 15.0:
        slope = math.log(row.vapour_pressure / SEA_LEVEL_PRESSURE) / (1.0 / boiling - 1.0 / 298.15)
    return SEA_LEVEL_PRESSURE * math.exp(slope * (1.0 / boiling - 1.0 / temperature))


# ---- mixtures ---------------------------------------------------------------------------------------------------


def _from_ingredients(row: PropellantRow, at: float, pressure: float | None) -> StoredState:
    """Return the mass-weighted sum over the ingredients; the heat of mixing is taken as that of the row."""
    taken = row.pressure if pressure is None else float(pressure)
    warnings = _limits(row, at, pressure)
    per_mass, volume_ratio = 0.0, 0.0
    for part, share in row.components:
        start, end = (_ingredient(row, part, point, where) for point, where in ((row.temperature, row.pressure), (at, taken)))
        per_mass += share * (end.enthalpy_change - start.enthalpy_change) / part.molar_mass
        if start.density and end.density and not math.isnan(volume_ratio):
            volume_ratio += share / end.density if row.density is None else share * start.density / end.density
        else:
            volume_ratio = math.nan
        warnings += [text for text in end.warnings if "specific heat" in text]
    if row.phase == "gas":
        density: float | None = taken * row.molar_mass / (GAS_CONSTANT * at)
        if taken > _IDEAL_UP_TO:
            warnings.append(
                f"{row.name} at {taken / 1e5:.3g} bar is summed from ideal gases: the real-gas change of its enthalpy is neglected."
            )
        if row.boiling_point is not None and at < row.boiling_point:
            warnings.append(f"{row.name} at {at:g} K is below its boiling point ({row.boiling_point:g} K): taken as a gas.")
    else:
        density = None if math.isnan(volume_ratio) or row.density is None else row.density / volume_ratio
    source = "sum over its ingredients, heat of mixing unchanged: " + ", ".join(part.name for part, _ in row.components)
    return StoredState(at, taken, per_mass * row.molar_mass, density, row.phase, tuple(dict.fromkeys(warnings)), source)


def _ingredient(row: PropellantRow, part: PropellantRow, at: float, pressure: float) -> StoredState:
    """Return the state of one ingredient inside a mixture: of the phase of the mixture, whatever it would be alone."""
    if row.phase == "gas":
        return stored_state(part, at)
    if part.phase == "liquid" and part.coolprop_fluid and part.freezing_point is not None and at < part.freezing_point + 0.1:
        warm, colder = (_ingredient(row, part, part.freezing_point + step, pressure) for step in (5.1, 0.1))
        slope = (warm.enthalpy_change - colder.enthalpy_change) / 5.0
        change = colder.enthalpy_change + slope * (at - part.freezing_point - 0.1)
        return StoredState(at, pressure, change, colder.density, part.phase, (), "in solution below its own freezing point")
    if part.coolprop_fluid and part.phase == "liquid":
        fluid = open_fluid(part)
        if at < fluid.T_critical():
            _update(fluid, part, "QT_INPUTS", 0.0, at, at, pressure)
            pressure = max(pressure, float(fluid.p()) * (1.0 + 2.0 * _NEAR_SATURATION))
    if part.coolprop_fluid is None and part.heat_capacity is None and not part.components:
        moved = abs(at - part.temperature) > 0.02
        text = f"No specific heat of {part.name} is known: its share of the enthalpy is left as it is."
        return StoredState(at, pressure, 0.0, part.density, part.phase, (text,) if moved else (), "unchanged")
    return stored_state(part, at, pressure)
