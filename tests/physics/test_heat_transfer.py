"""Convective heat load: Bartz's equations by hand at stated points, limits and the integral over a wall."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.errors import InputError
from propkit.physics import contour, heat_transfer, wall


def test_coefficient_by_hand() -> None:
    """Bartz (1957) evaluated with a desk calculator (20 digits) at Dt 0.25 m, arc 0.11763 m, 1e-4 Pa s, 2100 J/kg/K,
    Pr 0.75, 7 MPa, c* 1780 m/s, throat, sigma 1: 10991.387 W/m2/K."""
    given_state = (0.25, 0.11763, 1e-4, 2100.0, 0.75, 7e6, 1780.0)
    assert float(heat_transfer.heat_transfer_coefficient(*given_state, 1.0, 1.0)) == pytest.approx(10991.38712, rel=1e-9)
    wider = heat_transfer.heat_transfer_coefficient(*given_state, 32.0, 1.0)
    assert float(wider) == pytest.approx(10991.38712 / 2.0**4.5, rel=1e-9)


def test_coefficient_of_a_handbook_example() -> None:
    """A design handbook's kerosene engine, from memory (5 %): throat 24.9 in, arcs 18.68 and 4.76 in, 4.18e-6 lb/(in s),
    0.485 Btu/(lb R), Pr 0.816, 1000 psia, c* 5660 ft/s: 0.0027 Btu/(in2 s F) before (At/A)^0.9 sigma."""
    inch, pound, psi, foot, btu = 0.0254, 0.45359237, 6894.757293, 0.3048, 1055.05585
    found = heat_transfer.heat_transfer_coefficient(
        24.9 * inch,
        0.5 * (18.68 + 4.76) * inch,
        4.18e-6 * pound / inch,
        0.485 * btu / pound * 1.8,
        0.816,
        1000.0 * psi,
        5660.0 * foot,
        1.0,
        1.0,
    )
    assert float(found) / (btu * 1.8 / inch**2) == pytest.approx(0.0027, rel=0.05)
    # its viscosity at 22.5 lb/lbmol and 6140 R, by the estimate it uses
    estimate = float(heat_transfer.estimated_viscosity(0.0225, 6140.0 / 1.8))
    assert estimate == pytest.approx(4.18e-6 * pound / inch, rel=0.05)


def test_property_correction_by_hand() -> None:
    """Desk calculator: Tw 800 K, T0 3500 K, M 2.3, exponent 1.2: 1.2418154552; with Tw = T0 at rest 1."""
    found = heat_transfer.property_correction(800.0, 3500.0, 2.3, 1.2)
    assert float(found) == pytest.approx(1.2418154552, rel=1e-9)
    assert float(heat_transfer.property_correction(3500.0, 3500.0, 0.0, 1.2)) == 1.0


def test_units_of_the_estimated_viscosity() -> None:
    """46.6e-10 sqrt(25) 5000^0.6 lbm/(in s) at 25 lbm/lbmol and 5000 R: 165.7227 x 2.33e-8 = 3.86134e-6 lbm/(in s)."""
    inch, pound = 0.0254, 0.45359237
    found = float(heat_transfer.estimated_viscosity(0.025, 5000.0 / 1.8))
    assert found * inch / pound == pytest.approx(46.6e-10 * 5.0 * 165.7227, rel=1e-6)


@given(st.floats(0.4, 1.0), st.floats(500.0, 3500.0), st.floats(1.0, 2.0))
def test_recovery_lies_between_static_and_stagnation(prandtl: float, static: float, factor: float) -> None:
    total = static * factor
    found = float(heat_transfer.adiabatic_wall_temperature(static, total, prandtl))
    assert static * (1 - 1e-12) <= found <= total * (1 + 1e-12)
    assert float(heat_transfer.adiabatic_wall_temperature(static, total, 1.0)) == pytest.approx(total, rel=1e-12)


def test_flux_and_load() -> None:
    """Even flux over a closed-form frustum: q pi (r1 + r2) slant."""
    assert float(heat_transfer.heat_flux(2000.0, 3000.0, 500.0)) == pytest.approx(5e6)
    assert float(heat_transfer.heat_flux(2000.0, 3000.0, 3000.0)) == 0.0
    points = wall.quadrature((wall.straight("frustum", (0.0, 0.1), (0.4, 0.2)),))
    load = heat_transfer.heat_load(np.full_like(points.r, 5e6), points)
    assert load == pytest.approx(5e6 * math.pi * 0.3 * math.hypot(0.4, 0.1), rel=1e-12)
    assert float(heat_transfer.coolant_temperature_rise(3e6, 10.0, 3000.0)) == pytest.approx(100.0)


def test_peak_lies_at_the_throat() -> None:
    """Mass flux is largest there; sigma moves the peak little (common practice, no source: just upstream)."""
    pieces = (*contour.chamber(0.05, 4.0, 1.0), *contour.bell(0.05, 20.0))
    shape = wall.draw(pieces, 60)
    ratio = (shape.r / 0.05) ** 2
    coefficient = heat_transfer.heat_transfer_coefficient(0.1, 0.047, 9e-5, 2100.0, 0.6, 5e6, 1750.0, ratio, 1.2)
    assert shape.x[int(np.argmax(coefficient))] == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (
            lambda: heat_transfer.heat_flux([100.0, 100.0], [3000.0, 700.0], 800.0),
            "`wall_temperature` is 800 K; it must be at most the local adiabatic wall temperature, 700 K",
        ),
        (lambda: heat_transfer.heat_flux(100.0, 3000.0, 0.0), "`wall_temperature` is 0; it must be above 0"),
        (lambda: heat_transfer.heat_transfer_coefficient(0.0, *([1.0] * 8)), "`throat_diameter` is 0"),
        (lambda: heat_transfer.heat_transfer_coefficient(*([1.0] * 7), 0.5, 1.0), "`area_ratio` is 0.5"),
        (lambda: heat_transfer.recovery_factor(0.0), "`prandtl` is 0"),
        (lambda: heat_transfer.property_correction(500.0, 3000.0, 1.0, 1.0), "`isentropic_exponent` is 1"),
        (lambda: heat_transfer.adiabatic_wall_temperature(-1.0, 3000.0, 0.7), "`static_temperature` is -1"),
        (lambda: heat_transfer.coolant_temperature_rise(1.0, 0.0, 1.0), "`coolant_mass_flow` is 0"),
        (lambda: heat_transfer.estimated_prandtl(1.0), "`isentropic_exponent` is 1"),
        (lambda: heat_transfer.estimated_viscosity(0.0, 300.0), "`molar_mass` is 0"),
    ],
)
def test_refusals(call: object, words: str) -> None:
    with pytest.raises(InputError) as caught:
        call()  # type: ignore[operator]
    assert words in str(caught.value)
