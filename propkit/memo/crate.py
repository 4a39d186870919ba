"""A record as a research object: a zip by RO-Crate 1.1 with record, memos, tables and, where there is one, the notebook."""

from __future__ import annotations

import csv
import io
import json
import zipfile
from collections.abc import Mapping, Sequence
from typing import Any

from propkit.memo.record_page import record_page
from propkit.memo.record_pdf import record_pdf
from propkit.record.canonical import canonical_bytes
from propkit.record.record import Record

SPECIFICATION = "https://w3id.org/ro/crate/1.1"
CONTEXT = "https://w3id.org/ro/crate/1.1/context"
METADATA = "ro-crate-metadata.json"
_FORMATS = {
    ".json": "application/json",
    ".html": "text/html",
    ".pdf": "application/pdf",
    ".csv": "text/csv",
    ".ipynb": "application/x-ipynb+json",
}
_FORMULA = ("=", "+", "-", "@", "\t", "\r")


def record_crate(record: Record, extra: Mapping[str, tuple[str, bytes]] | None = None, paper: str = "a4") -> bytes:
    """Return a record as the bytes of an RO-Crate; the same record gives the same bytes.

    Parameters
    ----------
    record : Record
        The record.
    extra : mapping, optional
        Further files: name -> (description, bytes), for instance the executed notebook.
    paper : {"a4", "letter"}
        Size of the sheets of the PDF memo.

    Raises
    ------
    RecordError
        When the record does not verify.
    MissingExtraError
        Without the typst package.
    """
    content = record.content
    files: dict[str, tuple[str, bytes]] = {
        "calculation.record.json": ("Calculation record: inputs, results, provenance and digests", record.to_bytes()),
        "memo.html": ("Memo as a page that carries the record", record_page(record)),
        "memo.pdf": ("Memo as PDF/A-2b", record_pdf(record, paper)),
        "tables/inputs_and_results.csv": ("Inputs and results in SI units", _values_csv(content)),
    }
    if content["stations"]["rows"]:
        files["tables/stations.csv"] = ("Flow states at the stations in SI units", _stations_csv(content["stations"]))
    if content["composition"]:
        files["tables/composition.csv"] = ("Mole fractions of 1e-8 and above", _composition_csv(content["composition"]))
    files |= extra or {}
    return packed(record.provenance["time"], metadata(record, files), files)


def packed(time: str, described: Mapping[str, Any], files: Mapping[str, tuple[str, bytes]]) -> bytes:
    """Return files and their description as the bytes of a zip with the dates of the record."""
    moment = (*(int(part) for part in time[:10].split("-")), *(int(part) for part in time[11:19].split(":")))
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        members = {
            METADATA: json.dumps(described, indent=1, ensure_ascii=False).encode(),
            **{name: data for name, (_, data) in files.items()},
        }
        for name, data in members.items():
            entry = zipfile.ZipInfo(name, moment)  # type: ignore[arg-type]
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o100644 << 16
            archive.writestr(entry, data)
    return stream.getvalue()


def metadata(record: Record, files: Mapping[str, tuple[str, bytes]]) -> dict[str, Any]:
    """Return the JSON-LD that describes the crate."""
    content, provenance = record.content, record.provenance
    author = [{"@id": "#author"}] if content["author"] else []
    root = {
        "@id": "./",
        "@type": "Dataset",
        "name": record.title,
        "description": content["purpose"] or content["description"],
        "datePublished": provenance["time"],
        "license": {"@id": "#terms"},
        "identifier": record.digest,
        "hasPart": [{"@id": name} for name in files],
        "mentions": [{"@id": "#calculation"}],
        **({"author": author[0]} if author else {}),
    }
    parts = [
        {
            "@id": name,
            "@type": "File",
            "name": about,
            "encodingFormat": _FORMATS["." + name.rpartition(".")[2]],
            "contentSize": str(len(data)),
        }
        for name, (about, data) in files.items()
    ]
    people = [{"@id": "#author", "@type": "Person", "name": content["author"]}] if content["author"] else []
    return {"@context": CONTEXT, "@graph": [_descriptor(), root, *parts, *people, _terms(), *_calculation(record, provenance)]}


def _descriptor() -> dict[str, Any]:
    return {"@id": METADATA, "@type": "CreativeWork", "conformsTo": {"@id": SPECIFICATION}, "about": {"@id": "./"}}


def _terms() -> dict[str, Any]:
    return {
        "@id": "#terms",
        "@type": "CreativeWork",
        "name": "Terms of use",
        "description": "No licence is stated. The author decides about the use of this calculation; export-control rules may apply.",
    }


def _calculation(record: Record, provenance: Mapping[str, Any]) -> Sequence[dict[str, Any]]:
    versions = provenance["versions"]
    software = {"@id": "#propkit", "@type": "SoftwareApplication", "name": "propkit", "version": versions["propkit"],
                "softwareRequirements": ", ".join(f"{name} {version}" for name, version in sorted(versions.items()) if name != "propkit")}  # fmt: skip
    action = {
        "@id": "#calculation",
        "@type": "CreateAction",
        "name": f"Calculation: {record.content['description']}",
        "endTime": provenance["time"],
        "instrument": {"@id": "#propkit"},
        "result": [{"@id": "calculation.record.json"}],
    }
    return [software, action]


def _values_csv(content: Mapping[str, Any]) -> bytes:
    rows: list[Sequence[Any]] = [("object", "name", "value", "unit", "kind", "as typed")]
    for kind, stored in content["objects"].items():
        rows += [
            (kind, name, entry["value"], entry["unit"], entry["kind"], entry.get("typed", "")) for name, entry in stored["inputs"].items()
        ]
        rows += [(kind, name, entry["value"], entry["unit"], "computed", "") for name, entry in stored["results"].items()]
    return _csv(rows)


def _stations_csv(stations: Mapping[str, Any]) -> bytes:
    units = stations["units"]
    rows: list[Sequence[Any]] = [("station", *(f"{name} [{unit}]" if unit else name for name, unit in units.items()))]
    rows += [(row["station"], *(row.get(name, "") for name in units)) for row in stations["rows"]]
    return _csv(rows)


def _composition_csv(composition: Mapping[str, Mapping[str, float]]) -> bytes:
    species = list(dict.fromkeys(name for station in composition.values() for name in station))
    rows: list[Sequence[Any]] = [("species", *composition)]
    rows += [(name, *(station.get(name, "") for station in composition.values())) for name in species]
    return _csv(rows)


def _csv(rows: Sequence[Sequence[Any]]) -> bytes:
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerows([_cell(value) for value in row] for row in rows)
    return stream.getvalue().encode()


def _cell(value: Any) -> Any:
    """Return a cell that a spreadsheet takes as what it is: text never starts a formula."""
    if isinstance(value, str) and value.startswith(_FORMULA):
        return f"'{value}"
    return canonical_bytes(value).decode() if isinstance(value, int | float) else value
