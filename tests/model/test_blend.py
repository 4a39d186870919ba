"""Blends: conservation, shares, roles, statements and errors."""

import copy
import json
import math
import pickle

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import propkit as pk
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.propellants import library
from propkit.model import sheet
from propkit.model.base import from_recipe

NAMES = sorted(library())


@st.composite
def ingredients(draw):
    names = draw(st.lists(st.sampled_from(NAMES), min_size=1, max_size=5, unique=True))
    weights = draw(st.lists(st.floats(0.01, 1.0), min_size=len(names), max_size=len(names)))
    total = math.fsum(weights)
    return {name: weight / total for name, weight in zip(names, weights, strict=True)}


@given(ingredients(), st.sampled_from(["mass", "volume", "mole"]), st.sampled_from([None, "-12 kJ/kg", 5000.0]))
@settings(max_examples=150, deadline=None)
def test_mass_elements_and_enthalpy_are_conserved(shares, by, mixing):
    made = pk.blend(shares, by=by, mixing_enthalpy=mixing)
    rows = {name: library()[name] for name in shares}
    weight = {"mass": lambda row: 1.0, "volume": lambda row: row.density, "mole": lambda row: row.molar_mass}[by]
    masses = {name: share * weight(rows[name]) for name, share in shares.items()}
    total = math.fsum(masses.values())
    for name, mass in masses.items():
        assert made.row.mixture[name] == pytest.approx(mass / total, rel=1e-12)
    assert math.fsum(made.row.mixture.values()) == pytest.approx(1.0, abs=1e-12)
    # elements, and through them the mass
    stream = made.stream()[0]
    expected = {}
    for name, mass in masses.items():
        for symbol, count in rows[name].element_counts:
            expected[symbol] = expected.get(symbol, 0.0) + mass / total * count / rows[name].molar_mass
    assert stream.elements.keys() == expected.keys()
    for symbol, amount in expected.items():
        assert stream.elements[symbol] == pytest.approx(amount, rel=1e-12)
    assert math.fsum(ATOMIC_WEIGHTS[s] * 1e-3 * n for s, n in stream.elements.items()) == pytest.approx(1.0, rel=1e-12)
    # enthalpy
    heat = {None: 0.0, "-12 kJ/kg": -12e3, 5000.0: 5000.0}[mixing]
    parts = [masses[name] / total * rows[name].specific_enthalpy for name in masses]
    scale = math.fsum(abs(part) for part in parts) + abs(heat)
    assert stream.enthalpy == pytest.approx(math.fsum(parts) + heat, abs=1e-12 * scale)
    # ideal volumes
    volumes = math.fsum(masses[name] / total / rows[name].density for name in masses)
    assert made.density.magnitude == pytest.approx(1.0 / volumes, rel=1e-12)


@given(ingredients())
@settings(max_examples=30, deadline=None)
def test_order_of_the_ingredients_does_not_matter(shares):
    one, other = pk.blend(shares), pk.blend(dict(reversed(shares.items())))
    assert one.si("specific_enthalpy") == pytest.approx(other.si("specific_enthalpy"), rel=1e-12, abs=1e-6)
    assert one.roles
    assert set(one.roles) == set(other.roles)


def test_blend_of_one_is_that_one():
    made, alone = pk.blend({"RP-1": 1.0}), pk.Propellant.from_library("RP-1")
    assert made.si("specific_enthalpy") == pytest.approx(alone.si("specific_enthalpy"), rel=1e-14)
    assert made.si("molar_mass") == pytest.approx(alone.si("molar_mass"), rel=1e-14)


def test_blend_of_blends():
    inner = pk.blend({"hydrazine": 0.5, "UDMH": 0.5}, name="half and half")
    outer = pk.blend({inner: 0.8, "MMH": 0.2})
    flat = pk.blend({"hydrazine": 0.4, "UDMH": 0.4, "MMH": 0.2})
    assert outer.si("specific_enthalpy") == pytest.approx(flat.si("specific_enthalpy"), rel=1e-13)
    assert outer.stream()[0].elements["N"] == pytest.approx(flat.stream()[0].elements["N"], rel=1e-13)
    assert outer.stream(320.0)[0].enthalpy == pytest.approx(flat.stream(320.0)[0].enthalpy, rel=1e-12)


def test_library_blends_are_reproduced_with_their_mixing_heat():
    for name, row in library().items():
        if row.components:
            made = pk.blend(row.mixture, mixing_enthalpy=row.mixing_enthalpy, density=row.density)
            assert made.si("specific_enthalpy") == pytest.approx(row.specific_enthalpy, rel=1e-12), name


def test_shares_as_text_pairs_and_percent():
    plain = pk.blend({"ethanol": 0.92, "water": 0.08})
    assert pk.blend({"ethanol": "92 %", "water": "8 %"}) == plain
    assert pk.blend([("ethanol", 0.92), ("water", 0.08)]) == plain
    assert plain.ingredients == {"ethanol": 0.92, "water": 0.08}
    assert plain.by == "mass"
    assert plain.mixing_enthalpy is None


def test_volume_shares_are_those_before_mixing():
    made = pk.blend({"ethanol": 0.5, "water": 0.5}, by="volume")
    ethanol, water = library()["ethanol"].density, library()["water"].density
    assert made.row.mixture["ethanol"] == pytest.approx(ethanol / (ethanol + water), rel=1e-14)


def test_identity_copies_pickle_recipe_and_code():
    own = pk.Propellant(name="mine", formula="C H2", enthalpy="-20 kJ/mol", density=800.0)
    for made in (
        pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12}, name="a solid"),
        pk.blend({own: 0.5, "RP-1": 0.5}, by="volume", mixing_enthalpy="-1 kJ/kg", role="fuel", hazard="burns", source="mine"),
        pk.blend({pk.blend({"hydrazine": 0.5, "UDMH": 0.5}): 0.5, "MMH": 0.5}),
    ):
        again = eval(repr(made), {"pk": pk})
        for other in (
            again,
            copy.deepcopy(made),
            pickle.loads(pickle.dumps(made)),
            from_recipe(json.loads(json.dumps(made.recipe()))),
        ):
            assert other == made
            assert hash(other) == hash(made)
            assert other.row == made.row
    assert made.as_code().startswith("import propkit as pk\n")


def test_what_was_given_cannot_be_changed_afterwards():
    shares = {"ethanol": 0.92, "water": 0.08}
    made = pk.blend(shares)
    shares["water"] = 5.0
    made.ingredients["water"] = 5.0
    assert made == pk.blend({"ethanol": 0.92, "water": 0.08})
    with pytest.raises(TypeError):
        made.inputs["ingredients"][0] = ("water", 1.0)


def test_replace():
    made = pk.blend({"ethanol": 0.92, "water": 0.08})
    assert made.replace(by="mole").row.mixture["ethanol"] == pytest.approx(0.96711, abs=1e-5)
    assert made.replace(density="812 kg/m3").density.magnitude == 812.0
    assert made.replace(ingredients={"ethanol": 0.75, "water": 0.25}) == pk.blend({"ethanol": 0.75, "water": 0.25})


@pytest.mark.parametrize(
    ("shares", "role"),
    [
        ({"ethanol": 0.92, "water": 0.08}, "fuel"),
        ({"AP": 0.7, "Al": 0.18, "HTPB": 0.12}, "monopropellant"),
        ({"RP-1": 0.9, "Al": 0.1}, "fuel"),
        ({"LOX": 0.7, "LF2": 0.3}, "oxidizer"),
        ({"LOX": 0.7, "GN2": 0.3}, "oxidizer"),
        ({"nitric acid": 0.8, "NTO": 0.2}, "oxidizer"),
        ({"GN2": 0.5, "GHe": 0.5}, "cold gas"),
        ({"furfuryl alcohol": 0.7, "triethylamine": 0.3}, "fuel"),
        ({"nitromethane": 0.5, "methanol": 0.5}, "fuel"),
        ({"water": 1.0}, "diluent"),
    ],
)
def test_role_follows_from_the_ingredients(shares, role):
    assert pk.blend(shares).role == role


def test_role_given_or_unknown():
    assert pk.blend({"RP-1": 0.9, "Al": 0.1}, role="ingredient").role == "ingredient"
    own = pk.Propellant(formula="C H2", enthalpy="-20 kJ/mol")
    assert pk.blend({own: 0.5, "RP-1": 0.5}).role is None


def test_it_says_what_it_does_with_the_heat_of_mixing():
    neglected = pk.blend({"ethanol": 0.9, "water": 0.1})
    assert neglected.assumptions[0].statement == "Heat of mixing neglected."
    assert neglected.assumptions[0].origin == "default"
    assert "The library's ethanol-92 includes -4.16 kJ/kg of it" in neglected.warnings[0]
    included = pk.blend({"ethanol": 0.9, "water": 0.1}, mixing_enthalpy="-5 kJ/kg")
    assert included.assumptions[0].statement == "Heat of mixing -5 kJ/kg included as given."
    assert included.warnings == ()
    assert "ideal-volumes" in [entry.key for entry in included.assumptions]


def test_doubts_of_a_blend():
    assert "HTPB" in pk.blend({"AP": 0.7, "Al": 0.18, "HTPB": 0.12}).warnings[0]
    warm = pk.blend({"LOX": 0.5, "NTO": 0.5})
    assert any("different temperatures (LOX 90.17 K, NTO 298.15 K)" in text for text in warm.warnings)


def test_hazards_are_joined():
    made = pk.blend({"AP": 0.7, "Al": 0.18, "HTPB": 0.12})
    assert all(f"{name}: " in made.hazard for name in ("AP", "Al", "HTPB"))
    assert "water" not in pk.blend({"ethanol": 0.9, "water": 0.1}).hazard


def test_sheet_of_a_blend():
    made = pk.blend({"AP": 0.7, "Al": 0.18, "HTPB": 0.12}, name="a solid")
    for system in ("SI", "US"):
        report = sheet.report_of(made, system, lambda report, medium: "")
        assert report.title == "a solid"
        table = next(section.table for section in report.sections if section.name == "ingredients")
        assert table.index == ("AP", "Al", "HTPB")
        assert sum(table.columns[1].values) == pytest.approx(100.0)
        lines = [line for section in report.sections for line in section.lines]
        assert "Heat of mixing neglected." in lines
        assert "Volumes of the ingredients add up." in lines


OWN = pk.Propellant(name="mine", formula="C H2", enthalpy="-20 kJ/mol")


@pytest.mark.parametrize(
    ("shares", "options", "words"),
    [
        ({}, {}, "ingredients with their shares"),
        ("ethanol", {}, "ingredients with their shares"),
        (5, {}, "ingredients with their shares"),
        (["ethanol", "water"], {}, "ingredients with their shares"),
        ({"ethanol": 0.9, "water": 0.2}, {}, "add up to 1.1"),
        ({"ethanol": 0.9}, {}, "0.1 is missing"),
        ({"ethanol": 92, "water": 8}, {}, "'92 %'"),
        ({"ethanol": 1.0, "water": 0.0}, {}, "Leave out what is not in it"),
        ({"ethanol": 1.2, "water": -0.2}, {}, "above 0 and at most 1"),
        ({"ethanol": float("nan"), "water": 1.0}, {}, "finite"),
        ({"ethanol": True, "water": 0.5}, {}, "ingredients['ethanol']"),
        ({"ethanol": "half", "water": 0.5}, {}, "ingredients['ethanol']"),
        ({"etanol": 0.5, "water": 0.5}, {}, "Did you mean 'ethanol'"),
        ({5: 0.5, "water": 0.5}, {}, "a library name or a pk.Propellant"),
        ([("water", 0.5), ("water", 0.5)], {}, "given twice"),
        ({OWN: 0.5, "water": 0.5}, {"by": "volume"}, "Shares by volume need one"),
        ({"ethanol": 1.0}, {"by": "weight"}, "one of 'mass', 'volume', 'mole'"),
        ({"ethanol": 1.0}, {"density": "-3 kg/m3"}, "above 0 kg/m³"),
        ({"ethanol": 1.0}, {"mixing_enthalpy": "3 K"}, "unit of another kind"),
    ],
)
def test_bad_blend_is_told(shares, options, words):
    with pytest.raises(pk.InputError) as caught:
        pk.blend(shares, **options)
    assert words in str(caught.value)


def test_unknown_option_is_a_type_error():
    with pytest.raises(TypeError):
        pk.blend({"ethanol": 1.0}, temperature=300.0)
