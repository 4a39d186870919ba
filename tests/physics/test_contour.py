"""Contours: closed-form solids, joints, published bell lengths and angles, and geometries that cannot be."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import trapezoid

from propkit.errors import InputError
from propkit.physics import contour, gas_dynamics, wall
from propkit.physics.bell_table import bell_angles, inside_table

FIFTEEN = math.radians(15.0)


def whole(throat_radius: float, contraction: float, ratio: float) -> tuple[wall.Segment, ...]:
    return (*contour.chamber(throat_radius, contraction, 40.0 * throat_radius), *contour.bell(throat_radius, ratio))


@given(st.floats(1e-3, 1.0), st.floats(2.0, 12.0), st.floats(5.0, 100.0))
def test_joints_are_smooth_and_the_wall_runs_forward(throat_radius: float, contraction: float, ratio: float) -> None:
    pieces = whole(throat_radius, contraction, ratio)
    ends = np.array([0.0, 1.0])
    for first, second in itertools.pairwise(pieces):
        for one, other in zip(first.points(ends), second.points(ends), strict=True):
            assert other[0] == pytest.approx(one[1], abs=1e-12)
        assert second.angles(ends)[0] == pytest.approx(first.angles(ends)[1], abs=1e-9)
    shape = wall.draw(pieces)
    assert np.all(np.diff(shape.x) > 0.0)
    assert shape.r.min() == pytest.approx(throat_radius, rel=1e-12)
    assert shape.r[0] == pytest.approx(throat_radius * math.sqrt(contraction), rel=1e-12)
    assert shape.r[-1] == pytest.approx(throat_radius * math.sqrt(ratio), rel=1e-12)


def test_straight_pieces_against_frustum_formulas() -> None:
    """Closed form: pi (r1 + r2) slant, pi h (r1^2 + r1 r2 + r2^2)/3; force of even pressure p pi (r2^2 - r1^2)."""
    piece = (wall.straight("frustum", (0.1, 0.2), (0.5, 0.35)),)
    slant = math.hypot(0.4, 0.15)
    assert wall.wetted_area(piece) == pytest.approx(math.pi * 0.55 * slant, rel=1e-13)
    assert wall.volume(piece) == pytest.approx(math.pi * 0.4 * (0.2**2 + 0.2 * 0.35 + 0.35**2) / 3.0, rel=1e-13)
    assert wall.length(piece) == pytest.approx(0.4)
    points = wall.quadrature(piece)
    force = wall.wall_force(np.full_like(points.r, 3e5), points)
    assert force == pytest.approx(3e5 * math.pi * (0.35**2 - 0.2**2), rel=1e-12)


def test_arc_against_the_torus_zone() -> None:
    """Closed form of the zone of a torus: area 2 pi R (c a - R sin a), c the distance of the centre from the axis."""
    angle, radius, centre = math.radians(28.0), 0.04, 0.14
    arc = (wall.Arc("arc", 0.0, centre, radius, 0.0, angle),)
    expected = 2.0 * math.pi * radius * (centre * angle - radius * math.sin(angle))
    assert wall.wetted_area(arc) == pytest.approx(expected, rel=1e-13)
    points = wall.quadrature(arc)
    assert float(np.sum(points.ds)) == pytest.approx(radius * angle, rel=1e-13)
    assert points.curvature[0] == pytest.approx(1.0 / radius)


def test_parabola_curvature_against_differences() -> None:
    bell = contour.bell(0.1, 30.0)[1]
    share = np.linspace(0.1, 0.9, 9)
    step = 1e-5
    turn = bell.angles(share + step) - bell.angles(share - step)
    run = np.hypot(*bell.slopes(share)) * 2.0 * step
    np.testing.assert_allclose(bell.curvatures(share), turn / run, rtol=1e-6)
    assert np.all(bell.curvatures(share) < 0.0)


def test_wall_material_against_closed_forms() -> None:
    """A pipe, pi ((R + t)^2 - R^2) L; a whole convergent, whose ends are radial: volume outside less volume inside."""
    pipe = (wall.straight("pipe", (0.0, 0.1), (0.7, 0.1)),)
    assert wall.wall_volume(pipe, 0.004) == pytest.approx(math.pi * (0.104**2 - 0.1**2) * 0.7, rel=1e-13)
    pieces = contour.convergent(0.05, 4.0)
    thickness = 0.01
    shape = wall.draw(pieces, 4001)
    x_out, r_out = shape.x - thickness * np.sin(shape.angle), shape.r + thickness * np.cos(shape.angle)
    outside = trapezoid(np.pi * r_out**2, x_out)
    assert wall.wall_volume(pieces, thickness) == pytest.approx(outside - wall.volume(pieces), rel=1e-6)


@pytest.mark.parametrize(("ratio", "length"), [(10.0, 8.07), (25.0, 14.93), (50.0, 22.66)])
def test_cone_lengths_as_printed(ratio: float, length: float) -> None:
    """Sutton & Biblarz, table of bell nozzles: 15 degree cone in throat radii, from memory; printed digits."""
    assert float(contour.cone_length(1.0, ratio, FIFTEEN, 0.0)) == pytest.approx(length, abs=0.006)


@pytest.mark.parametrize(
    ("ratio", "length", "start", "lip"), [(10.0, 6.45, 25.0, 10.0), (25.0, 11.94, 30.0, 8.0), (50.0, 18.12, 32.0, 7.5)]
)
def test_bell_of_four_fifths_as_printed(ratio: float, length: float, start: float, lip: float) -> None:
    """Sutton & Biblarz, table of bell nozzles, from memory. Length 1 % (no throat arc there); angles 1.5 degrees."""
    pieces = contour.bell(1.0, ratio, 0.8)
    assert wall.length(pieces) == pytest.approx(length, rel=1e-2)
    found = [math.degrees(float(angle)) for angle in bell_angles(ratio, 0.8)]
    assert found == pytest.approx([start, lip], abs=1.5)
    assert math.degrees(contour.lip_angle(pieces)) == pytest.approx(found[1], abs=1e-9)


def test_bell_of_a_handbook_example() -> None:
    """A design handbook's example, from memory: area ratio 14, 80 %, throat radius 12.45: 27.4 and 9.8 degrees; the
    parabola starts at x = 2.19, r = 12.98 (1 degree of the chart; the point follows from the angle)."""
    found = [math.degrees(float(angle)) for angle in bell_angles(14.0, 0.8)]
    assert found == pytest.approx([27.4, 9.8], abs=1.0)
    pieces = contour.bell(12.45, 14.0, 0.8, math.radians(27.4), math.radians(9.8))
    x, r = pieces[1].points(np.array([0.0]))
    assert (x[0], r[0]) == pytest.approx((2.19, 12.98), abs=0.006)


def test_cone_closes_at_its_length() -> None:
    pieces = contour.cone(0.09, 35.0, FIFTEEN)
    expected = float(contour.cone_length(0.09, 35.0, FIFTEEN))
    assert wall.length(pieces) == pytest.approx(expected, rel=1e-13)
    assert contour.lip_angle(pieces) == pytest.approx(FIFTEEN, rel=1e-12)
    # by hand: 0.09 [sqrt(35) - 1 + 0.382 (1/0.9659258 - 1)]/0.2679492 = 1.655762
    assert expected == pytest.approx(1.655762, rel=1e-6)


def test_table_is_monotonic_and_continuous() -> None:
    ratios, fractions = np.geomspace(2.0, 400.0, 300), np.linspace(0.6, 1.0, 81)
    start, lip = bell_angles(ratios[:, None], fractions[None, :])
    assert np.all(np.diff(start, axis=0) > 0)
    assert np.all(np.diff(start, axis=1) < 0)
    assert np.all(np.diff(lip, axis=0) <= 0)
    assert np.all(np.diff(lip, axis=1) < 0)
    assert np.all(start[ratios >= 3.0] > lip[ratios >= 3.0])
    assert inside_table([3.0, 4.0, 100.0, 101.0]).tolist() == [False, True, True, False]


@given(st.floats(0.01, 0.5), st.floats(1.3, 10.0), st.floats(0.0, 3.0))
def test_chamber_holds_its_volume(throat_radius: float, contraction: float, more: float) -> None:
    least = wall.volume(contour.convergent(throat_radius, contraction)) / (math.pi * throat_radius**2)
    pieces = contour.chamber(throat_radius, contraction, least * (1.0 + more))
    assert wall.volume(pieces) == pytest.approx(least * (1.0 + more) * math.pi * throat_radius**2, rel=1e-10)


@pytest.mark.parametrize("divergent", [contour.cone(0.05, 40.0, FIFTEEN), contour.bell(0.05, 40.0)])
def test_wall_pressure_and_momentum_balance_agree(divergent: tuple[wall.Segment, ...]) -> None:
    """One-dimensional flow, exponent 1.22: (p + rho u^2) A at the inlet plus the wall's push is that at the exit."""
    pieces = (*contour.convergent(0.05, 3.0), *divergent)
    points = wall.quadrature(pieces)
    ratio = np.maximum((points.r / 0.05) ** 2, 1.0)
    subsonic = gas_dynamics.mach_from_area_ratio(ratio, 1.22, "subsonic")
    mach = np.where(points.x < 0.0, subsonic, gas_dynamics.mach_from_area_ratio(ratio, 1.22))

    def stream_force(area_ratio: float, branch: str) -> float:
        m = gas_dynamics.mach_from_area_ratio(area_ratio, 1.22, branch)  # type: ignore[arg-type]
        force = gas_dynamics.pressure_ratio(m, 1.22) * (1.0 + 1.22 * m**2) * area_ratio
        return 6e6 * float(force) * math.pi * 0.05**2

    push = wall.wall_force(6e6 * gas_dynamics.pressure_ratio(mach, 1.22), points)
    assert stream_force(3.0, "subsonic") + push == pytest.approx(stream_force(40.0, "supersonic"), rel=1e-9)


def test_default_convergent_makes_room() -> None:
    assert contour.convergent(0.1, 4.0)[0].angles(np.array([1.0]))[0] == pytest.approx(-contour.CONVERGENT_ANGLE)
    tight = contour.convergent(0.1, 1.5)
    assert -tight[0].angles(np.array([1.0]))[0] == pytest.approx(contour.largest_convergent_angle(1.5))
    assert contour.largest_convergent_angle(1.5) < contour.CONVERGENT_ANGLE


def test_stay_time_by_hand() -> None:
    """1 litre at 5 kg/m3 and 2 kg/s: 2.5 ms."""
    assert float(contour.stay_time(1e-3, 5.0, 2.0)) == pytest.approx(2.5e-3, rel=1e-14)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: contour.cone(0.1, 1.0, FIFTEEN), "`area_ratio` is 1; it must be above 1"),
        (lambda: contour.cone(-0.1, 10.0, FIFTEEN), "`throat_radius` is -0.1"),
        (lambda: contour.cone(0.1, 10.0, 0.0), "`half_angle` is 0; it must be above 0 and below 90 degrees"),
        (lambda: contour.cone(0.1, 10.0, math.radians(95.0)), "`half_angle` is 95"),
        (lambda: contour.cone(0.1, 1.02, math.radians(40.0)), "smaller half-angle or a larger area ratio"),
        (lambda: contour.bell(0.1, 10.0, 0.3), "`length` is 0.3; it must be 0.6 to 1"),
        (lambda: contour.bell(0.1, 1.5, 0.8), "2 to 400 for a bell without given angles"),
        (lambda: contour.bell(0.1, 10.0, 0.8, 0.1, 0.2), "`exit_angle`"),
        (lambda: contour.bell(0.1, 10.0, 0.8, math.radians(15.0), 0.1), "change length or angles, or take a cone"),
        (lambda: contour.bell(0.1, 10.0, 0.3, 1.2, math.radians(60.0)), "The chord of the divergent lies at"),
        (lambda: contour.convergent(0.1, 1.0), "`contraction_ratio` is 1; it must be above 1"),
        (lambda: contour.convergent(0.1, 1.5, math.radians(60.0)), "at most 24.5 degrees at contraction ratio 1.5"),
        (lambda: contour.chamber(0.1, 3.0, 0.05), "which the convergent alone holds"),
        (
            lambda: wall.wall_volume(contour.cone(0.1, 10.0, FIFTEEN), -1e-3),
            "`thickness` is -0.001 m; it must be above 0",
        ),
        (lambda: wall.wall_volume(contour.cone(0.1, 10.0, FIFTEEN), 0.05), "smallest radius of curvature"),
        (lambda: wall.wall_volume(contour.cone(0.1, 10.0, FIFTEEN), float("nan")), "`thickness` is nan"),
    ],
)
def test_refusals(call: object, words: str) -> None:
    with pytest.raises(InputError) as caught:
        call()  # type: ignore[operator]
    assert words in str(caught.value)
