"""The library against its checks, and the loader against bad files."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from propkit.data import propellants as library_data
from propkit.data.propellant_row import PHASES, ROLES, TRUST
from propkit.data.propellant_schema import FIELDS
from propkit.data.propellants import find, library, load_library, role_problem, suggestions
from propkit.errors import InputError, StorageError

CONTRACT = (
    "LOX", "GOX", "LF2", "NTO", "MON-3", "MON-10", "MON-25", "HTP-85", "HTP-90", "HTP-98", "N2O", "N2O-gas", "air",
    "LH2", "LH2-normal", "GH2", "LCH4", "GCH4", "RP-1", "Jet-A", "ethanol", "ethanol-75", "ethanol-92", "methanol",
    "isopropanol", "ammonia", "MMH", "UDMH", "hydrazine", "A-50", "propane", "ethane", "ethylene", "propylene",
    "butane", "HTPB", "paraffin", "PE", "PMMA", "ABS", "AP", "AN", "Al", "water", "GN2", "GHe", "argon", "CO2",
    "nitric acid", "natural gas", "furfuryl alcohol",
)  # fmt: skip

GOOD = """
[fuel]
title = "A fuel"
roles = ["fuel"]
phase = "liquid"
formula = "C H2"
enthalpy_kJ_mol = -20.0
temperature_K = 298.15
hazard = "Flammable"
source = "a test"
trust = "weak"
"""


def test_names_that_users_rely_on_are_there():
    assert [name for name in CONTRACT if name not in library()] == []
    assert len(library()) >= 55


@pytest.mark.parametrize("name", list(library()))
def test_row_is_complete_and_sane(name):
    row = library()[name]
    assert set(row.roles) <= set(ROLES)
    assert row.phase in PHASES
    assert row.trust in TRUST
    assert row.hazard
    assert row.source
    assert row.density is not None
    assert row.density > 0.0
    assert row.density_source
    assert math.isfinite(row.specific_enthalpy)
    assert abs(row.specific_enthalpy) < 17e6  # liquid water is the lowest, -15.87 MJ/kg
    assert row.state_text
    if row.freezing_point and row.boiling_point:
        assert row.freezing_point < row.boiling_point
    if row.phase == "liquid":
        assert row.freezing_point, "a liquid has a freezing point"
        assert row.freezing_point <= row.temperature
        assert row.boiling_point
    if row.coolprop_fluid is None and "mixture" not in row.source and row.phase == "liquid" and row.heat_capacity is None:
        assert row.components or name in ("isopropyl nitrate", "n-propyl nitrate", "nitric oxide in NTO")
    if row.heat_capacity_range:
        low, high = row.heat_capacity_range
        assert low <= row.temperature <= high


def test_every_role_has_propellants():
    used = {role for row in library().values() for role in row.roles}
    assert used == set(ROLES)


def test_aliases_do_not_hide_names():
    names = set(library())
    assert not [alias for row in library().values() for alias in row.aliases if alias in names]


@pytest.mark.parametrize("name", [name for name, row in library().items() if row.components])
def test_mixture_rows_conserve_mass_elements_and_enthalpy(name):
    row = library()[name]
    assert math.fsum(row.mixture.values()) == pytest.approx(1.0, abs=1e-15)
    elements = {}
    for part, share in row.components:
        for symbol, count in part.element_counts:
            elements[symbol] = elements.get(symbol, 0.0) + share / part.molar_mass * count
    for symbol, count in row.element_counts:
        assert count / row.molar_mass == pytest.approx(elements[symbol], rel=1e-12)
    enthalpy = math.fsum(share * part.specific_enthalpy for part, share in row.components) + row.mixing_enthalpy
    assert row.specific_enthalpy == pytest.approx(enthalpy, rel=1e-12)


@pytest.mark.parametrize(
    ("wrong", "first"),
    [
        ("lox", "LOX"),
        ("L0X", "LOX"),
        ("liquid oxygen", "LOX"),
        ("methane", "LCH4"),
        ("CH4", "LCH4"),
        ("Kerosene", "RP-1"),
        ("rp1", "RP-1"),
        ("N2O4", "NTO"),
        ("htp 90", "HTP-90"),
        ("hydrogen", "LH2"),
        ("Aluminum", "Al"),
        ("A50", "A-50"),
        ("hydrazin", "hydrazine"),
        ("nitrous", "N2O"),
    ],
)
def test_near_matches(wrong, first):
    assert suggestions(wrong)[0] == first
    with pytest.raises(InputError) as caught:
        find(wrong, input_name="fuel")
    assert f"`fuel` is {wrong!r}" in str(caught.value)
    assert repr(first) in str(caught.value)
    assert caught.value.data["near"][0] == first


def test_hopeless_name_points_to_the_list():
    with pytest.raises(InputError, match=r"pk\.propellants\(\) lists them"):
        find("zzzzzz")


@pytest.mark.parametrize("value", [None, 5, True, ["LOX"], b"LOX"])
def test_a_name_is_text(value):
    with pytest.raises(InputError, match=r"a library name or a pk\.Propellant"):
        find(value)


@given(st.text(max_size=40))
@settings(max_examples=50, deadline=None)
def test_any_text_is_a_name_or_a_clear_error(text):
    if text in library():
        assert find(text).name == text
        return
    with pytest.raises(InputError) as caught:
        find(text)
    assert caught.value.problems[0].name == "propellant"


@pytest.mark.parametrize(
    ("name", "wanted", "words"),
    [
        ("RP-1", "oxidizer", "swapped"),
        ("LOX", "fuel", "swapped"),
        ("N2O", "fuel", "swapped"),
        ("HTP-98", "fuel", "swapped"),
        ("Al", "oxidizer", "swapped"),
        ("LOX", "monopropellant", "a monopropellant"),
        ("RP-1", "cold gas", "Gases of the library for that: "),
        ("isopropyl nitrate", "oxidizer", "serves as monopropellant"),
    ],
)
def test_wrong_role_is_told(name, wanted, words):
    problem = role_problem(name, library()[name].roles, wanted)
    assert problem is not None
    assert words in str(problem)
    assert problem.name == wanted.replace(" ", "_")


@pytest.mark.parametrize(
    ("name", "wanted"),
    [("LOX", "oxidizer"), ("water", "fuel"), ("water", "oxidizer"), ("hydrazine", "fuel"),
     ("hydrazine", "monopropellant"), ("AP", "oxidizer"), ("Al", "fuel"), ("GN2", "cold gas"),
     ("AP", "monopropellant"), ("nitromethane", "fuel")],
)  # fmt: skip
def test_right_role_passes(name, wanted):
    assert role_problem(name, library()[name].roles, wanted) is None


def test_unstated_role_passes():
    assert role_problem("mine", (), "oxidizer") is None


# ---- user files ---------------------------------------------------------------------------------------------------


def write(tmp_path, text):
    file = tmp_path / "mine.toml"
    file.write_text(text, encoding="utf-8")
    return file


def test_user_library_loads(tmp_path):
    text = GOOD + (
        '[mix]\ntitle = "A mix"\nroles = ["fuel"]\nphase = "liquid"\nmixture = { fuel = 0.4, water = 0.6 }\n'
        'temperature_K = 298.15\nhazard = "None"\nsource = "a test"\ntrust = "weak"\n'
    )
    rows = load_library(write(tmp_path, text))
    assert list(rows) == ["fuel", "mix"]
    water = library()["water"].specific_enthalpy
    assert rows["mix"].specific_enthalpy == pytest.approx(0.4 * rows["fuel"].specific_enthalpy + 0.6 * water, rel=1e-14)
    assert rows["mix"].density is None  # the density of the fuel is unknown
    assert rows["fuel"].library.endswith("mine.toml")
    assert "fuel" not in library()


def test_enthalpy_by_mass_is_the_same_thing(tmp_path):
    per_mole = load_library(write(tmp_path, GOOD))["fuel"]
    per_mass = GOOD.replace("enthalpy_kJ_mol = -20.0", f"enthalpy_kJ_kg = {per_mole.specific_enthalpy / 1e3!r}")
    assert load_library(write(tmp_path, per_mass))["fuel"].molar_enthalpy == pytest.approx(-20e3, rel=1e-14)


@pytest.mark.parametrize(
    ("old", "new", "field", "words"),
    [
        ('title = "A fuel"\n', "", "title", "missing"),
        ('title = "A fuel"', 'title = ""', "title", "a text of 1 to 600 characters"),
        ('["fuel"]', '["fule"]', "roles", "oxidizer, fuel, monopropellant"),
        ('["fuel"]', "[]", "roles", "a list of one or more"),
        ('["fuel"]', '"fuel"', "roles", "a list of one or more"),
        ('"liquid"', '"plasma"', "phase", "one of liquid, gas, solid"),
        ('"C H2"', '"C(H2)"', "formula", "Parentheses are not read"),
        ('"C H2"', '"Qq"', "formula", "not an element"),
        ('formula = "C H2"\n', "", "formula", "or `mixture` instead"),
        ("-20.0", '"-20 kJ/mol"', "enthalpy_kJ_mol", "a number from"),
        ("-20.0", "nan", "enthalpy_kJ_mol", "a number from"),
        ("-20.0", "inf", "enthalpy_kJ_mol", "a number from"),
        ("-20.0", "true", "enthalpy_kJ_mol", "a number from"),
        ("-20.0", "1" + 400 * "0", "enthalpy_kJ_mol", "a number from"),
        ("-20.0", "2026-12-01", "enthalpy_kJ_mol", "a number from"),
        ("enthalpy_kJ_mol = -20.0\n", "", "enthalpy_kJ_mol", "missing"),
        ("enthalpy_kJ_mol = -20.0", "enthalpy_kJ_mol = -20.0\nenthalpy_kJ_kg = -3", "enthalpy_kJ_mol", "given twice"),
        ("298.15", "-5", "temperature_K", "a number from 1 to 2000 K"),
        ("298.15", "298.15\ndensity_kg_m3 = -1", "density_kg_m3", "a number from 0.001"),
        ("298.15", "298.15\ndensty_kg_m3 = 1", "densty_kg_m3", "Did you mean density_kg_m3"),
        ("298.15", "298.15\nsaturated = 1", "saturated", "true or false"),
        ("298.15", "298.15\nheat_capacity_J_kg_K = 2000", "heat_capacity_range_K", "given together"),
        ("298.15", "9.0\nheat_capacity_J_kg_K = 9e2\nheat_capacity_range_K = [4, 3]", "heat_capacity_range_K", "two"),
        ("298.15", "298.15\nmixture_by = \"mass\"", "mixture_by", "given without `mixture`"),
        ("298.15", "298.15\nother_values = [{ source = 'x' }]", "other_values", "a list of tables"),
        ("298.15", "298.15\naliases = [3]", "aliases", "a list of texts"),
        ('"weak"', '"certain"', "trust", "one of good, fair, weak"),
        ('hazard = "Flammable"\n', "", "hazard", "what can hurt"),
    ],
)  # fmt: skip
def test_bad_row_names_file_row_and_field(tmp_path, old, new, field, words):
    assert old in GOOD
    with pytest.raises(InputError) as caught:
        load_library(write(tmp_path, GOOD.replace(old, new)))
    message = str(caught.value)
    assert f"mine.toml: [fuel] {field}" in message
    assert words in message


MIX = """
[mix]
title = "A mix"
roles = ["fuel"]
phase = "liquid"
mixture = %s
temperature_K = 298.15
hazard = "None"
source = "a test"
trust = "weak"
"""


@pytest.mark.parametrize(
    ("mixture", "field", "words"),
    [
        ("{ fuel = 0.4, water = 0.5 }", "mixture", "these add up to 0.9"),
        ("{ fuel = 1.4, water = -0.4 }", "mixture", "shares above 0"),
        ("{ fuel = 0.4, watre = 0.6 }", "mixture", "'water'"),
        ("{ fuel = 0.4, MON-3 = 0.6 }", "mixture", "mixture of mixtures"),
        ("{ fuel = 0.4, mix = 0.6 }", "mixture", "mixture of mixtures"),
        ('{ fuel = 1 }\nformula = "C"', "formula", "left out"),
    ],
)
def test_bad_mixture_names_file_row_and_field(tmp_path, mixture, field, words):
    with pytest.raises(InputError) as caught:
        load_library(write(tmp_path, GOOD + MIX % mixture))
    assert f"mine.toml: [mix] {field}" in str(caught.value)
    assert words in str(caught.value)


ANYTHING = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=12) | st.sampled_from(["fuel", "C H2", "water"]),
    lambda inside: st.lists(inside, max_size=3) | st.dictionaries(st.text(max_size=6), inside, max_size=3),
    max_leaves=6,
)


@given(st.dictionaries(st.sampled_from([*FIELDS, "nonsense"]), ANYTHING, min_size=1, max_size=4))
@settings(max_examples=300, deadline=None)
def test_no_table_makes_another_error_than_a_clear_one(changes):
    import tomllib

    fields = {**tomllib.loads(GOOD)["fuel"], **changes}
    try:
        rows = library_data._rows_from_tables({"fuel": fields}, "mine.toml", "mine.toml")
    except InputError as error:
        names = [problem.name for problem in error.problems]
    else:
        names = []
        assert math.isfinite(rows["fuel"].specific_enthalpy)
    assert all(name.startswith("mine.toml: [fuel] ") for name in names)


def test_everything_wrong_is_listed_at_once(tmp_path):
    bad = GOOD.replace("298.15", "-1").replace('"liquid"', '"wet"') + "[other]\ntitle = 'x'\n"
    with pytest.raises(InputError) as caught:
        load_library(write(tmp_path, bad))
    names = [problem.name for problem in caught.value.problems]
    assert "mine.toml: [fuel] temperature_K" in names
    assert "mine.toml: [fuel] phase" in names
    assert "mine.toml: [other] roles" in names


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[fuel\n", "not TOML"),
        ("", "empty"),
        ("x = 3\n", "a table of fields"),
        ("a = " + "[" * 5000, "not TOML"),
        ("a = " + "9" * 5000, "not TOML"),
    ],
)
def test_file_that_is_no_library(tmp_path, text, words):
    with pytest.raises(InputError, match=words):
        load_library(write(tmp_path, text))


def test_binary_file(tmp_path):
    file = tmp_path / "mine.toml"
    file.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="not text in UTF-8"):
        load_library(file)


def test_missing_and_huge_files(tmp_path, monkeypatch):
    with pytest.raises(StorageError, match="cannot be read"):
        load_library(tmp_path / "none.toml")
    monkeypatch.setattr(library_data, "_LARGEST_FILE", 10)
    with pytest.raises(StorageError, match="not a propellant library"):
        load_library(write(tmp_path, GOOD))


def test_the_documentation_lists_every_field():
    from importlib import resources

    from propkit.data.propellant_schema import FIELDS

    text = resources.files("propkit.data").joinpath("README.md").read_text(encoding="utf-8")
    assert [field for field in FIELDS if f"`{field}`" not in text] == []


def test_the_example_of_the_documentation_loads(tmp_path):
    from importlib import resources

    text = resources.files("propkit.data").joinpath("README.md").read_text(encoding="utf-8")
    rows = load_library(write(tmp_path, text.split("```toml")[1].split("```")[0]))
    assert len(rows) == 2


# ---- gases that flow unreacted --------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", [name for name, row in library().items() if row.phase == "gas"])
def test_a_gas_row_is_made_of_species_of_the_data(name):
    from propkit.bridge.basis import load_basis
    from propkit.data.formula import molar_mass

    row = library()[name]
    fractions = row.gas_composition
    assert math.fsum(fractions.values()) == pytest.approx(1.0, rel=1e-12)
    table = load_basis("tm4513").table(sorted(row.elements))
    known = dict(zip(table.names, table.composition, strict=True))
    elements = dict.fromkeys(table.elements, 0.0)
    for species, fraction in fractions.items():
        for symbol, count in zip(table.elements, known[species], strict=True):
            elements[symbol] += fraction * float(count)
    for symbol, count in row.element_counts:
        assert elements[symbol] == pytest.approx(count, rel=1e-9)
    assert molar_mass(elements) == pytest.approx(row.molar_mass, rel=1e-9)


def test_a_reacting_row_has_no_gas_composition():
    assert library()["LOX"].gas_composition == {}
    assert library()["A-50"].gas_composition == {}
