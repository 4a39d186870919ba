"""Two plain values compared leaf by leaf, with a tolerance where the leaf is a number."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

RELATIVE = 1e-8
"""Relative tolerance of a recomputed number."""

FRACTION = 1e-12
"""Absolute tolerance of a recomputed mole fraction."""

ABSENT = "(absent)"


@dataclass(frozen=True, slots=True)
class Leaf:
    """One leaf of a record beside the one it is compared with.

    Parameters
    ----------
    path : str
        Place in the content, for instance ``objects.nozzle.results.mass_flow.value``.
    recorded, other : object
        The two values; ``(absent)`` where a side has none.
    difference : float or None
        Relative difference, absolute for a mole fraction; None for what is no number.
    same : bool
        Whether they agree within the tolerance.
    """

    path: str
    recorded: Any
    other: Any
    difference: float | None
    same: bool

    @property
    def group(self) -> str:
        """The part of the record it belongs to."""
        parts = self.path.split(".")
        return parts[2] if parts[0] == "objects" and len(parts) > 2 else parts[0]


def leaves(recorded: Any, other: Any, path: str = "") -> Iterator[Leaf]:
    """Yield every leaf of two plain values.

    Parameters
    ----------
    recorded, other : object
        Plain values; mappings are matched by key, lists by position.
    path : str
        Place of the two.
    """
    if isinstance(recorded, Mapping) and isinstance(other, Mapping):
        for key in dict.fromkeys((*recorded, *other)):
            yield from leaves(recorded.get(key, ABSENT), other.get(key, ABSENT), f"{path}.{key}" if path else str(key))
    elif isinstance(recorded, list) and isinstance(other, list):
        for place in range(max(len(recorded), len(other))):
            one, two = (side[place] if place < len(side) else ABSENT for side in (recorded, other))
            yield from leaves(one, two, f"{path}.{place + 1}")
    else:
        yield _leaf(recorded, other, path)


def _leaf(recorded: Any, other: Any, path: str) -> Leaf:
    if _number(recorded) and _number(other):
        gap = abs(float(recorded) - float(other))
        if path.startswith("composition."):
            return Leaf(path, recorded, other, gap, gap <= max(FRACTION, RELATIVE * abs(other)))
        if path.startswith("assumptions."):
            return Leaf(path, recorded, other, gap, gap <= RELATIVE)
        relative = gap / abs(other) if other else gap
        return Leaf(path, recorded, other, relative, relative <= RELATIVE)
    empty = isinstance(recorded, Mapping | list) and not recorded and other == ABSENT
    return Leaf(path, recorded, other, None, (type(recorded) is type(other) and recorded == other) or empty)


def _number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)
