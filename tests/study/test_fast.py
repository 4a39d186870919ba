"""The quick engine against the damped one: every station, every flow, and the guards that leave a design to the damped one."""

from dataclasses import replace

import numpy as np
import pytest

import propkit as pk
from propkit.chain import accelerated, case, chamber, nozzle
from propkit.physics import fast_flow, fast_newton, fast_predictor

PAIRS = {
    ("LOX", "RP-1"): (1.8, 3.4),
    ("LOX", "LCH4"): (2.0, 4.5),
    ("LOX", "LH2"): (2.5, 9.0),
    ("NTO", "MMH"): (1.1, 2.8),
}
STATES = ("pressure", "temperature", "density", "velocity", "sound_speed", "molar_mass", "isentropic_exponent", "enthalpy", "entropy")


def designs(pair, count, seed=1):
    rng = np.random.default_rng(seed)
    streams = [pk.Propellant.from_library(name).stream(None, None, role)[0] for name, role in zip(pair, ("oxidizer", "fuel"), strict=True)]
    mixture = case.two_streams(*streams, rng.uniform(*PAIRS[pair], count))
    return mixture, np.exp(rng.uniform(np.log(1e6), np.log(2.5e7), count)), np.exp(rng.uniform(np.log(3.0), np.log(150.0), count))


def compared(pair, count, flow="shifting", seed=1, exit_pressure=False, basis="tm4513+atct", pressure_at=None):
    """Return largest relative differences of the quick engine from the plain stages, by station and quantity, and designs it left."""
    mixture, pressure, ratio = designs(pair, count, seed)
    asked = (
        {"area_ratio": None, "exit_pressure": pressure / (10.0 * ratio)} if exit_pressure else {"area_ratio": ratio, "exit_pressure": None}
    )
    contraction = {}
    if pressure_at:
        contraction = {"contraction_ratio": np.random.default_rng(seed).uniform(1.3, 12.0, count), "pressure_at": pressure_at}
    wanted = {name: value for name, value in asked.items() if value is not None and flow == "shifting"}
    quick = accelerated.prepare(mixture, basis, pressure, **wanted, **contraction)
    assert quick is not None
    rest = quick.combust(mixture, pressure, keep=flow == "frozen", **contraction)
    expanded = quick.expand(rest, flow=flow, exponent="equilibrium", **asked)
    plain_rest = chamber.combust(mixture, basis, pressure=pressure, **contraction)
    freeze = {"freeze_at": "chamber"} if flow == "frozen" else {}
    plain = nozzle.expand(plain_rest, flow=flow, exponent="equilibrium", **freeze, **asked)
    worst = {}
    for name in chamber.INJECTOR_RESULTS:
        worst[f"face {name}"] = apart(getattr(rest.injector, name), getattr(plain_rest.injector, name))
    worst["c*"] = apart(rest.characteristic_velocity, plain_rest.characteristic_velocity)
    worst["stagnation pressure"] = apart(rest.stagnation.pressure, plain_rest.stagnation.pressure)
    for place in ("inlet", "throat", "exit") if pressure_at else ("throat", "exit"):
        mine, theirs = getattr(expanded.expansion, place), getattr(plain, place)
        for name in STATES:
            scale = np.abs(theirs.enthalpy).max() if name == "enthalpy" else None
            worst[f"{place} {name}"] = apart(getattr(mine, name), getattr(theirs, name), scale)
    return worst, expanded.slow


def apart(mine, theirs, scale=None):
    return float(np.max(np.abs(mine - theirs) / (np.abs(theirs) if scale is None else scale)))


@pytest.mark.parametrize("pair", PAIRS, ids="/".join)
def test_shifting_flow_agrees_with_the_damped_solver(pair):
    """1e-8 is the promise of a study; the damped solver is converged to 2e-12."""
    worst, slow = compared(pair, 300)
    assert max(worst.values()) < 1e-8, worst
    assert slow < 30


@pytest.mark.parametrize("flow", ["frozen", "constant-property"])
def test_other_flows_agree_with_the_damped_solver(flow):
    worst, _ = compared(("LOX", "LCH4"), 300, flow)
    assert max(worst.values()) < 1e-8, worst


def test_an_exit_pressure_may_be_asked_for_and_the_data_as_published_used():
    worst, _ = compared(("LOX", "LH2"), 200, exit_pressure=True, basis="tm4513")
    assert max(worst.values()) < 1e-8, worst


@pytest.mark.parametrize("flow", ["shifting", "frozen", "constant-property"])
@pytest.mark.parametrize("pressure_at", ["injector", "nozzle stagnation", "nozzle inlet static"])
def test_chambers_of_finite_contraction_agree_with_the_damped_solver(flow, pressure_at):
    worst, slow = compared(("LOX", "LCH4"), 150, flow, pressure_at=pressure_at)
    assert max(worst.values()) < 1e-8, worst
    assert slow < 15


@pytest.mark.full
@pytest.mark.parametrize("pair", PAIRS, ids="/".join)
@pytest.mark.parametrize("flow", ["shifting", "frozen"])
def test_many_chambers_of_finite_contraction_agree_with_the_damped_solver(pair, flow):
    worst, slow = compared(pair, 1500, flow, seed=5, pressure_at="injector")
    assert max(worst.values()) < 1e-8, worst
    assert slow < 150


def test_finite_and_infinite_contraction_together_are_refused():
    mixture, pressure, ratio = designs(("LOX", "LCH4"), 120)
    mixed = np.where(np.arange(120) % 2, 3.0, np.inf)
    assert accelerated.prepare(mixture, "tm4513+atct", pressure, area_ratio=ratio, contraction_ratio=mixed) is None
    quick = accelerated.prepare(mixture, "tm4513+atct", pressure, area_ratio=ratio)
    assert not quick.serves(mixture, mixed)


@pytest.mark.full
@pytest.mark.parametrize("pair", PAIRS, ids="/".join)
def test_twenty_thousand_random_designs_agree_with_the_damped_solver(pair):
    for seed in range(2):
        worst, slow = compared(pair, 2500, seed=seed)
        assert max(worst.values()) < 1e-8, worst
        assert slow < 125


def test_designs_outside_the_box_are_left_to_the_damped_solver_with_the_same_numbers():
    mixture, pressure, ratio = designs(("LOX", "RP-1"), 200)
    inside = pressure < 8e6
    some = replace(mixture, atoms=mixture.atoms[inside], enthalpy=mixture.enthalpy[inside], density=mixture.density[inside])
    quick = accelerated.prepare(some, "tm4513+atct", pressure[inside], area_ratio=ratio[inside])
    rest = quick.combust(mixture, pressure)
    assert set(np.flatnonzero(pressure > 8.5e6)) <= set(rest.slow)
    found = quick.expand(rest, flow="shifting", exponent=None, area_ratio=ratio, exit_pressure=None)
    assert len(rest.slow) <= found.slow < 200
    plain = nozzle.expand(chamber.combust(mixture, "tm4513+atct", pressure=pressure), flow="shifting", area_ratio=ratio)
    assert apart(found.expansion.exit.temperature, plain.exit.temperature) < 1e-8
    assert apart(rest.characteristic_velocity, plain.isentrope.pressure / plain.mass_flux) < 1e-8


def test_a_species_left_out_that_matters_sends_its_designs_to_the_damped_solver(monkeypatch):
    monkeypatch.setattr(fast_flow, "NEGLIGIBLE", float(np.log(1e-3)))
    worst, slow = compared(("LOX", "LCH4"), 120)
    assert slow == 120
    assert max(worst.values()) < 1e-10


def test_designs_that_do_not_come_to_rest_are_left_to_the_damped_solver(monkeypatch):
    mixture, pressure, ratio = designs(("LOX", "LCH4"), 120)
    quick = accelerated.prepare(mixture, "tm4513+atct", pressure, area_ratio=ratio)
    plain = nozzle.expand(chamber.combust(mixture, "tm4513+atct", pressure=pressure), flow="shifting", area_ratio=ratio)
    monkeypatch.setattr(fast_newton.solve, "__kwdefaults__", {**fast_newton.solve.__kwdefaults__, "steps": 1})
    monkeypatch.setattr(fast_flow, "STEPS", 1)
    rest = quick.combust(mixture, pressure)
    found = quick.expand(rest, flow="shifting", exponent=None, area_ratio=ratio, exit_pressure=None)
    assert found.slow > 100
    assert apart(found.expansion.exit.temperature, plain.exit.temperature) < 1e-8


def test_what_the_engine_does_not_serve_is_refused():
    mixture, pressure, ratio = designs(("LOX", "LCH4"), 120)
    assert accelerated.prepare(replace(mixture, condensed=True), "tm4513+atct", pressure, area_ratio=ratio) is None
    atoms = mixture.atoms.copy()
    atoms[3, 0] = 0.0
    assert accelerated.prepare(replace(mixture, atoms=atoms), "tm4513+atct", pressure, area_ratio=ratio) is None


def test_elimination_solves_symmetric_systems():
    rng = np.random.default_rng(4)
    for size in (2, 5, 6):
        root = rng.normal(size=(7, size, size))
        matrix = root @ root.transpose(0, 2, 1) + np.eye(size)
        matrix[:, -1, -1] = -0.5  # the row of the gas: its pivot is negative
        right = rng.normal(size=(7, size, 2))
        found = fast_newton._eliminate(np.ascontiguousarray(matrix.transpose(1, 2, 0)), np.ascontiguousarray(right.transpose(1, 2, 0)))
        np.testing.assert_allclose(found.transpose(2, 0, 1), np.linalg.solve(matrix, right), rtol=1e-8, atol=1e-10)


@pytest.mark.parametrize("pieces", [1, 3])
def test_a_fit_gives_back_a_polynomial_of_its_degree(pieces):
    at = fast_predictor.nodes(60, 2, pieces)
    value = (1.0 + at[0] - 2.0 * at[0] ** 3 + at[0] * at[1] ** 2)[None]
    fit = fast_predictor.Fit.of(at, value, (4, 5), pieces)
    place = np.random.default_rng(2).uniform(-1.0, 1.0, (2, 50))
    np.testing.assert_allclose(fit(place)[0], 1.0 + place[0] - 2.0 * place[0] ** 3 + place[0] * place[1] ** 2, atol=1e-9)


def test_coordinates_find_the_directions_in_which_designs_vary_and_go_back():
    mixture, pressure, ratio = designs(("LOX", "LCH4"), 50)
    logs = np.stack([np.log(pressure), np.log(ratio)])
    box = fast_predictor.Coordinates.of(mixture.atoms.T, mixture.enthalpy, logs)
    assert len(box.directions) == 1  # atoms and enthalpy follow from the mixture ratio alone
    place, inside = box(mixture.atoms.T, mixture.enthalpy, logs)
    assert inside.all()
    assert np.abs(place).max() <= 1.0
    atoms, enthalpy, back = box.back(place, logs)
    np.testing.assert_allclose(atoms, mixture.atoms.T, rtol=1e-9)
    np.testing.assert_allclose(enthalpy, mixture.enthalpy, rtol=1e-9)
    np.testing.assert_allclose(back, logs, rtol=1e-9)
