"""Isentropic flow in every model against an independent program, closed forms and identities."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from propkit.bridge.basis import load_basis
from propkit.constants import STANDARD_GRAVITY
from propkit.physics import equilibrium, expansion, gas_dynamics, ideal_nozzle
from propkit.physics.equilibrium import CONVERGED, OUT_OF_RANGE, EquilibriumState
from propkit.physics.expansion import FlowState, Isentrope

REFERENCE = Path(__file__).parents[1] / "reference" / "rocket_cases.csv"
ROWS = list(csv.DictReader(REFERENCE.read_text(encoding="utf-8").splitlines()))
COLDEST_COMPARED = 200.0


def reservoir(symbols: str, atoms: list[float], enthalpy: float, pressure: float) -> tuple[EquilibriumState, Isentrope]:
    table = load_basis().table(tuple(symbols))
    rest = equilibrium.solve(table, [atoms], pressure=pressure, enthalpy=enthalpy)
    return rest, expansion.shifting(table, np.array([atoms]), rest)


def frozen_at_rest(rest: EquilibriumState, symbols: str, basis: str = "tm4513+atct") -> expansion.Frozen:
    table = load_basis(basis).table(tuple(symbols))
    return expansion.frozen(table, rest.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)


KEROSENE = ("CHO", [19.233, 37.505, 45.702], -773e3, 7e6)
HYPERGOLIC = ("CHNO", [8.19, 49.143, 29.915, 27.068], 12e3, 2.4e6)


@pytest.mark.parametrize("flow", ["sh", "fr"])
@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["case"])
def test_throat_and_exit_agree_with_an_independent_program(row: dict[str, str], flow: str) -> None:
    """Source: the file's own column. Tolerance 1e-6: the table is good to 1e-8 and carries ten digits.

    Frozen exits below 200 K are left out: there the program extrapolates the polynomials.
    """
    symbols = tuple(symbol for symbol in "CHNOF" if float(row[f"b_{symbol}_kmol_kg"]) > 0.0)
    atoms = np.array([[1e3 * float(row[f"b_{symbol}_kmol_kg"]) for symbol in symbols]])
    table = load_basis("tm4513").table(symbols)
    rest = equilibrium.solve(table, atoms, pressure=float(row["pc_Pa"]), enthalpy=float(row["h0_J_kg"]))
    isentrope: Isentrope = expansion.shifting(table, atoms, rest)
    if flow == "fr":
        isentrope = expansion.frozen(table, rest.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
    throat = expansion.throat(isentrope)
    end = expansion.at_area_ratio(isentrope, throat.mass_flux, float(row["area_ratio"]), throat)
    assert (throat.status[0], end.status[0]) == (CONVERGED, CONVERGED)
    cstar = rest.pressure / throat.mass_flux
    vacuum = end.velocity + end.pressure / end.mass_flux
    expected = {
        "cstar_m_s": cstar, "pt_over_pc": throat.pressure / rest.pressure, "Tt_K": throat.temperature,
        "Mt": 1e3 * throat.molar_mass, "gamma_t": throat.isentropic_exponent, "rho_t_kg_m3": throat.density,
    }  # fmt: skip
    if flow == "sh" or float(row["fr_Te_K"]) > COLDEST_COMPARED:
        expected |= {
            "pe_Pa": end.pressure, "Te_K": end.temperature, "Me_kg_kmol": 1e3 * end.molar_mass,
            "gamma_e": end.isentropic_exponent, "Mach_e": end.mach, "u_e_m_s": end.velocity, "Isp_vac_m_s": vacuum,
            "Isp_vac_s": vacuum / STANDARD_GRAVITY, "CF_vac": vacuum / cstar,
        }  # fmt: skip
    for name, value in expected.items():
        assert float(value[0]) == pytest.approx(float(row[f"{flow}_{name}"]), rel=1e-6), name


def conserved(rest: EquilibriumState, state: FlowState) -> None:
    """Entropy relative to R/M and stagnation enthalpy relative to R T0/M to 1e-9: the issue's tolerance."""
    np.testing.assert_allclose((state.entropy - rest.entropy) / rest.gas_constant, 0.0, atol=1e-9)
    missing = rest.enthalpy - state.enthalpy - 0.5 * state.velocity**2
    np.testing.assert_allclose(missing / (rest.gas_constant * rest.temperature), 0.0, atol=1e-9)


@settings(deadline=None, max_examples=40)
@given(
    st.sampled_from([KEROSENE, HYPERGOLIC]),
    st.floats(2e4, 3e7),
    st.floats(0.4, 2.5),
    st.floats(1.0001, 400.0),
    st.booleans(),
)
def test_identities_along_the_nozzle(
    case: tuple[str, list[float], float, float], pressure: float, richer: float, ratio: float, held: bool
) -> None:
    """Conservation, Mach 1 and largest mass flux at the throat, continuity, and both branches of the area."""
    symbols, atoms, enthalpy, _ = case
    fuel = np.array([richer if symbol in "CH" else 1.0 for symbol in symbols]) * atoms
    weights = np.array([{"C": 12.011, "H": 1.008, "N": 14.007, "O": 15.999}[symbol] for symbol in symbols]) * 1e-3
    rest, isentrope = reservoir(symbols, list(fuel / (fuel @ weights)), enthalpy, pressure)
    assert rest.status[0] == CONVERGED
    if held:
        isentrope = frozen_at_rest(rest, symbols)
    throat = expansion.throat(isentrope)
    assert throat.status[0] == CONVERGED
    assert throat.mach[0] == pytest.approx(1.0, abs=1e-9)
    for side in (0.999, 1.001):
        beside = expansion.at_pressure(isentrope, throat.pressure * side, throat)
        assert beside.mass_flux[0] < throat.mass_flux[0]
    for supersonic in (True, False):
        state = expansion.at_area_ratio(isentrope, throat.mass_flux, ratio, throat, supersonic)
        assert state.status[0] == CONVERGED
        assert (state.mach[0] > 1.0) == supersonic
        assert state.mass_flux[0] * ratio == pytest.approx(throat.mass_flux[0], rel=1e-9)
        conserved(rest, state)
        again = expansion.at_pressure(isentrope, state.pressure, throat)
        assert again.temperature[0] == pytest.approx(state.temperature[0], rel=1e-9)
    conserved(rest, throat)


def test_the_throat_is_the_unit_area_ratio() -> None:
    rest, isentrope = reservoir(*KEROSENE)
    throat = expansion.throat(isentrope)
    for flow in (isentrope, frozen_at_rest(rest, "CHO")):
        sonic = expansion.throat(flow)
        assert expansion.at_area_ratio(flow, sonic.mass_flux, 1.0, sonic).pressure[0] == sonic.pressure[0]
    near = expansion.at_area_ratio(isentrope, throat.mass_flux, 1.0 + 1e-8, throat)
    assert near.pressure[0] == pytest.approx(throat.pressure[0], rel=1e-3)
    assert near.mach[0] > 1.0
    assert expansion.at_area_ratio(isentrope, throat.mass_flux, 0.9, throat).status[0] == OUT_OF_RANGE


def test_a_batch_equals_its_single_cases() -> None:
    """Tolerance 1e-10: each case stops by its own residual, whatever else is in the block."""
    table = load_basis().table(("C", "H", "O"))
    atoms = np.repeat([KEROSENE[1]], 12, axis=0)
    pressure, ratio = np.geomspace(1e5, 3e7, 12), np.geomspace(1.01, 300.0, 12)
    rest = equilibrium.solve(table, atoms, pressure=pressure, enthalpy=KEROSENE[2])
    isentrope = expansion.shifting(table, atoms, rest)
    throat = expansion.throat(isentrope)
    whole = expansion.at_area_ratio(isentrope, throat.mass_flux, ratio, throat)
    for row in range(12):
        alone = isentrope.take(np.array([row]))
        sonic = expansion.throat(alone)
        single = expansion.at_area_ratio(alone, sonic.mass_flux, ratio[row], sonic)
        assert sonic.pressure[0] == pytest.approx(throat.pressure[row], rel=1e-10)
        for name in ("pressure", "temperature", "velocity", "molar_mass", "isentropic_exponent"):
            assert getattr(single, name)[0] == pytest.approx(getattr(whole, name)[row], rel=1e-10), name


def test_freezing_at_the_throat() -> None:
    """Throat and mass flow are those of the flow in equilibrium; beyond, the frozen gas; the gap is not returned."""
    _, isentrope = reservoir(*KEROSENE)
    throat = expansion.throat(isentrope)
    flow = expansion.frozen_from(isentrope, throat, None)
    there = expansion.throat(flow)
    assert there.mass_flux[0] == throat.mass_flux[0]
    assert there.mach[0] == pytest.approx(0.97, abs=0.005)
    end = expansion.at_area_ratio(flow, there.mass_flux, 20.0, there)
    assert end.status[0] == CONVERGED
    np.testing.assert_allclose(end.amounts, throat.amounts)
    shifting = expansion.at_area_ratio(isentrope, throat.mass_flux, 20.0, throat)
    assert end.temperature[0] < shifting.temperature[0]
    first = expansion.at_area_ratio(flow, there.mass_flux, 1.0 + 1e-9, there)
    assert first.mach[0] > 1.0
    assert expansion.at_pressure(flow, 0.995 * there.pressure).status[0] == OUT_OF_RANGE
    upstream = expansion.at_pressure(flow, 1.2 * there.pressure)
    assert upstream.molar_mass[0] == pytest.approx(expansion.at_pressure(isentrope, 1.2 * there.pressure).molar_mass[0])
    inlet = expansion.at_area_ratio(flow, there.mass_flux, 3.0, there, supersonic=False)
    assert inlet.mach[0] < 1.0


def test_freezing_at_an_area_ratio() -> None:
    _, isentrope = reservoir(*KEROSENE)
    throat = expansion.throat(isentrope)
    flow = expansion.frozen_from(isentrope, throat, 3.0)
    place = expansion.at_area_ratio(isentrope, throat.mass_flux, 3.0, throat)
    before = expansion.at_area_ratio(flow, throat.mass_flux, 2.0, throat)
    equal = expansion.at_area_ratio(isentrope, throat.mass_flux, 2.0, throat)
    assert before.temperature[0] == pytest.approx(equal.temperature[0], rel=1e-12)
    after = expansion.at_area_ratio(flow, throat.mass_flux, 30.0, throat)
    np.testing.assert_allclose(after.amounts, place.amounts)
    assert after.mass_flux[0] * 30.0 == pytest.approx(throat.mass_flux[0], rel=1e-10)
    assert expansion.throat(flow).mach[0] == pytest.approx(1.0, abs=1e-10)


def test_frozen_flow_later_is_nearer_to_equilibrium() -> None:
    """Shifting, frozen at 3, at the throat, at rest: falling specific impulse in vacuum."""
    rest, isentrope = reservoir(*KEROSENE)
    throat = expansion.throat(isentrope)
    late, early = (expansion.frozen_from(isentrope, throat, place) for place in (3.0, None))
    impulses = []
    for flow in (isentrope, late, early, frozen_at_rest(rest, "CHO")):
        sonic = expansion.throat(flow)
        end = expansion.at_area_ratio(flow, sonic.mass_flux, 50.0, sonic)
        impulses.append(float((end.velocity + end.pressure / end.mass_flux)[0]))
    assert impulses == sorted(impulses, reverse=True)


@settings(deadline=None, max_examples=30)
@given(st.floats(1.05, 1.66), st.floats(1.0, 300.0))
def test_constant_properties_are_the_closed_forms(gamma: float, ratio: float) -> None:
    """Source: NACA Report 1135 through propkit.physics.gas_dynamics, itself tested against its tables."""
    flow = expansion.perfect_gas(gamma, 350.0, 3000.0, 5e6)
    throat = expansion.throat(flow)
    assert throat.mass_flux[0] == pytest.approx(float(ideal_nozzle.choked_mass_flux(5e6, 3000.0, 350.0, gamma)), rel=1e-12)
    end = expansion.at_area_ratio(flow, throat.mass_flux, ratio, throat)
    assert gas_dynamics.area_ratio(end.mach, gamma)[0] == pytest.approx(ratio, rel=1e-9)
    assert end.velocity[0] == pytest.approx(np.sqrt(-2.0 * end.enthalpy[0]), rel=1e-9)
    assert expansion.at_pressure(flow, end.pressure).mach[0] == pytest.approx(end.mach[0], rel=1e-9)
    assert expansion.at_pressure(flow, 6e6).status[0] == OUT_OF_RANGE


def test_a_monatomic_gas_is_a_perfect_gas_in_every_model() -> None:
    """Helium has cp = 5/2 R exactly, so shifting and frozen flow are the closed form; tolerance: rounding."""
    table = load_basis().table(("He",))
    rest = equilibrium.solve(table, [[1.0 / table.molar_mass[0]]], pressure=1e7, temperature=300.0)
    perfect = expansion.perfect_gas(5.0 / 3.0, rest.gas_constant, 300.0, 1e7)
    shifting = expansion.shifting(table, rest.amounts, rest)
    held = expansion.frozen(table, rest.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
    for flow in (shifting, held):
        for ratio in (1.0, 5.0, 50.0):
            one, other = (expansion.at_area_ratio(model, expansion.throat(model).mass_flux, ratio) for model in (flow, perfect))
            assert one.status[0] == CONVERGED
            assert one.temperature[0] == pytest.approx(other.temperature[0], rel=1e-9)


def test_random_nozzles_all_have_an_answer(random_cases) -> None:  # type: ignore[no-untyped-def]
    """Every pair, 0.01-40 MPa, 0.1-10 times stoichiometric: throat and exit converge on the right side."""
    for symbols, cases in random_cases(400, 21, (1e4, 4e7), (0.1, 10.0)).items():
        table = load_basis().table(symbols)
        atoms = np.array(cases.atoms)
        rest = equilibrium.solve(table, atoms, pressure=cases.pressure, enthalpy=cases.enthalpy)
        isentrope = expansion.shifting(table, atoms, rest)
        throat = expansion.throat(isentrope)
        end = expansion.at_area_ratio(isentrope, throat.mass_flux, 60.0, throat)
        assert (rest.status == CONVERGED).all()
        assert (throat.status == CONVERGED).all()
        assert (end.status == CONVERGED).all()
        assert (end.mach > 1.0).all()
        np.testing.assert_allclose(throat.mach, 1.0, atol=1e-9)
        conserved(rest, end)
