"""What the flow model of a nozzle and its options make together with the chamber."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

from propkit.errors import Problem
from propkit.model.declare import as_text

if TYPE_CHECKING:
    from propkit.model.chamber import Chamber


def flow_problems(chamber: Chamber, flow: str, typed: Mapping[str, Any], values: Mapping[str, Any]) -> Iterator[Problem]:
    """Yield what is wrong with flow, freeze_at and exponent for a chamber.

    Parameters
    ----------
    chamber : Chamber
        The chamber upstream.
    flow : str
        The flow model in effect.
    typed, values : mapping
        Inputs of the nozzle as given, and as read.
    """
    freeze_at, exponent = values["freeze_at"], values["exponent"]
    if flow not in chamber.flows:
        yield Problem("flow", repr(flow), " or ".join(map(repr, chamber.flows)), chamber.flow_reason)
    if freeze_at is not None and flow != "frozen":
        allowed = "left out unless flow is 'frozen'"
        yield Problem("freeze_at", as_text(typed["freeze_at"]), allowed, f"The flow is {flow!r}.")
    elif freeze_at not in (None, "chamber") and not chamber.freezes_late:
        yield Problem("freeze_at", as_text(typed["freeze_at"]), "'chamber' or left out", chamber.flow_reason)
    if exponent is not None and flow != "constant-property":
        allowed = "left out unless flow is 'constant-property'"
        yield Problem("exponent", repr(typed["exponent"]), allowed, f"The flow is {flow!r}.")
    elif exponent is not None and not chamber.chooses_exponent:
        yield Problem("exponent", repr(typed["exponent"]), "left out for a gas with a single exponent")
    elif flow == "constant-property" and exponent != "frozen" and chamber.chooses_exponent and _on_a_plateau(chamber):
        hint = "Melting or freezing holds the temperature of this chamber: the equilibrium exponent is not above 1."
        yield Problem("exponent", repr(exponent or "equilibrium"), "'frozen' for this chamber", hint)


def _on_a_plateau(chamber: Chamber) -> bool:
    return chamber.si("isentropic_exponent") <= 1.0
