"""How a result came about: the relation, the same with numbers put in, the result; or the conditions that an iteration satisfies."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import TYPE_CHECKING, Any

from propkit.constants import GAS_CONSTANT
from propkit.errors import InputError, NotAvailableError
from propkit.model import paths, sheet, terms
from propkit.physics.expansion_parallel import Parallel
from propkit.physics.relations import RELATIONS
from propkit.report import Report, Row, Step, UnitSystem

if TYPE_CHECKING:
    from propkit.model.base import Calculation


def working_of(calculation: Calculation, result: str, system: UnitSystem, render: Callable[[Report, str], str]) -> Report:
    """Return the working of a result of the chain as a report.

    Raises
    ------
    InputError
        For a name that is no result of this chain.
    NotAvailableError
        For a result that this recipe does not have.
    """
    place = paths.resolve(calculation, result)
    link = calculation.chain()[place.position]
    name = place.name
    state, _, quantity = name.partition(".")
    if quantity:
        steps = list(state_steps(link, state, quantity))
        row = _state_row(link, state, quantity, system)
    else:
        if name not in link.declared_results and name not in link.resolved():
            if name in link.inputs:
                raise InputError(f"{result!r} was given, not computed: its working is the input itself ({link.typed_text(name)}).")
            raise InputError(f"{result!r} is an input left at its default, not computed: it has no working.")
        if not link.has(name):
            link.si(name)
        row = sheet.row_of(link, name, system)
        steps = list(result_steps(link, name, system))
    return Report(
        kind="Working",
        title=f"{row.label}, {link.subtitle()}",
        subtitle="",
        units=system,
        headline=(row,),
        steps=tuple(steps),
        render=render,
    )


def result_steps(link: Calculation, name: str, system: UnitSystem) -> Iterator[Step]:
    """Yield the steps of a declared result: its relation, those that feed it, the conditions of the states behind it."""
    key = terms.key_for(link, name)
    if key in RELATIONS:
        yield relation_step(key, terms.values_for(link, key, name), name, sheet.row_of(link, name, system))
    for label, other, values in terms.supporting(link, name):
        yield relation_step(other, values, label, None)
    yield from terms.conditions(link, name)


def relation_step(key: str, values: Mapping[str, float], name: str, result: Row | None) -> Step:
    """Return a relation with the numbers put in."""
    relation = RELATIONS[key]
    row = result or _plain_row(key, name, relation.evaluate(values))
    return Step(
        name=name,
        label=row.label,
        text=f"{name} = {relation.written}",
        latex=relation.latex,
        numbers=f"{name} = {relation.substitute(values)}",
        numbers_latex=f"{relation.result.symbol} = {relation.substitute_latex(values)}",
        result=row,
        source=relation.source,
    )


def _plain_row(key: str, name: str, value: float) -> Row:
    relation = RELATIONS[key]
    label = name.replace("_", " ")
    return Row(
        name,
        label,
        relation.result.symbol,
        value,
        relation.result.unit,
        6,
        "computed",
        relation=key,
        source=relation.source,
    )


def _state_row(link: Calculation, state: str, quantity: str, system: UnitSystem) -> Row:
    from propkit import quantities

    entry = quantities.quantity(quantity, "state")
    value, unit = sheet.in_display(entry, getattr(link, state).si(quantity), system)
    return Row(f"{state}.{quantity}", f"{entry.label} at the {state}", entry.symbol, value, unit, entry.digits, "computed")


def state_steps(link: Any, state: str, quantity: str) -> Iterator[Step]:
    """Yield the conditions that a state of the nozzle satisfies."""
    if quantity not in getattr(link, state).names():
        raise NotAvailableError(f"the {state} state has no {quantity}")
    values = {name: getattr(link, state).si(name) for name in getattr(link, state).names()}
    simple = {"mach": "mach", "sound_speed": "sound_speed", "density": "ideal_gas_density"}
    if quantity in simple and (quantity == "mach" or not isinstance(link.held.isentrope, Parallel)):
        there = dict(values)
        if "molar_mass" in there:
            there["gas_constant"] = GAS_CONSTANT / there["molar_mass"]
        yield relation_step(simple[quantity], there, f"{state}.{quantity}", None)
    yield from terms.state_conditions(link, state)
