"""Every bad input is a PropkitError that names the input, the value, what is allowed and what to try."""

from __future__ import annotations

import math
import re

import pytest

import propkit as pk


def chamber(**changes):
    return pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4), **{"pressure": "7 MPa", **changes})


PRESSURES = [
    (-1.0, "above|at least"),
    (0, "at least"),
    ("0 Pa", "at least"),
    ("-7 MPa", "at least"),
    ("100 psig", r"gauge.*114\.696 psi"),
    ("9 barg", r"gauge.*10\.01"),
    ("7 K", "another kind"),
    ("7 m", "another kind"),
    ("7,5 MPa", r"decimal sign as a point.*7\.5 MPa"),
    ("1,000 kPa", "ambiguous"),
    ("3 500 psi", "without spaces: 3500 psi"),
    ("7 MPa + 3 MPa", "Arithmetic"),
    ("9 bar a", "absolute; write 9 bar"),
    ("9**9**9**9 Pa", "Arithmetic"),
    ("1_000 Pa", "underscores"),
    (True, "absolute pressure"),
    ([7e6, 8e6], "study"),
    (None, "absolute pressure|missing"),
    (math.nan, "finite"),
    (math.inf, "finite"),
    ("nan Pa", "finite|one number"),
    ("1e999 Pa", "finite"),
    (1e30, "at most"),
    ("1 GPa", "at most"),
    ("seven", "one number and one unit"),
    ("", "one number and one unit"),
    ("7", "unit is missing"),
    ("7 MPA", "case-sensitive"),
    ("7 Pa" * 50, "too long"),
    (b"7 MPa", "absolute pressure"),
    (7 + 0j, "absolute pressure"),
]


@pytest.mark.parametrize(("value", "words"), PRESSURES, ids=[repr(value)[:24] for value, _ in PRESSURES])
def test_a_bad_pressure_is_refused_in_words(value, words):
    with pytest.raises(pk.InputError) as caught:
        chamber(pressure=value)
    message = str(caught.value)
    assert message.startswith("`pressure` is ")
    assert "it must be" in message
    assert re.search(words, message), message
    assert caught.value.problems[0].name == "pressure"


OTHERS = [
    (lambda: pk.PropellantCase("LOXX", "LCH4", mixture_ratio=3), "oxidizer", "LOX"),
    (lambda: pk.PropellantCase("LCH4", "LOX", mixture_ratio=3), "oxidizer", "fuel"),
    (lambda: pk.PropellantCase("LOX", "LOX", mixture_ratio=3), "fuel", "oxidizer"),
    (lambda: pk.PropellantCase("LOX", 7, mixture_ratio=3), "fuel", "pk.Propellant"),
    (lambda: pk.PropellantCase("LOX", "LCH4", mixture_ratio=0), "mixture_ratio", "at least"),
    (lambda: pk.PropellantCase("LOX", "LCH4", mixture_ratio=-3), "mixture_ratio", "at least"),
    (lambda: pk.PropellantCase("LOX", "LCH4", mixture_ratio="3 MPa"), "mixture_ratio", "another kind"),
    (lambda: pk.PropellantCase("LOX", "LCH4", mixture_ratio=3, equivalence_ratio=1), "mixture_ratio", "one of the two"),
    (lambda: pk.PropellantCase("LOX", "LCH4"), "mixture_ratio", "missing"),
    (lambda: pk.PropellantCase("LOX", "LCH4", mixture_ratio=3, thermo_basis="tm4514"), "thermo_basis", "tm4513"),
    (lambda: pk.Chamber("LOX", pressure=7e6), "case", "PropellantCase"),
    (lambda: chamber(contraction_ratio=0.8), "contraction_ratio", "throat over chamber"),
    (lambda: chamber(contraction_ratio=1), "contraction_ratio", "above 1"),
    (lambda: chamber(cstar_efficiency=1.02), "cstar_efficiency", "at most 1"),
    (lambda: chamber(cstar_efficiency=0), "cstar_efficiency", "above 0.5"),
    (lambda: chamber(pressure_at="injektor"), "pressure_at", "'injector'"),
    (lambda: pk.Nozzle(chamber(), area_ratio=0.5, throat_diameter=0.1), "area_ratio", "at least 1"),
    (lambda: pk.Nozzle(chamber(), exit_pressure="6 MPa", throat_diameter=0.1), "exit_pressure", "throat pressure"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20), "nozzle size", "one size"),
    (lambda: pk.Nozzle(chamber(), throat_diameter=0.1), "nozzle size", "area_ratio"),
    (lambda: pk.Nozzle(chamber()), "nozzle size", "missing"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_diameter=0.1, throat_area=0.01), "nozzle size", "too much"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, exit_pressure=5e4, throat_area=0.01), "nozzle size", "too much"),
    (lambda: pk.Nozzle(chamber(), throat_diameter=0.1, exit_diameter=0.09), "exit_diameter", "area ratio comes out"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, thrust=1e5), "sizing_ambient", "sized_for"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, sizing_ambient=0.0), "sizing_ambient", "left out"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=-0.01), "throat_area", "at least"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, flow="shiftin"), "flow", "'shifting'"),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, freeze_at="throat"), "freeze_at", "frozen"),
    (
        lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, flow="frozen", freeze_at=0.5),
        "freeze_at",
        "above 1",
    ),
    (lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, exponent="frozen"), "exponent", "constant-property"),
    (
        lambda: pk.Nozzle(chamber(), area_ratio=20, throat_area=0.01, discharge_coefficient=1.1),
        "discharge_coefficient",
        "at most 1",
    ),
    (lambda: pk.Nozzle(7, area_ratio=20, throat_area=0.01), "chamber", "pk.Chamber"),
    (lambda: pk.Performance(chamber(), ambient="vacuum"), "nozzle", "pk.Nozzle"),
    (
        lambda: pk.Chamber.from_gas(pressure=7e6, temperature=3000, isentropic_exponent=0.9, molar_mass=0.02),
        "isentropic_exponent",
        "above 1",
    ),
    (
        lambda: pk.Chamber.from_gas(pressure=7e6, temperature=3000, isentropic_exponent=1.2),
        "molar_mass",
        "gas_constant",
    ),
    (
        lambda: pk.Chamber.from_gas(pressure=7e6, temperature=3000, isentropic_exponent=1.2, molar_mass=0.02, gas_constant=400),
        "molar_mass",
        "one of the two",
    ),
]


@pytest.mark.parametrize(("make", "name", "words"), OTHERS, ids=[f"{name}-{index}" for index, (_, name, _) in enumerate(OTHERS)])
def test_other_bad_inputs_name_themselves(make, name, words):
    with pytest.raises(pk.InputError) as caught:
        make()
    assert name in [problem.name for problem in caught.value.problems], caught.value
    assert words in str(caught.value), caught.value
    assert "it must be" in str(caught.value)


AMBIENTS = [
    "sealevel please",
    "1 K",
    "-5 kPa",
    "7 MPa",
    "10 MPa",
    -1.0,
    math.nan,
    None,
    True,
    "12",
    "1000 km",
    "12 km 3",
    "20 psig",
]


@pytest.mark.parametrize("value", AMBIENTS, ids=repr)
def test_bad_ambients_are_refused(value):
    nozzle = pk.Nozzle(chamber(), area_ratio=10, throat_diameter=0.1)
    with pytest.raises(pk.InputError) as caught:
        pk.Performance(nozzle, ambient=value)
    assert caught.value.problems[0].name == "ambient"


def test_all_bad_and_missing_inputs_stand_in_one_error():
    with pytest.raises(pk.InputError) as caught:
        pk.Chamber("no case", pressure="7 psig", cstar_efficiency=2, contraction_ratio=0.5)
    assert [problem.name for problem in caught.value.problems] == [
        "case",
        "pressure",
        "contraction_ratio",
        "cstar_efficiency",
    ]


def test_an_unknown_keyword_is_a_type_error_with_near_matches():
    with pytest.raises(TypeError, match="no input 'presure'.*pressure"):
        chamber(presure="7 MPa")
    with pytest.raises(TypeError, match="no input 'colour'"):
        pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4, colour="red")
    with pytest.raises(TypeError, match="positional"):
        pk.PropellantCase("LOX", "LCH4", 3.4)


def test_a_thrust_that_cannot_be_reached_is_a_range_error():
    with pytest.raises(pk.RangeError, match="smaller area_ratio"):
        pk.Nozzle.sized_for(chamber(pressure="0.2 MPa"), thrust="10 kN", ambient="sea level", area_ratio=100)


def test_results_that_a_gas_does_not_have_say_why():
    gas = pk.Chamber.from_gas(pressure="7 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    for name in ("composition", "specific_heat", "frozen_specific_heat", "frozen_isentropic_exponent"):
        with pytest.raises(pk.NotAvailableError, match="given by its properties"):
            getattr(gas, name)
    with pytest.raises(pk.NotAvailableError, match="no propellant case"):
        _ = gas.case
    assert not hasattr(gas, "composition")
    with pytest.raises(pk.InputError, match="no composition to shift"):
        pk.Nozzle(gas, area_ratio=10, throat_diameter=0.1, flow="shifting")
    perf = pk.Performance(pk.Nozzle(gas, area_ratio=10, throat_diameter=0.1), ambient="vacuum")
    with pytest.raises(pk.NotAvailableError, match="mixture ratio"):
        _ = perf.oxidizer_mass_flow
    with pytest.raises(pk.NotAvailableError, match="bulk density"):
        _ = perf.density_impulse


def test_paths_that_lead_nowhere_list_candidates(perf):
    with pytest.raises(pk.InputError, match="no input of this chain.*chamber.pressure"):
        perf.replace({"chamber.presure": 7e6})
    with pytest.raises(pk.InputError, match="ambiguous"):
        perf.working("pressure")
    with pytest.raises(pk.InputError, match="is a result.*nozzle.thrust"):
        perf.replace({"thrust": "100 kN"})
    with pytest.raises(pk.InputError, match="was given"):
        perf.working("mixture_ratio")


def test_an_attribute_cannot_be_set(perf):
    with pytest.raises(AttributeError, match="immutable"):
        perf.ambient = "vacuum"
    with pytest.raises(AttributeError):
        perf.thrust = 5
    with pytest.raises(AttributeError):
        perf.colour = 5
    with pytest.raises(AttributeError):
        del perf.ambient


def test_at_refuses_what_no_state_has(nozzle):
    for keywords in (
        {},
        {"area_ratio": 3, "pressure": 1e5},
        {"area_ratio": 0.5},
        {"pressure": "20 MPa"},
        {"pressure": 0.0},
        {"area_ratio": 3, "branch": "sub"},
    ):
        with pytest.raises(pk.InputError):
            nozzle.at(**keywords)


def test_a_gas_hotter_than_the_data_is_a_range_error():
    hot = pk.Propellant(name="hot", formula="H2", enthalpy="900 kJ/mol", density="1 kg/m3", temperature="298.15 K", role="fuel")
    with pytest.raises(pk.RangeError) as caught:
        pk.Chamber(pk.PropellantCase("GOX", hot, mixture_ratio=1.0), pressure="1 MPa")
    assert caught.value.data["temperature"] > 0


def _fuel_with(formula):
    return pk.Propellant(name="X", formula=formula, enthalpy="-24 kJ/mol", density="810 kg/m3", temperature="298.15 K", role="fuel")


def test_an_element_without_species_data_is_refused_in_words():
    with pytest.raises(pk.InputError, match="'Co'; it must be an element of the species data"):
        pk.Chamber(pk.PropellantCase("LOX", _fuel_with("Co H2"), mixture_ratio=2), pressure="5 MPa")


def test_an_element_without_an_oxidation_valence_has_no_stoichiometric_ratio():
    case = pk.PropellantCase("LOX", _fuel_with("Zn C2 H6"), mixture_ratio=2)
    with pytest.raises(pk.NotAvailableError):
        _ = case.equivalence_ratio
    with pytest.raises(pk.InputError, match="give mixture_ratio"):
        pk.PropellantCase("LOX", _fuel_with("Zn C2 H6"), equivalence_ratio=1)
