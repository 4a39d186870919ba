"""What the objects say to somebody who types something wrong or unusual: near names, all problems at once, what to try."""

from __future__ import annotations

import pytest

import propkit as pk


@pytest.fixture(scope="module")
def perf() -> pk.Performance:
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="7 MPa"), area_ratio=20, throat_diameter="0.1 m")
    return pk.Performance(nozzle, ambient="sea level")


@pytest.mark.parametrize(
    ("path", "first"),
    [
        ("thurst", "performance.thrust"),
        ("mas_flow", "performance.mass_flow"),
        ("chamber.presure", "chamber.pressure"),
        ("chamber.throat_diameter", "nozzle.throat_diameter"),
        ("nozle.area_ratio", "nozzle.area_ratio"),
        ("exit.presure", "nozzle.exit.pressure"),
        ("nozzle.exit.presure", "nozzle.exit.pressure"),
    ],
)
def test_a_mistyped_path_gets_the_nearest_name_of_the_object_itself_first(perf, path, first):
    with pytest.raises(pk.InputError) as caught:
        perf.working(path)
    assert f"Did you mean {first}" in str(caught.value)


def test_a_missing_input_says_in_a_sentence_what_it_is():
    with pytest.raises(pk.InputError) as caught:
        pk.PropellantCase()
    assert "`fuel` is missing; it must be given. Propellant that is burnt." in str(caught.value)


def test_every_bad_input_of_a_burn_is_listed_at_once(perf):
    with pytest.raises(pk.InputError) as caught:
        perf.burn(duration="-1 s", ullage="3 kg", residuals=0.7)
    assert [problem.name for problem in caught.value.problems] == ["duration", "ullage", "residuals"]


@pytest.mark.parametrize(
    ("given", "add"), [({}, "area_ratio"), ({"area_ratio": 20}, "throat_diameter"), ({"throat_area": 0.1}, "area_ratio")]
)
def test_a_nozzle_without_a_size_is_told_what_to_add(perf, given, add):
    with pytest.raises(pk.InputError, match=f"Add, for example, {add}"):
        pk.Nozzle(perf.nozzle.chamber, **given)


@pytest.mark.parametrize("name", ["", "  "])
def test_a_propellant_with_an_empty_name_is_refused(name):
    with pytest.raises(pk.InputError, match="`name`"):
        pk.Propellant(name=name, formula="C H2", enthalpy="-25 kJ/mol")


def test_a_propellant_without_a_name_goes_by_its_formula():
    assert pk.Propellant(formula="C H2", enthalpy="-25 kJ/mol").label == "C H2"


def test_an_enthalpy_of_zero_needs_no_unit():
    iron = {"name": "iron", "formula": "Fe", "role": "fuel"}
    assert pk.Propellant(**iron, enthalpy=0).si("molar_enthalpy") == 0.0
    for other in (1, False):
        with pytest.raises(pk.InputError, match="enthalpy"):
            pk.Propellant(**iron, enthalpy=other)


def test_the_minus_of_a_printed_page_is_read():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3, oxidizer_temperature="\N{MINUS SIGN}183 °C")
    assert case.si("oxidizer_temperature") == pytest.approx(90.15, abs=1e-9)


def test_a_temperature_difference_is_refused_as_one():
    with pytest.raises(pk.InputError, match="temperature difference"):
        pk.PropellantCase("LOX", "LCH4", mixture_ratio=3, oxidizer_temperature="5 delta_degC")


def test_a_cold_film_that_cannot_be_a_gas_is_told_what_would_work():
    case = pk.PropellantCase.with_film("LOX", "LCH4", mixture_ratio=3.4, film_fraction=0.05)
    with pytest.raises(pk.RangeError, match=r"film_mixture_ratio=0\.3.*fuel_temperature=") as caught:
        pk.Chamber(case, pressure="5 MPa")
    assert "temperature 10 K" in str(caught.value)
    assert pk.Chamber(case.replace(film_mixture_ratio=0.3), pressure="5 MPa").has("temperature")
    warm = case.replace(fuel_temperature="350 K", fuel_pressure="8 MPa")
    assert pk.Chamber(warm, pressure="5 MPa").has("temperature")


def test_the_sheet_of_a_case_shows_a_blend_by_its_label_and_a_flag_as_yes():
    blend = pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12})
    given = {row.name: row for row in pk.PropellantCase.monopropellant(blend, condensed=True).report().given}
    assert given["propellant"].typed == given["propellant"].value == blend.label
    assert given["condensed"].typed == given["condensed"].value == "yes"


def test_a_working_warns_once(perf):
    text = str(perf.replace({"nozzle.area_ratio": 60}).working("thrust"))
    assert text.count("Separation is likely") == 1


def test_a_text_sheet_fits_a_terminal_of_80_columns():
    blend = pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12})
    solid = pk.PropellantCase.monopropellant(blend, condensed=True, name="a name of a grain " * 8)
    chamber = pk.Chamber(solid, pressure="7 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m", contour=pk.Cone("15 deg"))
    perf = pk.Performance(nozzle, ambient="sea level")
    sheets = [*perf.chain(), perf.working("thrust"), perf.report(units="US"), pk.Propellant.from_library("IRFNA")]
    for sheet in sheets:
        widest = max(str(sheet).splitlines(), key=lambda line: sum(not 0x300 <= ord(letter) < 0x370 for letter in line))
        assert sum(not 0x300 <= ord(letter) < 0x370 for letter in widest) <= 80, widest


def test_prices_have_the_sign_of_the_change_where_the_thrust_is_negative(perf):
    worse = perf.replace({"chamber.pressure": "0.3 MPa", "nozzle.area_ratio": 60})
    assert worse.si("thrust") < 0.0
    efficiency = next(p for p in worse.assumptions.of("cstar-efficiency").prices if p.alternative == "0.97")
    # 0.97 of the characteristic velocity takes more mass flow for the same (negative) thrust: a smaller negative impulse
    assert efficiency.specific_impulse == pytest.approx(0.03, rel=1e-9)
    assert worse.assumptions.of("full-flow").prices[0].thrust > 1.0


def test_a_saturation_beyond_all_bounds_is_said_in_words():
    case = pk.PropellantCase.cold_gas("xenon", temperature="200 K")
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="1 kPa"), area_ratio=200, throat_diameter="30 um")
    sheet = " ".join(str(pk.Performance(nozzle, ambient="vacuum")).split())
    assert "over a million times its vapour pressure" in sheet
    assert "throat.." not in sheet
    assert "Separation in vacuum" in str(pk.Performance(nozzle, ambient="vacuum").report().sections)


def test_the_formula_of_a_blend_is_shown_to_four_digits():
    blend = pk.blend({"ethanol": 0.5, "water": 0.2, "RP-1": 0.3})
    table = next(s.table for s in pk.PropellantCase("LOX", blend, mixture_ratio=2).sections("SI") if s.name == "propellants")
    formula = next(column for column in table.columns if column.name == "formula").values[1]
    assert all(len(part.lstrip("CHO").replace(".", "").lstrip("0")) <= 4 for part in formula.split())


def test_the_range_of_an_angle_is_told_in_degrees():
    with pytest.raises(pk.InputError, match="above 0 ° and below 90 °"):
        pk.Cone(15)
