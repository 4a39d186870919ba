"""The loss ledger and what feeds it: exact products, published factors, and boundary layers with closed forms."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.errors import InputError
from propkit.physics import boundary_layer, contour, gas_dynamics, ideal_nozzle, losses, wall

RATIOS = st.floats(0.5, 1.0, exclude_min=True)


@given(st.floats(50.0, 500.0), st.lists(RATIOS, min_size=5, max_size=5), st.permutations(losses.ORDER))
def test_product_of_the_ratios_is_the_delivered_value(ideal: float, ratios: list[float], order: list[str]) -> None:
    given_losses = [losses.Loss(name, ratio) for name, ratio in zip(order, ratios, strict=True)]
    lines = losses.ledger(ideal, given_losses)
    assert [line.name for line in lines] == list(losses.ORDER)
    assert lines[-1].after == pytest.approx(ideal * math.prod(line.ratio for line in lines), rel=1e-12)
    assert sum(line.decrement for line in lines) == pytest.approx(ideal - lines[-1].after, rel=1e-12, abs=1e-10)
    for first, second in itertools.pairwise(lines):
        assert second.before == first.after


def test_decrements_are_converted_in_their_place() -> None:
    """By hand: 400 s, c* efficiency 0.95 gives 380; minus 3.8 s divergence is 376.2, a ratio of 0.99."""
    lines = losses.ledger(400.0, [losses.Loss("divergence", decrement=3.8), losses.Loss("energy release", 0.95)])
    assert [line.name for line in lines] == ["energy release", "divergence"]
    assert [line.after for line in lines] == pytest.approx([380.0, 376.2], rel=1e-14)
    assert lines[1].ratio == pytest.approx(0.99, rel=1e-14)
    assert losses.ledger(400.0, []) == ()


@pytest.mark.parametrize(
    ("degrees", "factor"),
    [(0, 1.0), (8, 0.995), (10, 0.992), (12, 0.989), (15, 0.983), (18, 0.976), (20, 0.970), (24, 0.957)],
)
def test_cone_factors_as_printed(degrees: float, factor: float) -> None:
    """Sutton & Biblarz, table of the nozzle angle correction factor, from memory; last printed digit."""
    assert float(losses.cone_divergence_factor(math.radians(degrees))) == pytest.approx(factor, abs=6e-4)


@pytest.mark.parametrize(("ratio", "factor"), [(10.0, 0.985), (25.0, 0.987), (50.0, 0.988)])
def test_bell_factors_as_printed(ratio: float, factor: float) -> None:
    """Sutton & Biblarz, table of bell nozzles, 80 % length, from memory; 0.003 for the simple rule and chart angles."""
    pieces = contour.bell(1.0, ratio, 0.8)
    found = losses.bell_divergence_factor(contour.throat_to_lip_angle(pieces, 1.0), contour.lip_angle(pieces))
    assert float(found) == pytest.approx(factor, abs=3e-3)


def test_bell_rule_of_equal_angles_is_the_cone() -> None:
    angle = math.radians(15.0)
    assert losses.bell_divergence_factor(angle, angle) == losses.cone_divergence_factor(angle)


def test_cone_factor_is_the_mean_axial_component_of_a_source_flow() -> None:
    """Closed form by quadrature: the mean of cos b over the spherical cap of half-angle a, weighted with its area."""
    half = math.radians(25.0)
    nodes, weights = np.polynomial.legendre.leggauss(20)
    b = 0.5 * half * (nodes + 1.0)
    mean = np.sum(weights * np.cos(b) * np.sin(b)) / np.sum(weights * np.sin(b))
    assert float(losses.cone_divergence_factor(half)) == pytest.approx(mean, rel=1e-13)


@given(st.floats(0.8, 1.0), st.floats(1.0, 1e6), st.floats(0.0, 1e6))
def test_divergence_acts_on_momentum_only(factor: float, momentum: float, pressure: float) -> None:
    ratio = float(losses.divergence_ratio(factor, momentum, pressure))
    assert factor * (1 - 1e-12) <= ratio <= 1.0
    assert float(losses.divergence_ratio(factor, momentum, 0.0)) == pytest.approx(factor, rel=1e-12)


def test_estimates_at_their_ends() -> None:
    assert float(losses.kinetics_ratio(450.0, 430.0, 0.0)) == 1.0
    assert float(losses.kinetics_ratio(450.0, 430.0, 1.0)) == pytest.approx(430.0 / 450.0)
    assert float(losses.two_phase_ratio(0.0, 1.0)) == 1.0
    assert float(losses.two_phase_ratio(0.3, 0.1, 0.9)) == pytest.approx(1.0 - 0.027)


def plate(length: np.ndarray, **changed: np.ndarray) -> boundary_layer.WallFlow:
    """Air-like core at rest temperature everywhere, so that reference and core properties are the same."""
    one = np.ones_like(length)
    columns = {"radius": 5.0 * one, "velocity": 60.0 * one, "density": 1.2 * one, "temperature": 300.0 * one}
    columns |= {"viscosity": 1.8e-5 * one, "adiabatic_wall_temperature": 300.0 * one, "wall_temperature": 300.0 * one}
    return boundary_layer.WallFlow(length=length, **(columns | changed))


def test_flat_plate_momentum_thickness() -> None:
    """Schlichting, turbulent flat plate of the 1/7-power profile: theta = 0.036 x Re_x^(-1/5), from memory (2 %)."""
    length = np.linspace(0.0, 2.0, 300)
    theta = boundary_layer.momentum_thickness(plate(length))
    reynolds = 1.2 * 60.0 * length[1:] / 1.8e-5
    np.testing.assert_allclose(theta[1:], 0.036 * length[1:] * reynolds**-0.2, rtol=0.02)
    # closed form of the law used: (5/4 0.0128)^(4/5)
    np.testing.assert_allclose(theta[1:], (1.25 * 0.0128) ** 0.8 * length[1:] * reynolds**-0.2, rtol=1e-9)


def test_cone_against_the_plate() -> None:
    """Closed form: on a cone (r ~ s, no pressure gradient) theta is (4/9)^(4/5) of the plate's at the same length."""
    length = np.linspace(1e-3, 2.0, 4000)
    cone = boundary_layer.momentum_thickness(plate(length, radius=0.3 * length))
    flat = boundary_layer.momentum_thickness(plate(length))
    assert cone[-1] / flat[-1] == pytest.approx((4.0 / 9.0) ** 0.8, rel=1e-3)


def test_accelerated_flow_against_the_closed_form() -> None:
    """Closed form for u ~ s at even density: theta(1) = [5/4 c/(5/4 (2 + H) + 3/4)]^(4/5)."""
    length = np.linspace(1e-3, 1.0, 6000)
    theta = boundary_layer.momentum_thickness(plate(length, velocity=60.0 * length))[-1]
    c = 0.0128 * (1.8e-5 / (1.2 * 60.0)) ** 0.25
    power = 1.25 * (2.0 + 9.0 / 7.0)
    assert theta == pytest.approx((1.25 * c / (power + 0.75)) ** 0.8, rel=1e-3)


def test_compressible_limits() -> None:
    """An adiabatic wall at Taw = 3 T: H = 9/7 3 + 2 = 5.857, and (9/7 + 1) 3 - 1 is the same (Crocco)."""
    assert float(boundary_layer.form_parameter(1000.0, 3000.0, 3000.0)) == pytest.approx((9.0 / 7.0 + 1.0) * 3.0 - 1.0)
    assert float(boundary_layer.reference_temperature(1000.0, 3000.0, 3000.0)) == pytest.approx(1000.0 * 2.44)


def nozzle_flow(throat_radius: float, pressure: float, ratio: float, count: int = 60) -> tuple[float, float]:
    """Return drag and vacuum thrust of a bell with constant properties (exponent 1.2, 3400 K, 360 J/kg/K)."""
    pieces = (*contour.convergent(throat_radius, 4.0), *contour.bell(throat_radius, ratio))
    shape = wall.draw(pieces, count)
    area = np.maximum((shape.r / throat_radius) ** 2, 1.0)
    mach = np.where(
        shape.x < 0.0,
        gas_dynamics.mach_from_area_ratio(area, 1.2, "subsonic"),
        gas_dynamics.mach_from_area_ratio(area, 1.2),
    )
    temperature = 3400.0 * gas_dynamics.temperature_ratio(mach, 1.2)
    static = pressure * gas_dynamics.pressure_ratio(mach, 1.2)
    density, velocity = static / (360.0 * temperature), mach * np.sqrt(1.2 * 360.0 * temperature)
    adiabatic = temperature + 0.9 * (3400.0 - temperature)
    run = np.concatenate([[0.0], np.cumsum(np.hypot(np.diff(shape.x), np.diff(shape.r)))])
    viscosity = 9e-5 * (temperature / 3400.0) ** 0.6
    cooled = np.full_like(run, 900.0)
    flow = boundary_layer.WallFlow(run, shape.r, velocity, density, temperature, viscosity, adiabatic, cooled)
    theta = boundary_layer.momentum_thickness(flow)[-1]
    drag = boundary_layer.boundary_layer_drag(shape.r[-1], shape.angle[-1], density[-1], velocity[-1], theta)
    coefficient = ideal_nozzle.thrust_coefficient(1.2, static[-1] / pressure, ratio)
    return float(drag), float(coefficient) * pressure * math.pi * throat_radius**2


def test_size_of_the_loss() -> None:
    """Common practice, no source: 0.3 to 2 % for large engines, more for small ones: (size x pressure)^-0.2."""
    drag, thrust = nozzle_flow(0.1, 7e6, 50.0)
    assert 0.003 < drag / thrust < 0.02
    small, small_thrust = nozzle_flow(0.01, 7e6, 50.0)
    assert (small / small_thrust) / (drag / thrust) == pytest.approx(10.0**0.2, rel=1e-6)
    finer, _ = nozzle_flow(0.1, 7e6, 50.0, 240)
    assert finer == pytest.approx(drag, rel=2e-3)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: losses.ledger(400.0, [losses.Loss("friction", 0.9)]), "one of 'energy release', 'kinetics'"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics", 0.9)] * 2), "'kinetics' twice"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics", 1.2)]), "`losses: kinetics` is 1.2"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics", 0.0)]), "above 0 and at most 1"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics")]), "a ratio or as a decrement"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics", decrement=400.0)]), "below the specific impulse left"),
        (lambda: losses.ledger(400.0, [losses.Loss("kinetics", decrement=-1.0)]), "`decrement` is -1"),
        (lambda: losses.ledger(0.0, []), "`specific_impulse` is 0"),
        (lambda: losses.cone_divergence_factor(-0.1), "`half_angle` is -5.7"),
        (lambda: losses.kinetics_ratio(400.0, 410.0), "`frozen` is 410"),
        (lambda: losses.kinetics_ratio(400.0, 390.0, 1.5), "`share` is 1.5"),
        (lambda: losses.divergence_ratio(1.1, 1.0, 0.0), "`divergence_factor` is 1.1"),
        (lambda: losses.divergence_ratio(0.9, 1.0, -2.0), "`thrust` is -1"),
        (lambda: losses.boundary_layer_ratio(11.0, 10.0), "`drag` is 11"),
        (lambda: losses.two_phase_ratio(1.2, 0.1), "`condensed_mass_fraction` is 1.2"),
        (lambda: boundary_layer.momentum_thickness(plate(np.array([0.0, 0.0, 1.0]))), "rising along the wall"),
    ],
)
def test_refusals(call: object, words: str) -> None:
    with pytest.raises(InputError) as caught:
        call()  # type: ignore[operator]
    assert words in str(caught.value)
