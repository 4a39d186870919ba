"""Wall contours: a cone or a parabolic bell, declared apart from the size of the nozzle that they are given to."""

from __future__ import annotations

import math
from typing import Any, ClassVar

from propkit.errors import InputError, Problem
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import Bounds, NumberInput, QuantityInput, as_text
from propkit.physics import bell_table, contour, losses
from propkit.physics.wall import Segment

_ARCS = Bounds(above=0.0, at_most=10.0)
_ANGLES = Bounds(above=0.0, below=math.radians(90.0))
_HINT_ANGLE = 'A plain number is in radians; write "15 deg".'


class Contour(Calculation):
    """What every contour has: the arcs at the throat and the convergent. Use `Cone` or `Bell`.

    Parameters
    ----------
    throat_arc, upstream_arc : float
        Radii of the arcs downstream and upstream of the throat over the throat radius [1].
    inlet_arc : float
        Radius of the arc between cylinder and convergent over the throat radius [1].
    convergent_angle : quantity
        Half-angle of the convergent [rad]; 30 degrees by default, or less where the arcs leave no room for it.
    """

    kind = "contour"
    title = "Contour"
    divergence_relation: ClassVar[str] = ""

    throat_arc: NumberInput = NumberInput(
        doc="radius of the arc downstream of the throat over the throat radius", default=contour.DOWNSTREAM_ARC, bounds=_ARCS
    )
    upstream_arc: NumberInput = NumberInput(
        doc="radius of the arc upstream of the throat over the throat radius", default=contour.UPSTREAM_ARC, bounds=_ARCS
    )
    inlet_arc: NumberInput = NumberInput(
        doc="radius of the arc between cylinder and convergent over the throat radius", default=contour.INLET_ARC, bounds=_ARCS
    )
    convergent_angle: QuantityInput = QuantityInput(
        doc="half-angle of the convergent, 30 degrees where it fits", default=None, bounds=_ANGLES, hint=_HINT_ANGLE
    )

    def divergent(self, throat_radius: float, area_ratio: float) -> tuple[Segment, ...]:
        """Return the divergent as segments from the throat (x = 0) to the lip; InputError where none fits."""
        raise NotImplementedError

    def divergence_terms(self, segments: tuple[Segment, ...], throat_radius: float) -> dict[str, float]:
        """Return the angles [rad] that the divergence factor follows from, by the names of its relation."""
        raise NotImplementedError

    def divergence_factor(self, segments: tuple[Segment, ...], throat_radius: float) -> float:
        """Return the factor on the momentum thrust of a divergent."""
        raise NotImplementedError

    def own_doubts(self, area_ratio: float) -> tuple[str, ...]:
        """Return what is doubtful about this contour at an area ratio."""
        return ()

    def upstream_wall(
        self, throat_radius: float, contraction_ratio: float, characteristic_length: float | None = None
    ) -> tuple[Segment, ...]:
        """Return convergent and, where the characteristic length [m] is known, cylinder; ends at x = 0."""
        given = throat_radius, contraction_ratio
        arcs = self.si("upstream_arc"), self.si("inlet_arc")
        angle = self._values["convergent_angle"]
        if characteristic_length is None:
            return contour.convergent(*given, angle, *arcs)
        return contour.chamber(*given, characteristic_length, angle, *arcs)

    def subtitle(self) -> str:
        """Return what tells the contour from others."""
        return repr(self)


class Cone(Contour):
    """A conical divergent.

    Parameters
    ----------
    half_angle : quantity
        Half-angle of the cone [rad], for instance ``"15 deg"``.
    throat_arc, upstream_arc, inlet_arc, convergent_angle
        As for `Contour`.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.
    """

    divergence_relation = "cone_divergence_factor"

    half_angle: QuantityInput = QuantityInput(doc="half-angle of the cone", bounds=_ANGLES, kw_only=False, hint=_HINT_ANGLE)

    def _calculate(self) -> Outcome:
        return Outcome(absent={"convergent_angle": "30 degrees, or less where the arcs leave no room for it"})

    def divergent(self, throat_radius: float, area_ratio: float) -> tuple[Segment, ...]:
        """Return throat arc and straight wall."""
        return contour.cone(throat_radius, area_ratio, self.si("half_angle"), self.si("throat_arc"))

    def divergence_terms(self, segments: tuple[Segment, ...], throat_radius: float) -> dict[str, float]:
        """Return the half-angle."""
        return {"half_angle": self.si("half_angle")}

    def divergence_factor(self, segments: tuple[Segment, ...], throat_radius: float) -> float:
        """Return (1 + cos a)/2."""
        return float(losses.cone_divergence_factor(self.si("half_angle")))

    @property
    def text(self) -> str:
        """The contour in words."""
        return f"cone of {math.degrees(self.si('half_angle')):.4g}°"


class Bell(Contour):
    """A parabolic bell after Rao: throat arc and a parabola between two wall angles.

    Parameters
    ----------
    length : float
        Length from throat to lip over that of a 15 degree cone of the same area ratio [1], 0.6 to 1 with the angles of the
        table.
    throat_angle, exit_angle : quantity
        Wall angles [rad] where the parabola starts and at the lip; by default read from the published chart.
    throat_arc, upstream_arc, inlet_arc, convergent_angle
        As for `Contour`.

    Raises
    ------
    InputError
        Listing every input that is wrong.
    """

    divergence_relation = "bell_divergence_factor"

    length: NumberInput = NumberInput(
        doc="length over that of a 15 degree cone", default=0.8, bounds=Bounds(above=0.0, at_most=2.0), kw_only=False,
        hint="It is a share: 0.8 is the common 80 % bell.",
    )  # fmt: skip
    throat_angle: QuantityInput = QuantityInput(doc="wall angle where the parabola starts", default=None, bounds=_ANGLES, hint=_HINT_ANGLE)
    exit_angle: QuantityInput = QuantityInput(
        doc="wall angle at the lip", default=None, bounds=Bounds(at_least=0.0, below=math.radians(90.0)), hint=_HINT_ANGLE
    )

    def _check(self, bad: set[str]) -> list[Problem]:
        steep, flat = self._values["throat_angle"], self._values["exit_angle"]
        if steep is not None and flat is not None and flat >= steep:
            return [Problem("exit_angle", as_text(self._typed["exit_angle"]), "below the throat angle", "A bell turns back to the axis.")]
        return []

    def _calculate(self) -> Outcome:
        chart = "read from the chart at the area ratio of the nozzle that the bell is given to"
        absent = {"throat_angle": chart, "exit_angle": chart}
        return Outcome(absent={**absent, "convergent_angle": "30 degrees, or less where the arcs leave no room for it"})

    def divergent(self, throat_radius: float, area_ratio: float) -> tuple[Segment, ...]:
        """Return throat arc and parabola."""
        angles = self._values["throat_angle"], self._values["exit_angle"]
        return contour.bell(throat_radius, area_ratio, self.si("length"), *angles, self.si("throat_arc"))

    def divergence_terms(self, segments: tuple[Segment, ...], throat_radius: float) -> dict[str, float]:
        """Return the angle of the line from throat to lip, and the wall angle at the lip."""
        chord = contour.throat_to_lip_angle(segments, throat_radius)
        return {"throat_to_lip_angle": chord, "lip_angle": contour.lip_angle(segments)}

    def divergence_factor(self, segments: tuple[Segment, ...], throat_radius: float) -> float:
        """Return that of a cone of the mean of both angles."""
        return float(losses.bell_divergence_factor(**self.divergence_terms(segments, throat_radius)))

    def own_doubts(self, area_ratio: float) -> tuple[str, ...]:
        """Say where the chart of wall angles is continued beyond its ends."""
        given = self._values["throat_angle"] is not None and self._values["exit_angle"] is not None
        if given or bool(bell_table.inside_table(area_ratio)):
            return ()
        low, high = bell_table.AREA_RATIOS[0], bell_table.AREA_RATIOS[-1]
        return (
            f"The wall angles are continued beyond the chart, which covers area ratios {low:g} to {high:g}; give throat_angle and exit_angle where they are known.",
        )

    @property
    def text(self) -> str:
        """The contour in words."""
        return f"bell of {100.0 * self.si('length'):.4g} % length"


def read_contour(name: str, value: Any) -> Contour:
    """Return `value` when it is a contour."""
    if isinstance(value, Cone | Bell):
        return value
    raise InputError(Problem(name, as_text(value), 'a contour: pk.Cone("15 deg") or pk.Bell(length=0.8)'))
