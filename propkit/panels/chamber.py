"""The face of a chamber."""

from __future__ import annotations

from propkit.panels.faces import Face, Unit
from propkit.panels.steps import Scale

WIDEST_SHOWN = 8.0


class ChamberFace(Face):
    """Pressure, contraction and c* efficiency."""

    minor = ("pressure_at", "characteristic_length", "name")

    def scale(self, name: str, unit: Unit) -> Scale | None:
        """Return a slider; that of the contraction ratio ends where contraction hardly matters any more."""
        if name == "contraction_ratio":
            return Scale(1.1, WIDEST_SHOWN, 0.05)
        return super().scale(name, unit)

    def position(self, name: str, unit: Unit) -> float | None:
        """Return where the slider stands: at its end for a chamber at rest."""
        found = super().position(name, unit)
        return WIDEST_SHOWN if name == "contraction_ratio" and found is None else found
