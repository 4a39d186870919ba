"""From a number back to where it comes from: its relation, its inputs, their sources, down to the data rows."""

from __future__ import annotations

import html
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from propkit import quantities
from propkit.errors import InputError
from propkit.model import paths, sheet, terms
from propkit.model.base import Calculation
from propkit.physics.relations import RELATIONS
from propkit.sources import reference
from propkit.view import cells, numbers

_STATES = ("inlet", "throat", "exit")
_ELSEWHERE = {
    "exit_velocity": ("nozzle", "exit.velocity"),
    "exit_pressure": ("nozzle", "exit.pressure"),
    "ambient_pressure": ("performance", "ambient"),
    "throat_mass_flux": ("nozzle", "throat.density", "throat.velocity"),
    "local_mass_flux": ("nozzle", "exit.density", "exit.velocity"),
    "stagnation_temperature": ("chamber", "temperature"),
}
"""Argument of a relation -> kind of the object and the names that it stands for."""


@dataclass(frozen=True, slots=True)
class Origin:
    """One number, how it came about, and the numbers that it rests on.

    Parameters
    ----------
    path : str
        Path of the number in the chain.
    text : str
        Label and value, as a person reads them.
    how : str
        Relation, conditions, or "given".
    source : str
        Full reference, or where the data row comes from.
    parts : tuple of Origin
        What it rests on; empty where the branch ends or was shown above.
    """

    path: str
    text: str
    how: str
    source: str
    parts: tuple[Origin, ...] = ()

    def lines(self, depth: int = 0) -> Iterator[tuple[int, Origin]]:
        """Yield every number of the tree with its depth."""
        yield depth, self
        for part in self.parts:
            yield from part.lines(depth + 1)

    def __str__(self) -> str:
        made = []
        for depth, origin in self.lines():
            source = f"  [{origin.source}]" if origin.source else ""
            made.append(f"{'   ' * depth}{'└─ ' if depth else ''}{origin.text}: {origin.how}{source}")
        return "\n".join(made)

    def to_html(self) -> str:
        """Return the tree as nested lists; everything is escaped."""
        source = f" <small>{html.escape(self.source)}</small>" if self.source else ""
        inner = "".join(f"<li>{part.to_html()}</li>" for part in self.parts)
        nested = f"<ul>{inner}</ul>" if inner else ""
        return f"<b>{html.escape(self.text)}</b>: {html.escape(self.how)}{source}{nested}"

    def _repr_html_(self) -> str:
        return f"<div class='propkit-trace'>{self.to_html()}</div>"


def trace(calculation: Calculation, name: str) -> Origin:
    """Return where a number of a chain comes from.

    Parameters
    ----------
    calculation : Calculation
        The last object of the chain.
    name : str
        An input or result, or a path to one.

    Raises
    ------
    InputError
        For a name that the chain does not have.
    """
    place = paths.resolve(calculation, name)
    link = calculation.chain()[place.position]
    if "." not in place.name and not link.has(place.name):
        raise InputError(f"the {link.kind} of this record has no {place.name}")
    return _Tracer().of(link, place.name)


_ANALYSES = {
    "study": "a design of the study, computed through the chain with inputs of its own",
    "uncertainty": "propagated from the distributions of the inputs",
    "reconciliation": "least-squares adjustment of the quoted figures",
    "firing": "from the recording, over its steady window",
}
"""Kind of an analysis -> how its results come about; its sheet tells the rest."""


class _Tracer:
    """Walks up a chain; what was shown once is not shown again."""

    def __init__(self) -> None:
        self.shown: set[str] = set()

    def of(self, link: Calculation, name: str) -> Origin:
        path = f"{link.kind}.{name}"
        if link.kind in _ANALYSES and link.kind_of(name) == "computed":
            return Origin(path, _text(link, name), _ANALYSES[link.kind], "")
        state, _, quantity = name.partition(".")
        text = _state_text(link, state, quantity) if quantity else _text(link, name)
        if path in self.shown:
            return Origin(path, text, "see above", "")
        self.shown.add(path)
        if quantity:
            return self._state(link, path, text, quantity)
        kind = link.kind_of(name)
        if name in link.inputs or kind == "default":
            return self._input(link, name, path, text, kind)
        if (link.kind, name) == ("performance", "mass_flow"):
            return Origin(path, text, "that of the nozzle", "", (self.of(link.nozzle, name),))  # type: ignore[attr-defined]
        if (link.kind, name) == ("nozzle", "characteristic_velocity"):
            return self._delivered_cstar(link, path, text)
        key = terms.key_for(link, name)
        if key in RELATIONS:
            relation = RELATIONS[key]
            parts = [part for argument in relation.arguments for part in self._argument(link, argument, name, key)]
            return Origin(path, text, relation.written, reference(relation.source), tuple(parts))
        entry = link.declared_results.get(name)
        source = reference(entry.source) if entry is not None and entry.source else ""
        return Origin(path, text, self._condition(link, name), source, self._rests_on(link, name))

    def _input(self, link: Calculation, name: str, path: str, text: str, kind: str) -> Origin:
        row = getattr(link._values.get(name), "row", None)
        if row is not None:
            return Origin(path, text, f"data row {row.name}", row.source)
        if name == "thermo_basis":
            basis = str(link.si(name))
            return Origin(path, text, kind, "; ".join(reference(part) for part in basis.split("+")))
        typed = f"given as {link.typed_text(name)}" if name in link.inputs else "default"
        return Origin(path, text, typed, "")

    def _argument(self, link: Calculation, argument: str, name: str, key: str) -> Iterator[Origin]:
        role, _, what = argument.partition("_")
        if link.kind == "case" and role in ("oxidizer", "fuel") and what in ("enthalpy", "density", "valence"):
            yield self._stream(link, role, what, argument, key, name)
            return
        if argument == "ambient_pressure" and name.endswith("_vacuum"):
            yield Origin(argument, "ambient pressure 0", "vacuum", "")
            return
        found = self._place(link, argument, name)
        if found is not None:
            for owner, part in found:
                yield self.of(owner, part)
            return
        value = terms.values_for(link, key, name).get(argument)
        if value is not None:
            yield Origin(argument, f"{argument.replace('_', ' ')} {numbers.pretty(value, 6)}", "computed on the way", "")

    def _place(self, link: Calculation, argument: str, name: str) -> list[tuple[Calculation, str]] | None:
        chain = {entry.kind: entry for entry in link.chain()}
        if argument in _ELSEWHERE:
            kind, *names = _ELSEWHERE[argument]
            return [(chain[kind], part) for part in names] if kind in chain else None
        if argument in ("diameter", "area"):
            other = name.replace("area", "diameter") if argument == "diameter" else name.replace("diameter", "area")
            return [(link, other)]
        suffixed = f"{argument}_vacuum"
        if name.endswith("_vacuum") and suffixed != name and link.has(suffixed):
            return [(link, suffixed)]
        for owner in reversed(link.chain()):
            if owner.has(argument) and not (owner is link and argument == name):
                return [(owner, argument)]
        return None

    def _stream(self, case: Calculation, role: str, what: str, argument: str, key: str, name: str) -> Origin:
        row = case._values[role].row
        value = terms.values_for(case, key, name).get(argument, float("nan"))
        unit = {"enthalpy": "J/kg", "density": "kg/m³", "valence": "mol/kg"}[what]
        source = row.density_source if what == "density" else row.source
        how = "from the valences of its elements" if what == "valence" else f"data row {row.name}, at the stored state"
        return Origin(
            f"case.{argument}",
            f"{what} of the {role} {row.name} {numbers.pretty(value, 6)} {unit}",
            how,
            "" if what == "valence" else source,
        )

    def _state(self, nozzle: Any, path: str, text: str, quantity: str) -> Origin:
        state = path.split(".")[1]
        chamber = nozzle.chamber
        closed = nozzle.flow == "constant-property"
        how = {
            "inlet": "state at the nozzle inlet",
            "throat": "isentropic expansion to the largest mass flux (Mach 1)",
            "exit": "isentropic expansion to the area ratio of the exit",
        }.get(state, "isentropic expansion")
        parts = [self.of(chamber, "stagnation_pressure"), self.of(chamber, "temperature"), self.of(nozzle, "flow")]
        if state == "exit":
            parts.append(self.of(nozzle, "exit_pressure" if "exit_pressure" in nozzle.inputs else "area_ratio"))
        return Origin(path, text, f"{how}, {nozzle.flow} flow", reference("naca1135" if closed else "rn1037"), tuple(parts))

    def _delivered_cstar(self, nozzle: Any, path: str, text: str) -> Origin:
        parts = [self.of(nozzle.chamber, name) for name in ("stagnation_pressure", "cstar_efficiency")]
        parts += [self.of(nozzle, name) for name in ("throat.density", "throat.velocity", "discharge_coefficient")]
        how = "stagnation pressure times c* efficiency over mass flux of the throat times discharge coefficient"
        return Origin(path, text, how, reference("definition"), tuple(parts))

    def _condition(self, link: Calculation, name: str) -> str:
        if link.kind == "nozzle":
            return "from the state at the exit"
        if link.kind == "chamber" and link.upstream is None:
            return "balance of momentum and energy between injector face and nozzle inlet"
        return "chemical equilibrium at the enthalpy of the propellants and the chamber pressure"

    def _rests_on(self, link: Calculation, name: str) -> tuple[Origin, ...]:
        if link.kind == "nozzle":
            quantity = name.removeprefix("exit_")
            return (self.of(link, f"exit.{quantity}"),) if f"exit.{quantity}" in link.state_paths() else ()
        if link.kind != "chamber":
            return ()
        parts = [self.of(link, part) for part in ("pressure", "contraction_ratio", "pressure_at") if part != name and link.has(part)]
        if link.upstream is not None:
            parts += [self.of(link.upstream, part) for part in ("enthalpy", "thermo_basis") if link.upstream.has(part)]
        return tuple(parts)


def _text(link: Calculation, name: str) -> str:
    row = sheet.row_of(link, name, "SI")
    shown = row.value if isinstance(row.value, str) or row.value is None else numbers.pretty(row.value, row.digits)
    return f"{row.label} {shown} {cells.unit_text(row.unit)}".rstrip()


def _state_text(link: Calculation, state: str, name: str) -> str:
    row = quantities.quantity(name, "state")
    value, unit = sheet.in_display(row, getattr(link, state).si(name), "SI")
    shown = value if isinstance(value, str) or value is None else numbers.pretty(value, row.digits)
    return f"{row.label} at the {state} {shown} {cells.unit_text(unit)}".rstrip()
