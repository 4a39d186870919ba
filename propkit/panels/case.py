"""The face of a propellant case."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from propkit.panels.faces import Face

ROLES = ("oxidizer", "fuel", "propellant")
WHAT = (*ROLES, "gas")
"""Inputs that are a propellant."""
AS_GIVEN = "as given"


class CaseFace(Face):
    """Propellants by name from the library, mixture ratio or equivalence ratio, states as stored."""

    minor = (
        "oxidizer_temperature", "fuel_temperature", "oxidizer_pressure", "fuel_pressure", "propellant_temperature", "propellant_pressure",
        "tank_pressure", "thermo_basis", "condensed", "name",
    )  # fmt: skip
    only_in_code = ("additives",)

    def effective(self, name: str) -> float | None:
        """Return the value in effect: a stored temperature is that of the propellant where none is given."""
        found = super().effective(name)
        role, _, what = name.partition("_")
        if found is None and what == "temperature" and role in ROLES:
            stored = getattr(getattr(self.link._values.get(role), "row", None), "temperature", None)
            return None if stored is None else float(stored)
        return found

    def text_now(self, name: str, system: Any = "SI") -> str:
        """Return the text of an input; a stored state that is not given shows as empty."""
        role, _, what = name.partition("_")
        if what in ("temperature", "pressure") and role in ROLES and name not in self.link.inputs:
            return ""
        return super().text_now(name, system)

    def choices(self, name: str) -> Mapping[str, str] | None:
        """Return the library's propellants of a role, and the one given where it is none of them."""
        if name not in self.link.declared_inputs or name not in WHAT:
            return super().choices(name)
        listed = dict(library_names(name).items())
        if self.choice_now(name) == AS_GIVEN:
            listed = {AS_GIVEN: f"{self.link.input_text(name)} (as given)", **listed}
        return listed

    def choice_now(self, name: str) -> str:
        """Return the library name of a propellant, or that it is one of the analyst's own."""
        if name not in WHAT:
            return super().choice_now(name)
        typed = self.link.inputs.get(name)
        return typed if isinstance(typed, str) and typed in library_names(name) else AS_GIVEN

    def chosen(self, name: str, choice: str) -> Any:
        """Return the propellant that a choice stands for."""
        return self.link.inputs[name] if choice == AS_GIVEN else super().chosen(name, choice)

    def placeholder(self, name: str) -> str:
        """Return what an empty field says."""
        if name.endswith("_temperature"):
            stored = self.effective(name)
            return "as stored" if stored is None else f"{stored:.5g} K, as stored"
        return "as stored"


def library_names(role: str) -> dict[str, str]:
    """Return library names of a role with what they are."""
    from propkit.model.propellant import propellants

    if role not in _LISTED:
        frame = propellants()
        suits = frame["role"].str.contains(role) if role in ROLES[:2] else frame["role"].notna()
        _LISTED[role] = {str(name): f"{name} · {title}" for name, title in frame.loc[suits, "title"].items()}
    return _LISTED[role]


_LISTED: dict[str, dict[str, str]] = {}
