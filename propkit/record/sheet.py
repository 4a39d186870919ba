"""What a record says, as a neutral report made of the recorded numbers: nothing is recomputed for showing it."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

from propkit import quantities, units
from propkit.errors import PropkitError
from propkit.model.base import render
from propkit.model.sheet import in_display
from propkit.report import Column, Report, Row, Section, Table

if TYPE_CHECKING:
    from propkit.record.record import Record

_TITLES = {
    "case": "Propellant case",
    "chamber": "Chamber",
    "nozzle": "Nozzle",
    "performance": "Performance",
    "reconciliation": "Reconciliation",
    "firing": "Hot firing",
    "uncertainty": "Uncertainty",
    "study": "Study",
}
_DEEPEST_SHOWN = 3
_LONGEST_VALUE = 80
_SAMPLED = re.compile(r"design (?P<design>[0-9]{1,9}) (?P<result>.+)")
_INDENT = "\u2003"
HEADLINES = {
    "case": ("mixture_ratio", "bulk_density"),
    "chamber": ("temperature", "characteristic_velocity", "molar_mass"),
    "nozzle": ("mass_flow", "throat_diameter", "exit_diameter"),
    "performance": ("thrust", "specific_impulse", "mass_flow"),
    "reconciliation": ("p_value", "chi_square", "degrees_of_freedom"),
    "firing": ("characteristic_velocity", "thrust_coefficient", "specific_impulse"),
    "uncertainty": (),
    "study": (),
}


def report_of(record: Record) -> Report:
    """Return the report of a record."""
    content, provenance = record.content, record.provenance
    return Report(
        kind="Calculation record",
        title=record.title,
        subtitle=content["description"] if content["title"] else "",
        units="SI",
        headline=headline_of(record),
        sections=(*_text_sections(content), *_object_sections(content), *_rest(record, content), _seal(record, provenance)),
        doubts=tuple(entry["text"] for entry in content["warnings"]),
        cautions=tuple(content["cautions"]),
        render=render,
    )


def headline_of(record: Record) -> tuple[Row, ...]:
    """Return the answer of a record: the rows that head its report."""
    content = record.content
    last = content["objects"][content["object"]]
    return tuple(
        _row(content["object"], name, entry, "computed")
        for name in HEADLINES[content["object"]]
        if (entry := last["results"].get(name) or last["inputs"].get(name))
    )


def _text_sections(content: Mapping[str, Any]) -> Iterator[Section]:
    for name in ("author", "purpose", "notes"):
        if content[name]:
            yield Section(name, name.capitalize(), lines=tuple(content[name].splitlines()))


def _object_sections(content: Mapping[str, Any]) -> Iterator[Section]:
    for kind in _TITLES:
        stored = content["objects"].get(kind)
        if stored is None:
            continue
        listed = [(name, entry, entry["kind"]) for name, entry in _declared(kind, stored["inputs"])]
        listed += [(name, entry, "computed") for name, entry in _declared(kind, stored["results"]) if not _SAMPLED.fullmatch(name)]
        long = {name for name, entry, _ in listed if isinstance(entry["value"], str) and len(entry["value"]) > _LONGEST_VALUE}
        rows = tuple(_row(kind, name, entry, how) for name, entry, how in listed if name not in long)
        lines = tuple(f"{name.replace('_', ' ')}: {entry['value']}" for name, entry, _ in listed if name in long)
        yield Section(kind, stored["name"] or _TITLES[kind], rows=rows, lines=lines)
        sample = _sample_table(stored["results"])
        if sample is not None:
            yield Section(f"{kind}-sample", sample.title, table=sample)


def _sample_table(results: Mapping[str, Any]) -> Table | None:
    """Return the designs of a study that its record holds as a table, a column for each; None where there are none."""
    found: dict[str, dict[str, Any]] = {}
    for name, entry in results.items():
        match = _SAMPLED.fullmatch(name)
        if match is not None:
            unit = f" [{units.shown_unit(entry['unit'])}]" if entry["unit"] else ""
            found.setdefault(match["result"].replace("_", " ") + unit, {})[match["design"]] = entry["value"]
    designs = sorted({design for values in found.values() for design in values}, key=int)
    columns = tuple(
        Column(f"design {design}", f"design {design}", "", "", 6, tuple(values.get(design) for values in found.values()))
        for design in designs
    )
    return Table("sample", "Designs that are recomputed", "result", tuple(found), columns) if found else None


def _declared(kind: str, entries: Mapping[str, Any]) -> list[tuple[str, Any]]:
    """Return entries in the order of the catalogue; the canonical form has lost their own."""
    order = {name.rpartition(".")[2]: place for place, name in enumerate(quantities.CATALOGUE)}
    return sorted(entries.items(), key=lambda item: (order.get(item[0], len(order)), item[0]))


def _row(kind: str, name: str, entry: Mapping[str, Any], how: Any) -> Row:
    value, unit, digits, symbol, label = entry["value"], entry["unit"], 6, "", name.replace("_", " ")
    try:
        quantity = quantities.quantity(name, kind)
    except KeyError:
        quantity = None
    if quantity is not None:
        digits, symbol, label = quantity.digits, quantity.symbol, quantity.label
        if quantity.unit == unit and isinstance(value, int | float):
            value, unit = in_display(quantity, value, "SI")
    elif isinstance(value, float) and value.is_integer() and abs(value) < 1e6 and not unit:
        digits = len(str(abs(int(value))))
    if isinstance(value, bool):
        value = "yes" if value else "no"
    typed = str(entry.get("typed", ""))
    return Row(name, label, symbol, value, unit, digits, how, typed=typed if typed != value else "")


def _origin_lines(record: Record) -> tuple[str, ...]:
    """Return where the first result comes from, two levels deep; nothing where the record cannot be recomputed."""
    content = record.content
    stored = content["objects"][content["object"]]["results"]
    names = [name for name in reversed(HEADLINES[content["object"]][:2]) if name in stored]
    try:
        origin = record.trace(names[0]) if names else None
    except PropkitError:
        return ()
    listed = [] if origin is None else [(depth, entry) for depth, entry in origin.lines() if depth < _DEEPEST_SHOWN]
    return tuple(f"{_INDENT * depth}{entry.text}: {entry.how}" for depth, entry in listed)


def _rest(record: Record, content: Mapping[str, Any]) -> Iterator[Section]:
    lines = _origin_lines(record)
    if lines:
        yield Section("trace", "Where the result comes from", lines=lines)
    rows = content["stations"]["rows"]
    if rows:
        yield Section("stations", "Stations", table=_station_table(rows, content["stations"]["units"]))
    if content["composition"]:
        yield Section("composition", "Composition", table=_composition_table(content["composition"]))
    yield Section(
        "assumptions", "Assumptions", lines=tuple(f"{entry['statement']} ({entry['origin']})" for entry in content["assumptions"])
    )


def _station_table(rows: list[dict[str, Any]], stored_units: Mapping[str, str]) -> Table:
    columns = []
    for name in dict.fromkeys(name for row in rows for name in row if name != "station"):
        values = [row.get(name) for row in rows]
        unit, digits, symbol, label = stored_units.get(name, ""), 6, "", name.replace("_", " ")
        if name in quantities.CATALOGUE:
            quantity = quantities.quantity(name, "state")
            digits, symbol, label = quantity.digits, quantity.symbol, quantity.label
            if quantity.unit == unit:
                unit = quantity.shown_in("SI", [value for value in values if value is not None])
                values = [None if value is None else units.convert(float(value), quantity.unit, unit) for value in values]
        columns.append(Column(name, label, symbol, unit, digits, tuple(values)))
    order = {name: place for place, name in enumerate(quantities.CATALOGUE)}
    columns.sort(key=lambda column: order.get(column.name, len(order)))
    return Table("stations", "Stations", "station", tuple(row["station"] for row in rows), tuple(columns))


def _composition_table(composition: Mapping[str, Mapping[str, float]], smallest: float = 1e-4) -> Table:
    stations = [name for name in ("injector face", "nozzle inlet", "throat", "exit") if name in composition]
    stations += [name for name in composition if name not in stations]
    largest = {species: 0.0 for station in stations for species in composition[station]}
    for station in stations:
        for species, value in composition[station].items():
            largest[species] = max(largest[species], value)
    names = tuple(sorted((name for name, value in largest.items() if value >= smallest), key=lambda name: (-largest[name], name)))
    columns = tuple(Column(station, station, "x", "", 5, tuple(composition[station].get(name) for name in names)) for station in stations)
    return Table("composition", "Composition", "species", names, columns, f"Mole fractions of {smallest:g} and above at some station.")


def _seal(record: Record, provenance: Mapping[str, Any]) -> Section:
    versions = ", ".join(f"{name} {version}" for name, version in sorted(provenance["versions"].items()))
    lines = (f"made {provenance['time']} with {versions}", f"digest {record.digest}", f"content digest {record.content_digest}")
    return Section("provenance", "Provenance", lines=lines)
