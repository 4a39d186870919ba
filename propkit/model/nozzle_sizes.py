"""The sizes of a nozzle: which inputs go together, which displace each other, and how the others are read."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from typing import Any

from propkit import units
from propkit.chain import sizing
from propkit.errors import InputError, Problem
from propkit.model.chamber import Chamber
from propkit.model.declare import as_text

SIZES = (*sizing.THROAT_SIZES, *sizing.EXIT_SIZES, *sizing.FLOW_SIZES)
EXPANSIONS = ("area_ratio", "exit_pressure")


def read_chamber(name: str, value: Any) -> Chamber:
    """Return `value` when it is a chamber."""
    if isinstance(value, Chamber):
        return value
    raise InputError(Problem(name, as_text(value), "a pk.Chamber", "Chain the objects: case, chamber, nozzle, performance."))


def read_freeze(name: str, value: Any) -> str | float:
    """Return where the composition freezes: a word, or an area ratio above 1."""
    if value in ("chamber", "throat"):
        return str(value)
    allowed = "'chamber', 'throat' or a supersonic area ratio above 1"
    try:
        ratio = units.to_si(value, "", name)
    except InputError as error:
        raise InputError(Problem(name, as_text(value), allowed)) from error
    if not 1.0 < ratio <= 1e4:
        raise InputError(Problem(name, as_text(value), allowed))
    return ratio


def size_problems(typed: Mapping[str, Any], values: Mapping[str, Any], bad: Collection[str]) -> Iterator[Problem]:
    """Yield what is wrong with the sizes of a nozzle taken together; `bad` names inputs refused already."""
    expansion = [name for name in EXPANSIONS if name in typed or name in bad]
    throat = [name for name in sizing.THROAT_SIZES if name in typed or name in bad]
    lips = [name for name in sizing.EXIT_SIZES if name in typed or name in bad]
    flows = [name for name in sizing.FLOW_SIZES if name in typed or name in bad]
    given = [*expansion, *throat, *lips, *flows]
    shown = ", ".join(f"{name}={as_text(typed.get(name, '?'))}" for name in given) or "missing"
    wanted = "one of area_ratio or exit_pressure with one size (" + ", ".join(SIZES) + "), or one throat size with one exit size"
    two_sizes = len(throat) == 1 and len(lips) == 1 and not flows and not expansion
    one_size = len(expansion) == 1 and len(throat) + len(lips) + len(flows) == 1
    if not (two_sizes or one_size):
        missing = not expansion or not (throat or lips or flows)
        add = 'area_ratio=35 and throat_diameter="0.18 m"' if not given else 'throat_diameter="0.18 m"'
        add = "area_ratio=35" if given and not expansion else add
        hint = f"Add, for example, {add}." if missing and len(given) <= 1 else "Leave out what is too much."
        yield Problem("nozzle size", shown, wanted, hint)
    if two_sizes and not set(bad) & set(given):
        ratio = size_ratio(typed, values)
        if not 1.0 <= ratio <= 1e4:
            yield Problem(
                lips[0],
                as_text(typed[lips[0]]),
                "an exit at least as large as the throat",
                f"The area ratio comes out as {ratio:.4g}.",
            )
    if flows == ["thrust"] and values["sizing_ambient"] is None and "sizing_ambient" not in bad:
        yield Problem(
            "sizing_ambient",
            "missing",
            "given with thrust",
            'For example sizing_ambient="vacuum", or use Nozzle.sized_for.',
        )
    if "thrust" not in flows and "sizing_ambient" in typed:
        yield Problem(
            "sizing_ambient",
            as_text(typed["sizing_ambient"]),
            "left out unless the nozzle is sized for a thrust",
        )


def size_ratio(typed: Mapping[str, Any], values: Mapping[str, Any]) -> float:
    """Return exit over throat area from the two sizes given."""
    areas = [
        float(sizing.area_of(name, values[name])) for group in (sizing.EXIT_SIZES, sizing.THROAT_SIZES) for name in group if name in typed
    ]
    return areas[0] / areas[1]


def displaced(typed: Mapping[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
    """Return `typed` without the sizes that the changes displace: naming one member of a group displaces the others."""
    kept = dict(typed)
    throat, lips, flows, expansion = (set(group) for group in (sizing.THROAT_SIZES, sizing.EXIT_SIZES, sizing.FLOW_SIZES, EXPANSIONS))
    named = set(changes)
    drop: set[str] = set()
    two_sizes = bool(throat & set(typed)) and bool(lips & set(typed))
    if named & throat and named & lips:
        drop = throat | lips | flows | expansion
    elif two_sizes:
        drop |= throat if named & throat else set()
        drop |= lips if named & (lips | expansion) else set()
        drop |= throat if named & flows else set()
    elif named & (throat | lips | flows):
        drop = throat | lips | flows
    drop |= expansion if named & expansion else set()
    if drop & {"thrust"} and "thrust" not in named:
        drop.add("sizing_ambient")
    for name in drop:
        kept.pop(name, None)
    if named & {"flow"} and changes.get("flow") != "frozen" and "freeze_at" not in named:
        kept.pop("freeze_at", None)
    if named & {"flow"} and changes.get("flow") != "constant-property" and "exponent" not in named:
        kept.pop("exponent", None)
    return kept
