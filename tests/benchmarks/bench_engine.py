"""Benchmark report: the batch engine against plain Cantera loops, one object from scratch, and import time.

Run it with ``python tests/benchmarks/bench_engine.py``. Everything is measured in one process on one core, interleaved; it prints a
report and never fails. The plain loop is HP for the chamber, then throat (bounded search of the mass flux) and exit (bracketed root) by
equilibrium at constant entropy, on the same species and basis.
"""

from __future__ import annotations

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import statistics
import subprocess
import sys
import time

import numpy as np
from scipy import optimize

import propkit as pk
from propkit.bridge.basis import load_basis
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage

DESIGNS = 2000
LOOP = 12


def batch(oxidizer, fuel, mixture_ratio, pressure, area_ratio):
    mixture = case_stage.two_streams(oxidizer, fuel, mixture_ratio)
    combustion = chamber_stage.combust(mixture, "tm4513+atct", pressure=pressure)
    return nozzle_stage.expand(combustion, flow="shifting", area_ratio=area_ratio)


def plain_cantera(gas, fractions, enthalpy, pressure, area_ratio):
    gas.TPX = 3000.0, pressure, fractions
    gas.equilibrate("TP")
    gas.HP = enthalpy, pressure
    gas.equilibrate("HP", rtol=1e-10)
    entropy, h0 = gas.entropy_mass, gas.enthalpy_mass

    def flux(p):
        gas.SP = entropy, p
        gas.equilibrate("SP", rtol=1e-10)
        return gas.density * np.sqrt(max(2.0 * (h0 - gas.enthalpy_mass), 0.0))

    throat = optimize.minimize_scalar(
        lambda p: -flux(p), bounds=(0.45 * pressure, 0.65 * pressure), method="bounded", options={"xatol": 1.0}
    )
    top = -throat.fun
    exit_pressure = optimize.brentq(lambda p: top / flux(p) - area_ratio, 1e-5 * pressure, 0.5 * pressure, rtol=1e-8)
    flux(exit_pressure)
    return gas.T


def main() -> None:
    rng = np.random.default_rng(1)
    oxidizer = pk.Propellant.from_library("LOX").stream(None, None, "oxidizer")[0]
    fuel = pk.Propellant.from_library("RP-1").stream(None, None, "fuel")[0]
    mixture_ratio, pressure, area_ratio = rng.uniform(1.8, 3.4, DESIGNS), rng.uniform(3e6, 2e7, DESIGNS), rng.uniform(5.0, 60.0, DESIGNS)
    gas = load_basis("tm4513+atct").cantera_solution(("C", "H", "O"))
    batch(oxidizer, fuel, mixture_ratio[:50], pressure[:50], area_ratio[:50])

    ours, theirs, apart = [], [], []
    for repeat in range(3):
        start = time.perf_counter()
        done = batch(oxidizer, fuel, mixture_ratio, pressure, area_ratio)
        ours.append((time.perf_counter() - start) / DESIGNS)
        start = time.perf_counter()
        for k in range(repeat * LOOP, (repeat + 1) * LOOP):
            r = mixture_ratio[k]
            mixture = case_stage.two_streams(oxidizer, fuel, r)
            fractions = _elemental(gas, mixture)
            found = plain_cantera(gas, fractions, float(mixture.enthalpy[0]), pressure[k], area_ratio[k])
            apart.append(abs(found / done.exit.temperature[k] - 1.0))
        theirs.append((time.perf_counter() - start) / LOOP)
    print(f"LOX/RP-1 shifting, chamber + throat + exit, {len(gas.species_names)} species, one core")
    print(f"  batch of {DESIGNS}: {1e6 * statistics.median(ours):8.1f} us a design   ({', '.join(f'{1e6 * t:.1f}' for t in ours)})")
    print(f"  plain loop      : {1e6 * statistics.median(theirs):8.1f} us a design   ({', '.join(f'{1e6 * t:.0f}' for t in theirs)})")
    print(f"  ratio           : {statistics.median(theirs) / statistics.median(ours):8.1f}   exit temperatures agree to {max(apart):.1e}")

    single, same = [], []
    for k in range(40):
        start = time.perf_counter()
        case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=mixture_ratio[k])
        nozzle = pk.Nozzle(pk.Chamber(case, pressure=pressure[k]), area_ratio=area_ratio[k], throat_diameter=0.1)
        pk.Performance(nozzle, ambient=0.0)
        single.append(time.perf_counter() - start)
        start = time.perf_counter()
        plain_cantera(gas, _elemental(gas, case.held.mixture), case.si("enthalpy"), pressure[k], area_ratio[k])
        same.append(time.perf_counter() - start)
    print(
        f"one Performance from scratch: {1e3 * statistics.median(single):.1f} ms median; plain Cantera route {1e3 * statistics.median(same):.1f} ms"
    )
    times = []
    for _ in range(5):
        start = time.perf_counter()
        subprocess.run([sys.executable, "-c", "import propkit"], check=True)
        whole = time.perf_counter() - start
        start = time.perf_counter()
        subprocess.run([sys.executable, "-c", "pass"], check=True)
        times.append(whole - (time.perf_counter() - start))
    print(f"import propkit: {1e3 * statistics.median(times):.0f} ms beyond an empty interpreter")


def _elemental(gas, mixture) -> str:
    """Return a start composition of atoms for Cantera: the same elements and amounts."""
    return ", ".join(f"{symbol}:{amount}" for symbol, amount in zip(mixture.symbols, mixture.atoms[0], strict=True))


if __name__ == "__main__":
    main()
