"""Formulas and atomic weights."""

import math

import cantera as ct
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.formula import formula_text, molar_mass, parse_formula
from propkit.errors import InputError


def test_atomic_weights_are_those_of_cantera():
    theirs = {}
    for symbol in ct.Element.element_symbols:
        try:
            theirs[symbol] = ct.Element(symbol).weight
        except ct.CanteraError:  # an element without a stable isotope
            continue
    assert theirs == ATOMIC_WEIGHTS


@pytest.mark.parametrize(
    ("text", "counts"),
    [
        ("C H1.95", {"C": 1.0, "H": 1.95}),
        ("C2H6O", {"C": 2.0, "H": 6.0, "O": 1.0}),
        ("C12H23", {"C": 12.0, "H": 23.0}),
        ("N2 O4", {"N": 2.0, "O": 4.0}),
        ("CH3NO2", {"C": 1.0, "H": 3.0, "N": 1.0, "O": 2.0}),
        ("CH3CH2OH", {"C": 2.0, "H": 6.0, "O": 1.0}),
        ("NH4ClO4", {"N": 1.0, "H": 4.0, "Cl": 1.0, "O": 4.0}),
        ("H₂O₂", {"H": 2.0, "O": 2.0}),
        ("  Al ", {"Al": 1.0}),
        ("C7.337 H10.982 O.058", {"C": 7.337, "H": 10.982, "O": 0.058}),
        ("CO", {"C": 1.0, "O": 1.0}),
        ("Co", {"Co": 1.0}),
    ],
)
def test_formula_is_read(text, counts):
    assert parse_formula(text) == counts


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "cannot be empty"),
        ("   ", "cannot be empty"),
        ("(CH3)2", "Parentheses are not read"),
        ("CuSO4·5H2O", "Hydrate dots"),
        ("NH4+", "Charged species"),
        ("C 2 H6", "'2' stands alone".replace("'", "")),
        ("h2o", "begin with a capital letter"),
        ("Ch4", "Did you mean C H"),
        ("Xx2", "not an element"),
        ("Tc", "not an element"),
        ("C0 H4", "zero"),
        ("C1,5H2", "not part of a formula"),
        ("C" * 201, "too long"),
        (5, "Give the formula as text"),
        (None, "Give the formula as text"),
    ],
)
def test_bad_formula_says_what_is_wrong(text, words):
    with pytest.raises(InputError) as caught:
        parse_formula(text)
    assert words in str(caught.value)
    assert caught.value.problems[0].name == "formula"


def test_water_weighs_what_its_atoms_weigh():
    # IUPAC 2018 abridged weights of H and O, as printed: 1.008 and 15.999
    assert molar_mass(parse_formula("H2O")) == pytest.approx((2 * 1.008 + 15.999) * 1e-3, rel=1e-15)


@given(st.dictionaries(st.sampled_from(sorted(ATOMIC_WEIGHTS)), st.floats(1e-8, 1e5, allow_nan=False), min_size=1, max_size=6))
def test_text_of_counts_reads_back(counts):
    back = parse_formula(formula_text(counts, digits=17))
    assert back.keys() == counts.keys()
    assert all(math.isclose(back[symbol], counts[symbol], rel_tol=1e-15) for symbol in counts)
