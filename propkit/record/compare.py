"""The difference of two records: inputs, assumptions, versions and results that changed, sized."""

from __future__ import annotations

import html
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from propkit.record.differences import ABSENT, Leaf, leaves
from propkit.record.outcome import visible

if TYPE_CHECKING:
    from propkit.record.record import Record

_TOPICS = {
    "inputs": "Inputs",
    "assumptions": "Assumptions",
    "warnings": "Warnings",
    "data": "Data",
    "versions": "Versions",
    "results": "Results",
    "stations": "Stations",
    "composition": "Composition",
    "texts": "Texts",
}
_MOST = 40
_TEXTS = ("title", "author", "purpose", "notes", "description")


@dataclass(frozen=True, slots=True)
class Comparison:
    """What differs between two records; `same` where nothing but time and versions does."""

    first: str
    second: str
    topics: Mapping[str, tuple[Leaf, ...]]

    @property
    def same(self) -> bool:
        """Whether both say the same: inputs, assumptions, data and results."""
        return not any(self.topics[topic] for topic in self.topics if topic != "versions")

    def __str__(self) -> str:
        lines = [f"A  {self.first}", f"B  {self.second}", ""]
        for topic, found in self.topics.items():
            if found:
                lines.append(f"{_TOPICS[topic]}: {len(found)} differ")
                lines += [f"  {' | '.join(cells)}" for cells in _cells(found)]
        if not any(self.topics.values()):
            lines.append("no difference")
        return "\n".join(visible(line) for line in lines)

    def to_html(self) -> str:
        """Return the tables as a fragment of HTML; everything is escaped."""
        parts = [f"<p>A: <b>{html.escape(self.first)}</b><br>B: <b>{html.escape(self.second)}</b></p>"]
        for topic, found in self.topics.items():
            if found:
                rows = "".join("<tr>" + "".join(f"<td>{html.escape(cell)}</td>" for cell in cells) + "</tr>" for cells in _cells(found))
                head = "<tr><th>what</th><th>A</th><th>B</th><th>change</th></tr>"
                parts.append(f"<p><b>{_TOPICS[topic]}</b></p><table><thead>{head}</thead><tbody>{rows}</tbody></table>")
        if not any(self.topics.values()):
            parts.append("<p>No difference.</p>")
        return f'<div class="propkit-comparison">{"".join(parts)}</div>'

    def to_page(self) -> str:
        """Return a whole page without scripts."""
        style = "body{font:15px/1.45 sans-serif;max-width:60rem;margin:2rem auto;padding:0 1rem}table{border-collapse:collapse}td,th{border-bottom:1px solid #ccc;padding:.2rem .6rem;text-align:left}"
        return f'<!doctype html><html lang="en"><meta charset="utf-8"><title>Two records compared</title><style>{style}</style><body>{self.to_html()}</body></html>\n'

    def _repr_html_(self) -> str:
        return self.to_html()


def _cells(found: tuple[Leaf, ...]) -> list[tuple[str, str, str, str]]:
    made = [(_name(leaf), _text(leaf.recorded), _text(leaf.other), _change(leaf)) for leaf in found[:_MOST]]
    if len(found) > _MOST:
        made.append((f"and {len(found) - _MOST} more", "", "", ""))
    return made


def _name(leaf: Leaf) -> str:
    skipped = {"objects", "inputs", "results", "value", "content"}
    return ".".join(part for part in leaf.path.split(".") if part not in skipped)


def _text(value: Any) -> str:
    if isinstance(value, float | int) and not isinstance(value, bool):
        return f"{value:.9g}"
    if isinstance(value, Mapping):
        return f"present, {len(value)} {'entry' if len(value) == 1 else 'entries'}"
    text = " ".join(str(value).split())
    return text if len(text) <= 100 else f"{text[:97]}..."


def _change(leaf: Leaf) -> str:
    if leaf.difference is None:
        return ""
    if leaf.path.startswith("composition.") or not leaf.recorded:
        return f"{leaf.other - leaf.recorded:+.3g}"
    return f"{100.0 * (leaf.other - leaf.recorded) / abs(leaf.recorded):+.4g} %"


def compare(first: Record, second: Record) -> Comparison:
    """Return what differs between two records; nothing is recomputed."""
    one, two = first.content, second.content
    found = {
        "inputs": _differing(_objects(one, "inputs"), _objects(two, "inputs"), typed=False),
        "assumptions": _differing(_statements(one), _statements(two)),
        "warnings": _differing(_warned(one), _warned(two)),
        "data": _differing(_picked(one, "basis", "propellants"), _picked(two, "basis", "propellants")),
        "versions": _differing(first.provenance["versions"], second.provenance["versions"]),
        "results": _differing(_objects(one, "results"), _objects(two, "results")),
        "stations": _differing(_by_station(one), _by_station(two)),
        "composition": _differing({"composition": one["composition"]}, {"composition": two["composition"]}),
        "texts": _differing(_picked(one, *_TEXTS), _picked(two, *_TEXTS)),
    }
    labels = [f"{record.title} (made {record.provenance['time']}, {record.digest[:19]}…)" for record in (first, second)]
    return Comparison(labels[0], labels[1], found)


def _statements(content: Mapping[str, Any]) -> dict[str, str]:
    return {entry["key"]: f"{entry['statement']} ({entry['origin']})" for entry in content["assumptions"]}


def _warned(content: Mapping[str, Any]) -> dict[str, str]:
    return {entry["text"]: "present" for entry in content["warnings"]}


def _picked(content: Mapping[str, Any], *names: str) -> dict[str, Any]:
    return {name: content[name] for name in names}


def _objects(content: Mapping[str, Any], part: str) -> dict[str, Any]:
    return {kind: stored[part] for kind, stored in content["objects"].items()}


def _by_station(content: Mapping[str, Any]) -> dict[str, Any]:
    return {row["station"]: {name: value for name, value in row.items() if name != "station"} for row in content["stations"]["rows"]}


def _differing(one: Any, two: Any, typed: bool = True) -> tuple[Leaf, ...]:
    found = [leaf for leaf in leaves(one, two) if not leaf.same]
    if not typed:
        moved = {leaf.path.rpartition(".")[0] for leaf in found if leaf.path.endswith(".value")}
        found = [
            leaf for leaf in found if not leaf.path.endswith((".typed", ".kind", ".unit")) or leaf.path.rpartition(".")[0] not in moved
        ]
    whole = {
        leaf.path
        for leaf in found
        if ABSENT in (leaf.recorded, leaf.other) and isinstance(leaf.recorded if leaf.other == ABSENT else leaf.other, Mapping)
    }
    return tuple(_unpacked(leaf) if leaf.path in whole else leaf for leaf in found)


def _unpacked(leaf: Leaf) -> Leaf:
    """Return a leaf whose present side is an entry with a value, as that value."""
    sides = [side["value"] if isinstance(side, Mapping) and "value" in side else side for side in (leaf.recorded, leaf.other)]
    return Leaf(leaf.path, sides[0], sides[1], None, False)
