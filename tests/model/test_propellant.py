"""The propellant object: inputs, values, identity, sheet, errors."""

import copy
import json
import pickle

import pint
import pytest

import propkit as pk
from propkit.model import sheet
from propkit.model.base import from_recipe
from propkit.model.propellant import as_propellant

LOT = {
    "name": "RP-1 lot 7",
    "formula": "C H1.95",
    "enthalpy": "-24.717 kJ/mol",
    "density": "810 kg/m3",
    "temperature": "298.15 K",
    "role": "fuel",
}
FILE = """
["my fuel"]
title = "A fuel of mine"
roles = ["fuel", "monopropellant"]
phase = "liquid"
formula = "C3 H7 N O3"
enthalpy_kJ_mol = -229.7
temperature_K = 298.15
density_kg_m3 = 1034.0
heat_capacity_J_kg_K = 1750.0
heat_capacity_range_K = [260.0, 340.0]
freezing_K = 190.65
boiling_K = 374.2
hazard = "Explosive when heated"
source = "a certificate"
trust = "fair"

[watered]
title = "The same with water"
roles = ["monopropellant"]
phase = "liquid"
mixture = { "my fuel" = 0.9, water = 0.1 }
mixing_enthalpy_kJ_kg = -2.0
temperature_K = 298.15
hazard = "Explosive when heated"
source = "sum"
trust = "weak"

[cold]
title = "A liquefied gas"
roles = ["oxidizer"]
phase = "liquid"
formula = "O2"
enthalpy_kJ_mol = -12.979
temperature_K = 90.17
pressure_kPa = 101.136
saturated = true
coolprop_fluid = "Oxygen"
hazard = "Cryogenic"
source = "a table"
trust = "good"
"""


@pytest.fixture
def file(tmp_path):
    path = tmp_path / "mine.toml"
    path.write_text(FILE, encoding="utf-8")
    return path


def test_library_propellant_has_the_values_of_its_row():
    lox = pk.Propellant.from_library("LOX")
    assert lox.name == "LOX"
    assert lox.label == "LOX"
    assert lox.role == "oxidizer"
    assert lox.roles == ("oxidizer",)
    assert lox.elements.to_dict() == {"O": 2.0}
    assert lox.density.to("kg/m**3").magnitude == 1141.26
    assert lox.temperature.to("K").magnitude == 90.17
    assert lox.molar_mass.to("g/mol").magnitude == pytest.approx(2 * 15.999, rel=1e-15)
    assert lox.specific_enthalpy.to("kJ/kg").magnitude == pytest.approx(-12.979 / 0.031998, rel=1e-14)
    assert lox.enthalpy.to("kJ/mol").magnitude == pytest.approx(-12.979, rel=1e-15)
    assert lox.vapour_pressure is None
    assert "Cryogenic" in lox.hazard
    assert lox.source


def test_own_propellant_by_mole_and_by_mass():
    by_mole = pk.Propellant(**LOT)
    # RP-1 model CH1.95: -24.717 kJ over 13.9766 g (12.011 + 1.95 x 1.008)
    assert by_mole.specific_enthalpy.to("kJ/kg").magnitude == pytest.approx(-24.717 / 0.0139766, rel=1e-12)
    by_mass = pk.Propellant(**{**LOT, "enthalpy": f"{by_mole.si('specific_enthalpy')!r} J/kg"})
    assert by_mass.si("molar_enthalpy") == pytest.approx(-24717.0, rel=1e-14)
    quantity = pint.get_application_registry().Quantity(-24.717, "kJ/mol")
    assert pk.Propellant(**{**LOT, "enthalpy": quantity}) == by_mole


def test_oxygen_balance():
    """AP +34.0 %, AN +20.0 %, RDX -21.6 %: the usual values to CO2, H2O, HCl (from memory)."""
    for name, percent in (
        ("AP", 34.0),
        ("AN", 20.0),
        ("RDX", -21.6),
        ("HMX", -21.6),
        ("nitromethane", -39.3),
        ("LOX", 100.0),
    ):
        assert pk.Propellant.from_library(name).oxygen_balance * 100.0 == pytest.approx(percent, abs=0.06)


def test_equality_hash_copies_pickle_and_recipe(file):
    made = [
        pk.Propellant.from_library("LOX"),
        pk.Propellant(**LOT),
        pk.Propellant(**LOT, heat_capacity="2010 J/(kg K)", heat_capacity_range=("230 K", "370 K")),
        pk.Propellant.from_library("LOX").replace(density="1150 kg/m3"),
        *pk.load_propellants(file).values(),
    ]
    for one in made:
        for again in (pickle.loads(pickle.dumps(one)), copy.copy(one), copy.deepcopy(one), eval(repr(one), {"pk": pk})):
            assert again == one
            assert hash(again) == hash(one)
            assert again.row == one.row
        back = from_recipe(json.loads(json.dumps(one.recipe())))
        assert back == one
        assert back.row == one.row
    assert len(set(made)) == len(made)


def test_equal_means_same_values_however_typed():
    assert pk.Propellant(**LOT) == pk.Propellant(**{**LOT, "density": 810.0, "temperature": "25 °C", "formula": "C  H1.95"})
    assert pk.Propellant(**LOT) == pk.Propellant(**{**LOT, "name": "another name"})
    assert pk.Propellant(**LOT) != pk.Propellant(**{**LOT, "density": 811.0})


def test_it_is_immutable():
    lox = pk.Propellant.from_library("LOX")
    with pytest.raises(AttributeError, match="immutable"):
        lox.density = 1.0
    with pytest.raises(AttributeError):
        lox.row.density = 1.0
    lox.row.elements["O"] = 3.0
    elements = lox.elements
    elements["O"] = 3.0
    assert lox.elements.to_dict() == {"O": 2.0}


def test_library_values_can_be_replaced_by_better_ones():
    lot = pk.Propellant.from_library("RP-1").replace(density="812 kg/m3", enthalpy="-1770 kJ/kg", name="lot 9", role="fuel")
    assert lot.density.magnitude == 812.0
    assert lot.si("specific_enthalpy") == pytest.approx(-1.77e6, rel=1e-14)
    assert lot.source == "as given"
    assert lot.label == "lot 9"
    assert lot.row.formula == pk.Propellant.from_library("RP-1").formula


def test_user_library(file):
    mine = pk.Propellant.from_library("my fuel", library=file)
    assert mine.roles == ("fuel", "monopropellant")
    assert mine.name == "my fuel"
    assert mine.si("molar_enthalpy") == -229.7e3
    assert mine.stream(310.0)[0].enthalpy - mine.si("specific_enthalpy") == pytest.approx(1750.0 * (310.0 - 298.15))
    watered = pk.load_propellants(file)["watered"]
    water = pk.Propellant.from_library("water")
    expected = 0.9 * mine.si("specific_enthalpy") + 0.1 * water.si("specific_enthalpy") - 2000.0
    assert watered.si("specific_enthalpy") == pytest.approx(expected, rel=1e-12)
    file.unlink()
    assert from_recipe(mine.recipe()) == mine  # the file is no longer needed
    with pytest.raises(pk.StorageError):
        pk.Propellant.from_library("my fuel", library=file)


def test_user_row_with_an_equation_of_state(file):
    pytest.importorskip("CoolProp")
    cold, lox = pk.load_propellants(file)["cold"], pk.Propellant.from_library("LOX")
    for state in ((None, None), (80.0, None), (120.0, 5e6)):
        assert cold.stream(*state)[0].enthalpy == pytest.approx(lox.stream(*state)[0].enthalpy, rel=1e-12)


def test_user_library_name_with_near_matches(file):
    with pytest.raises(pk.InputError, match="Did you mean 'my fuel'"):
        pk.Propellant.from_library("my feul", library=file)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"formula": None}, "`formula` is missing"),
        ({"enthalpy": None}, "`enthalpy` is missing"),
        ({"enthalpy": -24717.0}, "A number alone could be per mole or per mass"),
        ({"enthalpy": "-24717"}, "The unit is missing"),
        ({"enthalpy": "3 MPa"}, "an enthalpy per mole of the formula or per mass"),
        ({"enthalpy": "-24,7 kJ/mol"}, "decimal sign as a point"),
        ({"enthalpy": True}, "`enthalpy` is True"),
        ({"enthalpy": "-1e30 kJ/mol"}, "within 1e9 J/mol of zero"),
        ({"formula": "C1 H" + "9" * 50}, "beyond 1e+06"),
        ({"formula": "(CH3)2"}, "Parentheses are not read"),
        ({"formula": 5}, "Give the formula as text"),
        ({"density": "0 kg/m3"}, "above 0 kg/m³"),
        ({"density": "5 K"}, "unit of another kind"),
        ({"temperature": "-3 K"}, "above 0 K"),
        ({"role": "feul"}, "Did you mean 'fuel'"),
        ({"role": 3}, "one of 'oxidizer', 'fuel'"),
        ({"role": ""}, "one of 'oxidizer', 'fuel'"),
        ({"phase": "liqid"}, "Did you mean 'liquid'"),
        ({"saturated": 1}, "True or False"),
        ({"heat_capacity_range": ("200 K", "300 K")}, "given together with heat_capacity"),
        ({"heat_capacity": 2000.0, "heat_capacity_range": ("400 K", "300 K")}, "the lower first"),
        ({"heat_capacity": 2000.0, "heat_capacity_range": "300 K"}, "two temperatures"),
        ({"hazard": "x" * 300}, "at most 200 characters"),
        ({"library_name": "LOX"}, "given beside library_name"),
        ({"library_name": "LOXX"}, "'LOX'"),
    ],
)
def test_bad_input_is_named(change, words):
    given = {name: value for name, value in {**LOT, **change}.items() if value is not None}
    with pytest.raises(pk.InputError) as caught:
        pk.Propellant(**given)
    assert words in str(caught.value)
    assert {problem.name for problem in caught.value.problems} & {*change, "formula", "temperature"}


def test_everything_wrong_is_listed():
    with pytest.raises(pk.InputError) as caught:
        pk.Propellant(formula="Qq", enthalpy="x", density=-1, role="no")
    assert [problem.name for problem in caught.value.problems] == ["formula", "enthalpy", "density", "role"]


def test_unknown_keyword_names_its_neighbour():
    with pytest.raises(TypeError, match="did you mean density"):
        pk.Propellant(**LOT, densty=5)


def test_reader_of_propellant_inputs():
    lot = pk.Propellant(**LOT)
    assert as_propellant("fuel", lot) is lot
    assert as_propellant("fuel", "LCH4") == pk.Propellant.from_library("LCH4")
    assert as_propellant("oxidizer", {"LOX": 0.7, "LF2": 0.3}) == pk.blend({"LOX": 0.7, "LF2": 0.3})
    for value in (5, None, ["LOX"]):
        with pytest.raises(pk.InputError, match="`fuel` is"):
            as_propellant("fuel", value)
    with pytest.raises(pk.InputError, match="Did you mean 'LCH4'"):
        as_propellant("fuel", "methane")


def test_stream_is_per_kilogram():
    stream, doubts = pk.Propellant.from_library("NTO").stream()
    assert doubts == ()
    weights = {"N": 14.007e-3, "O": 15.999e-3}
    assert sum(weights[symbol] * amount for symbol, amount in stream.elements.items()) == pytest.approx(1.0, rel=1e-12)


def test_a_gas_says_at_which_pressure_its_density_is():
    pytest.importorskip("CoolProp")
    case = pk.PropellantCase("GOX", "RP-1", mixture_ratio=2.4)
    assert any("GOX is that of the gas at 1 bar; give oxidizer_pressure" in text for text in case.warnings)
    fed = pk.PropellantCase("GOX", "RP-1", mixture_ratio=2.4, oxidizer_pressure="20 MPa")
    assert not any("density" in text for text in fed.warnings)
    assert fed.si("bulk_density") > 50.0 * case.si("bulk_density")


def test_another_state_of_a_row_points_to_the_case():
    with pytest.raises(pk.InputError, match="oxidizer_temperature="):
        pk.Propellant.from_library("LOX").replace(temperature="80 K")


def test_doubts_travel_into_the_case():
    case = pk.PropellantCase("LOX", "HTPB", mixture_ratio=2.4)
    assert any("an estimate or its sources disagree" in text for text in case.warnings)
    blended = pk.PropellantCase("LOX", {"ethanol": 0.9, "water": 0.1}, mixture_ratio=1.4)
    assert any("Heat of mixing neglected" in text for text in blended.warnings)


def test_doubts_travel():
    assert "an estimate or its sources disagree" in pk.Propellant.from_library("HTPB").warnings[0]
    assert pk.Propellant.from_library("LOX").warnings == ()
    assert "No range was given" in pk.Propellant(**LOT, heat_capacity=2000.0).warnings[0]


@pytest.mark.parametrize("name", list(pk.propellants().index))
@pytest.mark.parametrize("system", ["SI", "US"])
def test_every_row_has_a_sheet(name, system):
    made = pk.Propellant.from_library(name)
    report = sheet.report_of(made, system, lambda report, medium: "")
    assert report.cautions == (f"{name}: {made.hazard}",)
    assert {row.name for row in report.headline} == {"specific_enthalpy", "density"}
    text = " ".join(line for section in report.sections for line in section.lines)
    assert made.source in text
    assert made.row.formula in text
    assert made.figures(system)[0].alt.startswith("Mass fractions: ")
    assert sum(made.figures(system)[0].layers[0].values.values) == pytest.approx(100.0)
    if made.row.other_values:
        table = next(section.table for section in report.sections if section.name == "sources")
        assert table.index[0] == "used here"
        assert table.columns[1].values[0] == 0.0


def test_the_table_of_the_library():
    frame = pk.propellants()
    assert frame.index.name == "name"
    assert len(frame) >= 55
    for column in ("title", "role", "formula", "enthalpy", "density", "hazard", "source"):
        assert column in frame.columns
    assert frame.loc["LOX", "enthalpy"] == -12979.0
    assert frame.attrs["units"]["enthalpy"] == "J/mol"
    assert set(frame["role"]) <= {"oxidizer", "fuel", "monopropellant", "cold gas", "ingredient", "diluent"}
    assert "LCH4" in frame[frame["title"].str.contains("methane", case=False)].index
    assert frame[["title", "role", "formula", "hazard", "source"]].notna().all().all()


def test_the_table_of_a_user_library(file):
    frame = pk.propellants(file)
    assert list(frame.index) == ["my fuel", "watered", "cold"]
    assert frame.loc["watered", "role"] == "monopropellant"
