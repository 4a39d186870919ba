"""From an object to the content of its record: everything a reviewer compares, in plain values and SI units."""

from __future__ import annotations

import sys
import unicodedata
from collections.abc import Mapping
from datetime import UTC, datetime
from typing import Any

from propkit.bridge.basis import load_basis
from propkit.errors import InputError, NotAvailableError, Problem, PropkitError
from propkit.model.base import Calculation
from propkit.model.declare import CustomInput, Declared
from propkit.record.canonical import digest_of, plain, text_digest
from propkit.versions import numeric_versions

SMALLEST_FRACTION = 1e-8
"""Mole fractions from here up are recorded."""

FREE_TEXT = ("title", "author", "purpose", "notes")
LONGEST = {"title": 200, "author": 200, "purpose": 2000, "notes": 4000}

CAUTIONS = (
    "Preliminary analysis, not a release of hardware.",
    "Propellants are toxic, cryogenic, oxidising or explosive; handling them needs training and protection.",
    "Firing and pressure work follow local codes, range rules and licensed practice.",
    "Export-control rules may apply to these data.",
)


def content_of(calculation: Calculation, texts: Mapping[str, str], smallest: float = SMALLEST_FRACTION) -> dict[str, Any]:
    """Return the content of the record of the chain that ends in an object.

    Parameters
    ----------
    calculation : Calculation
        The last object of the chain.
    texts : mapping
        title, author, purpose, notes.
    smallest : float
        Smallest mole fraction that is recorded [1].

    Returns
    -------
    dict
        Plain values.
    """
    chain = calculation.chain()
    content: dict[str, Any] = {name: texts.get(name, "") for name in FREE_TEXT}
    content["object"] = calculation.kind
    content["description"] = calculation.subtitle()
    content["recipe"] = plain(calculation.recipe())
    content["objects"] = {link.kind: _object(link) for link in chain}
    content["basis"] = _basis(chain)
    content["propellants"] = _propellants(chain)
    content["assumptions"] = [_assumption(entry) for entry in calculation.assumptions]
    content["warnings"] = [{"text": str(doubt), "code": doubt.code, "about": doubt.about} for doubt in calculation.warnings]
    content["stations"] = _stations(chain)
    content["composition"] = _composition(chain, smallest)
    content["second_engine"] = _second_engine(calculation)
    content["cautions"] = [*calculation.cautions(), *CAUTIONS]
    return content


def read_texts(texts: Mapping[str, Any]) -> dict[str, str]:
    """Return title, author, purpose and notes after checking them.

    Raises
    ------
    InputError
        For a text that is none, is too long, or holds control characters; all are listed.
    """
    problems = []
    for name, value in texts.items():
        longest = LONGEST[name]
        legal = isinstance(value, str) and len(value) <= longest and all(printable(character) for character in value)
        if not legal:
            shown = ascii(value)
            shown = shown if len(shown) <= 60 else f"{shown[:57]}..."
            problems.append(Problem(name, shown, f"a text of at most {longest} characters without control characters"))
    if problems:
        raise InputError(problems)
    return {name: str(value) for name, value in texts.items()}


_JOINERS = "\u200c\u200d"


def printable(character: str) -> bool:
    """Whether a character may stand in a text: letters, signs, spaces of every width, line ends; no controls, no half characters."""
    return character.isprintable() or character in "\n\t" or character in _JOINERS or unicodedata.category(character) == "Zs"


def provenance_now(show_cell: bool = False) -> dict[str, Any]:
    """Return versions, UTC time and, for a record that is shown, the digest of the notebook cell."""
    made: dict[str, Any] = {
        "versions": numeric_versions(),
        "time": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
    }
    cell = current_cell() if show_cell else None
    if cell is not None:
        made["cell"] = text_digest(cell)
    return made


def current_cell() -> str | None:
    """Return the source of the notebook cell that is running, or None outside a notebook. IPython is never imported here."""
    ipython = sys.modules.get("IPython")
    shell = ipython.get_ipython() if ipython is not None else None
    history = getattr(getattr(shell, "history_manager", None), "input_hist_raw", None)
    return str(history[-1]) if shell is not None and hasattr(shell, "kernel") and history and history[-1] else None


def _object(link: Calculation) -> dict[str, Any]:
    inputs = {}
    for name, entry in link.declared_inputs.items():
        if name in (link.upstream_input, "name") or (name not in link.inputs and link.kind_of(name) == "computed"):
            continue
        inputs[name] = _input(link, name, entry.quantity.unit)
    results = {}
    for name in (*link.resolved(), *link.declared_results):
        if not link.has(name) or name in inputs:
            continue
        declared: Declared = link.declared_results.get(name) or link.declared_inputs[name]
        value = plain(link.si(name))
        if value is not None:
            results[name] = {"value": value, "unit": declared.quantity.unit}
    absent = {
        name: str(reason)
        for name, reason in link._outcome.absent.items()
        if name not in results and name not in inputs and not link.has(name)
    }
    return {"name": link.given_name(), "inputs": inputs, "results": results, "absent": absent}


def _input(link: Calculation, name: str, unit: str) -> dict[str, Any]:
    value = link.given_or_result(name)
    made: dict[str, Any] = {"kind": link.kind_of(name)}
    if name in link.inputs:
        typed = link.inputs[name]
        made["typed"] = plain(typed) if isinstance(typed, str | int | float | bool) else link.input_text(name)
    if isinstance(value, int | float) and not isinstance(value, bool):
        made |= {"value": plain(float(value)), "unit": unit}
    elif isinstance(link.declared_inputs[name], CustomInput):
        made |= {"value": link.input_text(name), "unit": ""}
    else:
        made |= {"value": value if isinstance(value, bool) else str(value), "unit": ""}
    return made


def _basis(chain: tuple[Calculation, ...]) -> dict[str, Any] | None:
    for link in chain:
        mixture = getattr(link.held, "mixture", None)
        if mixture is not None:
            basis = load_basis(str(link.si("thermo_basis")))
            symbols = sorted(str(symbol) for symbol in mixture.symbols)
            checksum = basis.checksum(tuple(symbols), mixture.condensed)
            return {"name": basis.name, "title": basis.title, "elements": symbols, "checksum": checksum}
    return None


def _propellants(chain: tuple[Calculation, ...]) -> dict[str, Any]:
    made = {}
    for name in chain[0].declared_inputs:
        row = getattr(chain[0]._values.get(name), "row", None)
        if row is None:
            continue
        shown = {
            "name": row.name,
            "formula": row.formula,
            "molar_mass": row.molar_mass,
            "molar_enthalpy": row.molar_enthalpy,
            "temperature": row.temperature,
            "density": row.density,
            "source": row.source,
            "trust": row.trust,
            "hazard": row.hazard,
        }
        made[name] = {**plain(shown), "checksum": digest_of(plain(row))}
    return made


def _assumption(entry: Any) -> dict[str, Any]:
    made: dict[str, Any] = plain(entry)
    return made


def _stations(chain: tuple[Calculation, ...]) -> dict[str, Any]:
    from propkit.model.state import State

    states: tuple[State, ...] = ()
    for link in chain:
        for method in ("all_states", "states"):
            if hasattr(link, method):
                states = getattr(link, method)()
                break
    rows = [{"station": state.station, **{name: plain(state.si(name)) for name in state.names()}} for state in states]
    names = dict.fromkeys(name for row in rows for name in row if name != "station")
    return {"units": {name: getattr(State, name).quantity.unit for name in names}, "rows": rows}


def _composition(chain: tuple[Calculation, ...], smallest: float) -> dict[str, dict[str, float]]:
    listed: list[tuple[str, list[tuple[str, float]]]] = []
    for link in chain:
        if link.kind == "chamber" and hasattr(link.held, "composition") and (link is chain[-1] or link.states()):  # type: ignore[attr-defined]
            listed.append(("injector face", link.held.composition()))
        if link.kind == "nozzle":
            listed += link.held.compositions()
    return {station: {species: float(value) for species, value in pairs if value >= smallest} for station, pairs in listed}


def _second_engine(calculation: Calculation) -> dict[str, Any]:
    check = getattr(calculation, "cross_check", None)
    if check is None:
        return {"reason": "the second engine solves chamber, throat and exit; it is recorded with a performance"}
    try:
        found: dict[str, Any] = plain(check())
    except NotAvailableError as error:
        return {"reason": error.message}
    except PropkitError as error:
        return {"reason": f"the second engine found no solution: {error.message}"}
    return found
