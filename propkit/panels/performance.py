"""The face of a performance: the surroundings, by word, pressure or altitude."""

from __future__ import annotations

from typing import Any

from propkit.model import sheet
from propkit.panels import show
from propkit.panels.faces import Face, Unit
from propkit.panels.steps import Scale
from propkit.physics import atmosphere
from propkit.report import UnitSystem
from propkit.units import shown_unit

HIGHEST = 40.0
ALTITUDES = Unit("km", 1e3)


class PerformanceFace(Face):
    """The ambient condition: the text field takes every form, the slider is an altitude."""

    minor = ("minimum_pressure", "name")
    only_in_code = ("losses",)

    def label(self, name: str) -> str:
        """Return the label of a control: the slider of the surroundings is an altitude."""
        return "surroundings (slider: altitude)" if name == "ambient" else super().label(name)

    def told(self, name: str, system: UnitSystem) -> str:
        """Return the pressure of the surroundings."""
        if name != "ambient":
            return super().told(name, system)
        quantity = self.declared(name).quantity
        shown, unit = sheet.in_display(quantity, self.link.si("ambient"), system)
        return f"{show.value(shown, quantity.digits)} {shown_unit(unit)}"

    def suggestions(self, name: str) -> tuple[str, ...]:
        """Return what the field offers."""
        return ("sea level", "vacuum") if name == "ambient" else ()

    def text_now(self, name: str, system: Any = "SI") -> str:
        """Return the ambient condition as it was typed; a bare number is a pressure in Pa."""
        typed = self.link.inputs.get(name)
        if name == "ambient" and not isinstance(typed, str):
            return str(self.link.input_text(name))
        return super().text_now(name, system)

    def unit(self, name: str, system: Any) -> Unit:
        """Return kilometres for the slider of the surroundings."""
        return ALTITUDES if name == "ambient" else super().unit(name, system)

    def scale(self, name: str, unit: Unit) -> Scale | None:
        """Return the slider over altitude."""
        return Scale(0.0, HIGHEST, 0.2) if name == "ambient" else super().scale(name, unit)

    def position(self, name: str, unit: Unit) -> float | None:
        """Return the altitude of the ambient condition; the end of the slider for a vacuum."""
        if name != "ambient":
            return super().position(name, unit)
        ambient = self.link._values["ambient"]
        if ambient.altitude is not None:
            return float(ambient.altitude) / 1e3
        if ambient.pressure <= float(atmosphere.pressure(HIGHEST * 1e3)):
            return HIGHEST
        ground = float(atmosphere.pressure(0.0))
        return float(atmosphere.altitude_of_pressure(ambient.pressure)) / 1e3 if ambient.pressure < ground else 0.0
