"""Text and quantities to SI floats: what is read, and what is refused in words."""

from __future__ import annotations

import decimal
import fractions

import numpy as np
import pint
import pytest

import propkit as pk
from propkit import units

REGISTRY = pint.UnitRegistry()


@pytest.mark.parametrize(
    "value",
    [
        decimal.Decimal("7e6"),
        fractions.Fraction(7_000_000),
        np.float32(7e6),
        np.array(7e6),
        REGISTRY.Quantity(decimal.Decimal(7), "MPa"),
        REGISTRY.Quantity(np.float64(7), "MPa"),
        "7 N·mm⁻²",
        "7\N{NO-BREAK SPACE}MPa",
    ],
    ids=repr,
)
def test_every_kind_of_real_number_is_read(value):
    assert units.to_si(value, "Pa") == pytest.approx(7e6, rel=1e-15)


@pytest.mark.parametrize("text", ["25 °C", "25 \N{DEGREE CELSIUS}", "25 \N{MASCULINE ORDINAL INDICATOR}C", "298.15 \N{KELVIN SIGN}"])
def test_degree_signs_as_keyboards_type_them(text):
    assert units.to_si(text, "K") == pytest.approx(298.15, abs=1e-9)


@pytest.mark.parametrize(
    ("value", "unit", "words"),
    [
        (decimal.Decimal("NaN"), "Pa", "finite"),
        (decimal.Decimal("sNaN"), "Pa", "finite"),
        (decimal.Decimal("1e400"), "Pa", "finite"),
        (10**400, "Pa", "finite"),
        (fractions.Fraction(10**400), "Pa", "finite"),
        (REGISTRY.Quantity(7 + 1j, "MPa"), "Pa", "real number"),
        (REGISTRY.Quantity(25, "delta_degC"), "K", "difference"),
    ],
    ids=repr,
)
def test_what_is_no_finite_value_of_the_kind_is_refused(value, unit, words):
    with pytest.raises(pk.InputError, match=words) as caught:
        units.to_si(value, unit, "pressure")
    assert caught.value.problems[0].name == "pressure"


def test_a_difference_is_still_a_difference_inside_a_compound_unit():
    assert units.to_si(REGISTRY.Quantity(20, "W/m**2/delta_degC"), "W/(m**2*K)") == 20.0
