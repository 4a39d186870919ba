"""Benchmark report: a study against loops over Cantera, side by side in one run on one core; it prints, and never fails.

Run it with ``python tests/benchmarks/bench_study.py [--large]``; ``--large`` adds 1 000 000 designs (cost a design, memory, two threads and two processes).

Three engines, interleaved three times, LOX/RP-1, every species verified on every design, shifting, chamber + throat + exit:

* *plain*: HP, bounded search of the largest mass flux, bracketed root for the exit, each state by equilibrium at constant entropy;
* *economical*: the same by Newton's iteration on Mach number and area ratio, with species below 1e-11 in a first look dropped;
* *study*: `pk.Study(...).run()` and its complete `.frame`, predictor included, in one thread.

Times are processor time and elapsed time of this process; on a shared machine the first is the steadier one.

Measured on two shared cores without AVX-512, numpy 2.4, medians of three repeats of one run each, under load where it says so:

* 3 100 to 3 600 times the plain loop (41 to 66 ms a design there, 13 to 21 us here), 260 to 300 times the economical one;
* LOX/LCH4 1.0, LOX/LH2 0.9 to 1.0, NTO/MMH 1.7 to 2.3 of LOX/RP-1; frozen 0.6 to 0.8, constant-property 0.5 of shifting;
* finite contraction 2 (stagnation pressure quoted) to 3 times (injector pressure) infinite: 28 and 42 us a design; by the damped solver
  305 and 1 400 us;
* 1 000 000 designs with ten results: 13.0 us a design, 1.13 of the cost at 10 000 in one run under load, 0.41 GB at the peak;
* 10 000 trials on four inputs: 0.17 to 0.27 s; a map of 2 500 designs re-solved: 28 ms processor time at best, 38 to 43 as the median
  under load (before isentropes were followed in few steps: 50 at best, 58 as the median);
* first order with exact derivatives, seven inputs: 22 to 35 ms processor time (fourth-order differences: 25 ms), without warnings;
* 1 000 000 designs, five interleaved rounds with warm pools on a quiet machine: two processes 1.85 times as fast as one thread at best, 1.80 as the
  median; two threads 1.17 at best, 0.99 as the median (NumPy's short calls hand the interpreter's lock to and fro; blocks of 5 000 and
  10 000 designs and other switch intervals are no better). Give a process pool as `executor` for very large studies.

Where the time of 10 000 designs goes (profile, processor time): before local fits 45 % predictor, 8.4 evaluations a design (2 chamber, 3
throat, 3.4 exit); with fits by pieces 25 % predictor, 5.3 evaluations (1.3, 1, 3). Of an evaluation the exponentials are two fifths, matrix products a
third, elimination a tenth; verifying the species left out is a tenth of the whole.
"""

from __future__ import annotations

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import resource
import statistics
import sys
import time
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor

import cantera as ct
import numpy as np
from scipy import optimize

import propkit as pk
from propkit.bridge.basis import load_basis

DESIGNS = 10_000
PLAIN, ECONOMICAL = 8, 20
BASIS = "tm4513+atct"
RANGES = {"chamber.pressure": (3e6, 2e7), "nozzle.area_ratio": (5.0, 60.0)}
PAIRS = {("LOX", "RP-1"): (1.8, 3.4), ("LOX", "LCH4"): (2.2, 4.2), ("LOX", "LH2"): (3.0, 8.0), ("NTO", "MMH"): (1.2, 2.6)}


def performance(pair, ratio, flow="shifting", **chamber):
    case = pk.PropellantCase(*pair, mixture_ratio=ratio, thermo_basis=BASIS)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure=1e7, **chamber), area_ratio=30, throat_diameter=0.1, flow=flow)
    return pk.Performance(nozzle, ambient="sea level")


def study(pair, ends, count, flow="shifting", seed=1, results=None):
    return pk.Study.sample(
        performance(pair, 0.5 * sum(ends), flow), {**RANGES, "case.mixture_ratio": ends}, count, seed=seed, results=results
    )


class Clock:
    """Elapsed and processor time of a block of code."""

    def __enter__(self):
        self.start = time.perf_counter(), time.process_time()
        return self

    def __exit__(self, *error):
        self.elapsed, self.processor = time.perf_counter() - self.start[0], time.process_time() - self.start[1]


def expanded(gas, entropy, enthalpy, pressure):
    gas.SP = entropy, pressure
    gas.equilibrate("SP", rtol=1e-9)
    velocity = np.sqrt(max(2.0 * (enthalpy - gas.enthalpy_mass), 0.0))
    return velocity, gas.density * velocity


def burnt(gas, design):
    fractions, enthalpy, pressure, _ = design
    gas.TPX = 3000.0, pressure, fractions
    gas.equilibrate("TP")
    gas.HP = enthalpy, pressure
    gas.equilibrate("HP", rtol=1e-9)
    return gas.entropy_mass, gas.enthalpy_mass


def plain(gas, design):
    entropy, enthalpy = burnt(gas, design)
    pressure, ratio = design[2:]
    ends = (0.45 * pressure, 0.65 * pressure)
    throat = optimize.minimize_scalar(
        lambda p: -expanded(gas, entropy, enthalpy, p)[1], bounds=ends, method="bounded", options={"xatol": 1.0}
    )
    top = -throat.fun
    at = optimize.brentq(lambda p: top / expanded(gas, entropy, enthalpy, p)[1] - ratio, 1e-5 * pressure, 0.5 * pressure, rtol=1e-8)
    expanded(gas, entropy, enthalpy, at)
    return gas.T


def exponent(gas, entropy, pressure):
    """Isentropic exponent by a difference in pressure; the gas is left at the pressure."""
    gas.SP = entropy, pressure * 1.001
    gas.equilibrate("SP", rtol=1e-9)
    other = gas.density
    gas.SP = entropy, pressure
    gas.equilibrate("SP", rtol=1e-9)
    return np.log(1.001) / np.log(other / gas.density)


def economical(gas, design):
    entropy, enthalpy = burnt(gas, design)
    pressure, ratio = design[2:]
    p = 0.57 * pressure
    for _ in range(8):
        gamma = exponent(gas, entropy, p)
        square = 2.0 * (enthalpy - gas.enthalpy_mass)
        sound = gamma * gas.P / gas.density
        step = np.log(square / sound) / (2.0 * gas.P / gas.density / square + (gamma - 1.0) / gamma)
        p *= np.exp(step)
        if abs(step) < 1e-6:
            break
    top = expanded(gas, entropy, enthalpy, p)[1]
    goal = np.log(top / ratio)
    gamma_low = 1.2
    p = pressure * (0.02 if ratio < 10 else 0.004)
    for _ in range(12):
        velocity, flux = expanded(gas, entropy, enthalpy, p)
        slope = 1.0 / gamma_low - gas.P / gas.density / velocity**2
        step = (goal - np.log(flux)) / slope
        p *= np.exp(np.clip(step, -1.0, 1.0))
        if abs(step) < 1e-8:
            break
    expanded(gas, entropy, enthalpy, p)
    return gas.T


def designs_of(made, count, gas):
    """Return designs of a study as Cantera takes them: atoms by amount, h, p, area ratio."""
    found = []
    for row in range(count):
        design = made.plan.design(row)
        mixture = made.target.replace({"case.mixture_ratio": design["case.mixture_ratio"]}).case.held.mixture
        fractions = ", ".join(f"{symbol}:{amount}" for symbol, amount in zip(mixture.symbols, mixture.atoms[0], strict=True))
        found.append((fractions, float(mixture.enthalpy[0]), design["chamber.pressure"], design["nozzle.area_ratio"]))
    return found


def pruned(gas, designs):
    """Return a gas of the species that reach 1e-11 somewhere in a first look."""
    largest = np.zeros(gas.n_species)
    for design in designs[:6]:
        entropy, enthalpy = burnt(gas, design)
        largest = np.maximum(largest, gas.X)
        for share in (0.5, 0.05, 0.002):
            expanded(gas, entropy, enthalpy, share * design[2])
            largest = np.maximum(largest, gas.X)
    kept = [species for species, amount in zip(gas.species(), largest, strict=True) if amount > 1e-11]
    return ct.Solution(thermo="ideal-gas", species=kept)


def timed_study(made, executor):
    with Clock() as clock:
        result = made.run(executor=executor, progress=False)
        frame = result.frame
    return clock, result, frame


def side_by_side(executor):
    ends = PAIRS["LOX", "RP-1"]
    made = study(("LOX", "RP-1"), ends, DESIGNS)
    whole = load_basis(BASIS).cantera_solution(("C", "H", "O"))
    listed = designs_of(made, 3 * ECONOMICAL, whole)
    small = pruned(whole, listed)
    timed_study(made, executor)
    rows, apart = [], []
    for repeat in range(3):
        clock, result, frame = timed_study(made, executor)
        times = {"study": (clock.elapsed / DESIGNS, clock.processor / DESIGNS)}
        for name, loop, gas, count in (("plain", plain, whole, PLAIN), ("economical", economical, small, ECONOMICAL)):
            first = repeat * count
            with Clock() as clock:
                found = [loop(gas, listed[row]) for row in range(first, first + count)]
            times[name] = (clock.elapsed / count, clock.processor / count)
            apart += [abs(value / frame["nozzle.exit.temperature"][first + place] - 1.0) for place, value in enumerate(found)]
        rows.append(times)
    print(f"LOX/RP-1, shifting, {DESIGNS} designs, {len(whole.species_names)} species ({len(small.species_names)} in the economical loop)")
    for name in ("study", "plain", "economical"):
        shown = "  ".join(f"{1e6 * row[name][0]:9.1f}/{1e6 * row[name][1]:9.1f}" for row in rows)
        print(f"  {name:11} us a design, elapsed/processor: {shown}")
    for name in ("plain", "economical"):
        ratios = [statistics.median(row[name][which] / row["study"][which] for row in rows) for which in (0, 1)]
        print(f"  study is {ratios[0]:7.0f} (processor {ratios[1]:7.0f}) times the {name} loop")
    print(f"  exit temperatures agree to {max(apart):.1e}; {result.notes}")


def others(executor):
    base = None
    for pair, ends in PAIRS.items():
        made = study(pair, ends, DESIGNS)
        best = min(timed_study(made, executor)[0].processor for _ in range(3)) / DESIGNS
        base = base or best
        print(f"  {'/'.join(pair):10} {1e6 * best:7.1f} us a design, {best / base:4.2f} of LOX/RP-1")
    for flow in ("frozen", "constant-property"):
        made = study(("LOX", "RP-1"), PAIRS["LOX", "RP-1"], DESIGNS, flow)
        best = min(timed_study(made, executor)[0].processor for _ in range(3)) / DESIGNS
        print(f"  {flow:17} {1e6 * best:7.1f} us a design, {best / base:4.2f} of shifting")
    for pressure_at in ("injector", "nozzle stagnation"):
        target = performance(("LOX", "RP-1"), 2.6, contraction_ratio=2.5, pressure_at=pressure_at)
        ranges = {**RANGES, "case.mixture_ratio": PAIRS["LOX", "RP-1"], "chamber.contraction_ratio": (1.4, 6.0)}
        made = pk.Study.sample(target, ranges, DESIGNS, seed=1)
        best = min(timed_study(made, executor)[0].processor for _ in range(3)) / DESIGNS
        print(f"  finite contraction, {pressure_at} pressure: {1e6 * best:7.1f} us a design, {best / base:4.2f} of infinite")
    for count in (1000, 2500, 50_000):
        made = study(("LOX", "RP-1"), PAIRS["LOX", "RP-1"], count)
        best = min(timed_study(made, executor)[0].processor for _ in range(3)) / count
        print(f"  {count:6} designs: {1e6 * best:7.1f} us a design")


def live_map(executor):
    axes = {"chamber.pressure": np.linspace(4e6, 16e6, 50), "case.mixture_ratio": np.linspace(2.0, 3.2, 50)}
    times = []
    for place in range(7):
        target = performance(("LOX", "RP-1"), 2.6).replace({"nozzle.area_ratio": 20.0 + place})
        with Clock() as clock:
            pk.Study(target, axes, results=["specific_impulse", "thrust"]).run(executor=executor, progress=False)
        times.append(clock)
    print(
        f"  map of 2500 designs re-solved: {1e3 * statistics.median(t.elapsed for t in times):.0f} ms elapsed, {1e3 * statistics.median(t.processor for t in times):.0f} ms processor"
    )


def first_order():
    """Print the time of first-order analyses with exact derivatives, warnings (curvature by differences) not asked for."""
    inputs = {"chamber.pressure": "1 %", "case.mixture_ratio": "1 %", "nozzle.area_ratio": "1 %", "nozzle.throat_diameter": "0.2 %",
              "case.fuel.enthalpy": "1 kJ/mol", "case.oxidizer.enthalpy": "0.2 kJ/mol", "performance.ambient": "1 kPa"}  # fmt: skip
    for flow in ("shifting", "frozen", "constant-property"):
        plan, times = pk.Uncertainty(performance(("LOX", "RP-1"), 2.6, flow), inputs), []
        for _ in range(9):
            with Clock() as clock:
                plan.run()
            times.append(clock.processor)
        print(f"  first order, {len(inputs)} inputs, {flow}: {1e3 * min(times):.1f} ms processor")


def trials(executor):
    inputs = {"chamber.pressure": "1 %", "case.mixture_ratio": "2 %", "nozzle.throat_diameter": "0.2 %", "nozzle.area_ratio": "1 %"}
    plan = pk.Uncertainty(performance(("LOX", "RP-1"), 2.6), inputs)
    with Clock() as clock:
        plan.run(samples=10_000, seed=1, executor=executor, progress=False)
    print(f"  10 000 trials on four inputs: {clock.elapsed:.2f} s elapsed, {clock.processor:.2f} s processor")


def large(executor):
    ends, results = PAIRS["LOX", "RP-1"], ["specific_impulse", "thrust", "mass_flow", "chamber.temperature", "nozzle.exit.temperature",
                                           "nozzle.exit.pressure", "specific_impulse_vacuum", "thrust_coefficient", "chamber.molar_mass", "nozzle.exit.mach"]  # fmt: skip
    small = study(("LOX", "RP-1"), ends, DESIGNS, results=results)
    made = study(("LOX", "RP-1"), ends, 1_000_000, results=results)
    few = min(timed_study(small, executor)[0].processor for _ in range(3)) / DESIGNS
    clock, _, frame = timed_study(made, executor)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
    many = clock.processor / len(frame)
    print(
        f"  1 000 000 designs, ten results: {1e6 * many:.1f} us a design, {many / few:.2f} of that at {DESIGNS}; peak memory {peak:.2f} GB"
    )
    workers(executor, made, small)


def workers(one, made, small):
    """Two threads and two processes against one thread, each pool warm, in five interleaved rounds."""
    with ThreadPoolExecutor(2) as threads, ProcessPoolExecutor(2) as processes:
        for pool in (threads, processes):
            timed_study(small, pool)
        rounds = [[timed_study(made, pool)[0].elapsed for pool in (one, threads, processes)] for _ in range(5)]
    for place, name in ((1, "threads"), (2, "processes")):
        gains = sorted(times[0] / times[place] for times in rounds)
        print(
            f"  two {name} against one thread, {len(rounds)} rounds: best {gains[-1]:.2f}, median {statistics.median(gains):.2f} times as fast"
        )


def main() -> None:
    with ThreadPoolExecutor(1) as executor:
        side_by_side(executor)
        others(executor)
        live_map(executor)
        trials(executor)
        first_order()
        if "--large" in sys.argv:
            large(executor)


if __name__ == "__main__":
    main()
