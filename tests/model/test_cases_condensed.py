"""Liquids and solids along the chain: composites, graphite, plateaus, throats at a phase boundary."""

import cantera
import numpy as np
import pytest

import propkit as pk
from propkit.bridge.basis import load_basis
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage

SHARES = {"AP": 0.70, "Al": 0.18, "HTPB": 0.12}


def composite(shares=None, pressure="7 MPa", **inputs):
    case = pk.PropellantCase.monopropellant(pk.blend(shares or SHARES), condensed=True, thermo_basis="tm4513")
    return pk.Chamber(case, pressure=pressure, **inputs)


def nozzle(chamber, **inputs):
    return pk.Nozzle(chamber, **{"area_ratio": 10, "throat_diameter": "0.1 m", **inputs})


def test_composite_at_7_mpa():
    """AP/Al/HTPB 70/18/12: 3524.08 K, 34.556 mol gas and 3.1146 mol liquid alumina per kg, from Cantera's multi-phase Gibbs solver
    with an outer root on temperature; half a unit of the last digit."""
    chamber = composite()
    assert chamber.si("temperature") == pytest.approx(3524.08, abs=0.006)
    gas_moles = 1.0 / chamber.si("molar_mass")
    assert gas_moles == pytest.approx(34.556, abs=6e-4)
    alumina = chamber.composition["Al2O3 (liquid)"]
    assert alumina / (1.0 - alumina) * gas_moles == pytest.approx(3.1146, abs=6e-5)  # composition is over all moles
    assert chamber.si("density") == pytest.approx(7e6 / (chamber.si("gas_constant") * chamber.si("temperature")), rel=1e-12)


def test_condensed_mass_fraction_at_the_stations():
    flow = nozzle(composite())
    fractions = flow.stations["condensed_mass_fraction"]
    chamber = flow.chamber
    alumina = chamber.composition["Al2O3 (liquid)"] / (1.0 - chamber.composition["Al2O3 (liquid)"]) / chamber.si("molar_mass")
    assert fractions.iloc[0] == pytest.approx(alumina * 0.1019600768, rel=1e-5)
    assert fractions.is_monotonic_increasing
    assert "condensed_mass_fraction" in flow.exit.names()
    with pytest.raises(pk.NotAvailableError, match="only gases are counted"):
        _ = nozzle(composite().replace({"case.condensed": False})).exit.condensed_mass_fraction


def test_gas_only_where_nothing_condenses_changes_nothing():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    plain, both = (nozzle(pk.Chamber(one, pressure="7 MPa")) for one in (case, case.replace(condensed=True)))
    assert both.exit.condensed_mass_fraction == 0.0
    for name in ("pressure", "temperature", "velocity"):
        assert both.exit.si(name) == pytest.approx(plain.exit.si(name), rel=1e-10)


def test_energy_entropy_and_mass_are_conserved_in_two_phase_flow():
    for contraction in ("infinite", 3.0):
        flow = nozzle(composite(contraction_ratio=contraction))
        rest = float(flow.chamber.held.stagnation.enthalpy[0])
        for state in (flow.inlet, flow.throat, flow.exit):
            assert state.si("enthalpy") + state.si("velocity") ** 2 / 2 == pytest.approx(rest, abs=1e-4)
            assert state.si("entropy") == pytest.approx(flow.inlet.si("entropy"), rel=1e-11)
        flux = flow.throat.si("density") * flow.throat.si("velocity")
        assert flow.exit.si("density") * flow.exit.si("velocity") * 10 == pytest.approx(flux, rel=1e-10)


def test_throat_at_a_phase_boundary_tells_both_mach_numbers():
    """Alumina freezes at 2327 K: the sound speed jumps there, and the largest mass flux can lie at the jump."""
    flow = nozzle(composite({"AP": 0.686, "Al": 0.10, "HTPB": 0.214}))
    assert flow.throat.si("temperature") == pytest.approx(2327.0, abs=0.01)
    (doubt,) = [entry for entry in flow.warnings if entry.code == "phase-boundary"]
    before, after = flow.held.mach_beside_throat()
    assert before < 1.0 < after
    assert f"{before:.4g}" in doubt
    assert f"{after:.4g}" in doubt
    pressure, flux = flow.throat.si("pressure"), flow.held.mass_flux[0]
    for factor in (0.97, 0.99, 0.999, 1.001, 1.01, 1.03):
        state = flow.at(pressure=pressure * factor)
        assert state.si("density") * state.si("velocity") < flux * (1 + 1e-12)
    for name in ("mass_flow", "characteristic_velocity"):
        assert all(step.residual is None or step.residual < 1e-9 for step in flow.working(name).steps if step.name != "mach")


def test_a_chamber_on_a_plateau_has_no_equilibrium_heat_capacity():
    chamber = composite({"AP": 0.66, "Al": 0.10, "HTPB": 0.24})
    assert chamber.si("temperature") == pytest.approx(2327.0, abs=0.01)
    with pytest.raises(pk.NotAvailableError, match="phase transition"):
        _ = chamber.specific_heat
    assert 0.9 < chamber.si("isentropic_exponent") < 1.0
    assert "undefined" in chamber._outcome.absent["specific_heat"]
    with pytest.raises(pk.InputError, match="'frozen' for this chamber"):
        nozzle(chamber, flow="constant-property")
    assert nozzle(chamber, flow="constant-property", exponent="frozen").exit.mach > 3.0
    assert str(chamber)


def test_frozen_flow_holds_the_phases_and_says_so():
    flow = nozzle(composite(), flow="frozen")
    assert "held-phases" in [entry.code for entry in flow.warnings]
    fractions = flow.stations["condensed_mass_fraction"]
    assert fractions.to_numpy() == pytest.approx(fractions.iloc[0], rel=1e-12)
    assert flow.at(area_ratio=5.0).condensed_mass_fraction == pytest.approx(fractions.iloc[0], rel=1e-12)


def test_the_sheets_say_what_is_outside():
    chamber = composite()
    assert "burning rate" in str(chamber)
    assert "over all moles" in str(chamber)
    hybrid = pk.PropellantCase("N2O", "HTPB", mixture_ratio=6.0)
    assert "regression rate" in str(hybrid)
    assert "regression" not in str(pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5))
    assert "no liquid or solid" in str(pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.5))


# -- graphite


def gas_and_graphite(chamber):
    """Return Cantera's moles of graphite per kg over the gas at our temperature and pressure."""
    basis, table = load_basis("tm4513"), chamber.held.table
    symbols = table.elements
    gas = basis.cantera_solution(symbols)
    name = "C (graphite)"
    (graphite,) = [one for one in basis.cantera_species(symbols, condensed=True) if one.name == name]
    data = graphite.input_data
    data["equation-of-state"] = {"model": "constant-volume", "molar-volume": "1e-12 m^3/kmol"}
    solid = cantera.Solution(thermo="fixed-stoichiometry", species=[cantera.Species.from_dict(data)])
    atoms = chamber.held.atoms[0]
    temperature, pressure = chamber.si("temperature"), chamber.si("pressure")
    gas.TPX = temperature, pressure, dict(zip(symbols, atoms, strict=True))
    mix = cantera.Mixture([(gas, float(atoms.sum()) * 1e-3), (solid, 0.0)])
    mix.T, mix.P = temperature, pressure
    mix.equilibrate("TP", solver="vcs", rtol=1e-11, max_steps=5000)
    return 1e3 * float(mix.species_moles[-1])


def test_graphite_of_a_fuel_rich_kerosene_case_is_canteras():
    """Cantera's vcs solver at our temperature and pressure: 1e-6 of the amount, and none on the lean side of the onset."""
    onset = 0.0
    for ratio in (0.4, 0.6, 0.8, 0.95):
        chamber = pk.Chamber(
            pk.PropellantCase("LOX", "RP-1", mixture_ratio=ratio, condensed=True, thermo_basis="tm4513"),
            pressure="7 MPa",
        )
        ours = float(chamber.held.injector.amounts[0][chamber.held.table.names.index("C (graphite)")])
        assert ours == pytest.approx(gas_and_graphite(chamber), rel=1e-6, abs=1e-9)
        onset = ratio if ours > 0.0 else onset
    assert onset > 0.0


def test_onset_of_graphite_is_where_the_gas_alone_is_just_saturated():
    oxidizer, fuel = (
        pk.Propellant.from_library(name).stream(None, None, role)[0] for name, role in (("LOX", "oxidizer"), ("RP-1", "fuel"))
    )
    ratios = np.linspace(0.5, 1.3, 81)
    both = chamber_stage.combust(case_stage.two_streams(oxidizer, fuel, ratios, condensed=True), "tm4513", pressure=7e6)
    gas = chamber_stage.combust(case_stage.two_streams(oxidizer, fuel, ratios), "tm4513", pressure=7e6)
    forms = both.injector.amounts[:, both.table.names.index("C (graphite)")] > 0.0
    told = [any(code == "supersaturation" and "carbon" in text for text, code, _ in gas.doubts(k)) for k in range(len(ratios))]
    assert forms[0]
    assert not forms[-1]
    assert list(forms) == told
