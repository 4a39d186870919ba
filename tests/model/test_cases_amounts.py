"""How much of each: every way of saying it, additives, several propellants on one side, oxygen balance, fuel-rich gas."""

import pickle

import pytest
from hypothesis import given
from hypothesis import strategies as st

import propkit as pk
from propkit.model.base import from_recipe

WAYS = ("mixture_ratio", "equivalence_ratio", "mixture_ratio_by_volume", "oxidizer_percent")


@given(st.floats(0.05, 30.0), st.sampled_from([("LOX", "RP-1"), ("NTO", "MMH"), ("HTP-90", "ethanol"), ("LOX", "LH2")]))
def test_every_way_of_saying_it_gives_the_same_case(ratio, pair):
    case = pk.PropellantCase(*pair, mixture_ratio=ratio)
    for way in WAYS:
        other = pk.PropellantCase(*pair, **{way: case.si(way)})
        assert other.si("mixture_ratio") == pytest.approx(ratio, rel=1e-12)
        for name in (*WAYS, "enthalpy", "bulk_density", "oxygen_balance"):
            assert other.si(name) == pytest.approx(case.si(name), rel=1e-10, abs=1e-12)


def test_the_definitions():
    """Volumes and masses of the tanks worked by hand from the densities of the rows."""
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5)
    oxidizer, fuel = (pk.Propellant.from_library(name).density.magnitude for name in ("LOX", "RP-1"))
    assert case.mixture_ratio_by_volume == pytest.approx((2.5 / oxidizer) / (1.0 / fuel), rel=1e-12)
    assert case.oxidizer_percent == pytest.approx(100 * 2.5 / 3.5, rel=1e-12)
    assert case.equivalence_ratio == pytest.approx(case.stoichiometric_mixture_ratio / 2.5, rel=1e-12)


def test_percent_is_read_in_percent():
    for value in (72, "72 %", "72 percent", 72.0):
        assert pk.PropellantCase("LOX", "RP-1", oxidizer_percent=value).mixture_ratio == pytest.approx(72 / 28, rel=1e-12)
    for value in (0, 100, -3, "7 m", "72"):
        with pytest.raises(pk.InputError, match="oxidizer_percent"):
            pk.PropellantCase("LOX", "RP-1", oxidizer_percent=value)


def test_one_way_displaces_the_others():
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5)
    for way in WAYS[1:]:
        assert set(case.replace({way: 1.3 if way != "oxidizer_percent" else 70}).inputs) == {"oxidizer", "fuel", way}
    with pytest.raises(pk.InputError, match="one of them"):
        pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5, equivalence_ratio=1.0, oxidizer_percent=70)
    with pytest.raises(pk.InputError, match="mixture_ratio.*missing"):
        pk.PropellantCase("LOX", "RP-1")


def test_a_ratio_by_volume_needs_densities():
    light = pk.Propellant(formula="C H2", enthalpy="-20 kJ/mol", role="fuel")
    case = pk.PropellantCase("LOX", light, mixture_ratio=2.5)
    assert not case.has("mixture_ratio_by_volume")
    with pytest.raises(pk.NotAvailableError, match="density"):
        _ = case.mixture_ratio_by_volume
    with pytest.raises(pk.InputError, match="density"):
        pk.PropellantCase("LOX", light, mixture_ratio_by_volume=1.2)


@pytest.mark.parametrize(
    ("name", "balance"), [("AP", 0.3404), ("AN", 0.1999), ("RDX", -0.2161), ("HMX", -0.2161), ("nitromethane", -0.3932)]
)
def test_oxygen_balance_of_ingredients(name, balance):
    """Handbook values of explosives and ingredients (CO2, H2O, HCl), recalled from memory; four digits."""
    case = pk.PropellantCase.monopropellant(pk.Propellant.from_library(name).replace(role="monopropellant"))
    assert case.oxygen_balance == pytest.approx(balance, abs=2e-4)


def test_oxygen_balance_vanishes_at_the_stoichiometric_mixture():
    for pair in (("LOX", "RP-1"), ("NTO", "MMH"), ("HTP-90", "HTPB"), ("LF2", "LH2")):
        assert pk.PropellantCase(*pair, equivalence_ratio=1.0).oxygen_balance == pytest.approx(0.0, abs=1e-14)
        assert pk.PropellantCase(*pair, equivalence_ratio=1.2).oxygen_balance < 0.0


# -- additives and several propellants on one side


def test_an_additive_is_a_share_of_the_whole():
    plain = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5)
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5, additives={"water": 0.06})
    water = pk.Propellant.from_library("water")
    assert case.si("enthalpy") == pytest.approx(0.94 * plain.si("enthalpy") + 0.06 * water.si("specific_enthalpy"), rel=1e-12)
    assert 1 / case.si("bulk_density") == pytest.approx(0.94 / plain.si("bulk_density") + 0.06 / water.si("density"), rel=1e-4)
    for symbol in ("C", "H", "O"):
        expected = 0.94 * plain.elements[symbol] + 0.06 * water.elements.get(symbol, 0.0) / water.si("molar_mass")
        assert case.elements[symbol] == pytest.approx(expected, rel=1e-12)
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="7 MPa"), area_ratio=20, mass_flow="100 kg/s"), ambient="vacuum")
    assert perf.si("oxidizer_mass_flow") + perf.si("fuel_mass_flow") == pytest.approx(94.0, rel=1e-12)
    assert perf.si("oxidizer_mass_flow") / perf.si("fuel_mass_flow") == pytest.approx(2.5, rel=1e-12)
    assert perf.chamber.si("temperature") < pk.Chamber(plain, pressure="7 MPa").si("temperature")


def test_additives_survive_recipe_code_and_pickle():
    own = pk.Propellant(name="seed", formula="Na Cl", enthalpy="-411 kJ/mol", density="2160 kg/m3")
    for additives in ({"water": 0.05}, [("water", "5 %"), (own, 0.01)], {own: 0.01}):
        case = pk.PropellantCase("LOX", "ethanol", mixture_ratio=1.4, additives=additives)
        assert from_recipe(case.recipe()).si("enthalpy") == case.si("enthalpy")
        assert eval(repr(case), {"pk": pk}) == case
        assert pickle.loads(pickle.dumps(case)) == case
        assert "seed" in str(case) or "water" in str(case)


@pytest.mark.parametrize("additives", [{"water": 0}, {"water": 1.0}, {"water": 0.6, "AP": 0.5}, {"watr": 0.1}, "water", 3])
def test_bad_additives_are_refused(additives):
    with pytest.raises(pk.InputError, match="additives"):
        pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5, additives=additives)


def test_every_result_of_a_case_with_additives_has_a_working_that_holds():
    case = pk.PropellantCase("LOX", "RP-1", oxidizer_percent=70, additives={"water": 0.05})
    for name in (*case.declared_results, *case.resolved()):
        steps = case.working(name).steps
        assert steps, name
        assert all(step.residual is None or step.residual < 1e-12 for step in steps)


def test_two_fuels_are_a_blend():
    by_name = pk.PropellantCase("LOX", {"ethanol": 0.75, "water": 0.25}, mixture_ratio=1.2)
    blended = pk.PropellantCase("LOX", pk.blend({"ethanol": 0.75, "water": 0.25}), mixture_ratio=1.2)
    assert by_name.si("enthalpy") == blended.si("enthalpy")
    assert from_recipe(by_name.recipe()) == by_name


# -- doubts


@pytest.mark.parametrize("pair", [("LOX", "RP-1"), ("LOX", "LCH4"), ("NTO", "MMH"), ("LOX", "LH2")])
def test_a_gas_generator_points_to_a_measured_gas(pair):
    (doubt,) = [entry for entry in pk.PropellantCase(*pair, equivalence_ratio=6).warnings if entry.code == "fuel-rich"]
    assert "pk.Chamber.from_gas" in doubt
    chamber = pk.Chamber(pk.PropellantCase(*pair, equivalence_ratio=10), pressure="5 MPa")
    assert "fuel-rich" in [entry.code for entry in chamber.warnings]
    assert not [entry for entry in pk.PropellantCase(*pair, equivalence_ratio=1.8).warnings if entry.code == "fuel-rich"]


def test_supersaturated_carbon_is_told_and_forms_where_it_may():
    gas = pk.Chamber(pk.PropellantCase("LOX", "RP-1", mixture_ratio=0.6), pressure="7 MPa")
    (doubt,) = [entry for entry in gas.warnings if entry.code == "supersaturation"]
    assert "carbon" in doubt
    assert "condensed=True" in doubt
    both = gas.replace({"case.condensed": True})
    assert both.composition["C (graphite)"] > 0.1
    assert not [entry for entry in both.warnings if entry.code == "supersaturation"]
    assert not [entry for entry in gas.replace({"mixture_ratio": 2.5}).warnings if entry.code == "supersaturation"]


def test_saturation_ratio_of_water_is_that_of_the_vapour():
    """In frozen flow: partial pressure over CoolProp's vapour pressure; 3 % for the ideal gas and the two sets of data."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    chamber = pk.Chamber(pk.PropellantCase.monopropellant("HTP-85"), pressure="2 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=9, throat_diameter="20 mm", flow="frozen")
    state = nozzle.exit
    assert 275.0 < state.si("temperature") < 400.0
    partial = chamber.composition["H2O"] * state.si("pressure")
    expected = partial / coolprop.PropsSI("P", "T", state.si("temperature"), "Q", 1, "Water")
    (doubt,) = [entry for entry in nozzle.warnings if entry.code == "supersaturation" and "the exit" in entry]
    assert float(doubt.partition("saturation ratio ")[2].partition(")")[0]) == pytest.approx(expected, rel=0.03)


def test_absent_elements_condense_nothing():
    chamber = pk.Chamber(pk.PropellantCase("LOX", "RP-1", mixture_ratio=1e-4), pressure="1 MPa")
    assert not [entry for entry in chamber.warnings if "water" in entry]
