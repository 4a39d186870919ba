"""From what an analyst types for a propellant to its row, and back.

A reader maps (input name, value) to what is kept of the input; `row_of` makes the row of all of them.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import replace
from typing import Any

from propkit import units
from propkit.constants import REFERENCE_PRESSURE, REFERENCE_TEMPERATURE
from propkit.data import propellants as library_data
from propkit.data.formula import formula_text, molar_mass, parse_formula
from propkit.data.propellant_row import ROLES, PropellantRow
from propkit.errors import InputError, Problem, near_matches
from propkit.model.declare import as_text

_ENTHALPY = 'an enthalpy per mole of the formula or per mass, for example "-24.717 kJ/mol" or "-1768 kJ/kg"'
_LARGEST_ENTHALPY = 1e9
_RANGE = 'two temperatures, the lower first, for example ("260 K", "340 K")'


def enthalpy(name: str, value: Any) -> tuple[str, float]:
    """Return (unit, value in it): J/mol of the formula or J/kg; a bare number other than 0 could be either and is refused."""
    if not isinstance(value, bool) and isinstance(value, int | float) and value == 0:
        return "J/mol", 0.0
    if not isinstance(value, str) and not hasattr(value, "units"):
        hint = "A number alone could be per mole or per mass."
        raise InputError(Problem(name, as_text(value), _ENTHALPY, hint))
    try:
        unit, assigned = "J/kg", units.to_si(value, "J/kg", name)
    except InputError:
        try:
            unit, assigned = "J/mol", units.to_si(value, "J/mol", name)
        except InputError as error:
            problem = error.problems[0]
            raise InputError(Problem(name, problem.value, _ENTHALPY, problem.hint)) from error
    if abs(assigned) > _LARGEST_ENTHALPY:
        raise InputError(Problem(name, as_text(value), f"within 1e9 {unit} of zero", "Is the unit right?"))
    return unit, assigned


def temperature_range(name: str, value: Any) -> tuple[float, float]:
    """Return two temperatures [K], the lower first."""
    if not isinstance(value, list | tuple) or len(value) != 2:
        raise InputError(Problem(name, as_text(value), _RANGE))
    low, high = (units.to_si(entry, "K", name) for entry in value)
    if not 0.0 < low < high:
        raise InputError(Problem(name, as_text(value), _RANGE))
    return low, high


def formula(name: str, value: Any) -> str:
    """Return the text of a formula that can be read."""
    parse_formula(value, name)
    return " ".join(value.split())


def library_name(name: str, value: Any) -> str:
    """Return the name of a row of the library."""
    return library_data.find(value, input_name=name).name


def roles(name: str, value: Any) -> tuple[str, ...]:
    """Return one or more roles, the main one first: ``"fuel"`` or ``"oxidizer, monopropellant"``."""
    listed = [part.strip() for part in value.split(",")] if isinstance(value, str) else value
    allowed = f"one of {', '.join(map(repr, ROLES))}, or several with commas"
    if not isinstance(listed, list | tuple) or not listed or not all(isinstance(part, str) for part in listed):
        raise InputError(Problem(name, as_text(value), allowed))
    for part in listed:
        if part not in ROLES:
            near = near_matches(part, ROLES, 1)
            raise InputError(Problem(name, as_text(value), allowed, f"Did you mean {near[0]!r}?" if near else ""))
    return tuple(dict.fromkeys(listed))


def row_of(values: Mapping[str, Any]) -> PropellantRow:
    """Return the row that the inputs of a propellant of one's own make."""
    elements = parse_formula(values["formula"])
    mass = molar_mass(elements)
    unit, assigned = values["enthalpy"]
    label = values["name"] or values["formula"]
    return PropellantRow(
        name=label,
        title=label,
        roles=values["role"] or (),
        phase=values["phase"] or "liquid",
        formula=values["formula"],
        element_counts=tuple(elements.items()),
        molar_mass=mass,
        molar_enthalpy=assigned if unit == "J/mol" else assigned * mass,
        temperature=values["temperature"] or REFERENCE_TEMPERATURE,
        pressure=values["pressure"] or REFERENCE_PRESSURE,
        saturated=values["saturated"],
        hazard=values["hazard"] or "",
        source=values["source"] or "as given",
        trust="",
        coolprop_fluid=values["coolprop_fluid"],
        species=values["species"],
        density=values["density"],
        density_source="" if values["density"] is None else "as given",
        heat_capacity=values["heat_capacity"],
        heat_capacity_range=values["heat_capacity_range"],
        heat_capacity_source="" if values["heat_capacity"] is None else "as given",
        freezing_point=values["freezing_point"],
        boiling_point=values["boiling_point"],
        vapour_pressure=values["vapour_pressure"],
    )


def changed_row(row: PropellantRow, values: Mapping[str, Any], given: Collection[str]) -> PropellantRow:
    """Return a library row with what the analyst gave in place of its own."""
    plain = ("hazard", "source", "heat_capacity_range", "freezing_point", "boiling_point", "vapour_pressure")
    changes: dict[str, Any] = {name: values[name] for name in plain if name in given}
    for name in ("density", "heat_capacity"):
        if name in given:
            changes |= {name: values[name], f"{name}_source": "as given"}
    if "density" in given:
        changes["density_temperature"] = None
    if "role" in given:
        changes["roles"] = values["role"]
    if "enthalpy" in given:
        unit, assigned = values["enthalpy"]
        changes |= {
            "molar_enthalpy": assigned if unit == "J/mol" else assigned * row.molar_mass,
            "source": values["source"] or "as given",
            "trust": "",
            "other_values": (),
            "impulse_note": "",
        }
    if values["name"]:
        changes["name"] = values["name"]
    return replace(row, **changes) if changes else row


def inputs_of(row: PropellantRow) -> dict[str, Any]:
    """Return the inputs that make a propellant with the values of a row of its own."""
    given: dict[str, Any] = {
        "formula": formula_text(row.elements, digits=17),
        "enthalpy": f"{row.molar_enthalpy!r} J/mol",
        "temperature": row.temperature,
        "pressure": row.pressure,
        "phase": row.phase,
        "role": ", ".join(row.roles),
        "hazard": row.hazard[:200],
        "source": row.source[:200],
        "name": row.name,
    }
    optional = ("density", "heat_capacity", "heat_capacity_range", "coolprop_fluid", "species")
    for name in (*optional, "freezing_point", "boiling_point", "vapour_pressure"):
        if (value := getattr(row, name)) is not None:
            given[name] = value
    if row.saturated:
        given["saturated"] = True
    return given
