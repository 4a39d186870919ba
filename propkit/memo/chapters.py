"""The chapters of the memo of one record, as markup: from the summary to the provenance."""

from __future__ import annotations

import re
from collections.abc import Iterator
from html import escape
from typing import Any

from propkit import quantities
from propkit.errors import PropkitError, RecordError
from propkit.memo import markup
from propkit.memo.identities import identities
from propkit.model.base import Calculation
from propkit.record.build import CAUTIONS
from propkit.record.outcome import Verification
from propkit.record.record import Record
from propkit.record.trace import Origin, trace
from propkit.report import Report, Row, Section, Step
from propkit.sources import SOURCES, reference
from propkit.view import numbers

_MOST_ORIGINS = 1
_ORDER = ("chamber", "throat", "exit")
_WORKED = ("case", "chamber", "nozzle", "performance")
_SAMPLES = re.compile(r"([\[(])((?:[-+0-9.eNonaif]+,\s*){30,}[-+0-9.eNonaif]+)")
_ABOUT = {"given": "as given", "default": "default", "method": "of the method", "computed": "computed"}


class Material:
    """What the chapters of a record are made of: the record, its object, its verification, the sheets of the chain.

    Raises
    ------
    RecordError
        When the record does not verify: a memo never shows numbers that do not follow from the inputs.
    """

    def __init__(self, record: Record) -> None:
        self.record = record
        self.verification: Verification = record.verify(record.title)
        if not self.verification.ok:
            raise RecordError(f"the record {record.title!r} does not verify, so no memo is made of it:\n{self.verification}")
        self.content: dict[str, Any] = record.content
        self.calculation: Calculation = record.calculation
        self.links = self.calculation.chain()
        self.reports: list[Report] = [link.report() for link in self.links]
        self.last = self.reports[-1]

    def facts(self) -> list[tuple[str, str]]:
        """Return the facts of the title block."""
        provenance = self.record.provenance
        return [
            ("author", self.content["author"]),
            ("date", provenance["time"].replace("T", " ").replace("Z", " UTC")),
            ("subject", self.content["description"]),
            (
                "computed with",
                f"propkit {provenance['versions']['propkit']}, data basis {self.content['basis']['name'] if self.content['basis'] else 'none'}",
            ),
            ("record", self.record.digest),
        ]


def chapters(material: Material) -> Iterator[tuple[str, str]]:
    """Yield title and markup of each chapter; empty ones are left out."""
    makers = (
        ("Purpose", _purpose),
        ("Results", _results),
        ("The analysis", _analysis),
        ("Assumptions", _assumptions),
        ("Inputs", _inputs),
        ("Results along the chain", _between),
        ("Working", _working),
        ("Stations and composition", _stations),
        ("Checks", _checks),
        ("Warnings and cautions", _warnings),
        ("Where the result comes from", _origins),
        ("References", _references),
        ("Provenance", _provenance),
    )
    for title, make in makers:
        body = "".join(make(material))
        if body:
            yield title, body


def _purpose(material: Material) -> Iterator[str]:
    for text in (material.content["purpose"], material.content["notes"]):
        for paragraph in text.split("\n\n"):
            if paragraph.strip():
                yield f"<p>{escape(paragraph.strip())}</p>"


def _results(material: Material) -> Iterator[str]:
    report = material.last
    shown = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in shown]
    if rest:
        yield markup.rows_table([*report.headline, *rest])
    drawings = "".join(markup.drawing(figure) for part in material.reports[-2:] for figure in part.figures)
    if drawings:
        yield f'<div class="figures">{drawings}</div>'


def _analysis(material: Material) -> Iterator[str]:
    """Yield what the sheet of a study, an uncertainty, a reconciliation or a firing tells beyond its results."""
    if material.calculation.kind in _WORKED:
        return
    for section in material.last.sections:
        yield f"<h3>{escape(section.title)}</h3>"
        if section.rows:
            yield markup.rows_table(section.rows)
        if section.table is not None:
            yield markup.data_table(section.table)
        if section.lines:
            yield markup.lines_list(section.lines)


def _assumptions(material: Material) -> Iterator[str]:
    entries = material.calculation.assumptions
    rows = [(str(entry.statement), _ABOUT.get(entry.origin, entry.origin), entry.about.replace("_", " ")) for entry in entries]
    if rows:
        yield markup.text_table(("assumption", "origin", "bears on"), rows)
    sections = entries.sections() if hasattr(entries, "sections") else ()
    for section in sections:
        if section.table is not None:
            yield f"<h3>{escape(section.title)}</h3>"
            yield markup.data_table(section.table)


def _inputs(material: Material) -> Iterator[str]:
    yield '<p class="quiet">● given, ○ default, = computed</p>'
    for report, link in zip(material.reports, material.links, strict=True):
        if report.given:
            yield f"<h3>{escape(link.title)}</h3>"
            yield markup.rows_table(report.given, typed=True)
    for section in material.reports[0].sections:
        if section.name == "propellants" and section.table is not None:
            yield "<h3>Propellants</h3>"
            yield markup.data_table(section.table)


def _between(material: Material) -> Iterator[str]:
    for report, link in zip(material.reports[:-1], material.links, strict=False):
        shown = {row.name for row in report.headline}
        rows = [*(row for row in report.headline if row.kind == "computed"), *(row for row in report.results if row.name not in shown)]
        if rows:
            yield f"<h3>{escape(link.title)}</h3>"
            yield markup.rows_table(rows)


def _working(material: Material) -> Iterator[str]:
    told: set[str] = set()
    for report, link in zip(material.reports, material.links, strict=True):
        for row in report.headline:
            steps = [step for step in _steps(link, row) if _key(step) not in told]
            told |= {_key(step) for step in steps}
            if steps:
                yield f"<h3>{escape(link.title)}: {escape(row.label)}</h3>"
                yield markup.working(steps, untitled=row.label)


def _steps(link: Calculation, row: Row) -> tuple[Step, ...]:
    """Return the steps of a computed result; none for what is given, and for analyses, whose sheets tell how they came about."""
    if row.kind != "computed" or link.kind not in _WORKED:
        return ()
    try:
        steps: tuple[Step, ...] = link.working(row.name).steps
    except PropkitError:
        return ()
    return steps


def _key(step: Step) -> str:
    return f"{step.label} {step.text} {step.numbers}"


def _section_of(material: Material, name: str) -> Section | None:
    found = [section for report in material.reports for section in report.sections if section.name == name]
    return found[-1] if found else None


def _stations(material: Material) -> Iterator[str]:
    for name in ("stations", "composition"):
        section = _section_of(material, name)
        if section is not None and section.table is not None:
            yield f"<h3>{escape(section.title)}</h3>"
            yield markup.data_table(section.table)


def _checks(material: Material) -> Iterator[str]:
    made = list(identities(material.links))
    if made:
        yield "<h3>Identities</h3>"
        yield markup.conditions_table(made)
    yield "<h3>Second engine</h3>"
    yield from _second_engine(material)
    yield "<h3>Recomputation</h3>"
    count = len(material.verification.leaves)
    yield f"<p>When this memo was made, {count} values of the record were recomputed from its inputs and compared: {escape(material.verification.status)}.</p>"
    rows = [(check.name, "agrees" if check.status == "same" else check.status, check.detail) for check in material.verification.checks]
    yield markup.text_table(("compared", "outcome", "detail"), rows)


def _second_engine(material: Material) -> Iterator[str]:
    check = material.content["second_engine"]
    differences = check.get("differences")
    if not differences:
        yield f"<p>Not compared: {escape(str(check.get('reason', 'no reason is recorded')))}.</p>"
        return
    largest = max(abs(value) for station in differences.values() for value in station.values())
    yield (
        f"<p>{escape(str(check['engine']))} solved chamber, throat and exit independently, on the same data. The largest relative difference is "
        f"{numbers.pretty(largest, 2)} (enthalpy and entropy relative to RT and R).</p>"
    )
    order = [name for name in quantities.CATALOGUE if any(name in station for station in differences.values())]
    names = order + sorted({name for station in differences.values() for name in station} - set(order))
    stations = sorted(differences, key=lambda name: _ORDER.index(name) if name in _ORDER else len(_ORDER))
    rows = [
        (station, *(numbers.pretty(differences[station][name], 2) if name in differences[station] else "" for name in names))
        for station in stations
    ]
    yield markup.text_table(("difference", *(name.replace("_", " ") for name in names)), rows, range(1, len(names) + 1))


def _warnings(material: Material) -> Iterator[str]:
    doubts = [str(doubt) for doubt in material.calculation.warnings]
    yield "<h3>Warnings</h3>"
    yield markup.lines_list(doubts) if doubts else "<p>None.</p>"
    yield "<h3>Cautions</h3>"
    yield markup.lines_list(dict.fromkeys((*material.last.cautions, *CAUTIONS)))


def _origins(material: Material) -> Iterator[str]:
    if material.calculation.kind not in _WORKED:
        return
    names = [row.name for row in material.last.headline if row.kind == "computed"]
    for name in [name for name in names if name != "thrust"][:_MOST_ORIGINS] or names[:1]:
        yield _tree(trace(material.calculation, name))


def _tree(origin: Origin) -> str:
    rows: list[str] = []
    repeated: list[str] = []
    listed = list(origin.lines())
    for place, (depth, entry) in enumerate(listed):
        if entry.how == "see above":
            repeated.append(entry.path.rpartition(".")[2].replace("_", " "))
            following = listed[place + 1] if place + 1 < len(listed) else None
            if following is None or following[0] != depth or following[1].how != "see above":
                rows.append(_tree_row(depth, ", ".join(repeated), "see above"))
                repeated = []
            continue
        rows.append(_tree_row(depth, entry.text, entry.how))
    return f'<div class="table-frame"><table class="trace"><thead><tr><th>number</th><th>how it came about</th></tr></thead><tbody>{"".join(rows)}</tbody></table></div>'


def _tree_row(depth: int, text: str, how: str) -> str:
    indent = f' style="padding-left:{depth}em"' if depth else ""
    return f"<tr><td{indent}>{escape(text)}</td><td>{escape(how)}</td></tr>"


def _references(material: Material) -> Iterator[str]:
    found: dict[str, None] = {}
    for report in material.reports:
        found.update((row.source, None) for row in report.rows() if row.source)
    for link in material.links:
        for row in link.report().headline:
            found.update((step.source, None) for step in _steps(link, row) if step.source)
    lines = [reference(key) for key in found if key not in ("definition", "conservation", "common-practice")]
    basis = material.content["basis"]
    if basis:
        lines += [SOURCES[part] for part in basis["name"].split("+") if part in SOURCES]
    for role, row in material.content["propellants"].items():
        lines.append(f"{row['name']} ({role}): {row['source']}")
    yield markup.lines_list(dict.fromkeys(lines))


def _provenance(material: Material) -> Iterator[str]:
    record, content = material.record, material.content
    provenance = record.provenance
    rows = [("made", provenance["time"])]
    rows += [(name, version) for name, version in sorted(provenance["versions"].items())]
    rows += [("digest of the record", record.digest), ("digest of the content", record.content_digest)]
    if content["basis"]:
        rows.append((f"data basis {content['basis']['name']}", content["basis"]["checksum"]))
    rows += [(f"data row {row['name']}", row["checksum"]) for row in content["propellants"].values()]
    if "cell" in provenance:
        rows.append(("notebook cell", provenance["cell"]))
    yield markup.text_table(("what", "value"), rows)
    yield "<h3>The same calculation as a script</h3>"
    code = material.calculation.as_code().rstrip()
    shown = _SAMPLES.sub(lambda match: f"{match[1]}... {match[2].count(',') + 1} values here ...", code)
    if shown != code:
        yield "<p>Long rows of numbers are left out here; the record holds them.</p>"
    yield f"<pre>{escape(shown)}</pre>"
