"""From the arguments of a constructor to SI values: every bad or missing input is listed in one error."""

from __future__ import annotations

import inspect
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from propkit.errors import InputError, Problem, near_matches
from propkit.model.declare import REQUIRED, Input, as_typed


@dataclass(frozen=True, slots=True)
class Bound:
    """Inputs as typed and as read: `typed` holds what was given, `values` the SI value of every input."""

    typed: dict[str, Any]
    values: dict[str, Any]


def signature(declared: Mapping[str, Input]) -> inspect.Signature:
    """Return the constructor's signature as declared, for help and for tooltips."""
    kinds = inspect.Parameter
    listed = sorted(declared.values(), key=lambda entry: entry.kw_only)
    return inspect.Signature(
        [
            kinds(
                entry.name,
                kinds.KEYWORD_ONLY if entry.kw_only else kinds.POSITIONAL_OR_KEYWORD,
                default=kinds.empty if entry.required else entry.default,
            )
            for entry in listed
        ]
    )


def name_arguments(kind: str, declared: Mapping[str, Input], args: tuple[Any, ...], keywords: Mapping[str, Any]) -> dict[str, Any]:
    """Return the arguments by name; TypeError for one that is unknown or given twice."""
    positional = [name for name, entry in declared.items() if not entry.kw_only]
    if len(args) > len(positional):
        raise TypeError(
            f"{kind} takes {len(positional)} positional argument(s) ({', '.join(positional)}), {len(args)} were given; name the others"
        )
    named = dict(zip(positional, args, strict=False))
    for name, value in keywords.items():
        if name not in declared:
            near = near_matches(name, declared)
            hint = f"; did you mean {' or '.join(near)}?" if near else f"; it takes {', '.join(declared)}"
            raise TypeError(f"{kind} has no input {name!r}{hint}")
        if name in named:
            raise TypeError(f"{kind} got {name!r} twice")
        named[name] = value
    return named


def read(declared: Mapping[str, Input], named: Mapping[str, Any], problems: list[Problem]) -> Bound:
    """Read every argument; what is wrong is appended to `problems`, and its value is then None."""
    typed: dict[str, Any] = {}
    values: dict[str, Any] = {}
    for name, entry in declared.items():
        given = name in named and not (named[name] is None and entry.default is None)
        if not given:
            values[name] = None if entry.required else entry.default
            if entry.required:
                problems.append(Problem(name, "missing", _allowed(entry), _sentence(entry.doc)))
            continue
        try:
            values[name] = entry.read(named[name])
            typed[name] = as_typed(named[name])
        except InputError as error:
            problems.extend(error.problems or (Problem(name, repr(named[name]), str(error)),))
            values[name] = None
    return Bound(typed, values)


def _sentence(text: str) -> str:
    """Return a one-line meaning as a sentence."""
    return f"{text[:1].upper()}{text[1:]}." if text else ""


def _allowed(entry: Input) -> str:
    choices = getattr(entry, "choices", ())
    if choices:
        return "one of " + ", ".join(map(repr, choices))
    try:
        bounds = entry.bounds.text(entry.quantity.unit)
    except KeyError:
        bounds = ""
    return f"given ({bounds})" if bounds else "given"


def is_required(value: Any) -> bool:
    """Whether a declared default stands for "must be given"."""
    return value is REQUIRED
