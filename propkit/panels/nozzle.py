"""The face of a nozzle: how far it expands, and which size is given."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from propkit.chain import sizing
from propkit.panels.faces import Face, Group

EXPANSIONS = ("area_ratio", "exit_pressure")
THROATS, LIPS, FLOWS = tuple(sizing.THROAT_SIZES), tuple(sizing.EXIT_SIZES), tuple(sizing.FLOW_SIZES)
NO_CONTOUR, AS_GIVEN = "none", "as given"
CONTOURS = {"cone": "cone of 15°", "bell 80": "bell, 80 % of the cone's length", "bell 70": "bell, 70 % of the cone's length"}
"""Contours that the panel offers, with their labels."""


def contour_of(choice: str) -> Any:
    """Return the contour of a choice."""
    from propkit.model.contour import Bell, Cone

    return Cone("15 deg") if choice == "cone" else Bell(length=0.8 if choice == "bell 80" else 0.7)


class NozzleFace(Face):
    """Two groups: what says the expansion (an exit size may, beside a throat size), and the size."""

    minor = ("discharge_coefficient", "contour", "wall_thickness", "wall_density", "name")

    def groups(self) -> tuple[Group, ...]:
        """Return the groups of expansion and size with their given members."""
        given = self.link.inputs
        size = next(name for name in (*THROATS, *FLOWS, *LIPS) if name in given)
        expansion = next((name for name in EXPANSIONS if name in given), "")
        expansion = expansion or next(name for name in LIPS if name in given)
        ways = (*EXPANSIONS, *LIPS) if size in THROATS else EXPANSIONS
        sizes = (*THROATS, *LIPS, *FLOWS) if expansion in EXPANSIONS else THROATS
        return (
            Group(f"{self.kind}:expansion", "expansion given by", ways, expansion),
            Group(f"{self.kind}:size", "size given by", sizes, size),
        )

    def hidden(self) -> frozenset[str]:
        """Return what the flow model and the size given have no use for."""
        flow, given = self.link._values["flow"], self.link.inputs
        unused = {name for name, model in (("freeze_at", "frozen"), ("exponent", "constant-property")) if flow != model}
        if not self.link.chamber.has("frozen_isentropic_exponent"):
            unused.add("exponent")
        unused |= {"wall_thickness", "wall_density"} if "contour" not in given else set()
        unused |= {"wall_density"} if "wall_thickness" not in given else set()
        two_sizes = any(name in given for name in THROATS) and any(name in given for name in LIPS)
        listed = {group.member for group in self.groups()}
        unused |= {name for name in (*EXPANSIONS, *THROATS, *LIPS, *FLOWS) if name not in listed}
        if "thrust" not in given or two_sizes:
            unused.add("sizing_ambient")
        return frozenset(unused)

    def choose(self, group: Group, member: str) -> dict[str, Any]:
        """Return the changes that make `member` the given one: a lip size as expansion keeps the throat size."""
        changes = {self.path(member): self.text_now(member)}
        other = next(found for found in self.groups() if found.key != group.key)
        if member in LIPS and group.key.endswith("expansion"):
            changes[self.path(other.member)] = self.link.inputs[other.member]
        if member in THROATS and other.member in LIPS:
            changes[self.path(other.member)] = self.link.inputs[other.member]
        if member == "thrust":
            changes = {self.path("thrust"): self._vacuum_thrust(), self.path("sizing_ambient"): "vacuum"}
        return changes

    def _vacuum_thrust(self) -> str:
        from propkit.model.performance import Performance
        from propkit.panels.steps import value_text

        force = Performance(self.link, ambient="vacuum").si("thrust")
        scale, unit = next((s, u) for s, u in ((1e6, "MN"), (1e3, "kN"), (1.0, "N")) if force >= s or s == 1.0)
        return f"{value_text(force / scale)} {unit}"

    def companions(self, name: str) -> dict[str, Any]:
        """Return inputs that must be named beside `name`, so that none of them is displaced."""
        given = self.link.inputs
        if name in (*THROATS, *LIPS):
            return {
                self.path(other): given[other]
                for other in (*THROATS, *LIPS)
                if other in given and other != name and self._pair(name, other)
            }
        if name == "sizing_ambient" and "thrust" in given:
            return {self.path("thrust"): given["thrust"]}
        if name == "thrust" and "sizing_ambient" in given:
            return {self.path("sizing_ambient"): self.link.inputs["sizing_ambient"]}
        return {}

    def _pair(self, name: str, other: str) -> bool:
        return (name in THROATS) != (other in THROATS)

    def choices(self, name: str) -> Mapping[str, str] | None:
        """Return the choices; a flow model only where the chamber allows it."""
        found = super().choices(name)
        if name == "flow":
            return {flow: flow for flow in self.link.chamber.flows}
        if name == "contour":
            listed = {NO_CONTOUR: "none", **CONTOURS}
            return {AS_GIVEN: repr(self.link.inputs[name]), **listed} if self.choice_now(name) == AS_GIVEN else listed
        return found

    def choice_now(self, name: str) -> str:
        """Return the choice in effect; a contour that is none of those offered stays as it was given."""
        if name != "contour":
            return super().choice_now(name)
        given = self.link.inputs.get(name)
        return NO_CONTOUR if given is None else next((key for key in CONTOURS if contour_of(key) == given), AS_GIVEN)

    def chosen(self, name: str, choice: str) -> Any:
        """Return the input that a choice stands for."""
        if name != "contour":
            return super().chosen(name, choice)
        return None if choice == NO_CONTOUR else self.link.inputs[name] if choice == AS_GIVEN else contour_of(choice)

    def suggestions(self, name: str) -> tuple[str, ...]:
        """Return what the field of the freezing place and of the sizing ambient offer."""
        return {"freeze_at": ("chamber", "throat"), "sizing_ambient": ("sea level", "vacuum")}.get(name, ())

    def text_now(self, name: str, system: Any = "SI") -> str:
        """Return the text of an input; a place of freezing is a word or a ratio."""
        if name == "freeze_at":
            return str(self.link._values["freeze_at"])
        return super().text_now(name, system)
