"""The propellant library: loading, checking and finding its rows.

The library that comes with propkit and a user's own TOML file are read by the same code. Everything here is data out of
data; the objects that a user meets are in `propkit.model.propellant`.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Mapping, Sequence
from functools import lru_cache
from importlib import resources
from pathlib import Path
from types import MappingProxyType
from typing import Any

from propkit.data.formula import formula_text, molar_mass, parse_formula
from propkit.data.propellant_row import OtherValue, PropellantRow
from propkit.data.propellant_schema import row_problems
from propkit.errors import InputError, Problem, StorageError, near_matches

LIBRARY_FILE = "propellants.toml"
_LARGEST_FILE = 4_000_000

_SERVES: Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "oxidizer": (("oxidizer",), ("diluent",)),
    "fuel": (("fuel",), ("diluent", "ingredient", "monopropellant")),
    "monopropellant": (("monopropellant",), ("ingredient",)),
    "cold gas": (("cold gas",), ()),
}
"""Use -> roles that serve, and roles that serve as well unless the propellant is of the opposite kind."""

_OPPOSITE = {"oxidizer": "fuel", "fuel": "oxidizer"}


@lru_cache(maxsize=1)
def library() -> Mapping[str, PropellantRow]:
    """Return the library that comes with propkit: name -> row, read once."""
    text = resources.files("propkit.data").joinpath(LIBRARY_FILE).read_text(encoding="utf-8")
    return MappingProxyType(_rows_from_text(text, LIBRARY_FILE, ""))


def load_library(path: str | Path) -> Mapping[str, PropellantRow]:
    """Return the rows of a library file of one's own.

    Parameters
    ----------
    path : str or Path
        A TOML file of at most 4 MB: one table a propellant, with the fields of propkit/data/README.md. A `mixture` may
        name rows of the same file or of the library that comes with propkit.

    Returns
    -------
    Mapping
        Name -> row, in the order of the file.

    Raises
    ------
    StorageError
        When the file cannot be read.
    InputError
        When it is not TOML, or a row is wrong: file, row and field of everything wrong are listed.
    """
    file = Path(path)
    try:
        if file.stat().st_size > _LARGEST_FILE:
            raise StorageError(f"{file} has more than {_LARGEST_FILE // 1_000_000} MB; that is not a propellant library.")
        text = file.read_text(encoding="utf-8")
    except UnicodeDecodeError as error:
        raise InputError(Problem(str(file), "not text in UTF-8", "a TOML file", "")) from error
    except OSError as error:
        if isinstance(error, StorageError):
            raise
        raise StorageError(f"{file} cannot be read: {error.strerror or error}.", path=str(file)) from error
    return MappingProxyType(_rows_from_text(text, file.name, str(file)))


def find(name: str, rows: Mapping[str, PropellantRow] | None = None, input_name: str = "propellant") -> PropellantRow:
    """Return the row called `name`.

    Parameters
    ----------
    name : str
        Library name, spelled as the library spells it.
    rows : Mapping, optional
        The library to look in; the one that comes with propkit unless given.
    input_name : str
        Name of the input for the error text.

    Returns
    -------
    PropellantRow
        The row.

    Raises
    ------
    InputError
        When there is no such row; the error names near matches, and `data["near"]` carries them.
    """
    known = library() if rows is None else rows
    if isinstance(name, str) and name in known:
        return known[name]
    if not isinstance(name, str):
        raise InputError(Problem(input_name, repr(name)[:60], "a library name or a pk.Propellant", 'For example "LOX".'), near=[])
    near = suggestions(name, known)
    raise InputError(Problem(input_name, repr(name[:60]), "a name of the library or a pk.Propellant", _near_text(near)), near=near)


def suggestions(name: str, rows: Mapping[str, PropellantRow] | None = None, count: int = 4) -> list[str]:
    """Return the library names that a wrong `name` may have meant, the likeliest first.

    Case and the marks between words do not count; a row's other names and its title are looked at as well.
    """
    known = library() if rows is None else rows
    wanted = _folded(name)
    if not wanted:
        return []
    spelled: dict[str, list[str]] = {}
    for key, row in known.items():
        for text in (key, *row.aliases, row.title, *([row.formula] if not row.components else [])):
            spelled.setdefault(_folded(text), []).append(key)
    found = list(spelled.get(wanted, []))
    for text in near_matches(wanted, spelled, count=6):
        found += spelled[text]
    return list(dict.fromkeys(found))[:count]


def role_problem(name: str, roles: Sequence[str], wanted: str) -> Problem | None:
    """Return what is wrong with using a propellant of these `roles` as the `wanted` one; None when nothing is.

    Parameters
    ----------
    name : str
        Name of the propellant.
    roles : Sequence of str
        What it can be used as; an empty one is never wrong (a propellant whose role nobody stated).
    wanted : str
        "oxidizer" | "fuel" | "monopropellant" | "cold gas".

    Returns
    -------
    Problem or None
        Names the input, the propellant with its roles, and what to try.
    """
    serve, serve_as_well = _SERVES[wanted]
    opposite = _OPPOSITE.get(wanted)
    if not roles or any(role in serve for role in roles):
        return None
    if opposite not in roles and any(role in serve_as_well for role in roles):
        return None
    if wanted == "oxidizer" and "fuel" in roles:
        hint = "The oxidizer comes first: PropellantCase(oxidizer, fuel). Are the two swapped?"
    elif wanted == "fuel" and "oxidizer" in roles:
        hint = "The fuel comes second: PropellantCase(oxidizer, fuel). Are the two swapped?"
    elif wanted == "cold gas":
        usual = ", ".join(key for key, row in library().items() if "cold gas" in row.roles)
        hint = f"Gases of the library for that: {usual}."
    else:
        hint = f"{name} serves as {_or(roles)}; a propellant of your own may state another role."
    article = "an" if wanted[0] in "aeiou" else "a"
    return Problem(wanted.replace(" ", "_"), f"{name!r} ({_or(roles)})", f"{article} {wanted}", hint)


def _or(words: Sequence[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} or {words[-1]}"


def _near_text(near: Sequence[str]) -> str:
    if not near:
        return "pk.propellants() lists them."
    return f"Did you mean {_or([repr(item) for item in near])}? pk.propellants() lists all."


def _folded(text: str) -> str:
    return "".join(letter for letter in text.casefold() if letter.isalnum())


def _rows_from_text(text: str, file: str, origin: str) -> dict[str, PropellantRow]:
    try:
        tables = tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        raise InputError(Problem(file, "not TOML", "a TOML file with one table a propellant", f"{error}.")) from error
    return _rows_from_tables(tables, file, origin)


def _rows_from_tables(tables: Mapping[str, Any], file: str, origin: str) -> dict[str, PropellantRow]:
    problems = [problem for name, row in tables.items() for problem in row_problems(file, name, row)]
    if not tables:
        problems.append(Problem(file, "empty", "one table a propellant", ""))
    if problems:
        raise InputError(problems)
    rows: dict[str, PropellantRow] = {}
    for name, fields in tables.items():
        if "mixture" not in fields:
            try:
                elements = parse_formula(fields["formula"], f"{file}: [{name}] formula")
            except InputError as error:
                problems += error.problems
                continue
            rows[name] = _row(name, fields, _of_formula(fields, elements), origin)
    for name, fields in tables.items():
        if "mixture" in fields:
            wrong = _mixture_problems(file, name, fields, rows, tables, origin)
            problems += wrong
            if not wrong:
                rows[name] = _row(name, fields, _of_mixture(fields, rows, origin), origin)
    if problems:
        raise InputError(problems)
    return {name: rows[name] for name in tables}


def _of_formula(fields: Mapping[str, Any], elements: dict[str, float]) -> dict[str, Any]:
    mass = molar_mass(elements)
    per_mole = fields["enthalpy_kJ_mol"] * 1e3 if "enthalpy_kJ_mol" in fields else fields["enthalpy_kJ_kg"] * 1e3 * mass
    return {
        "formula": formula_text(elements),
        "element_counts": tuple(elements.items()),
        "molar_mass": mass,
        "molar_enthalpy": float(per_mole),
        "components": (),
        "mixing_enthalpy": 0.0,
        "density": fields.get("density_kg_m3"),
    }


def _component(name: str, rows: Mapping[str, PropellantRow], origin: str) -> PropellantRow | None:
    return rows.get(name) or (library().get(name) if origin else None)


def _mixture_problems(
    file: str,
    name: str,
    fields: Mapping[str, Any],
    rows: Mapping[str, PropellantRow],
    tables: Mapping[str, Any],
    origin: str,
) -> list[Problem]:
    problems = []
    for part in fields["mixture"]:
        row = _component(part, rows, origin)
        if row is not None and not row.components:
            continue
        inside = "the name of a row with a formula of its own"
        if part in tables or row is not None:
            hint = "A mixture of mixtures is not read: write it out in its ingredients."
        else:
            hint = _near_text(suggestions(part, {**(library() if origin else {}), **rows}))
        problems.append(Problem(f"{file}: [{name}] mixture", repr(part), inside, hint))
    return problems


def _of_mixture(fields: Mapping[str, Any], rows: Mapping[str, PropellantRow], origin: str) -> dict[str, Any]:
    parts = {part: _component(part, rows, origin) for part in fields["mixture"]}
    by_mole = fields.get("mixture_by", "mass") == "mole"
    weights = {
        part: share * (row.molar_mass if by_mole else 1.0)
        for (part, share) in fields["mixture"].items()
        if (row := parts[part]) is not None
    }
    total = math.fsum(weights.values())
    shares = {part: weight / total for part, weight in weights.items()}
    known = {part: row for part, row in parts.items() if row is not None}
    moles = math.fsum(share / known[part].molar_mass for part, share in shares.items())
    elements: dict[str, float] = {}
    for part, share in shares.items():
        for symbol, count in known[part].element_counts:
            elements[symbol] = elements.get(symbol, 0.0) + share / known[part].molar_mass * count / moles
    mixing = fields.get("mixing_enthalpy_kJ_kg", 0.0) * 1e3
    specific = math.fsum([mixing, *(share * known[part].specific_enthalpy for part, share in shares.items())])
    mass = molar_mass(elements)
    return {
        "formula": formula_text(elements),
        "element_counts": tuple(elements.items()),
        "molar_mass": mass,
        "molar_enthalpy": specific * mass,
        "components": tuple((known[part], share) for part, share in shares.items()),
        "mixing_enthalpy": mixing,
        "density": fields.get("density_kg_m3") or _ideal_density(shares, known),
    }


def _ideal_density(shares: Mapping[str, float], rows: Mapping[str, PropellantRow]) -> float | None:
    volumes = [share / density for part, share in shares.items() if (density := rows[part].density)]
    return 1.0 / math.fsum(volumes) if len(volumes) == len(shares) else None


def _row(name: str, fields: Mapping[str, Any], basic: dict[str, Any], origin: str) -> PropellantRow:
    bounds = fields.get("heat_capacity_range_K")
    return PropellantRow(
        name=name,
        title=fields["title"],
        roles=tuple(fields["roles"]),
        phase=fields["phase"],
        temperature=float(fields["temperature_K"]),
        pressure=float(fields.get("pressure_kPa", 100.0)) * 1e3,
        hazard=fields["hazard"],
        source=fields["source"],
        trust=fields["trust"],
        saturated=fields.get("saturated", False),
        aliases=tuple(fields.get("aliases", ())),
        coolprop_fluid=fields.get("coolprop_fluid"),
        species=fields.get("species"),
        density_temperature=fields.get("density_temperature_K"),
        density_slope=fields.get("density_slope_kg_m3_K"),
        density_source=fields.get("density_source", "ideal volumes of its ingredients" if basic["components"] else ""),
        heat_capacity=fields.get("heat_capacity_J_kg_K"),
        heat_capacity_range=None if bounds is None else (float(bounds[0]), float(bounds[1])),
        heat_capacity_source=fields.get("heat_capacity_source", ""),
        freezing_point=fields.get("freezing_K"),
        boiling_point=fields.get("boiling_K"),
        vapour_pressure=None if "vapour_pressure_kPa" not in fields else fields["vapour_pressure_kPa"] * 1e3,
        other_values=tuple(OtherValue(item["source"], item["enthalpy_kJ_mol"] * 1e3) for item in fields.get("other_values", ())),
        note=fields.get("note", ""),
        impulse_note=fields.get("impulse_note", ""),
        library=origin,
        **basic,
    )
