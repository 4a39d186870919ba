"""Identities over the whole range of the objects: what must hold whatever the numbers are.

Tolerances are those of the solver's convergence (1e-11) with a margin for round-off in differences.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import propkit as pk
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage

PAIRS = [
    ("LOX", "LH2", 6.0), ("LOX", "LCH4", 3.4), ("LOX", "RP-1", 2.6), ("LOX", "ethanol-75", 1.4), ("NTO", "MMH", 1.9), ("NTO", "UDMH", 2.6),
    ("HTP-90", "RP-1", 7.0), ("HTP-98", "ethanol", 4.0), ("N2O", "propane", 8.0), ("GOX", "ammonia", 1.3), ("LOX", "hydrazine", 0.9),
]  # fmt: skip
pairs = st.sampled_from(PAIRS)
pressures = st.floats(1e5, 3e7)
richness = st.floats(0.45, 1.6)
ratios = st.floats(1.05, 150.0)
flows = st.sampled_from(["shifting", "frozen", "throat", "constant-property"])


def build(pair, pressure, rich, ratio, flow="shifting", **chamber):
    case = pk.PropellantCase(pair[0], pair[1], mixture_ratio=pair[2] * rich)
    made = pk.Chamber(case, pressure=pressure, **chamber)
    frozen = {"flow": "frozen", "freeze_at": "throat"} if flow == "throat" else {"flow": flow}
    return pk.Nozzle(made, area_ratio=ratio, throat_diameter=0.1, **frozen)


@given(pairs, pressures, richness, ratios, flows)
def test_conservation_along_the_nozzle(pair, pressure, rich, ratio, flow):
    if flow == "throat":
        ratio = max(ratio, 1.3)
    nozzle = build(pair, pressure, rich, ratio, flow)
    rest = nozzle.inlet
    scale = 8.31446261815324 / rest.si("molar_mass")
    for state in (nozzle.inlet, nozzle.throat, nozzle.exit):
        total = state.si("enthalpy") + state.si("velocity") ** 2 / 2
        assert abs(total - rest.si("enthalpy")) / (scale * rest.si("temperature")) < 1e-9
        assert abs(state.si("entropy") - rest.si("entropy")) / scale < 1e-9
    held, atoms = nozzle.held, nozzle.chamber.held.atoms[0]
    for flow_state in (held.throat, held.exit):
        if flow_state.amounts is not None:
            made = flow_state.amounts[0] @ held.table.composition
            assert np.max(np.abs(made - atoms)) / atoms.max() < 1e-10


@given(pairs, pressures, richness, st.sampled_from(["shifting", "frozen", "constant-property"]))
def test_the_throat_is_the_mass_flux_maximum_at_mach_one(pair, pressure, rich, flow):
    nozzle = build(pair, pressure, rich, 10.0, flow)
    throat = nozzle.throat
    assert throat.mach == pytest.approx(1.0, abs=1e-9)
    flux = throat.si("density") * throat.si("velocity")
    for factor in (0.98, 0.995, 1.005, 1.02):
        there = nozzle.at(pressure=throat.si("pressure") * factor)
        assert there.si("density") * there.si("velocity") < flux


@given(pairs, pressures, richness, ratios, flows, st.floats(0.0, 2e5))
def test_thrust_relations(pair, pressure, rich, ratio, flow, ambient):
    nozzle = build(pair, pressure, rich, max(ratio, 1.3), flow)
    ambient = min(ambient, 0.5 * pressure)
    perf = pk.Performance(nozzle, ambient=ambient)
    p0, area = nozzle.chamber.si("stagnation_pressure"), nozzle.si("throat_area")
    assert perf.si("thrust") == pytest.approx(perf.thrust_coefficient * p0 * area, rel=1e-12, abs=1e-6)
    assert perf.si("specific_impulse") == pytest.approx(
        nozzle.si("characteristic_velocity") * perf.thrust_coefficient / 9.80665, rel=1e-12, abs=1e-9
    )
    assert perf.si("thrust_vacuum") - perf.si("thrust") == pytest.approx(ambient * nozzle.si("exit_area"), rel=1e-9, abs=1e-6)


@given(pairs, pressures, richness, st.floats(2.0, 100.0))
def test_shifting_is_at_least_frozen_at_the_throat_is_at_least_frozen(pair, pressure, rich, ratio):
    impulse = [
        pk.Performance(build(pair, pressure, rich, ratio, flow), ambient="vacuum").si("specific_impulse")
        for flow in ("shifting", "throat", "frozen")
    ]
    assert impulse[0] >= impulse[1] * (1 - 1e-9)
    assert impulse[1] >= impulse[2] * (1 - 1e-9)


@given(pairs, st.floats(2e5, 2e7), richness, st.floats(0.6, 1.0))
def test_cstar_efficiency_changes_flow_and_impulse_but_no_thrust(pair, pressure, rich, efficiency):
    ideal = pk.Performance(build(pair, pressure, rich, 20.0), ambient="vacuum")
    real = ideal.replace({"chamber.cstar_efficiency": efficiency})
    assert real.si("mass_flow") * efficiency == pytest.approx(ideal.si("mass_flow"), rel=1e-12)
    assert real.si("thrust") == pytest.approx(ideal.si("thrust"), rel=1e-12)
    assert real.si("specific_impulse") == pytest.approx(ideal.si("specific_impulse") * efficiency, rel=1e-12)
    assert real.nozzle.exit == ideal.nozzle.exit


@given(pairs, st.floats(2e5, 2e7), richness, st.floats(0.8, 1.0))
def test_a_discharge_coefficient_acts_as_a_smaller_throat(pair, pressure, rich, coefficient):
    with_it = build(pair, pressure, rich, 20.0).replace(discharge_coefficient=coefficient)
    same = with_it.replace(
        {
            "discharge_coefficient": 1.0,
            "throat_area": with_it.si("throat_area") * coefficient,
            "area_ratio": 20.0 / coefficient,
        }
    )
    for name in ("mass_flow", "exit_area", "exit_pressure"):
        assert with_it.si(name) == pytest.approx(same.si(name), rel=1e-11)
    one, two = pk.Performance(with_it, ambient="vacuum"), pk.Performance(same, ambient="vacuum")
    assert one.si("thrust") == pytest.approx(two.si("thrust"), rel=1e-11)


def test_finite_contraction_against_the_stated_figures():
    """NTO/MMH 1.9, 2.4 MPa at the injector: computed independently from the three conservation laws; four printed digits, so 5e-4."""
    chamber = pk.Chamber(pk.PropellantCase("NTO", "MMH", mixture_ratio=1.9), pressure="2.4 MPa")
    whole = pk.Nozzle(chamber, area_ratio=10, throat_diameter=0.1).si("mass_flow")
    for ratio, expected in ((1.5, 0.9142), (2, 0.9508), (3, 0.9778), (5, 0.9920)):
        part = pk.Nozzle(chamber.replace(contraction_ratio=ratio), area_ratio=10, throat_diameter=0.1).si("mass_flow")
        assert part / whole == pytest.approx(expected, abs=5e-4)


@given(
    pairs,
    st.floats(3e5, 2e7),
    richness,
    st.floats(1.2, 8.0),
    st.sampled_from(["injector", "nozzle stagnation", "nozzle inlet static"]),
)
def test_the_combustor_conserves_mass_momentum_and_energy(pair, pressure, rich, ratio, where):
    chamber = build(pair, pressure, rich, 5.0, contraction_ratio=ratio, pressure_at=where).chamber
    held = chamber.held
    inlet, velocity = held.inlet, held.inlet_velocity
    assert inlet.pressure + inlet.density * velocity**2 == pytest.approx(held.injector.pressure, rel=1e-10)
    assert inlet.density * velocity * ratio == pytest.approx(held.throat.mass_flux, rel=1e-10)
    scale = inlet.gas_constant * inlet.temperature
    assert (inlet.enthalpy + velocity**2 / 2 - held.enthalpy) / scale == pytest.approx(0.0, abs=1e-10)
    quoted = {
        "injector": held.injector.pressure,
        "nozzle stagnation": held.stagnation.pressure,
        "nozzle inlet static": inlet.pressure,
    }[where]
    assert quoted == pytest.approx(pressure, rel=1e-11)


def test_a_wide_chamber_tends_to_infinite_contraction(chamber):
    wide = chamber.replace(contraction_ratio=1e4)
    assert wide.si("stagnation_pressure") == pytest.approx(chamber.si("stagnation_pressure"), rel=1e-7)
    assert math.isinf(chamber.contraction_ratio)
    gas = pk.Chamber.from_gas(pressure=7e6, temperature=3000, molar_mass=0.022, isentropic_exponent=1.2)
    assert gas.replace(contraction_ratio=1e4).si("stagnation_pressure") == pytest.approx(7e6, rel=1e-7)


def test_infinite_contraction_makes_all_readings_of_the_pressure_agree(chamber):
    for where in ("nozzle stagnation", "nozzle inlet static"):
        assert chamber.replace(pressure_at=where).si("characteristic_velocity") == chamber.si("characteristic_velocity")


def test_constant_property_combustor_conserves_momentum():
    gas = pk.Chamber.from_gas(pressure=7e6, temperature=3000, molar_mass=0.022, isentropic_exponent=1.2, contraction_ratio=2)
    nozzle = pk.Nozzle(gas, area_ratio=10, throat_diameter=0.1)
    inlet = nozzle.inlet
    assert inlet.si("pressure") + inlet.si("density") * inlet.si("velocity") ** 2 == pytest.approx(7e6, rel=1e-12)
    assert inlet.si("density") * inlet.si("velocity") * 2 * nozzle.si("throat_area") == pytest.approx(nozzle.si("mass_flow"), rel=1e-12)


@pytest.mark.parametrize("flow", ["shifting", "frozen", "constant-property"])
def test_a_batch_equals_its_single_cases(flow):
    oxidizer = pk.Propellant.from_library("LOX").stream(None, None, "oxidizer")[0]
    fuel = pk.Propellant.from_library("RP-1").stream(None, None, "fuel")[0]
    mixture_ratio = np.linspace(1.2, 5.0, 17)
    pressure = np.geomspace(2e5, 2e7, 17)
    options = {"flow": flow, "freeze_at": "chamber", "exponent": "equilibrium", "area_ratio": 25.0}
    whole = chamber_stage.combust(case_stage.two_streams(oxidizer, fuel, mixture_ratio), "tm4513+atct", pressure=pressure)
    batch = nozzle_stage.expand(whole, **options)
    for k in range(17):
        one = chamber_stage.combust(case_stage.two_streams(oxidizer, fuel, mixture_ratio[k]), "tm4513+atct", pressure=pressure[k])
        single = nozzle_stage.expand(one, **options)
        for name in ("temperature", "pressure", "velocity", "mach"):
            assert getattr(single.exit, name)[0] == pytest.approx(getattr(batch.exit, name)[k], rel=1e-10)
        assert single.mass_flux[0] == pytest.approx(batch.mass_flux[k], rel=1e-10)


def test_states_along_the_nozzle_close_the_loop(nozzle):
    for ratio in (1.0, 1.0001, 1.5, 10.0, 35.0):
        state = nozzle.at(area_ratio=ratio)
        assert nozzle.throat.si("density") * nozzle.throat.si("velocity") / (state.si("density") * state.si("velocity")) == pytest.approx(
            ratio, rel=1e-10
        )
    for ratio in (1.0001, 1.5, 10.0):
        state = nozzle.at(area_ratio=ratio, branch="subsonic")
        assert state.mach < 1
        again = nozzle.at(pressure=state.si("pressure"))
        assert again.si("temperature") == pytest.approx(state.si("temperature"), rel=1e-10)


def test_freezing_at_the_throat_keeps_the_equilibrium_throat(perf):
    shifting, frozen = perf.nozzle, perf.nozzle.replace(flow="frozen", freeze_at="throat")
    assert frozen.si("mass_flow") == pytest.approx(shifting.si("mass_flow"), rel=1e-12)
    assert 0.95 < frozen.throat.mach < 1.0
    assert frozen.exit.si("molar_mass") == pytest.approx(frozen.throat.si("molar_mass"), rel=1e-12)
    late = perf.nozzle.replace(flow="frozen", freeze_at=4.0)
    assert late.at(area_ratio=3.0).si("temperature") == pytest.approx(shifting.at(area_ratio=3.0).si("temperature"), rel=1e-10)
    assert late.exit.si("molar_mass") == pytest.approx(shifting.at(area_ratio=4.0).si("molar_mass"), rel=1e-10)
    with pytest.raises(pk.InputError, match="freez|frozen"):
        frozen.at(pressure=frozen.throat.si("pressure") * 0.99)
