"""Verification of a record: seals, data, then every value recomputed from the inputs and compared.

Nothing in a record is executed: its recipe names classes of propkit and their inputs, and nothing else.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from propkit.bridge.second_engine import SecondSolution
from propkit.errors import PropkitError, RecordError
from propkit.model.base import Calculation, from_recipe
from propkit.record.build import FREE_TEXT, SMALLEST_FRACTION, content_of
from propkit.record.canonical import digest_of, whole_digest
from propkit.record.differences import ABSENT, Leaf, leaves
from propkit.record.outcome import Check, Verification
from propkit.versions import numeric_versions

VERSION_EFFECT = 1e-3
"""Relative difference up to which a value may differ because versions or data differ; beyond it the value is a mismatch."""

_CAN_MOVE_NUMBERS = ("propkit", "numpy", "scipy", "cantera")
_ROUNDING = 1e-10
_EDGE = 0.01
"""Width of the band round the smallest recorded fraction in which a species may be on one side only."""


def verify_document(
    document: Mapping[str, Any],
    name: str,
    seals: tuple[str, str] | None = None,
    migrated_from: int | None = None,
    known: dict[str, dict[str, Any]] | None = None,
) -> Verification:
    """Return the verification of a document of the present form.

    Parameters
    ----------
    document : mapping
        A record.
    name : str
        What to call it.
    seals : tuple of str, optional
        Content digest and digest as computed over the document before migration; over `document` itself unless given.
    migrated_from : int, optional
        Schema version that the record was written in, where it is an older one.
    known : dict, optional
        What was recomputed already in this run, by digest of the recipe; filled, so that records of one calculation share it.

    Returns
    -------
    Verification
        What was compared, and the outcome.
    """
    checks = [*seal_checks(document, seals or (digest_of(document["content"]), whole_digest(document)))]
    if migrated_from is not None:
        checks.append(Check("schema", "noted", f"written in version {migrated_from}, read through its migrations"))
    try:
        again = _shared(document["content"], known if known is not None else {})
    except PropkitError as error:
        checks.append(Check("recompute", "differs", f"the record cannot be recomputed: {error.message}"))
        return Verification(name, document["digest"], _label(document["content"]), tuple(checks), ())
    return judged(document, again, name, tuple(checks))


def _shared(content: Mapping[str, Any], known: dict[str, dict[str, Any]]) -> dict[str, Any]:
    key = digest_of(content["recipe"])
    if key not in known:
        known[key] = recomputed(content)
    elif known[key]["object"] not in content["objects"]:
        raise RecordError(f"its recipe makes a {known[key]['object']}, which the record does not hold")
    return known[key]


def recomputed(content: Mapping[str, Any]) -> dict[str, Any]:
    """Return the content that the recipe of a record gives now.

    Raises
    ------
    PropkitError
        When the recipe is refused, has no solution, or makes an object that the record does not hold.
    """
    calculation = from_recipe(content["recipe"])
    if not isinstance(calculation, Calculation) or calculation.kind not in content["objects"]:
        raise RecordError(f"its recipe makes a {getattr(calculation, 'kind', 'thing')}, which the record does not hold")
    texts = {entry: str(content[entry]) for entry in FREE_TEXT}
    return content_of(calculation, texts, SMALLEST_FRACTION * (1.0 - _EDGE))


def judged(document: Mapping[str, Any], again: Mapping[str, Any], name: str, seals: tuple[Check, ...] = ()) -> Verification:
    """Return the comparison of a document with its content computed again.

    Parameters
    ----------
    document : mapping
        A record.
    again : mapping
        Its content as `recomputed` gives it.
    name : str
        What to call it.
    seals : tuple of Check
        Checks that come first.
    """
    content = document["content"]
    versions = _version_notes(document["provenance"]["versions"])
    found = [leaf for leaf in leaves(content, again) if leaf.path not in FREE_TEXT and not _on_the_edge(leaf)]
    found = _engine_judged(found, content)
    data, noted = _data_notes(found)
    moved = bool(data) or any(check.name.removeprefix("version of ") in _CAN_MOVE_NUMBERS for check in versions)
    compared = tuple(leaf for leaf in found if leaf.path not in noted)
    free = Check("free text", "noted", "title, author, purpose and notes follow from nothing and are not checked")
    checks = (*seals, *versions, *data, *_comparison_checks(compared, moved), free)
    return Verification(name, document["digest"], _label(content), checks, compared)


def _label(content: Mapping[str, Any]) -> str:
    return str(content["title"] or content["description"])


def seal_checks(document: Mapping[str, Any], computed: tuple[str, str]) -> Iterator[Check]:
    """Yield whether the stored digests are those of the document; `computed` holds content digest and digest."""
    stored = (document["provenance"]["content_digest"], document["digest"])
    for label, kept, found in zip(("content digest", "digest"), stored, computed, strict=True):
        if kept == found:
            yield Check(label, "same", f"{kept[:23]}…")
        else:
            yield Check(
                label, "differs", f"the record says {kept[:23]}…, its content gives {found[:23]}…: it was changed after it was sealed"
            )


def _version_notes(recorded: Mapping[str, str]) -> list[Check]:
    here = numeric_versions()
    return [
        Check(f"version of {name}", "noted", f"recorded with {recorded.get(name, ABSENT)}, recomputed with {here.get(name, ABSENT)}")
        for name in dict.fromkeys((*here, *recorded))
        if recorded.get(name) != here.get(name)
    ]


def _data_notes(found: list[Leaf]) -> tuple[list[Check], set[str]]:
    """Return a note for each data checksum that differs, and the paths of those checksums."""
    differing = [leaf for leaf in found if not leaf.same and leaf.path.endswith(".checksum") and ABSENT not in (leaf.recorded, leaf.other)]
    notes = [
        Check(
            f"data of {leaf.path.rpartition('.')[0].replace('.', ' ')}",
            "noted",
            f"recorded with {str(leaf.recorded)[:19]}…, recomputed with {str(leaf.other)[:19]}…",
        )
        for leaf in differing
    ]
    return notes, {leaf.path for leaf in differing}


def _comparison_checks(compared: tuple[Leaf, ...], moved: bool) -> Iterator[Check]:
    groups: dict[str, list[Leaf]] = {}
    for leaf in compared:
        groups.setdefault(leaf.group, []).append(leaf)
    for group, listed in groups.items():
        wrong = [leaf for leaf in listed if not leaf.same]
        largest = max((leaf.difference for leaf in listed if leaf.difference is not None), default=None)
        words = f"{len(listed)} compared" + ("" if largest is None else f", largest difference {_size(largest)}")
        if not wrong:
            yield Check(group.replace("_", " "), "same", words)
        elif moved and all(_effect_of_versions(leaf) for leaf in wrong):
            yield Check(group.replace("_", " "), "noted", f"{words}; {len(wrong)} differ, an effect of other versions or data")
        else:
            yield Check(group.replace("_", " "), "differs", f"{words}; {len(wrong)} differ")


def _size(difference: float) -> str:
    """Return a difference; what is smaller than rounding matters is said as such, so that it reads the same each time."""
    return f"{difference:.1e}" if difference >= _ROUNDING else f"below {_ROUNDING:.0e}"


def _effect_of_versions(leaf: Leaf) -> bool:
    return leaf.difference is not None and leaf.difference <= VERSION_EFFECT


def _on_the_edge(leaf: Leaf) -> bool:
    if not leaf.path.startswith("composition."):
        return False
    sides = [side for side in (leaf.recorded, leaf.other) if side != ABSENT]
    return len(sides) == 1 and isinstance(sides[0], float) and abs(sides[0] / SMALLEST_FRACTION - 1.0) <= _EDGE


def _engine_judged(found: list[Leaf], content: Mapping[str, Any]) -> list[Leaf]:
    """Return the leaves with the differences of the second engine judged by the record's own two solutions.

    They are noise near 1e-10: computed on another machine they differ, but they always follow from the two solutions
    beside them, which are recomputed themselves.
    """
    stored = content["second_engine"]
    try:
        solution = SecondSolution(str(stored["engine"]), stored["stations"])
        own = solution.differences(stored["ours"])
    except (KeyError, TypeError, AttributeError, ZeroDivisionError):
        return found
    prefix = "second_engine.differences"
    kept = [leaf for leaf in found if not leaf.path.startswith(f"{prefix}.")]
    return [*kept, *leaves(stored.get("differences", {}), own, prefix)]
