"""Monopropellants and cold gas: fixed compositions, their flow models, and what is doubtful about them."""

import builtins
import pickle

import pytest
from hypothesis import given
from hypothesis import strategies as st

import propkit as pk
from propkit.model.base import from_recipe

R = 8.31446261815324


def bed(x):
    return pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=x)


def cold(gas="GN2", pressure="2 MPa", ratio=50, **inputs):
    return pk.Nozzle(
        pk.Chamber(pk.PropellantCase.cold_gas(gas, **inputs), pressure=pressure),
        area_ratio=ratio,
        throat_diameter="5 mm",
    )


CASES = [
    bed(0.55),
    pk.PropellantCase.monopropellant("HTP-90", propellant_temperature="300 K"),
    pk.PropellantCase.monopropellant(pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12}), condensed=True, thermo_basis="tm4513"),
    pk.PropellantCase.cold_gas("GN2", temperature="293 K", tank_pressure="30 MPa"),
    pk.PropellantCase.cold_gas("air"),
]


# -- hydrazine


@pytest.mark.parametrize(("x", "temperature"), [(0.0, 1646.0), (0.6, 1187.0), (1.0, 868.0)])
@pytest.mark.parametrize("pressure", ["0.3 MPa", "2 MPa"])
def test_decomposed_hydrazine(x, temperature, pressure):
    """Common practice, no source: 1646, 1187 and 868 K; 10 K for the spread of the enthalpy of liquid hydrazine."""
    chamber = pk.Chamber(bed(x), pressure=pressure)
    assert chamber.si("temperature") == pytest.approx(temperature, abs=10.0)
    assert not chamber.has("specific_heat")
    assert chamber.si("isentropic_exponent") == chamber.si("frozen_isentropic_exponent")


@given(st.floats(0.0, 1.0), st.floats(1.1, 10.0), st.sampled_from(["injector", "nozzle stagnation", "nozzle inlet static"]))
def test_a_bed_of_finite_area_conserves_mass_momentum_and_energy(x, contraction, where):
    chamber = pk.Chamber(bed(x), pressure="1.5 MPa", contraction_ratio=contraction, pressure_at=where)
    held = chamber.held
    inlet, velocity = held.inlet, held.inlet_velocity
    assert inlet.pressure + inlet.density * velocity**2 == pytest.approx(held.injector.pressure, rel=1e-11)
    assert inlet.density * velocity * contraction == pytest.approx(held.throat.mass_flux, rel=1e-11)
    assert inlet.enthalpy + velocity**2 / 2 == pytest.approx(held.enthalpy, rel=1e-11)
    quoted = {"injector": held.injector, "nozzle stagnation": held.stagnation, "nozzle inlet static": inlet}[where]
    assert quoted.pressure == pytest.approx(1.5e6, rel=1e-12)


@pytest.mark.parametrize("flow", ["frozen", "constant-property"])
def test_the_atoms_are_those_of_hydrazine(flow):
    nozzle = pk.Nozzle(pk.Chamber(bed(0.4), pressure="2 MPa"), area_ratio=40, throat_diameter="5 mm", flow=flow)
    atoms = nozzle.chamber.held.injector.amounts[0] @ nozzle.chamber.held.table.composition
    assert atoms == pytest.approx(nozzle.case.elements.to_numpy(), rel=1e-12)
    assert nozzle.exit.si("entropy") == pytest.approx(nozzle.inlet.si("entropy"), rel=1e-12)
    assert nozzle.case.fixed_composition.index.tolist() == ["NH3", "N2", "H2"]


def test_a_fixed_composition_neither_shifts_nor_freezes_elsewhere():
    chamber = pk.Chamber(bed(0.4), pressure="2 MPa")
    assert pk.Nozzle(chamber, area_ratio=40, throat_diameter="5 mm").flow == "frozen"
    for inputs in (
        {"flow": "shifting"},
        {"freeze_at": "throat"},
        {"freeze_at": 2.0},
        {"flow": "constant-property", "exponent": "frozen"},
    ):
        with pytest.raises(pk.InputError, match=r"composition of this gas is given|single exponent"):
            pk.Nozzle(chamber, area_ratio=40, throat_diameter="5 mm", **inputs)


def test_full_equilibrium_of_hydrazine_is_told_with_its_price():
    case = pk.PropellantCase.monopropellant("hydrazine")
    (doubt,) = [entry for entry in case.warnings if entry.code == "ammonia"]
    assert "ammonia_dissociation=0.6" in doubt
    assert pk.Chamber(case, pressure="2 MPa").si("temperature") == pytest.approx(883.0, abs=3.0)  # from SCIENCE, 2 MPa
    assert not bed(0.6).warnings


@pytest.mark.parametrize(
    ("inputs", "name"),
    [
        (("HTP-90", {"ammonia_dissociation": 0.5}), "ammonia_dissociation"),
        (("hydrazine", {"ammonia_dissociation": 1.5}), "ammonia_dissociation"),
        (("hydrazine", {"ammonia_dissociation": 0.5, "condensed": True}), "condensed"),
        (("LOX", {}), "propellant"),
        (("hydrasine", {}), "propellant"),
    ],
)
def test_bad_monopropellants_name_the_input(inputs, name):
    with pytest.raises(pk.InputError) as caught:
        pk.PropellantCase.monopropellant(inputs[0], **inputs[1])
    assert name in [problem.name for problem in caught.value.problems]


# -- others in equilibrium


@pytest.mark.parametrize(("name", "temperature"), [("HTP-85", 895.0), ("HTP-90", 1021.0), ("HTP-98", 1223.0)])
def test_peroxide_decomposes_to_the_temperatures_of_its_mixtures(name, temperature):
    """With the heat of mixing of aqueous peroxide; computed independently with it, 5 K for the assigned enthalpy of the library row."""
    chamber = pk.Chamber(pk.PropellantCase.monopropellant(name), pressure="2 MPa")
    assert chamber.si("temperature") == pytest.approx(temperature, abs=5.0)


def test_nitrous_oxide_is_mostly_nitrogen_and_oxygen():
    """N2O -> N2 + 1/2 O2 from 82 kJ/mol: about 1640 degrees C, common practice, no source; 60 K for the stored liquid."""
    chamber = pk.Chamber(pk.PropellantCase.monopropellant("N2O-gas"), pressure="3 MPa")
    assert chamber.si("temperature") == pytest.approx(1913.0, abs=60.0)
    assert chamber.composition["N2"] == pytest.approx(2.0 / 3.0, abs=0.01)


def test_bulk_density_and_density_impulse_are_of_the_one_propellant():
    nozzle = pk.Nozzle(pk.Chamber(bed(0.5), pressure="2 MPa"), area_ratio=40, throat_diameter="5 mm")
    perf = pk.Performance(nozzle, ambient="vacuum")
    assert perf.case.si("bulk_density") == pytest.approx(1003.6, rel=1e-3)
    assert perf.si("density_impulse") == pytest.approx(perf.si("specific_impulse") * 9.80665 * perf.case.si("bulk_density"), rel=1e-12)
    for name in ("oxidizer_mass_flow", "fuel_mass_flow"):
        with pytest.raises(pk.NotAvailableError, match="no mixture ratio"):
            getattr(perf, name)
    for name in ("mixture_ratio", "oxidizer", "fuel", "equivalence_ratio"):
        with pytest.raises(pk.NotAvailableError, match="one propellant"):
            getattr(perf.case, name)


# -- cold gas


@pytest.mark.parametrize("gas", ["GN2", "GHe", "argon", "krypton", "xenon", "neon", "CO2", "air", "GH2", "butane-gas", "N2O-gas"])
def test_cold_gases_expand_at_their_own_temperature(gas):
    nozzle = cold(gas, "1 MPa", temperature="310 K")
    assert nozzle.chamber.si("temperature") == pytest.approx(310.0, rel=1e-12)
    assert nozzle.exit.si("temperature") < 200.0
    rest = nozzle.inlet
    assert nozzle.exit.si("enthalpy") + nozzle.exit.si("velocity") ** 2 / 2 == pytest.approx(rest.si("enthalpy"), abs=1e-6 * R * 310)


@pytest.mark.parametrize(("gas", "gamma", "mass"), [("GHe", 5 / 3, 4.002602e-3), ("argon", 5 / 3, 39.95e-3), ("xenon", 5 / 3, 131.293e-3)])
def test_monatomic_gas_has_the_closed_forms(gas, gamma, mass):
    """NACA Report 1135: c* = sqrt(R T) / Gamma; 1e-5 for the rounding of atomic weights and of the heat capacity of the data."""
    nozzle = cold(gas, temperature="300 K")
    function = gamma**0.5 * (2 / (gamma + 1)) ** ((gamma + 1) / (2 * (gamma - 1)))
    assert nozzle.si("characteristic_velocity") == pytest.approx((R / mass * 300) ** 0.5 / function, rel=1e-5)
    other = nozzle.replace(flow="constant-property")
    assert nozzle.exit.si("velocity") == pytest.approx(other.exit.si("velocity"), rel=1e-6)


def test_compressibility_and_its_price_are_told():
    """CoolProp: nitrogen at 298 K and 20 MPa 1.06, nitrous oxide at 293 K and 4 MPa 0.71."""
    pytest.importorskip("CoolProp")
    for gas, pressure, temperature, told in (
        ("GN2", "20 MPa", "298.15 K", "1.05"),
        ("N2O-gas", "4 MPa", "293.15 K", "0.71"),
    ):
        doubts = [entry for entry in cold(gas, pressure, temperature=temperature).warnings if entry.code == "real-gas"]
        assert len(doubts) == 1
        assert f"compressibility is {told}" in doubts[0]
        assert "more mass flow" in doubts[0]
    assert not [entry for entry in cold("GHe", "1 MPa").warnings if entry.code == "real-gas"]


def test_condensation_is_told_with_what_rests_on_it():
    pytest.importorskip("CoolProp")
    (doubt,) = [entry for entry in cold("GN2", temperature="298 K").warnings if entry.code == "saturation"]
    assert "times its vapour pressure" in doubt
    assert "Saturation begins at area ratio" in doubt
    assert "of the vacuum specific impulse" in doubt
    assert not [entry for entry in cold("GN2", ratio=2, temperature="298 K").warnings if entry.code == "saturation"]


def test_saturation_begins_where_the_vapour_pressure_is_that_of_the_fluid():
    """At the area ratio told, pressure and temperature lie on CoolProp's saturation line; 3 % for a text of three digits."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    nozzle = cold("CO2", "1 MPa", temperature="300 K")
    (doubt,) = [entry for entry in nozzle.warnings if entry.code == "saturation" and "begins" in entry]
    ratio = float(doubt.partition("area ratio ")[2].partition(";")[0])
    state = nozzle.at(area_ratio=ratio)
    if state.si("temperature") > 216.6:
        assert coolprop.PropsSI("P", "T", state.si("temperature"), "Q", 1, "CO2") == pytest.approx(state.si("pressure"), rel=0.03)


def test_without_coolprop_it_is_said(monkeypatch):
    monkeypatch.setattr("propkit.chain.real_gas.find_spec", lambda name: None)
    doubts = [entry for entry in cold("GN2", "20 MPa").warnings if entry.code == "real-gas"]
    assert len(doubts) == 1
    assert "CoolProp is not installed" in doubts[0]


def test_no_number_of_a_cold_gas_needs_coolprop(monkeypatch):
    with_it = cold("GN2", "20 MPa", temperature="293 K")
    monkeypatch.setattr("propkit.chain.real_gas.find_spec", lambda name: None)
    real = builtins.__import__

    def without(name, *args, **keywords):
        if name.startswith("CoolProp"):
            raise ImportError(name)
        return real(name, *args, **keywords)

    monkeypatch.setattr(builtins, "__import__", without)
    again = cold("GN2", "20 MPa", temperature="293 K")
    for name in ("mass_flow", "exit_pressure", "characteristic_velocity"):
        assert again.si(name) == with_it.si(name)


def test_density_in_the_tank_is_that_of_the_real_gas():
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    case = pk.PropellantCase.cold_gas("GN2", temperature="293 K", tank_pressure="30 MPa")
    assert case.si("bulk_density") == pytest.approx(coolprop.PropsSI("D", "T", 293, "P", 30e6, "Nitrogen"), rel=1e-9)
    with pytest.raises(pk.NotAvailableError, match="tank_pressure"):
        _ = pk.PropellantCase.cold_gas("GN2").bulk_density


@pytest.mark.parametrize("gas", ["LN2", "LOX", "nothing"])
def test_what_is_no_gas_is_refused(gas):
    with pytest.raises(pk.InputError):
        pk.PropellantCase.cold_gas(gas)


# -- the contract of objects


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.subtitle())
def test_recipe_code_and_pickle_rebuild_the_chain(case):
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="2 MPa"), area_ratio=8, throat_diameter="20 mm"), ambient="vacuum")
    assert isinstance(case, pk.PropellantCase)
    assert from_recipe(perf.recipe()) == perf
    assert eval(repr(perf), {"pk": pk}) == perf
    assert pickle.loads(pickle.dumps(perf)) == perf
    space: dict = {}
    exec(perf.as_code(), space)
    assert space["performance"] == perf
    assert perf.replace({"chamber.pressure": "1 MPa"}).case is case
    for link in perf.chain():
        assert str(link)
        assert "<table" in link.report()._repr_mimebundle_()["text/html"]


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.subtitle())
def test_every_result_has_a_working_that_holds(case):
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="2 MPa"), area_ratio=8, throat_diameter="20 mm"), ambient="vacuum")
    for link in perf.chain():
        for name in (*link.declared_results, *link.resolved()):
            if not link.has(name) or (link is case and name == "bulk_density" and "gas" not in case.declared_inputs):
                continue
            working = perf.working(f"{link.kind}.{name}")
            assert working.steps, name
            assert all(step.residual is None or step.residual < 1e-9 for step in working.steps), name


def test_studies_and_replace_reach_the_inputs():
    perf = pk.Performance(pk.Nozzle(pk.Chamber(bed(0.5), pressure="2 MPa"), area_ratio=40, throat_diameter="5 mm"), ambient="vacuum")
    warmer = perf.replace({"case.ammonia_dissociation": 0.2})
    assert warmer.chamber.si("temperature") > perf.chamber.si("temperature")
    gas = pk.Performance(cold("GN2"), ambient="vacuum")
    hotter = gas.replace({"case.temperature": "400 K"})
    assert hotter.si("specific_impulse") / gas.si("specific_impulse") == pytest.approx((400 / 298.15) ** 0.5, rel=5e-3)


@pytest.mark.parametrize("case", CASES[:4], ids=lambda case: case.subtitle())
def test_a_study_in_one_batch_gives_the_numbers_of_the_objects(case):
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="2 MPa"), area_ratio=8, throat_diameter="20 mm"), ambient="vacuum")
    pressures = [1e6, 2e6, 3e6]
    frame = pk.Study(perf, {"chamber.pressure": pressures}).run().frame
    for pressure, row in zip(pressures, frame.itertuples(), strict=True):
        one = perf.replace({"chamber.pressure": pressure})
        for name in ("thrust", "specific_impulse", "mass_flow", "density_impulse"):
            assert getattr(row, name) == pytest.approx(one.si(name), rel=1e-9)


@pytest.mark.parametrize("gas", ["GHe", "argon", "neon"])
@pytest.mark.parametrize("ratio", [20.0, 100.0, 400.0])
def test_a_monatomic_cold_gas_expands_as_far_as_the_area_law_says(gas, ratio):
    # closed form of NACA Report 1135, equations 43, 44 and 80, for an exponent of 5/3; below 200 K the data hold cp, which is
    # exact for a monatomic gas
    case = pk.PropellantCase.cold_gas(gas, temperature="293 K")
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="10 bar"), area_ratio=ratio, throat_diameter="1 mm")
    mach = nozzle.exit.mach
    temperature = 293.0 / (1.0 + mach**2 / 3.0)
    assert nozzle.exit.si("temperature") == pytest.approx(temperature, rel=1e-9)
    assert ((1.0 + mach**2 / 3.0) / (4.0 / 3.0)) ** 2 / mach == pytest.approx(ratio, rel=1e-9)
