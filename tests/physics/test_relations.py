"""Written relations: each evaluates to its function, and reads, fills and sets in LaTeX."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.physics import algebra
from propkit.physics.relations import RELATIONS, TERMS, Relation
from propkit.sources import SOURCES

RANGES = {
    "isentropic_exponent": (1.05, 5 / 3),
    "mach": (0.05, 8.0),
    "pressure_ratio": (1e-4, 1.0),
    "exit_pressure_ratio": (1e-4, 0.5),
    "ambient_pressure_ratio": (0.0, 0.1),
    "area_ratio": (1.0, 300.0),
    "exit_mach": (1.0, 7.0),
    "half_angle": (0.01, 1.2),
    "lip_angle": (0.01, 0.3),
    "throat_to_lip_angle": (0.1, 0.5),
    "divergence_factor": (0.8, 1.0),
    "condensed_mass_fraction": (0.0, 0.4),
    "velocity_lag": (0.0, 0.3),
    "momentum_share": (0.8, 1.2),
    "share": (0.0, 1.0),
    "shifting": (400.0, 450.0),
    "frozen": (350.0, 400.0),
    "drag": (0.1, 5.0),
    "thrust": (10.0, 90.0),
    "adiabatic_wall_temperature": (2000.0, 3500.0),
    "wall_temperature": (300.0, 1500.0),
    "frozen_specific_heat": (1500.0, 9000.0),
    "gas_constant": (200.0, 1000.0),
    "oxidizer_valence": (-130.0, -20.0),
    "stagnation_enthalpy": (0.0, 1e6),
    "enthalpy": (-9e6, -1e3),
    "oxidizer_enthalpy": (-9e6, 1e6),
}
SUBSET = {
    *["frac", "sqrt", "left", "right", "cdot", "times", "pi", "ln", "exp", "cos", "sin", "tan", "dot", "mathrm"],
    *["rho", "phi", "gamma", "epsilon", "eta", "lambda", "alpha", "theta", "mu", "delta", "sigma", "Gamma", "Delta"],
}
EVERY = pytest.mark.parametrize("relation", list(RELATIONS.values()), ids=list(RELATIONS))


def draw(relation: Relation, rng: np.random.Generator) -> dict[str, float]:
    return {name: float(rng.uniform(*RANGES.get(name, (0.1, 9.0)))) for name in relation.arguments}


@EVERY
def test_written_formula_is_the_function(relation: Relation) -> None:
    """Text and function are written apart; 1e-11 is rounding in powers with large exponents."""
    rng = np.random.default_rng(7)
    for _ in range(40):
        values = draw(relation, rng)
        assert relation.evaluate(values) == pytest.approx(float(relation.function(**values)), rel=1e-11, abs=1e-300)


@EVERY
def test_numbers_put_in_still_give_the_result(relation: Relation) -> None:
    values = draw(relation, np.random.default_rng(11))
    filled = relation.substitute(values, digits=15)
    assert "{" not in filled
    assert algebra.evaluate(filled) == pytest.approx(relation.evaluate(values), rel=1e-9)
    assert not set(re.findall(r"[a-z_]{2,}", filled)) - set(algebra.FUNCTIONS) - {"pi"}


@EVERY
def test_terms_and_sources_are_known(relation: Relation) -> None:
    assert relation.source in SOURCES
    assert set(relation.terms) == set(algebra.names(relation.text))
    assert relation.result.symbol
    assert all(relation.terms[name] == TERMS[name] for name in relation.terms)
    assert relation.key in RELATIONS


@EVERY
def test_latex_is_balanced_and_in_the_subset(relation: Relation) -> None:
    values = draw(relation, np.random.default_rng(3))
    for text in (relation.latex, relation.substitute_latex(values)):
        assert text.count("{") == text.count("}")
        assert text.count(r"\left(") == text.count(r"\right)")
        commands = set(re.findall(r"\\([a-zA-Z]+)", text))
        assert commands <= SUBSET
    assert "_" not in relation.substitute_latex(values)


@given(st.floats(-1e9, 1e9, allow_subnormal=False), st.integers(1, 15))
def test_number_text_reads_back(value: float, digits: int) -> None:
    text = algebra.number_text(value, digits)
    assert algebra.evaluate(text) == pytest.approx(value, rel=10.0 ** (1 - digits), abs=1e-300)


def test_number_texts() -> None:
    assert algebra.number_text(9.7e6) == "9.7e6"
    assert algebra.number_text(0.0000125) == "1.25e-5"
    assert algebra.number_latex(9.7e6) == r"9.7 \times 10^{6}"
    assert algebra.number_latex(-0.25) == "-0.25"


def test_precedence_in_latex() -> None:
    symbols = {"a": "a", "b": "-2", "c": r"3 \times 10^{4}"}
    assert algebra.latex("{a} ** 2", symbols) == "a^{2}"
    assert algebra.latex("{b} ** 2", symbols) == r"\left(-2\right)^{2}"
    assert algebra.latex("{c} ** 2", symbols) == r"\left(3 \times 10^{4}\right)^{2}"
    assert algebra.latex("{a} - (1 - {a})", symbols) == r"a - \left(1 - a\right)"
    assert algebra.latex("{a} * {b}", symbols) == r"a\,\left(-2\right)"
    assert algebra.latex("({a} / 2) ** 2", symbols) == r"\left(\frac{a}{2}\right)^{2}"
    assert algebra.latex("2 * 3 * {a}", symbols) == r"2 \cdot 3\,a"


@pytest.mark.parametrize(
    "text",
    [
        "__import__('os')",
        "a.b",
        "a[0]",
        "[1]",
        "lambda: 1",
        "'7'",
        "True",
        "f(1)",
        "sqrt(1, 2)",
        "1 if 2 else 3",
        "a // b",
    ],
)
def test_outside_the_grammar(text: str) -> None:
    with pytest.raises(ValueError, match=r"grammar|number"):
        algebra.evaluate(text, {"a": 1.0, "b": 2.0})


def test_missing_number_is_named() -> None:
    with pytest.raises(KeyError, match="throat_area"):
        RELATIONS["choked_mass_flow"].substitute({"stagnation_pressure": 7e6})


def test_one_by_hand() -> None:
    """2 kg/s at 3000 m/s, 40 kPa against 100 kPa on 0.1 m2: 6000 - 6000 = 0 N, by hand."""
    values = {"mass_flow": 2.0, "exit_velocity": 3e3, "exit_pressure": 4e4, "ambient_pressure": 1e5, "exit_area": 0.1}
    relation = RELATIONS["thrust"]
    assert relation.evaluate(values) == 0.0
    assert relation.substitute(values) == "2 * 3000 + (40000 - 100000) * 0.1"
    assert relation.latex == r"F = \dot{m}\,u_{e} + \left(p_{e} - p_{a}\right)\,A_{e}"
    assert relation.written == "mass_flow * exit_velocity + (exit_pressure - ambient_pressure) * exit_area"
