"""Exact derivatives: one Newton step of the converged matrix, against differences, identities and Cantera."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import propkit as pk
from propkit.bridge.basis import load_basis
from propkit.constants import GAS_CONSTANT
from propkit.physics import equilibrium, expansion, gas_dynamics
from propkit.physics.arrays import TANGENT
from propkit.study.differences import stencil
from propkit.study.evaluation import function_of, variable

CASE = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.6)
CHAMBER = pk.Chamber(CASE, pressure="10 MPa", cstar_efficiency=0.97)
SIZE = {"area_ratio": 35, "throat_diameter": "0.18 m"}
SOLID = pk.PropellantCase.monopropellant(pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12}), condensed=True)
BED = pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.6)
GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2, contraction_ratio=3)


def performance(chamber=CHAMBER, ambient="sea level", **nozzle):
    return pk.Performance(pk.Nozzle(chamber, **(nozzle or SIZE)), ambient=ambient)


ALL = (
    "chamber.pressure", "case.mixture_ratio", "nozzle.area_ratio", "nozzle.throat_diameter", "case.fuel.enthalpy",
    "case.oxidizer.enthalpy", "chamber.cstar_efficiency", "performance.ambient",
)  # fmt: skip
DUCT = ("chamber.pressure", "nozzle.area_ratio", "nozzle.throat_diameter")
RESULTS = (
    "thrust", "specific_impulse_vacuum", "mass_flow", "chamber.characteristic_velocity", "chamber.stagnation_pressure",
    "nozzle.throat.pressure", "nozzle.throat.sound_speed", "nozzle.exit.temperature", "nozzle.exit.mach",
    "nozzle.exit.isentropic_exponent", "nozzle.exit.entropy", "nozzle.inlet.pressure",
)  # fmt: skip
BURNT = (*RESULTS, "chamber.temperature", "chamber.molar_mass", "chamber.isentropic_exponent", "chamber.frozen_specific_heat")

RECIPES = {
    "shifting": (performance(), ALL, (*BURNT, "chamber.specific_heat")),
    "frozen": (performance(**SIZE, flow="frozen"), ALL, BURNT),
    "constant-property": (performance(**SIZE, flow="constant-property"), ALL, BURNT),
    "frozen exponent": (performance(**SIZE, flow="constant-property", exponent="frozen"), ALL, BURNT),
    "frozen at the throat": (performance(**SIZE, flow="frozen", freeze_at="throat"), ALL, BURNT),
    "frozen at an area ratio": (performance(**SIZE, flow="frozen", freeze_at=3.0), ALL, BURNT),
    "exit pressure and thrust": (
        performance(exit_pressure="50 kPa", thrust="100 kN", sizing_ambient="vacuum"),
        ("chamber.pressure", "case.mixture_ratio", "nozzle.exit_pressure", "nozzle.thrust", "case.fuel.enthalpy"),
        BURNT,
    ),
    "equivalence ratio": (
        performance(pk.Chamber(pk.PropellantCase("LOX", "LH2", equivalence_ratio=1.3), pressure="8 MPa")),
        ("case.equivalence_ratio", "chamber.pressure"),
        BURNT,
    ),
    "finite contraction": (
        performance(pk.Chamber(CASE, pressure="10 MPa", contraction_ratio=2.0)),
        ("chamber.pressure", "case.mixture_ratio", "chamber.contraction_ratio", "case.fuel.enthalpy"),
        BURNT,
    ),
    "quoted at the inlet": (
        performance(pk.Chamber(CASE, pressure="10 MPa", contraction_ratio=2.0, pressure_at="nozzle inlet static"), **SIZE, flow="frozen"),
        ("chamber.pressure", "case.mixture_ratio", "chamber.contraction_ratio"),
        BURNT,
    ),
    "liquids and solids": (performance(pk.Chamber(SOLID, pressure="7 MPa"), area_ratio=12, throat_diameter=0.1), DUCT, BURNT),
    "held liquids and solids": (
        performance(pk.Chamber(SOLID, pressure="7 MPa"), area_ratio=12, throat_diameter=0.1, flow="frozen"),
        DUCT,
        BURNT,
    ),
    "given composition": (
        performance(pk.Chamber(BED, pressure="2 MPa"), area_ratio=40, throat_diameter=0.01, flow="frozen"),
        DUCT,
        RESULTS,
    ),
    "given gas": (
        performance(GAS, area_ratio=20, throat_diameter=0.1),
        (*DUCT, "chamber.temperature", "chamber.molar_mass", "chamber.isentropic_exponent", "chamber.contraction_ratio"),
        RESULTS,
    ),
}


def slopes_of(target, paths, results):
    """Return exact derivatives, those by differences, both as elasticities, and which inputs are exact."""
    known = [variable(target, path) for path in paths]
    nominal = {entry.path: entry.nominal for entry in known}
    function = function_of(target, paths, results)
    exact = function.tangents(nominal)
    centre = np.array(list(nominal.values()))
    steps = 2e-3 * np.abs(centre)
    around = stencil(centre, steps, np.array([entry.low for entry in known]), np.array([entry.high for entry in known]))
    table = np.array(list(function(around.inputs(tuple(nominal))).values()))
    scale = np.abs(centre) / np.maximum(np.abs(table[:, :1]), 1e-300)
    found = np.array([[exact.slopes[path][name] for path in exact.slopes] for name in function.results])
    columns = [list(nominal).index(path) for path in exact.slopes]
    np.testing.assert_allclose(list(exact.values.values()), table[:, 0], rtol=1e-11)
    return found * scale[:, columns], (around.slopes(table) * scale)[:, columns], tuple(exact.slopes)


@pytest.mark.parametrize("name", RECIPES)
def test_against_differences(name):
    target, paths, results = RECIPES[name]
    exact, differences, covered = slopes_of(target, paths, results)
    assert set(covered) == {variable(target, path).path for path in paths}
    # differences of fourth order over 0.2 %: the iteration's 1e-11 over the step is what they leave
    np.testing.assert_allclose(exact, differences, atol=1e-7, rtol=1e-7)
    for place, path in enumerate(covered):
        entry = variable(target, path)
        alone = function_of(target, (path,), results).tangents({path: entry.nominal})
        scale = [abs(entry.nominal / value) if value else 1.0 for value in alone.values.values()]
        np.testing.assert_allclose(np.array(list(alone.slopes[path].values())) * scale, exact[:, place], atol=1e-9)


@settings(deadline=None, max_examples=12)
@given(
    st.sampled_from(["shifting", "frozen", "constant-property"]),
    st.floats(2.0, 3.4),
    st.floats(5e5, 2.5e7),
    st.floats(2.0, 150.0),
)
def test_against_differences_over_the_range(flow, mixture_ratio, pressure, area_ratio):
    chamber = pk.Chamber(pk.PropellantCase("LOX", "RP-1", mixture_ratio=mixture_ratio), pressure=pressure)
    target = performance(chamber, "vacuum", area_ratio=area_ratio, throat_diameter=0.1, flow=flow)
    paths = ("chamber.pressure", "case.mixture_ratio", "nozzle.area_ratio", "case.fuel.enthalpy")
    exact, differences, _ = slopes_of(target, paths, ("thrust", "nozzle.exit.temperature", "chamber.temperature"))
    np.testing.assert_allclose(exact, differences, atol=3e-7, rtol=1e-6)


def gas_of(case, pressure):
    mixture = case.held.mixture
    table = load_basis("tm4513+atct").table(mixture.symbols)
    return table, mixture.atoms, mixture.enthalpy, np.array([pressure])


def moved(values, share=1.0):
    return values * (1.0 + 1j * TANGENT * share)


def tangent(values):
    return np.imag(values) / TANGENT


@pytest.mark.parametrize("pressure", [1e5, 1e7])
def test_identities_of_a_gas_at_given_pressure_and_enthalpy(pressure):
    """Thermodynamic identities of an ideal gas in equilibrium (any text): cp, the heat of throttling, Maxwell's relations."""
    table, atoms, h, p = gas_of(CASE, pressure)
    state = equilibrium.solve(table, atoms, pressure=p, enthalpy=h)
    heated = equilibrium.solve(table, atoms, pressure=p, enthalpy=h + 1j * TANGENT)
    assert tangent(heated.temperature)[0] == pytest.approx(1.0 / state.specific_heat[0], rel=1e-10)
    assert tangent(heated.entropy)[0] == pytest.approx(1.0 / state.temperature[0], rel=1e-10)
    throttled = equilibrium.solve(table, atoms, pressure=moved(p), enthalpy=h)
    # (d ln T / d ln p)_h = p V / (cp T) (d ln V / d ln T - 1); (ds / dp)_h = -V / T
    expected = state.gas_constant * (state.dlnv_dlnt - 1.0) / state.specific_heat
    np.testing.assert_allclose(tangent(throttled.temperature) / state.temperature, expected, rtol=1e-9, atol=1e-13)
    np.testing.assert_allclose(tangent(throttled.entropy), -state.gas_constant, rtol=1e-10)


def test_identities_along_an_isentrope():
    """(d ln rho / d ln p)_s = 1/gamma_s; (dh / dp)_s = 1/rho; the sound speed of the matrix is that of the flow."""
    table, atoms, h, p = gas_of(CASE, 1e7)
    flow = expansion.shifting(table, atoms, equilibrium.solve(table, atoms, pressure=p, enthalpy=h))
    for share in (0.7, 0.1, 0.001):
        plain = flow.at_pressure(share * p)
        state = flow.at_pressure(moved(share * p))
        np.testing.assert_allclose(tangent(state.density) / plain.density, 1.0 / plain.isentropic_exponent, rtol=1e-10)
        np.testing.assert_allclose(tangent(state.enthalpy), share * p / plain.density, rtol=1e-10)
        np.testing.assert_allclose(np.real(state.temperature), plain.temperature, rtol=1e-13)


def test_largest_mass_flux_does_not_move_with_the_throat_pressure():
    """At the throat d(rho u)/dp = 0 along the isentrope: the derivative of the flux with stagnation conditions needs no dp."""
    table, atoms, h, p = gas_of(CASE, 1e7)
    flow = expansion.shifting(table, atoms, equilibrium.solve(table, atoms, pressure=p, enthalpy=h))
    throat = flow.throat()
    beside = flow.at_pressure(moved(throat.pressure))
    assert abs(tangent(beside.density * beside.velocity)[0]) < 1e-9 * throat.mass_flux[0]


def test_potentials_give_the_entropy_of_an_added_element():
    """dg = sum mu_i db_i at constant p and T, with mu_i = R T l_i; at constant (p, h) the entropy moves by -R l_i db_i."""
    table, atoms, h, p = gas_of(CASE, 1e7)
    state = equilibrium.solve(table, atoms, pressure=p, enthalpy=h)
    for column in range(atoms.shape[1]):
        step = np.zeros_like(atoms)
        step[:, column] = 1.0
        found = equilibrium.solve(table, atoms + 1j * TANGENT * step, pressure=p, enthalpy=h)
        expected = -GAS_CONSTANT * state.element_potentials[0, column]
        assert tangent(found.entropy)[0] == pytest.approx(expected, rel=1e-10)


def test_mach_number_of_an_area_ratio():
    """dA/A = (M^2 - 1)/(1 + (g - 1)/2 M^2) dM/M (NACA Report 1135, equation 80, differentiated)."""
    for ratio, branch in ((1.001, "subsonic"), (3.0, "subsonic"), (1.001, "supersonic"), (60.0, "supersonic")):
        mach = gas_dynamics.mach_from_area_ratio(moved(np.array([ratio])), 1.2, branch)
        m = mach.real[0]
        assert tangent(mach)[0] == pytest.approx(m * (1.0 + 0.1 * m**2) / (m**2 - 1.0), rel=1e-9)


def cantera_temperature(solution, atoms, enthalpy, pressure):
    solution.TPX = 3000.0, pressure, ", ".join(f"{symbol}:{amount}" for symbol, amount in zip(("C", "H", "O"), atoms, strict=True))
    solution.equilibrate("TP", rtol=1e-12)
    solution.HP = enthalpy, pressure
    solution.equilibrate("HP", rtol=1e-12)
    return np.array([solution.T, solution.mean_molecular_weight * 1e-3])


def test_against_differences_of_cantera():
    """Cantera's own equilibrium on the same basis, by differences of fourth order: its 1e-9 over the step of 1 % is what they leave."""
    exact = function_of(CHAMBER, ("pressure", "mixture_ratio", "case.fuel.enthalpy"), ("temperature", "molar_mass"))
    nominal = {"chamber.pressure": 1e7, "case.mixture_ratio": 2.6, "case.fuel.enthalpy": variable(CHAMBER, "case.fuel.enthalpy").nominal}
    found = exact.tangents(nominal).slopes
    solution = load_basis("tm4513+atct").cantera_solution(("C", "H", "O"))
    molar_mass = CASE.fuel.si("molar_mass")

    def at(path, value):
        point = nominal | {path: value}
        mixture = CASE.replace({"mixture_ratio": point["case.mixture_ratio"]}).held.mixture
        more = (point["case.fuel.enthalpy"] - nominal["case.fuel.enthalpy"]) / molar_mass / (1.0 + point["case.mixture_ratio"])
        return cantera_temperature(solution, mixture.atoms[0], float(mixture.enthalpy[0]) + more, point["chamber.pressure"])

    for path, value in nominal.items():
        step = 0.01 * abs(value)
        low, mid_low, mid_high, high = (at(path, value + share * step) for share in (-1.0, -0.5, 0.5, 1.0))
        slope = (low - 8.0 * mid_low + 8.0 * mid_high - high) / (6.0 * step)
        for place, name in enumerate(("temperature", "molar_mass")):
            assert found[path][name] == pytest.approx(slope[place], rel=2e-5)


# -- what is said ------------------------------------------------------------------------------------------


def test_stored_temperatures_and_contours_go_by_differences_and_the_budget_says_so():
    chamber = pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4, oxidizer_temperature="92 K"), pressure="5 MPa")
    target = performance(chamber, area_ratio=20, throat_diameter=0.1, contour=pk.Bell(length=0.8))
    inputs = {"chamber.pressure": "1 %", "case.oxidizer_temperature": pk.Normal("1 K"), "nozzle.area_ratio": "1 %"}
    found = pk.Uncertainty(target, inputs, results=["thrust", "specific_impulse"]).run()
    assert found.first_order.exact == ("chamber.pressure",)
    assert dict(found.budget("thrust")["derivative"]) == {
        "chamber.pressure": "exact",
        "case.oxidizer_temperature": "differences",
        "nozzle.area_ratio": "differences",
    }
    assert "derivatives by differences in case.oxidizer_temperature, nozzle.area_ratio, exact in the others" in " ".join(str(found).split())
    assert "derivatives exact" in " ".join(str(pk.Uncertainty(performance(), {"chamber.pressure": "1 %"}).run()).split())


def test_recipes_without_a_batch_form_go_by_differences():
    film = pk.PropellantCase.with_film("LOX", "RP-1", mixture_ratio=2.6, film_fraction=0.1, film_mixture_ratio=0.5)
    target = performance(pk.Chamber(film, pressure="5 MPa"), "vacuum")
    found = pk.Uncertainty(target, {"chamber.pressure": "1 %"}, results=["thrust"]).run()
    assert found.first_order.exact == ()
    assert found.first_order.derivatives[0, 0] * 5e6 == pytest.approx(target.si("thrust"), rel=0.02)


def test_a_throat_at_a_phase_boundary_goes_by_differences():
    blend = pk.blend({"AP": 0.686, "Al": 0.10, "HTPB": 0.214})  # alumina freezes where the mass flux is largest
    chamber = pk.Chamber(pk.PropellantCase.monopropellant(blend, condensed=True, thermo_basis="tm4513"), pressure="7 MPa")
    target = performance(chamber, area_ratio=10, throat_diameter=0.1)
    assert any(doubt.code == "phase-boundary" for doubt in target.nozzle.warnings)
    assert not function_of(target, ("chamber.pressure",), ("mass_flow",)).tangents({"chamber.pressure": 7e6}).slopes
    found = pk.Uncertainty(target, {"chamber.pressure": "0.01 %"}, results=["mass_flow"]).run()
    assert found.first_order.exact == ()
    assert found.first_order.derivatives[0, 0] * 7e6 == pytest.approx(target.si("mass_flow"), rel=0.05)


def test_nominal_values_are_those_of_the_object():
    found = pk.Uncertainty(performance(), {"chamber.pressure": "1 %", "case.mixture_ratio": "1 %"}).run()
    for name, row in found.table.iterrows():
        value = performance().si(name)
        assert row["value"] == pytest.approx(value, rel=1e-12) or (math.isnan(row["value"]) and math.isnan(value))
