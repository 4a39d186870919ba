"""US Standard Atmosphere 1976: rows of the standard, an independent library, and identities."""

from __future__ import annotations

import csv
import math
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from propkit.errors import InputError, RangeError
from propkit.physics import atmosphere

REFERENCE = Path(__file__).parents[1] / "reference"
ROWS = list(csv.DictReader((REFERENCE / "atmosphere.csv").read_text(encoding="utf-8").splitlines()))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['altitude_kind']} {row['altitude_km']} km")
def test_rows_of_the_standard(row: dict[str, str]) -> None:
    """Source: US Standard Atmosphere 1976, as each row says; 1e-6 is the last printed digit."""
    height = float(row["geometric_m"])
    if row["altitude_kind"] == "geopotential":
        height = float(atmosphere.geometric_altitude(float(row["geopotential_m"])))
        assert height == pytest.approx(float(row["geometric_m"]), abs=6e-4)
    for function, column in (
        (atmosphere.temperature, "T_molecular_K"),
        (atmosphere.pressure, "p_Pa"),
        (atmosphere.density, "rho_kg_m3"),
        (atmosphere.sound_speed, "a_m_s"),
    ):
        assert float(function(height)) == pytest.approx(float(row[column]), rel=1e-6)


def test_layers_against_an_independent_library() -> None:
    """Source: `fluids.atmosphere.ATMOSPHERE_1976` (general-purpose library); same closed forms, so rounding only."""
    library = pytest.importorskip("fluids.atmosphere")
    for height in np.linspace(-4_900.0, 79_900.0, 97):
        other = library.ATMOSPHERE_1976(float(height))
        assert float(atmosphere.pressure(height)) == pytest.approx(other.P, rel=1e-9)
        assert float(atmosphere.temperature(height)) == pytest.approx(other.T, rel=1e-9)
        assert float(atmosphere.density(height)) == pytest.approx(other.rho, rel=1e-9)


# US Standard Atmosphere 1976, tables I and 8, from memory: altitude [km], kinetic temperature [K], molar mass [g/mol].
# Printed to 0.01 K and 0.01 g/mol; density and pressure have four or five digits, which is 0.02 g/mol.
UPPER = (
    (90, 186.87, 28.91),
    (95, 188.42, 28.73),
    (100, 195.08, 28.40),
    (105, 208.84, 27.88),
    (110, 240.00, 27.27),
    (115, 300.00, 26.68),
    (120, 360.00, 26.20),
    (130, 469.27, 25.44),
    (140, 559.63, 24.75),
    (150, 634.39, 24.10),
)


@pytest.mark.parametrize(("kilometres", "kinetic", "molar_mass"), UPPER)
def test_upper_rows(kilometres: float, kinetic: float, molar_mass: float) -> None:
    height = 1000.0 * kilometres
    assert float(atmosphere.kinetic_temperature(height)) == pytest.approx(kinetic, abs=0.02)
    ratio = float(atmosphere.kinetic_temperature(height) / atmosphere.temperature(height))
    assert 28.9644 * ratio == pytest.approx(molar_mass, abs=0.02)


def test_upper_pressures_are_nearly_hydrostatic() -> None:
    """The hydrostatic equation from the layers' own pressure at 86 km; 1.1 %: see the note at `UPPER_ROWS`."""

    def slope(height: float) -> float:
        gravity = 9.80665 * (6_356_766.0 / (6_356_766.0 + height)) ** 2
        return -gravity * 0.0289644 / (8.31432 * float(atmosphere.temperature(height)))

    logarithm = math.log(0.37338)
    edges = [86_000.0, 91_000.0, *(1000.0 * row[0] for row in UPPER[1:])]
    for low, high in pairwise(edges):
        logarithm += quad(slope, low, high)[0]
        assert float(atmosphere.pressure(high)) == pytest.approx(math.exp(logarithm), rel=1.1e-2)


def test_continuous_and_falling() -> None:
    height = np.linspace(atmosphere.LOWEST, atmosphere.HIGHEST, 31_001)
    pressure = atmosphere.pressure(height)
    assert np.all(np.diff(pressure) < 0.0)
    assert np.max(np.abs(np.diff(np.log(pressure)))) < 1.3e-3  # 5 m steps; the scale height is above 5 km
    assert np.max(np.abs(np.diff(atmosphere.temperature(height)))) < 0.08  # 5 m steps at 12 K/km and a little
    for edge in (11_019.1, 20_063.1, 47_350.1, 80_000.0, 86_000.0, 91_000.0, 110_000.0, 120_000.0):
        below, above = atmosphere.pressure([edge - 1e-3, edge + 1e-3])
        assert above == pytest.approx(below, rel=1e-6)
        below, above = atmosphere.kinetic_temperature([edge - 1e-3, edge + 1e-3])
        assert above == pytest.approx(below, rel=2e-5)


@given(st.floats(atmosphere.LOWEST, atmosphere.HIGHEST))
def test_altitude_of_pressure_is_the_inverse(height: float) -> None:
    """1e-6 m: rounding of the pressure (2e-16) over d ln p/dz (1e-4 1/m), with room."""
    assert float(atmosphere.altitude_of_pressure(atmosphere.pressure(height))) == pytest.approx(height, abs=1e-6)


@pytest.mark.parametrize("height", [-5_001.0, 150_001.0, 4e5])
def test_outside_the_range(height: float) -> None:
    with pytest.raises(RangeError, match="-5 to 150 km") as caught:
        atmosphere.pressure(height)
    assert caught.value.data["altitude"] == height
    assert ("vacuum" in str(caught.value)) == (height > 0)


def test_bad_values() -> None:
    with pytest.raises(InputError, match="finite"):
        atmosphere.temperature(float("nan"))
    for pressure in (0.0, -1.0, 2e5, 1e-4):
        with pytest.raises(RangeError):
            atmosphere.altitude_of_pressure(pressure)
    with pytest.raises(InputError):
        atmosphere.altitude_of_pressure([1e5, float("inf")])
