"""The two engines solve the same nozzles."""

from __future__ import annotations

import numpy as np
import pytest

from propkit.bridge.basis import atomic_weight, load_basis
from propkit.bridge.second_engine import cross_check
from propkit.physics import equilibrium, expansion


def kilogram(symbols: str, amounts: list[float]) -> list[float]:
    """Return the amounts scaled to one kilogram."""
    mass = sum(amount * atomic_weight(symbol) for symbol, amount in zip(symbols, amounts, strict=True))
    return [amount / mass for amount in amounts]


KEROSENE = (("C", "H", "O"), kilogram("CHO", [19.233, 37.505, 45.702]), -773e3, 7e6)
HYPERGOLIC = (("C", "H", "N", "O"), kilogram("CHNO", [8.19, 49.143, 29.915, 27.068]), 12e3, 7e5)


def ours(state, names=("pressure", "temperature", "density", "molar_mass", "enthalpy", "entropy", "velocity")):  # type: ignore[no-untyped-def]
    return {name: float(getattr(state, name)[0]) for name in names if hasattr(state, name)}


@pytest.mark.parametrize("freeze_at", ["shifting", "chamber", "throat", 1.5])
@pytest.mark.parametrize("case", [KEROSENE, HYPERGOLIC], ids=["C/H/O", "C/H/N/O"])
def test_both_engines_agree(case, freeze_at) -> None:  # type: ignore[no-untyped-def]
    """Tolerance 1e-6: Cantera is asked for 1e-10, and its sound speed comes from differences of density."""
    symbols, atoms, enthalpy, pressure = case
    base = load_basis()
    table = base.table(symbols)
    rest = equilibrium.solve(table, [atoms], pressure=pressure, enthalpy=enthalpy)
    shifting = expansion.shifting(table, np.array([atoms]), rest)
    flow = shifting
    if freeze_at == "chamber":
        flow = expansion.frozen(table, rest.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
    elif freeze_at != "shifting":
        flow = expansion.frozen_from(shifting, expansion.throat(shifting), None if freeze_at == "throat" else freeze_at)
    throat = expansion.throat(flow)
    end = expansion.at_area_ratio(flow, throat.mass_flux, 30.0, throat)
    keywords = {"flow": "shifting"} if freeze_at == "shifting" else {"flow": "frozen", "freeze_at": freeze_at}
    found = cross_check(base, symbols, atoms, enthalpy=enthalpy, pressure=pressure, area_ratio=30.0, **keywords)
    assert found.reason == ""
    assert found.engine.startswith("Cantera ")
    differences = found.differences({"reservoir": ours(rest), "throat": ours(throat), "exit": ours(end)})
    assert set(differences) == {"reservoir", "throat", "exit"}
    for station, parts in differences.items():
        assert len(parts) >= 6
        for name, value in parts.items():
            assert abs(value) < 1e-6, (station, name)
    by_pressure = cross_check(base, symbols, atoms, enthalpy=enthalpy, pressure=pressure, exit_pressure=float(end.pressure[0]), **keywords)
    assert by_pressure.stations["exit"]["velocity"] == pytest.approx(end.velocity[0], rel=1e-6)


def test_a_wrong_answer_is_seen() -> None:
    symbols, atoms, enthalpy, pressure = KEROSENE
    found = cross_check(load_basis(), symbols, atoms, enthalpy=enthalpy, pressure=pressure, area_ratio=10.0)
    wrong = {name: value * 1.001 for name, value in found.stations["throat"].items()}
    assert found.differences({"throat": wrong})["throat"]["temperature"] == pytest.approx(1e-3, rel=1e-9)


def test_an_exit_outside_the_data_is_not_compared() -> None:
    symbols, atoms, enthalpy, pressure = ("H", "O"), kilogram("HO", [59.8437, 58.7335]), -5.7e6, 2.5e6
    found = cross_check(load_basis(), symbols, atoms, enthalpy=enthalpy, pressure=pressure, flow="frozen", area_ratio=400.0)
    assert "outside the range" in found.reason
    assert not found.stations


def test_a_case_that_cantera_cannot_solve_has_a_reason() -> None:
    found = cross_check(load_basis(), ("H", "O"), [60.0, 58.0], enthalpy=-9e7, pressure=1e6, area_ratio=10.0)
    assert "did not converge" in found.reason
    assert not found.differences({"throat": {"temperature": 1.0}})
