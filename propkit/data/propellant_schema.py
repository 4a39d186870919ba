"""The fields of a library row: what each may hold. A bad field names file, row and field."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from propkit.data.propellant_row import PHASES, ROLES, TRUST
from propkit.errors import Problem, near_matches


@dataclass(frozen=True, slots=True)
class Field:
    """One field of a row: what it may hold and what it means."""

    check: Callable[[Any], str | None]
    meaning: str
    required: bool = False


def _text(value: Any) -> str | None:
    return None if isinstance(value, str) and value.strip() and len(value) <= 600 else "a text of 1 to 600 characters"


def _flag(value: Any) -> str | None:
    return None if isinstance(value, bool) else "true or false"


def _is_number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and -1e300 < value < 1e300


def _number(low: float, high: float, unit: str) -> Callable[[Any], str | None]:
    def check(value: Any) -> str | None:
        inside = _is_number(value) and low <= value <= high
        return None if inside else f"a number from {low:g} to {high:g} {unit}"

    return check


def _one_of(words: tuple[str, ...]) -> Callable[[Any], str | None]:
    def check(value: Any) -> str | None:
        return None if isinstance(value, str) and value in words else f"one of {', '.join(words)}"

    return check


def _roles(value: Any) -> str | None:
    good = isinstance(value, list) and value and all(isinstance(item, str) and item in ROLES for item in value)
    return None if good and len(set(value)) == len(value) else f"a list of one or more of {', '.join(ROLES)}"


def _texts(value: Any) -> str | None:
    good = isinstance(value, list) and all(_text(item) is None for item in value)
    return None if good else "a list of texts"


def _range(value: Any) -> str | None:
    good = isinstance(value, list) and len(value) == 2 and all(_is_number(item) for item in value)
    return None if good and 0.0 < value[0] < value[1] < 6000.0 else "two temperatures, the lower first [K]"


def _shares(value: Any) -> str | None:
    wanted = "a table of row names and shares above 0 that add up to 1 (1e-6)"
    if not isinstance(value, dict) or not value or not all(_is_number(share) and share > 0 for share in value.values()):
        return wanted
    return None if abs(math.fsum(value.values()) - 1.0) <= 1e-6 else f"{wanted}; these add up to {math.fsum(value.values()):.8g}"


def _others(value: Any) -> str | None:
    good = isinstance(value, list) and all(
        isinstance(item, dict)
        and set(item) == {"source", "enthalpy_kJ_mol"}
        and _text(item["source"]) is None
        and _is_number(item["enthalpy_kJ_mol"])
        for item in value
    )
    return None if good else "a list of tables with `source` (text) and `enthalpy_kJ_mol` (number)"


FIELDS: Mapping[str, Field] = {
    "title": Field(_text, "the propellant in plain words", required=True),
    "roles": Field(_roles, "what it can be used as, the main role first", required=True),
    "phase": Field(_one_of(PHASES), "state of aggregation at the state of the row", required=True),
    "aliases": Field(_texts, "other names, for hints only"),
    "formula": Field(_text, "element symbols with counts; the enthalpy is for one mole of it"),
    "mixture": Field(_shares, "row name -> share, instead of formula and enthalpy"),
    "mixture_by": Field(_one_of(("mass", "mole")), "whether the shares are of mass or of moles; mass unless given"),
    "mixing_enthalpy_kJ_kg": Field(_number(-5000, 5000, "kJ/kg"), "heat of mixing of a mixture, negative when released"),
    "enthalpy_kJ_mol": Field(_number(-1e5, 1e5, "kJ/mol"), "assigned enthalpy at the state of the row, per mole of formula"),
    "enthalpy_kJ_kg": Field(_number(-1e5, 1e5, "kJ/kg"), "the same per kilogram, instead of enthalpy_kJ_mol"),
    "temperature_K": Field(_number(1, 2000, "K"), "temperature of the row", required=True),
    "pressure_kPa": Field(_number(0.001, 1e6, "kPa"), "pressure of the row; 100 kPa unless given"),
    "saturated": Field(_flag, "true for a liquid at its vapour pressure"),
    "coolprop_fluid": Field(_text, "name of the fluid in CoolProp, where it has it"),
    "species": Field(_text, "formula key of the gas in the species data, for a gas that does not react: N2"),
    "density_kg_m3": Field(_number(1e-3, 25000, "kg/m3"), "density at the state of the row"),
    "density_temperature_K": Field(_number(1, 2000, "K"), "temperature of the density where it is another one"),
    "density_slope_kg_m3_K": Field(_number(-50, 0, "kg/m3/K"), "change of density with temperature"),
    "density_source": Field(_text, "where the density comes from"),
    "heat_capacity_J_kg_K": Field(_number(50, 20000, "J/(kg K)"), "specific heat for stored states where CoolProp has no fluid"),
    "heat_capacity_range_K": Field(_range, "where that specific heat holds"),
    "heat_capacity_source": Field(_text, "where the specific heat comes from"),
    "freezing_K": Field(_number(0.1, 5000, "K"), "freezing point"),
    "boiling_K": Field(_number(0.1, 6000, "K"), "boiling point at 101.325 kPa"),
    "vapour_pressure_kPa": Field(_number(1e-9, 1e5, "kPa"), "vapour pressure at 298.15 K, where it matters"),
    "hazard": Field(_text, "one line on what can hurt", required=True),
    "source": Field(_text, "where the enthalpy comes from", required=True),
    "trust": Field(_one_of(TRUST), "how far to trust the enthalpy", required=True),
    "other_values": Field(_others, "enthalpies that other sources give for the same state"),
    "note": Field(_text, "what a reader should know"),
    "impulse_note": Field(_text, "what the difference between the sources is worth in specific impulse"),
}
"""Every field of a row, in the order of the documentation."""

REQUIRED = tuple(name for name, field in FIELDS.items() if field.required)


def row_problems(file: str, name: str, row: Any) -> list[Problem]:
    """Return what is wrong with one row of a library file, field by field; an empty list when nothing is."""
    where = f"{file}: [{name}]"
    if not isinstance(row, dict):
        return [Problem(where, repr(row)[:60], "a table of fields", f"Write [{name}] and its fields below it.")]
    problems = []
    for field, value in row.items():
        if field not in FIELDS:
            near = near_matches(field, FIELDS)
            hint = f"Did you mean {near[0]}?" if near else "propkit/data/README.md lists the fields."
            problems.append(Problem(f"{where} {field}", "not a field of a propellant", "a known field", hint))
            continue
        wanted = FIELDS[field].check(value)
        if wanted is not None:
            shown = repr(value) if len(repr(value)) <= 60 else f"{repr(value)[:57]}..."
            problems.append(Problem(f"{where} {field}", shown, wanted, f"It is {FIELDS[field].meaning}."))
    problems += [
        Problem(f"{where} {field}", "missing", "given", f"It is {FIELDS[field].meaning}.") for field in REQUIRED if field not in row
    ]
    return problems + _combinations(where, row)


def _combinations(where: str, row: Mapping[str, Any]) -> list[Problem]:
    problems = []
    enthalpies = [field for field in ("enthalpy_kJ_mol", "enthalpy_kJ_kg") if field in row]
    if "mixture" in row:
        for field in ("formula", *enthalpies):
            if field in row:
                problems.append(Problem(f"{where} {field}", "given beside `mixture`", "left out", "A mixture takes both from its rows."))
    else:
        if "formula" not in row:
            problems.append(Problem(f"{where} formula", "missing", "given, or `mixture` instead", ""))
        if len(enthalpies) != 1:
            given = "missing" if not enthalpies else "given twice"
            problems.append(Problem(f"{where} enthalpy_kJ_mol", given, "given once, as enthalpy_kJ_mol or enthalpy_kJ_kg", ""))
        for field in ("mixture_by", "mixing_enthalpy_kJ_kg"):
            if field in row:
                problems.append(Problem(f"{where} {field}", "given without `mixture`", "left out", ""))
    if row.get("saturated") and row.get("phase") not in ("liquid", None):
        problems.append(Problem(f"{where} saturated", "true", "left out unless the phase is liquid", ""))
    if ("heat_capacity_J_kg_K" in row) != ("heat_capacity_range_K" in row):
        problems.append(
            Problem(f"{where} heat_capacity_range_K", "given alone" if "heat_capacity_range_K" in row else "missing",
                    "given together with heat_capacity_J_kg_K", "A specific heat without its range cannot be judged.")
        )  # fmt: skip
    return problems
