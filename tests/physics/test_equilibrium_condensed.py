"""Liquids and solids: a reference value, Cantera's multi-phase solver, plateaus, two-phase flow."""

from __future__ import annotations

import cantera
import numpy as np
import pytest

from propkit.bridge.basis import load_basis
from propkit.constants import GAS_CONSTANT
from propkit.physics import equilibrium, expansion
from propkit.physics.equilibrium import CONVERGED, EquilibriumState
from propkit.physics.thermodynamics import SpeciesTable

SYMBOLS = ("Al", "C", "Cl", "H", "N", "O")
WEIGHTS = {"Al": 26.9815384, "C": 12.011, "Cl": 35.45, "H": 1.008, "N": 14.007, "O": 15.999}
INGREDIENTS = {
    "AP": ({"N": 1.0, "H": 4.0, "Cl": 1.0, "O": 4.0}, -295.77),
    "Al": ({"Al": 1.0}, 0.0),
    "HTPB": ({"C": 7.337, "H": 10.982, "O": 0.058}, 10.0),
}
"""Formula and enthalpy [kJ/mol] as in the project's reference table of propellants."""

TABLE = load_basis("tm4513").table(SYMBOLS, condensed=True)
GAS = TABLE.gas_count


def composite(**shares: float) -> tuple[np.ndarray, float]:
    """Return atoms [mol/kg] in the order of `SYMBOLS` and enthalpy [J/kg]."""
    atoms, enthalpy = dict.fromkeys(SYMBOLS, 0.0), 0.0
    for name, share in shares.items():
        formula, molar_enthalpy = INGREDIENTS[name]
        mass = sum(WEIGHTS[symbol] * count for symbol, count in formula.items()) * 1e-3
        enthalpy += share * molar_enthalpy * 1e3 / mass
        for symbol, count in formula.items():
            atoms[symbol] += share * count / mass
    return np.array([[atoms[symbol] for symbol in SYMBOLS]]), enthalpy


ATOMS, ENTHALPY = composite(AP=0.70, Al=0.18, HTPB=0.12)


def held(state: EquilibriumState, table: SpeciesTable = TABLE, row: int = 0) -> dict[str, float]:
    """Return the liquids and solids present [mol/kg]."""
    found = zip(table.names[table.gas_count :], state.amounts[row, table.gas_count :], strict=True)
    return {name: float(amount) for name, amount in found if amount > 0.0}


def test_reference_value_of_a_composite() -> None:
    """AP/Al/HTPB 70/18/12 at 7 MPa: 3524.08 K, 34.556 mol gas, 3.1146 mol liquid alumina in a kilogram.

    Source: Cantera's multi-phase Gibbs solver with an outer root on temperature (project's SCIENCE page). Tolerance: half a
    unit of the last digit printed; the comparison at (T, p) below goes to 1e-6.
    """
    state = equilibrium.solve(TABLE, ATOMS, pressure=7e6, enthalpy=ENTHALPY)
    assert state.status[0] == CONVERGED
    assert state.temperature[0] == pytest.approx(3524.08, abs=0.006)
    assert state.gas_moles[0] == pytest.approx(34.556, abs=0.0006)
    assert held(state) == {"Al2O3 (liquid)": pytest.approx(3.1146, abs=0.00006)}
    alumina = state.amounts[0, TABLE.names.index("Al2O3 (liquid)")] * 0.1019600768
    assert state.condensed_mass_fraction[0] == pytest.approx(alumina, rel=1e-7)
    assert state.density[0] == pytest.approx(7e6 * state.molar_mass[0] / (GAS_CONSTANT * state.temperature[0]), rel=1e-12)


def cantera_amounts(table: SpeciesTable, atoms: np.ndarray, temperature: float, pressure: float) -> np.ndarray:
    """Return Cantera's amounts [mol/kg] at (T, p), with every liquid and solid whose table covers the temperature.

    Species of the condensed file have no equation of state; without a molar volume Cantera takes 0.001 kg/m3.
    """
    base, symbols = load_basis("tm4513"), table.elements
    gas = base.cantera_solution(symbols)
    phases = [(gas, 0.0)]
    rows = [row for row in range(table.gas_count, len(table.names))
            if table.temperature_low[row] <= temperature <= table.temperature_high[row]]  # fmt: skip
    everything = base.cantera_species(symbols, condensed=True)
    for row in rows:
        data = everything[row].input_data
        data["equation-of-state"] = {"model": "constant-volume", "molar-volume": "1e-12 m^3/kmol"}
        phases.append((cantera.Solution(thermo="fixed-stoichiometry", species=[cantera.Species.from_dict(data)]), 0.0))
    gas.TPX = temperature, pressure, dict(zip(symbols, atoms, strict=True))
    phases[0] = (gas, float(atoms.sum() * 1e-3))
    mix = cantera.Mixture(phases)
    mix.T, mix.P = temperature, pressure
    mix.equilibrate("TP", solver="vcs", rtol=1e-11, max_steps=5000)
    found = np.zeros(len(table.names))
    moles = 1e3 * np.array(mix.species_moles)
    found[: table.gas_count] = moles[: table.gas_count]
    found[rows] = moles[table.gas_count :]
    return found


def compare(table: SpeciesTable, atoms: np.ndarray, state: EquilibriumState, row: int) -> bool:
    """Compare a state with Cantera's at its (T, p); False where Cantera does not solve it."""
    try:
        theirs = cantera_amounts(table, atoms, float(state.temperature[row]), float(state.pressure[row]))
    except cantera.CanteraError:
        return False
    if np.abs(theirs @ table.composition / atoms - 1.0).max() > 1e-7:
        return False
    np.testing.assert_allclose(state.amounts[row], theirs, atol=1e-6 * theirs.sum(), rtol=0.0)
    return True


def test_composites_agree_with_canteras_multi_phase_solver() -> None:
    """Source: Cantera's `vcs` at our (T, p), amounts to 1e-6 of all moles: the issue's tolerance."""
    shares = [(al, fuel) for al in (0.02, 0.08, 0.14, 0.20) for fuel in (0.10, 0.13, 0.16, 0.19)]
    cases = [composite(AP=1.0 - al - fuel, Al=al, HTPB=fuel) for al, fuel in shares]
    atoms, enthalpy = np.vstack([case[0] for case in cases]), np.array([case[1] for case in cases])
    compared = 0
    for pressure in (2e5, 7e6):
        state = equilibrium.solve(TABLE, atoms, pressure=pressure, enthalpy=enthalpy)
        assert (state.status == CONVERGED).all()
        for row in range(len(cases)):
            melting = len([name for name in held(state, row=row) if name.startswith("Al2O3")]) == 2
            compared += 0 if melting else compare(TABLE, atoms[row], state, row)
    assert compared >= 24


@pytest.mark.parametrize("symbols", [("C", "H", "O"), ("C", "H", "N", "O")])
def test_graphite_and_water_agree_with_canteras_multi_phase_solver(symbols: tuple[str, ...]) -> None:
    """Fuel-rich kerosene and hypergolic gas down to cold exhaust; source and tolerance as above."""
    table = load_basis("tm4513").table(symbols, condensed=True)
    rich = {"C": 45.0, "H": 88.0, "O": 21.0, "N": 0.0} if len(symbols) == 3 else {"C": 30.0, "H": 80.0, "N": 20.0, "O": 17.0}
    lean = {"C": 8.0, "H": 30.0, "O": 54.0, "N": 10.0}
    compared = 0
    for amounts in (rich, lean):
        atoms = np.array([amounts[symbol] for symbol in symbols])
        temperatures = np.array([320.0, 390.0, 450.0, 700.0, 900.0, 1100.0, 1300.0])
        state = equilibrium.solve(table, np.tile(atoms, (7, 1)), pressure=1e6, temperature=temperatures)
        assert (state.status == CONVERGED).all()
        for row in range(7):
            compared += compare(table, atoms, state, row)
        if amounts is rich:
            assert "C (graphite)" in held(state, table, 5)
        else:
            assert list(held(state, table, 0)) == ["H2O (liquid)"]
            assert not held(state, table, 4)
    assert compared >= 8


def test_phases_present_are_stable_and_the_others_would_dissolve() -> None:
    """Least Gibbs energy: no phase left out has a negative formation energy from the gas. Tolerance: the iteration's."""
    pressure = np.geomspace(1e3, 7e6, 40)
    rest = equilibrium.solve(TABLE, ATOMS, pressure=7e6, enthalpy=ENTHALPY)
    state = equilibrium.solve(TABLE, np.tile(ATOMS, (40, 1)), pressure=pressure, entropy=rest.entropy[0])
    assert (state.status == CONVERGED).all()
    np.testing.assert_allclose(state.entropy, rest.entropy[0], rtol=1e-11)
    np.testing.assert_allclose(state.amounts @ TABLE.composition, np.tile(ATOMS, (40, 1)), rtol=1e-10)
    assert (state.amounts >= 0.0).all()
    gibbs = TABLE.properties(state.temperature).gibbs_energy[:, GAS:]
    formed = state.element_potentials @ TABLE.composition[GAS:].T - gibbs
    candidate = state.temperature[:, None] <= TABLE.temperature_high[GAS:]
    present = state.amounts[:, GAS:] > 0.0
    assert (formed[candidate & ~present] < 1e-7).all()
    np.testing.assert_allclose(formed[present], 0.0, atol=1e-9)


def test_melting_plateau_at_given_enthalpy_and_entropy() -> None:
    """Both phases of alumina coexist at its transition, 2327 K; the split takes the heat of fusion.

    gamma_s of the plateau against neighbouring states at constant entropy; tolerance 1e-6: the difference quotient.
    """
    cold, hot = (equilibrium.solve(TABLE, ATOMS, pressure=7e6, temperature=t) for t in (2326.9, 2327.1))
    assert list(held(cold)) == ["Al2O3 (alpha)"]
    assert list(held(hot)) == ["Al2O3 (liquid)"]
    between = np.linspace(cold.enthalpy[0], hot.enthalpy[0], 7)[1:-1]
    state = equilibrium.solve(TABLE, np.tile(ATOMS, (5, 1)), pressure=7e6, enthalpy=between)
    assert (state.status == CONVERGED).all()
    np.testing.assert_allclose(state.temperature, 2327.0, atol=0.01)
    assert np.ptp(state.temperature) < 1e-8
    liquid = state.amounts[:, TABLE.names.index("Al2O3 (liquid)")]
    np.testing.assert_allclose(np.diff(liquid, 2), 0.0, atol=1e-9)
    assert (np.diff(liquid) > 0.0).all()
    assert np.isnan(state.specific_heat).all()
    low, high = (equilibrium.solve(TABLE, ATOMS, pressure=7e6 * factor, entropy=state.entropy[2]) for factor in (0.9999, 1.0001))
    slope = np.log(high.pressure / low.pressure) / np.log(high.density / low.density)
    assert slope[0] == pytest.approx(state.isentropic_exponent[2], rel=1e-6)
    assert state.isentropic_exponent[2] == pytest.approx(1.0, abs=0.01)


def nozzle(temperature: float) -> tuple[EquilibriumState, expansion.Shifting]:
    rest = equilibrium.solve(TABLE, ATOMS, pressure=7e6, temperature=temperature)
    return rest, expansion.shifting(TABLE, ATOMS, rest)


@pytest.mark.parametrize("temperature", [2340.0, 2400.0, 2490.0, 2500.0, 2505.0, 2560.0, 3524.0])
def test_the_throat_is_the_largest_mass_flux_also_at_a_phase_boundary(temperature: float) -> None:
    """Against a dense scan of the isentrope; tolerance 2e-5: its spacing."""
    rest, flow = nozzle(temperature)
    throat = expansion.throat(flow)
    assert throat.status[0] == CONVERGED
    pressure = np.linspace(0.4, 0.85, 1500) * 7e6
    scan = flow.take(np.zeros(1500, dtype=int)).at_pressure(pressure)
    assert (scan.status == CONVERGED).all()
    assert scan.mass_flux.max() <= throat.mass_flux[0] * (1.0 + 1e-12)
    assert scan.mass_flux.max() >= throat.mass_flux[0] * (1.0 - 2e-5)
    before, after = (expansion.at_pressure(flow, throat.pressure * factor) for factor in (1.0 + 1e-6, 1.0 - 1e-6))
    assert before.mach[0] < 1.0 < after.mach[0]
    if temperature == 2500.0:
        assert throat.temperature[0] == pytest.approx(2327.0, abs=0.01)
        assert after.mach[0] - before.mach[0] > 0.05
    for ratio, supersonic in ((1.0001, True), (8.0, True), (60.0, True), (3.0, False)):
        state = expansion.at_area_ratio(flow, throat.mass_flux, ratio, throat, supersonic)
        assert state.status[0] == CONVERGED
        assert state.mass_flux[0] * ratio == pytest.approx(throat.mass_flux[0], rel=1e-9)
        missing = rest.enthalpy - state.enthalpy - 0.5 * state.velocity**2
        assert missing[0] / (rest.gas_constant[0] * rest.temperature[0]) == pytest.approx(0.0, abs=1e-9)
        assert (state.entropy - rest.entropy)[0] / rest.gas_constant[0] == pytest.approx(0.0, abs=1e-9)


def test_frozen_flow_keeps_the_amount_of_every_phase() -> None:
    rest, _ = nozzle(3500.0)
    flow = expansion.frozen(TABLE, rest.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
    throat = expansion.throat(flow)
    end = expansion.at_area_ratio(flow, throat.mass_flux, 10.0, throat)
    assert end.status[0] == CONVERGED
    np.testing.assert_array_equal(end.amounts, rest.amounts)
    assert throat.mach[0] == pytest.approx(1.0, abs=1e-12)
    assert end.mass_flux[0] * 10.0 == pytest.approx(throat.mass_flux[0], rel=1e-10)


def test_a_table_with_phases_that_do_not_form_changes_nothing() -> None:
    """Tolerance 1e-10: the same equations, another table."""
    atoms, gas_only = np.array([[19.233, 37.505, 45.702]]), load_basis().table(("C", "H", "O"))
    plain = equilibrium.solve(gas_only, atoms, pressure=7e6, enthalpy=-773e3)
    full = equilibrium.solve(load_basis().table(("C", "H", "O"), condensed=True), atoms, pressure=7e6, enthalpy=-773e3)
    assert full.temperature[0] == pytest.approx(plain.temperature[0], rel=1e-10)
    assert full.isentropic_exponent[0] == pytest.approx(plain.isentropic_exponent[0], rel=1e-10)


def random_composites(count: int, seed: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    random = np.random.default_rng(seed)
    cases = []
    for _ in range(count):
        al, fuel = random.uniform(0.01, 0.30), random.uniform(0.08, 0.30)
        cases.append(composite(AP=1.0 - al - fuel, Al=al, HTPB=fuel))
    pressure = np.exp(random.uniform(np.log(1e5), np.log(2e7), count))
    return np.vstack([case[0] for case in cases]), np.array([case[1] for case in cases]), pressure


def test_a_batch_equals_its_single_cases() -> None:
    """Tolerance 1e-10: each case has its own phases and stops by its own residual."""
    atoms, enthalpy, pressure = random_composites(12, 4)
    whole = equilibrium.solve(TABLE, atoms, pressure=pressure, enthalpy=enthalpy)
    for row in range(12):
        single = equilibrium.solve(TABLE, atoms[row], pressure=pressure[row], enthalpy=enthalpy[row])
        assert single.temperature[0] == pytest.approx(whole.temperature[row], rel=1e-10)
        np.testing.assert_allclose(single.amounts[0, GAS:], whole.amounts[row, GAS:], rtol=1e-8, atol=1e-12)


@pytest.mark.full
def test_two_thousand_random_cases_with_condensed_products(random_cases) -> None:  # type: ignore[no-untyped-def]
    """At least 4 999 in 5 000 converge; what says it converged balances and has no negative amount."""
    missed, total = 0, 0
    atoms, enthalpy, pressure = random_composites(600, 1)
    batches = [(TABLE, atoms, enthalpy, pressure)]
    for symbols, cases in random_cases(1400, 77, (1e5, 2e7), (0.1, 10.0)).items():
        table = load_basis("tm4513").table(symbols, condensed=True)
        batches.append((table, np.array(cases.atoms), np.array(cases.enthalpy), np.array(cases.pressure)))
    for table, amounts, given, p in batches:
        state = equilibrium.solve(table, amounts, pressure=p, enthalpy=given)
        good = state.status == CONVERGED
        total += int((state.status != equilibrium.OUT_OF_RANGE).sum())
        missed += int((state.status == equilibrium.NOT_CONVERGED).sum())
        np.testing.assert_allclose(state.amounts[good] @ table.composition, amounts[good], rtol=1e-10)
        assert (state.amounts[good] >= 0.0).all()
    assert total >= 1990
    assert missed <= total / 5000
