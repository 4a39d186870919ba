"""Separation criteria: the cited equations by hand, inverses, and the point along a nozzle."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.errors import InputError
from propkit.physics import gas_dynamics, ideal_nozzle, separation

PRESSURES = st.floats(1e2, 1e6)


def test_criteria_by_hand() -> None:
    """Ambient 100 kPa. Kalt & Badal at p0/pa = 1024 = 2^10: 2/3 2^-2 = 1/6. Schmucker at M = 5: 8.4^-0.64 =
    exp(-0.64 x 2.12823171) = exp(-1.36206829) = 0.256130. Summerfield 0.4."""
    assert float(separation.summerfield_pressure(1e5)) == pytest.approx(4e4)
    assert float(separation.kalt_badal_pressure(1e5, 1.024e8)) == pytest.approx(1e5 / 6.0, rel=1e-12)
    assert float(separation.schmucker_pressure(1e5, 5.0)) == pytest.approx(25613.0, rel=1e-5)


@given(PRESSURES, st.floats(1e6, 4e7), st.floats(1.5, 7.0))
def test_ambient_is_the_inverse(ambient: float, stagnation: float, mach: float) -> None:
    for criterion in separation.CRITERIA.values():
        pressure = criterion.pressure(ambient, stagnation, mach)
        assert float(criterion.ambient(pressure, stagnation, mach)) == pytest.approx(ambient, rel=1e-12)
        assert 0.0 < float(pressure) < ambient


@given(st.floats(1.5, 7.0), st.floats(1.05, 1.4))
def test_the_lip_shock_sustains_more_than_the_boundary_layer(mach: float, g: float) -> None:
    shock = float(separation.lip_shock_ambient(1e4, mach, g))
    assert shock == pytest.approx(1e4 * (1.0 + 2.0 * g / (g + 1.0) * (mach**2 - 1.0)), rel=1e-12)
    assert shock > float(separation.schmucker_ambient(1e4, mach)) or mach < 1.7


def test_point_in_a_nozzle_of_constant_properties() -> None:
    """Summerfield at 7 MPa, 101325 Pa, exponent 1.2: Mach number of p/p0 = 0.4 x 101325/7e6, closed form."""
    mach = np.linspace(1.0, 4.5, 400)
    pressure = 7e6 * gas_dynamics.pressure_ratio(mach, 1.2)
    share = separation.separation_share(separation.CRITERIA["summerfield"], pressure, mach, 101_325.0, 7e6)
    expected = math.sqrt(2.0 / 0.2 * ((0.4 * 101_325.0 / 7e6) ** (-0.2 / 1.2) - 1.0))
    assert separation.at_share(share, mach) == pytest.approx(expected, rel=1e-6)
    assert separation.at_share(share, pressure) == pytest.approx(0.4 * 101_325.0, rel=1e-6)


@pytest.mark.parametrize("name", list(separation.CRITERIA))
def test_point_agrees_with_the_ambient_at_the_lip(name: str) -> None:
    criterion = separation.CRITERIA[name]
    mach = np.linspace(1.0, 4.0, 200)
    pressure = 5e6 * gas_dynamics.pressure_ratio(mach, 1.25)
    limit = float(criterion.ambient(pressure[-1], 5e6, mach[-1]))
    assert math.isnan(separation.separation_share(criterion, pressure, mach, 0.999 * limit, 5e6))
    share = separation.separation_share(criterion, pressure, mach, 1.001 * limit, 5e6)
    assert 197.0 < share < 199.0
    deeper = separation.separation_share(criterion, pressure, mach, 3.0 * limit, 5e6)
    assert 0.0 < deeper < share
    assert math.isnan(separation.separation_share(criterion, pressure, mach, 0.0, 5e6))


def test_separation_at_the_first_station() -> None:
    criterion = separation.CRITERIA["summerfield"]
    assert separation.separation_share(criterion, [1e4, 5e3], [1.0, 1.5], 1e5, 2e4) == 0.0


def test_separated_thrust_exceeds_the_full_flowing_one() -> None:
    """Beyond the separation point the wall of a full-flowing nozzle is below ambient pressure and pulls backwards."""
    mach = np.linspace(1.0, 5.0, 800)
    g, p0, ambient, throat = 1.2, 5e6, 101_325.0, 0.01
    pressure, area = p0 * gas_dynamics.pressure_ratio(mach, g), throat * gas_dynamics.area_ratio(mach, g)
    velocity = ideal_nozzle.exhaust_velocity(pressure / p0, 3300.0, 360.0, g)
    flow = float(ideal_nozzle.choked_mass_flux(p0, 3300.0, 360.0, g)) * throat
    share = separation.separation_share(separation.CRITERIA["schmucker"], pressure, mach, ambient, p0)
    columns = [separation.at_share(share, column) for column in (velocity, pressure, area)]
    estimate = float(separation.separated_thrust(flow, columns[0], columns[1], ambient, columns[2]))
    full = float(separation.separated_thrust(flow, velocity[-1], pressure[-1], ambient, area[-1]))
    best = float(np.max(separation.separated_thrust(flow, velocity, pressure, ambient, area)))
    assert full < estimate < best


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: separation.summerfield_pressure(-1.0), "`ambient_pressure` is -1; it must be 0 or more"),
        (lambda: separation.kalt_badal_pressure(1e5, 0.0), "`stagnation_pressure` is 0"),
        (lambda: separation.schmucker_pressure(1e5, 0.5), "`mach` is 0.5"),
        (lambda: separation.summerfield_ambient(0.0), "`exit_pressure` is 0"),
        (lambda: separation.schmucker_ambient(1e4, 0.9), "`exit_mach` is 0.9"),
        (lambda: separation.lip_shock_ambient(1e4, 0.9, 1.2), "`mach` is 0.9"),
    ],
)
def test_refusals(call: object, words: str) -> None:
    with pytest.raises(InputError) as caught:
        call()  # type: ignore[operator]
    assert words in str(caught.value)
