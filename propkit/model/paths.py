"""Paths such as ``chamber.pressure``: finding what they mean in a chain, and rebuilding a chain from changed inputs.

Any unambiguous suffix of a path may be typed. A bare name that the object itself has means that one.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from propkit.errors import InputError, near_matches

if TYPE_CHECKING:
    from propkit.model.base import Calculation


@dataclass(frozen=True, slots=True)
class Place:
    """Where a path leads: the position of the object in the chain, the name, and whether it is an input."""

    path: str
    position: int
    name: str
    is_input: bool


def places(calculation: Calculation, *, inputs: bool = True, results: bool = True) -> dict[str, Place]:
    """Return every path of the chain that ends in `calculation`."""
    found: dict[str, Place] = {}
    for position, link in enumerate(calculation.chain()):
        prefix = link.kind
        if results:
            for name in (*link.declared_results, *link.state_paths()):
                found[f"{prefix}.{name}"] = Place(f"{prefix}.{name}", position, name, False)
        if inputs:
            for name in link.declared_inputs:
                found[f"{prefix}.{name}"] = Place(f"{prefix}.{name}", position, name, True)
    return found


def resolve(calculation: Calculation, path: str, *, inputs: bool = True, results: bool = True) -> Place:
    """Return the place that `path`, or an unambiguous suffix of one, leads to.

    Raises
    ------
    InputError
        For a path that is unknown or ambiguous; the candidates are listed.
    """
    if not isinstance(path, str):
        raise InputError(f"a path is a text such as 'chamber.pressure', not {path!r}")
    known = places(calculation, inputs=inputs, results=results)
    if path in known:
        return known[path]
    own = f"{calculation.kind}.{path}"
    if own in known:
        return known[own]
    if not results and own in places(calculation):
        others = [other for other in known if other.endswith(f".{path}")]
        hint = f" The input {' or '.join(others)} can be set." if others else ""
        raise InputError(f"{path!r} is a result of the {calculation.kind}, not an input.{hint}", path=path, candidates=others)
    found = [other for other in known if other.endswith(f".{path}")]
    if len(found) == 1:
        return known[found[0]]
    if found:
        raise InputError(f"{path!r} is ambiguous; it could be {', '.join(found)}.", path=path, candidates=found)
    near = _near(calculation.kind, path, known)
    what = "input" if not results else "input or result"
    hint = f" Did you mean {' or '.join(near)}?" if near else ""
    raise InputError(f"{path!r} is no {what} of this chain.{hint}", path=path, candidates=near)


def _near(kind: str, path: str, known: Iterable[str]) -> list[str]:
    """Return the paths most like one that is unknown: those of the object named, or else its own first, then upstream."""
    ordered = sorted(known, key=lambda other: not other.startswith(f"{kind}."))
    owner, _, name = path.partition(".")
    theirs = [other for other in ordered if name and other.startswith(f"{owner}.")]
    exact = [other for other in ordered if other.partition(".")[2] == (name or path)]
    if exact:
        return exact[:4]
    names = dict.fromkeys(other.partition(".")[2] for other in theirs or ordered)
    wanted = near_matches(name if theirs else path, names)
    found = [other for match in wanted for other in theirs or ordered if other.partition(".")[2] == match]
    return (found or near_matches(path, ordered))[:4]


def replace(calculation: Calculation, changes: Mapping[str, Any]) -> Any:
    """Return the chain's last object rebuilt with `changes` (path -> value)."""
    links = calculation.chain()
    by_link: dict[int, dict[str, Any]] = {}
    named: dict[str, str] = {}
    for path, value in changes.items():
        place = resolve(calculation, path, results=False)
        if place.path in named:
            raise InputError(
                f"{named[place.path]!r} and {path!r} are the same input; give it once.",
                path=path,
                candidates=[place.path],
            )
        named[place.path] = path
        by_link.setdefault(place.position, {})[place.name] = value
    for position, link in enumerate(links):
        beyond = [path for path in named if any(path.startswith(f"{other.kind}.") for other in links[:position])]
        if beyond and link.upstream_input in by_link.get(position, {}):
            whole = named[f"{link.kind}.{link.upstream_input}"]
            raise InputError(
                f"{whole!r} replaces the whole {links[position - 1].kind}, and {', '.join(beyond)} would change the one it "
                f"displaces; change the new one before handing it over.",
                path=whole,
                candidates=beyond,
            )
    rebuilt: Calculation | None = None
    for position, link in enumerate(links):
        own = by_link.get(position, {})
        if rebuilt is None and not own:
            continue
        rebuilt = _rebuild(link, own, rebuilt)
    return rebuilt if rebuilt is not None else calculation


def _rebuild(link: Calculation, own: Mapping[str, Any], upstream: Calculation | None) -> Calculation:
    typed = {**link.displaced(link._typed, own), **own}
    if upstream is not None:
        typed[link.upstream_input] = upstream
    return type(link)(**{name: value for name, value in typed.items() if value is not None})


def value_of(calculation: Calculation, path: str) -> float:
    """Return the SI value that `path` leads to."""
    place = resolve(calculation, path)
    return calculation.chain()[place.position].si_of(place.name)
