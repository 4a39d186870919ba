"""Symbols, formulas, units and numbers in every medium, against spellings written here by hand."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit import quantities
from propkit.view import cells, numbers, symbols


@pytest.mark.parametrize(
    ("symbol", "text", "html"),
    [
        ("p_{c}", "p_c", "<i>p</i><sub><i>c</i></sub>"),
        ("p_{0}", "p₀", "<i>p</i><sub>0</sub>"),
        (r"\dot{m}", "\u1e41", "<i>m\u0307</i>"),
        (r"\dot{m}_{ox}", "\u1e41ₒₓ", "<i>m\u0307</i><sub><i>ox</i></sub>"),
        (r"c^{*}", "c*", "<i>c</i><sup>*</sup>"),
        (r"\mathrm{M}", "M", "M"),
        (r"\rho u", "ρu", "<i>ρ</i><i>u</i>"),
        (r"\Delta h_{mix}", "Δhₘᵢₓ", "<i>Δ</i><i>h</i><sub><i>mix</i></sub>"),
        ("", "", ""),
    ],
)
def test_symbols(symbol: str, text: str, html: str) -> None:
    assert symbols.text_symbol(symbol) == text
    assert symbols.html_symbol(symbol) == html


@pytest.mark.parametrize("row", quantities.CATALOGUE.values(), ids=list(quantities.CATALOGUE))
def test_every_symbol_of_the_catalogue_is_set_whole(row: quantities.Quantity) -> None:
    for shown in (symbols.text_symbol(row.symbol), symbols.html_symbol(row.symbol)):
        assert "\\" not in shown
        assert "{" not in shown
        assert bool(shown) == bool(row.symbol)


@pytest.mark.parametrize(
    ("key", "text", "html"),
    [
        ("H2O", "H₂O", "H<sub>2</sub>O"),
        ("C2H2 (acetylene)", "C₂H₂ (acetylene)", "C<sub>2</sub>H<sub>2</sub> (acetylene)"),
        ("Al2O3 (liquid)", "Al₂O₃ (liquid)", "Al<sub>2</sub>O<sub>3</sub> (liquid)"),
        ("C H1.95", "CH₁.₉₅", "CH<sub>1.95</sub>"),
        ("CO", "CO", "CO"),
        ("<b>", "<b>", "&lt;b&gt;"),
    ],
)
def test_species(key: str, text: str, html: str) -> None:
    assert symbols.text_species(key) == text
    assert symbols.html_species(key) == html


@pytest.mark.parametrize(
    ("unit", "shown"),
    [("kg/m**3", "kg/m³"), ("degR", "°R"), ("psi", "psia"), ("lbf", "lbf"), ("pound/s", "lbm/s"), ("inch**2", "in²"),
     ("foot/s", "ft/s"), ("J/(kg*K)", "J/(kg·K)"), ("Btu/(pound*degR)", "Btu/(lbm·°R)"), ("percent", "%"), ("", ""), ("degree", "°")],
)  # fmt: skip
def test_units(unit: str, shown: str) -> None:
    assert cells.unit_text(unit) == shown


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (3594.58, 6, "3594.58"),
        (12345.6, 6, "12\u202f345.6"),
        (-1577549.8, 8, "\u22121\u202f577\u202f549.8"),
        (2.903e-5, 4, "2.903\u202f×\u202f10⁻⁵"),
        (6.02214e23, 6, "6.02214\u202f×\u202f10²³"),
        (0.0, 5, "0"),
        (1.0, 4, "1.000"),
        (9.9999, 3, "10.0"),
        (99999.7, 5, "100\u202f000"),
        (0.00099996, 3, "0.00100"),
        (math.inf, 5, "infinite"),
    ],
)
def test_numbers(value: float, digits: int, shown: str) -> None:
    assert numbers.pretty(value, digits) == shown


@given(st.floats(min_value=-1e12, max_value=1e12, allow_nan=False), st.integers(2, 9))
def test_a_number_reads_back_at_its_digits(value: float, digits: int) -> None:
    if abs(value) < 1e-300:
        return
    back = float(numbers.rounded(value, digits))
    assert abs(back - value) <= 0.5000001 * 10.0 ** (math.floor(math.log10(abs(value))) - digits + 1)


@given(st.floats(min_value=1e-12, max_value=1e12, allow_nan=False))
def test_a_number_is_cut_without_loss(value: float) -> None:
    shown = numbers.pretty(value, 5)
    assert "".join(numbers.split(shown)) == shown
    assert "." not in numbers.split(shown)[0]
