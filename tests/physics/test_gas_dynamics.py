"""Perfect-gas relations: NACA Report 1135 rows, closed forms by hand, round trips and identities."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.errors import InputError
from propkit.physics import gas_dynamics as gas
from propkit.physics import ideal_nozzle, waves

REFERENCE = Path(__file__).parents[1] / "reference"
ROWS = list(csv.DictReader((REFERENCE / "compressible_flow.csv").read_text(encoding="utf-8").splitlines()))
ISENTROPIC = [row for row in ROWS if row["kind"] == "isentropic"]
SHOCKS = [row for row in ROWS if row["kind"] == "normal_shock"]
EXPONENTS = st.floats(1.02, 5 / 3)


def label(row: dict[str, str]) -> str:
    return f"gamma {row['gamma']} M {row['M']}"


@pytest.mark.parametrize("row", ISENTROPIC, ids=label)
def test_isentropic_rows(row: dict[str, str]) -> None:
    """Source: NACA Report 1135 and closed form, as the row says; 1e-8 is the last printed digit."""
    g, m = float(row["gamma"]), float(row["M"])
    for function, column in (
        (gas.pressure_ratio, "p_over_p0"),
        (gas.temperature_ratio, "T_over_T0"),
        (gas.density_ratio, "rho_over_rho0"),
        (gas.area_ratio, "A_over_Astar"),
    ):
        assert float(function(m, g)) == pytest.approx(float(row[column]), rel=1e-8)
    if row["prandtl_meyer_deg"]:
        angle = math.degrees(float(waves.prandtl_meyer_angle(m, g)))
        assert angle == pytest.approx(float(row["prandtl_meyer_deg"]), abs=6e-7)


@pytest.mark.parametrize("row", SHOCKS, ids=label)
def test_shock_rows(row: dict[str, str]) -> None:
    """Source: NACA Report 1135 and closed form, as the row says; 1e-8 is the last printed digit."""
    g, m = float(row["gamma"]), float(row["M"])
    for function, column in (
        (waves.shock_mach, "M2"),
        (waves.shock_pressure_ratio, "p2_over_p1"),
        (waves.shock_density_ratio, "rho2_over_rho1"),
        (waves.shock_temperature_ratio, "T2_over_T1"),
        (waves.shock_stagnation_pressure_ratio, "p02_over_p01"),
    ):
        assert float(function(m, g)) == pytest.approx(float(row[column]), rel=1e-8)


@given(st.floats(1e-3, 30.0), EXPONENTS)
def test_inverses(mach: float, g: float) -> None:
    branch = "supersonic" if mach >= 1.0 else "subsonic"
    assert float(gas.mach_from_area_ratio(gas.area_ratio(mach, g), g, branch)) == pytest.approx(mach, rel=1e-9, abs=3e-8)
    assert float(gas.mach_from_pressure_ratio(gas.pressure_ratio(mach, g), g)) == pytest.approx(mach, rel=1e-7)
    assert float(gas.mach_from_temperature_ratio(gas.temperature_ratio(mach, g), g)) == pytest.approx(mach, rel=1e-6)


@given(st.floats(1.0, 1e8), EXPONENTS)
def test_area_ratio_round_trip_on_both_branches(ratio: float, g: float) -> None:
    for branch in ("supersonic", "subsonic"):
        mach = float(gas.mach_from_area_ratio(ratio, g, branch))
        assert (mach >= 1.0) == (branch == "supersonic") or mach == pytest.approx(1.0)
        assert float(gas.area_ratio(mach, g)) == pytest.approx(ratio, rel=1e-11)


@given(st.floats(1.0, 40.0), EXPONENTS)
def test_prandtl_meyer_round_trip(mach: float, g: float) -> None:
    angle = waves.prandtl_meyer_angle(mach, g)
    assert float(waves.mach_from_prandtl_meyer_angle(angle, g)) == pytest.approx(mach, rel=1e-7)


@given(st.floats(1.0, 40.0), EXPONENTS)
def test_shock_conserves_mass_momentum_energy(mach: float, g: float) -> None:
    """Conservation laws across the shock, upstream density, pressure g^-1 and sound speed 1."""
    behind = float(waves.shock_mach(mach, g))
    density, pressure = float(waves.shock_density_ratio(mach, g)), float(waves.shock_pressure_ratio(mach, g))
    velocity = behind * math.sqrt(pressure / density)
    assert density * velocity == pytest.approx(mach, rel=1e-11)
    assert pressure / g + density * velocity**2 == pytest.approx(1.0 / g + mach**2, rel=1e-11)
    assert pressure / density / (g - 1.0) + 0.5 * velocity**2 == pytest.approx(1.0 / (g - 1.0) + 0.5 * mach**2, rel=1e-11)


@given(EXPONENTS, st.floats(1.0, 1e4), st.floats(0.0, 1.0))
def test_thrust_coefficient_is_momentum_and_pressure(g: float, ratio: float, ambient: float) -> None:
    """F = m' u + (pe - pa) Ae with m' and u from the other closed forms (1e-10)."""
    exit_ratio = gas.pressure_ratio(gas.mach_from_area_ratio(ratio, g), g)
    flux = float(ideal_nozzle.choked_mass_flux(2e6, 3000.0, 350.0, g))
    velocity = float(ideal_nozzle.exhaust_velocity(exit_ratio, 3000.0, 350.0, g))
    expected = flux * velocity / 2e6 + (float(exit_ratio) - ambient) * ratio
    found = float(ideal_nozzle.thrust_coefficient(g, exit_ratio, ratio, ambient))
    assert found == pytest.approx(expected, rel=1e-10, abs=1e-10 * (1.0 + ambient * ratio))


# By hand (ten-digit decimal arithmetic, powers by logarithms): exponent, choked mass-flux function.
@pytest.mark.parametrize(
    ("g", "function"),
    [
        (1.4, math.sqrt(1.4) * (1 / 1.2) ** 3),
        (5 / 3, math.sqrt(5 / 3) * 0.75**2),
        (1.25, math.sqrt(1.25) * (8 / 9) ** 4.5),
    ],
)
def test_choked_mass_flux_function_at_exact_exponents(g: float, function: float) -> None:
    """Closed form: the exponent (g + 1)/(2 (g - 1)) is 3, 2 and 4.5 at 7/5, 5/3 and 5/4."""
    assert float(ideal_nozzle.choked_mass_flux_function(g)) == pytest.approx(function, rel=1e-14)


def test_choked_flux_of_a_kerosene_reservoir() -> None:
    """Common practice, no source: 7 MPa, 3558 K, 22.19 kg/kmol, exponent 1.151 pass about 3872 kg/s/m2 (0.3 %)."""
    flux = float(ideal_nozzle.choked_mass_flux(7e6, 3558.0, 8.314462618 / 22.19e-3, 1.151))
    assert flux == pytest.approx(3872.0, rel=3e-3)
    assert float(ideal_nozzle.characteristic_velocity(3558.0, 8.314462618 / 22.19e-3, 1.151)) == pytest.approx(7e6 / flux, rel=1e-12)


def test_limits() -> None:
    for g in (1.05, 1.2, 1.4, 5 / 3):
        limit = math.sqrt(2 * g**2 / (g - 1) * (2 / (g + 1)) ** ((g + 1) / (g - 1)))
        assert float(ideal_nozzle.thrust_coefficient(g, 0.0, 1.0)) == pytest.approx(limit, rel=1e-12)
        assert float(gas.area_ratio(1.0, g)) == 1.0
        # the strong-shock density limit (g + 1)/(g - 1)
        assert float(waves.shock_density_ratio(1e6, g)) == pytest.approx((g + 1) / (g - 1), rel=1e-9)
        # the largest turn (k - 1) 90 degrees
        k = math.sqrt((g + 1) / (g - 1))
        assert float(waves.prandtl_meyer_angle(1e8, g)) == pytest.approx((k - 1) * math.pi / 2, rel=1e-6)


def test_arrays_broadcast() -> None:
    mach = gas.mach_from_area_ratio([[2.0], [30.0]], [1.1, 1.2, 1.3])
    assert mach.shape == (2, 3)
    assert float(mach[1, 1]) == float(gas.mach_from_area_ratio(30.0, 1.2))
    assert np.all(np.diff(mach, axis=1) > 0)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: gas.area_ratio(0.0, 1.4), "`mach` is 0; it must be above 0"),
        (lambda: gas.pressure_ratio(-1.0, 1.4), "`mach` is -1"),
        (lambda: gas.pressure_ratio(1.0, 1.0), "`isentropic_exponent` is 1; it must be above 1"),
        (lambda: gas.mach_from_area_ratio([3.0, 0.5], 1.4), "`area_ratio` is 0.5; it must be 1 or more"),
        (lambda: gas.mach_from_pressure_ratio(1.2, 1.4), "`pressure_ratio` is 1.2"),
        (lambda: gas.mach_from_temperature_ratio(0.0, 1.4), "`temperature_ratio` is 0"),
        (lambda: ideal_nozzle.choked_mass_flux(-1.0, 3000.0, 300.0, 1.2), "`stagnation_pressure` is -1"),
        (lambda: ideal_nozzle.thrust_coefficient(1.2, 0.1, 0.5), "`area_ratio` is 0.5"),
        (lambda: waves.shock_mach(0.9, 1.4), "`mach` is 0.9; it must be 1 or more"),
        (lambda: waves.mach_from_prandtl_meyer_angle(3.0, 1.4), "turn to vacuum"),
    ],
)
def test_refusals(call: object, words: str) -> None:
    with pytest.raises(InputError) as caught:
        call()  # type: ignore[operator]
    assert words in str(caught.value)
