"""Chambers of finite contraction ratio: conservation laws, quoted figures and limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from propkit.bridge.basis import load_basis
from propkit.errors import InputError
from propkit.physics import combustor, gas_dynamics
from propkit.physics.combustor import PRESSURES, Combustor
from propkit.physics.equilibrium import CONVERGED


@pytest.fixture(scope="module")
def hypergolic(mixed):  # type: ignore[no-untyped-def]
    atoms, enthalpy = mixed("NTO", "MMH", 1.9)
    return np.array([[atoms[symbol] for symbol in "CHNO"]]), enthalpy


def solved(case: tuple[np.ndarray, float], pressure: float, ratio: float, at: str) -> Combustor:
    return combustor.combustor(load_basis().table(("C", "H", "N", "O")), case[0], case[1], pressure, ratio, at)


@pytest.mark.parametrize(("ratio", "share"), [(1.5, 0.9142), (2.0, 0.9508), (3.0, 0.9778), (5.0, 0.9920)])
def test_mass_flow_over_that_of_infinite_contraction(hypergolic, ratio: float, share: float) -> None:  # type: ignore[no-untyped-def]
    """Source: SCIENCE page of the project, NTO/MMH 1.9, 2.4 MPa at the injector. Tolerance 5e-4: its printed digits."""
    finite, wide = (solved(hypergolic, 2.4e6, value, "injector") for value in (ratio, np.inf))
    assert float((finite.throat.mass_flux / wide.throat.mass_flux)[0]) == pytest.approx(share, abs=5e-4)


@pytest.mark.parametrize("at", PRESSURES)
@pytest.mark.parametrize("ratio", [1.05, 1.5, 4.0, 40.0])
def test_conservation_from_the_face_to_the_inlet(hypergolic, ratio: float, at: str) -> None:  # type: ignore[no-untyped-def]
    """Mass against the throat, momentum and energy against the face, entropy against the gas at rest; tolerance 1e-10."""
    found = solved(hypergolic, 3e6, ratio, at)
    for state in (found.injector, found.inlet, found.stagnation, found.throat):
        assert state.status[0] == CONVERGED
    inlet, velocity = found.inlet, found.inlet_velocity
    face = inlet.pressure + inlet.density * velocity**2
    assert face[0] == pytest.approx(found.injector.pressure[0], rel=1e-10)
    assert inlet.density[0] * velocity[0] * ratio == pytest.approx(found.throat.mass_flux[0], rel=1e-10)
    thermal = inlet.gas_constant[0] * inlet.temperature[0]
    assert (inlet.enthalpy[0] + 0.5 * velocity[0] ** 2 - hypergolic[1]) / thermal == pytest.approx(0.0, abs=1e-10)
    assert inlet.entropy[0] == pytest.approx(found.stagnation.entropy[0], rel=1e-11)
    quoted = {"injector": found.injector, "nozzle stagnation": found.stagnation, "nozzle inlet static": found.inlet}
    assert quoted[at].pressure[0] == pytest.approx(3e6, rel=1e-11)
    assert found.injector.pressure[0] > found.stagnation.pressure[0] > found.inlet.pressure[0]


@pytest.mark.parametrize("at", PRESSURES)
def test_a_wide_chamber_tends_to_the_infinite_one(hypergolic, at: str) -> None:  # type: ignore[no-untyped-def]
    """The difference falls as the square of the inlet Mach number."""
    wide = solved(hypergolic, 2e6, np.inf, at)
    gaps = [abs(solved(hypergolic, 2e6, ratio, at).throat.mass_flux[0] / wide.throat.mass_flux[0] - 1.0) for ratio in (30.0, 300.0)]
    assert gaps[1] < 1e-4
    if at != "nozzle stagnation":
        assert gaps[0] / gaps[1] == pytest.approx(100.0, rel=0.02)
    assert wide.inlet_velocity[0] == 0.0
    assert wide.injector.temperature[0] == wide.stagnation.temperature[0] == wide.inlet.temperature[0]


def test_a_batch_may_mix_finite_and_infinite_contraction(hypergolic) -> None:  # type: ignore[no-untyped-def]
    atoms = np.repeat(hypergolic[0], 3, axis=0)
    table = load_basis().table(("C", "H", "N", "O"))
    ratio = np.array([2.0, np.inf, 6.0])
    whole = combustor.combustor(table, atoms, hypergolic[1], [2e6, 3e6, 4e6], ratio, "injector")
    for row, pressure in enumerate((2e6, 3e6, 4e6)):
        single = solved(hypergolic, pressure, ratio[row], "injector")
        for name in ("injector", "inlet", "stagnation", "throat"):
            one, other = getattr(single, name), getattr(whole, name)
            assert one.pressure[0] == pytest.approx(other.pressure[row], rel=1e-10), name
            assert one.temperature[0] == pytest.approx(other.temperature[row], rel=1e-10), name


@settings(deadline=None, max_examples=40)
@given(st.floats(1.05, 1.66), st.floats(1.01, 100.0), st.sampled_from(PRESSURES))
def test_constant_properties(gamma: float, ratio: float, at: str) -> None:
    """The three laws for a perfect gas, written out with its Mach number; tolerance: rounding."""
    face, rest = combustor.constant_property_pressures(2e6, gamma, ratio, at)
    mach = gas_dynamics.mach_from_area_ratio(ratio, gamma, "subsonic")
    static = rest * gas_dynamics.pressure_ratio(mach, gamma)
    assert float(face) == pytest.approx(float(static * (1.0 + gamma * mach**2)), rel=1e-12)
    quoted = {"injector": face, "nozzle stagnation": rest, "nozzle inlet static": static}[at]
    assert float(quoted) == pytest.approx(2e6, rel=1e-12)
    wide = combustor.constant_property_pressures(2e6, gamma, np.inf, at)
    assert [float(part) for part in wide] == [2e6, 2e6]


def test_bad_questions_are_refused(hypergolic) -> None:  # type: ignore[no-untyped-def]
    for pressure, ratio, at in ((2e6, 0.8, "injector"), (-2e6, 2.0, "injector"), (2e6, 2.0, "plenum")):
        with pytest.raises(InputError):
            solved(hypergolic, pressure, ratio, at)
        with pytest.raises(InputError):
            combustor.constant_property_pressures(pressure, 1.2, ratio, at)
