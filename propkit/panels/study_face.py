"""The face of a study: its axes, the result shown, the limits."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from propkit.panels.faces import Face, Unit
from propkit.panels.last_link import ChoiceSetting
from propkit.panels.session import FACES
from propkit.panels.steps import Scale


class SettingFace(Face):
    """What a panel shows of the settings of an analysis."""

    minor = ()

    def label(self, name: str) -> str:
        """Return the label of a setting."""
        return str(self.link.declared_inputs[name].label)

    def choices(self, name: str) -> Mapping[str, str] | None:
        """Return the words of a choice with what a person reads."""
        entry = self.link.declared_inputs.get(name)
        return entry.options if isinstance(entry, ChoiceSetting) else None

    def choice_now(self, name: str) -> str:
        """Return the choice in effect."""
        return str(self.link.si(name))

    def chosen(self, name: str, choice: str) -> Any:
        """Return the setting that a choice stands for."""
        return choice

    def placeholder(self, name: str) -> str:
        """Return what an empty field says."""
        return "no limit" if name.startswith("limit") else super().placeholder(name)


class StudyFace(SettingFace):
    """Axes with their ends and points, the result, the optimum, limits."""

    minor = ("optimum",)

    def scale(self, name: str, unit: Unit) -> Scale | None:
        """Return no slider: ends and limits are typed."""
        return None


FACES["study"] = StudyFace
