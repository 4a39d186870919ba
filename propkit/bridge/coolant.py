"""What a propellant takes up as a coolant: temperature rise at the pressure of the jacket, and where it boils."""

from __future__ import annotations

from dataclasses import dataclass

from propkit.bridge.stored_state import open_fluid, stored_state
from propkit.data.propellant_row import PropellantRow
from propkit.errors import InputError, MissingExtraError, NotAvailableError, RangeError

_HOTTEST = 3000.0
"""Temperature [K] up to which a mixture is looked for after the jacket."""


@dataclass(frozen=True, slots=True)
class Warmed:
    """A coolant after a jacket: temperature [K], mean heat capacity [J/(kg K)], boiling temperature [K] (None above the critical pressure), source."""

    temperature: float
    specific_heat: float
    boiling_temperature: float | None
    source: str


def warmed(row: PropellantRow, temperature: float, pressure: float, heat: float) -> Warmed:
    """Return a coolant that has taken up heat at constant pressure.

    Parameters
    ----------
    row : PropellantRow
        The propellant.
    temperature, pressure : float
        State on entering the jacket [K], [Pa].
    heat : float
        Heat taken up by mass [J/kg].

    Returns
    -------
    Warmed
        By CoolProp's equation of state where the row names a fluid and it can be used, else by the heat capacity of the row, or
        by what is known of its ingredients.

    Raises
    ------
    NotAvailableError
        Where neither is known.
    """
    if row.coolprop_fluid is not None:
        try:
            return _by_equation_of_state(row, temperature, pressure, heat)
        except (MissingExtraError, ValueError) as error:
            if row.heat_capacity is None:
                raise NotAvailableError(f"the state of {row.name} after the jacket is not known: {error}") from error
    if row.heat_capacity is None and row.components:
        return _by_ingredients(row, temperature, pressure, heat)
    if row.heat_capacity is None:
        raise NotAvailableError(f"no heat capacity of {row.name} is known; give the pk.Propellant a heat_capacity")
    return Warmed(temperature + heat / row.heat_capacity, row.heat_capacity, None, "specific heat of the library row, held")


def _by_equation_of_state(row: PropellantRow, temperature: float, pressure: float, heat: float) -> Warmed:
    import CoolProp

    fluid = open_fluid(row)
    fluid.update(CoolProp.PT_INPUTS, pressure, temperature)
    enthalpy = fluid.hmass()
    boiling = None
    if pressure < fluid.p_critical():
        fluid.update(CoolProp.PQ_INPUTS, pressure, 0.0)
        boiling = float(fluid.T())
    fluid.update(CoolProp.HmassP_INPUTS, enthalpy + heat, pressure)
    after = float(fluid.T())
    rise = after - temperature
    return Warmed(after, heat / rise if rise > 0.0 else float(fluid.cpmass()), boiling, "CoolProp's equation of state")


def _by_ingredients(row: PropellantRow, temperature: float, pressure: float, heat: float) -> Warmed:
    """Return a mixture after a jacket: the temperature at which its ingredients as stored hold the heat more."""
    from scipy.optimize import brentq

    def enthalpy(at: float) -> float:
        return stored_state(row, at, pressure).enthalpy_change / row.molar_mass

    start = enthalpy(temperature)
    step, high = max(20.0, heat / 6000.0), temperature
    try:
        while enthalpy(high) - start < heat:
            high = min(high + step, _HOTTEST)
            if high == _HOTTEST:
                raise NotAvailableError(f"the state of {row.name} after the jacket is not known: it takes up less than the load")
        after = float(brentq(lambda at: enthalpy(at) - start - heat, high - step, high, xtol=1e-9)) if heat > 0.0 else temperature
    except (InputError, MissingExtraError, RangeError, ValueError) as error:
        raise NotAvailableError(f"the state of {row.name} after the jacket is not known: {error}") from error
    rise = after - temperature
    return Warmed(after, heat / rise if rise > 0.0 else 0.0, _first_boiling(row, pressure), "sum over its ingredients as liquids")


def _first_boiling(row: PropellantRow, pressure: float) -> float | None:
    """Return the temperature at which the first ingredient of a mixture would boil alone [K]; None where none is known to."""
    import CoolProp

    found = []
    for part, _ in row.components:
        if part.coolprop_fluid is not None:
            fluid = open_fluid(part)
            if pressure < fluid.p_critical():
                fluid.update(CoolProp.PQ_INPUTS, pressure, 0.0)
                found.append(float(fluid.T()))
    return min(found, default=None)
