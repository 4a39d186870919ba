"""Recordings of an invented test campaign with known truth, for notebooks and checks: a seeded script.

    python -m propkit.reconcile.firing_demo OUT.csv --seed 1

Start-up and tail-off, correlated noise, slow wander, zeros before and after, calibration errors drawn from the stated
uncertainties, and a few anomalies. Nothing here is a real engine.
"""

from __future__ import annotations

import argparse
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from propkit.constants import STANDARD_GRAVITY
from propkit.model.chamber import Chamber
from propkit.model.nozzle import Nozzle
from propkit.model.performance import Performance
from propkit.model.propellant_case import PropellantCase

if TYPE_CHECKING:
    import pandas as pd

Array = npt.NDArray[np.float64]

CALIBRATION = {"chamber.pressure": 0.0025, "oxidizer_mass_flow": 0.004, "fuel_mass_flow": 0.004, "thrust": 0.002}
"""Relative standard uncertainty of the calibration of each channel."""

HEADERS = {
    "chamber.pressure": "chamber pressure [bar]",
    "oxidizer_mass_flow": "oxidizer flow [kg/s]",
    "fuel_mass_flow": "fuel flow [kg/s]",
    "thrust": "thrust [kN]",
}
"""Channel -> header of its column."""

_FACTORS = {"chamber.pressure": 1e-5, "oxidizer_mass_flow": 1.0, "fuel_mass_flow": 1.0, "thrust": 1e-3}


@dataclass(frozen=True, slots=True)
class DemoFiring:
    """A made-up firing: its table, what a test crew would know, and the truth.

    Parameters
    ----------
    table : DataFrame
        Time and channels, with units in the headers.
    truth : mapping of str to float
        True delivered results in SI.
    throat_before, throat_after : (diameter, standard uncertainty)
        Measured cold throat [m].
    throat_growth : (share, standard uncertainty)
        Hot growth of the diameter as it is known [1].
    """

    table: pd.DataFrame
    truth: Mapping[str, float]
    throat_before: tuple[float, float]
    throat_after: tuple[float, float]
    throat_growth: tuple[float, float]


def demo_target() -> Performance:
    """Return the invented engine of the campaign: a small LOX/LCH4 chamber on a sea-level stand."""
    case = PropellantCase("LOX", "LCH4", mixture_ratio=3.2)
    chamber = Chamber(case, pressure="5 MPa", cstar_efficiency=0.965)
    nozzle = Nozzle(chamber, area_ratio=8, throat_diameter="80 mm")
    return Performance(nozzle, ambient="sea level")


def demo_firing(
    target: Performance | None = None,
    seed: int = 1,
    *,
    coefficient_efficiency: float = 0.975,
    anomalies: bool = True,
    rate: float = 200.0,
    burn: float = 12.0,
    correlation_time: float = 0.02,
) -> DemoFiring:
    """Return a made-up firing.

    Parameters
    ----------
    target : Performance, optional
        The engine at its true steady conditions.
    seed : int
        Seed of noise, calibration errors and anomalies.
    coefficient_efficiency : float
        True thrust coefficient over the ideal one [1].
    anomalies : bool
        Whether spikes and a dropout are put in.
    rate : float
        Samples per second [Hz].
    burn : float
        Duration of the burn [s].
    correlation_time : float
        Time over which noise is alike [s].

    Returns
    -------
    DemoFiring
        Table and truth.
    """
    import pandas as pd

    engine = target or demo_target()
    rng, spoiler = np.random.default_rng(seed), np.random.default_rng([seed, 1])
    steady = {
        "chamber.pressure": engine.nozzle.chamber.si("pressure"),
        "oxidizer_mass_flow": engine.si("oxidizer_mass_flow"),
        "fuel_mass_flow": engine.si("fuel_mass_flow"),
        "thrust": coefficient_efficiency * engine.si("thrust"),
    }
    before, after = 3.0, 8.0
    end = before + burn + after
    time = np.arange(0.0, end, 1.0 / rate)
    shape = _shape(time, before, before + burn)
    ambient = engine.si("ambient")
    columns = {"time [s]": np.round(time, 6)}
    for name, value in steady.items():
        scale = 1.0 + CALIBRATION[name] * rng.standard_normal()
        offset = 0.001 * value * rng.standard_normal()
        drift = 0.0006 * value * rng.standard_normal() * (time - time[0]) / end
        noise = 0.004 * value * (0.15 + 0.85 * shape) * _noise(rng, len(time), 1.0 / rate, correlation_time)
        base = ambient if name == "chamber.pressure" else 0.0
        clean = base + (value - base) * shape * scale if name == "chamber.pressure" else value * shape * scale
        values = clean + offset + drift + noise
        if anomalies:
            values = _spoiled(spoiler, values, time, before, before + burn, value, name)
        columns[HEADERS[name]] = values * _FACTORS[name]
    truth, throats = _truth(engine, steady, rng)
    return DemoFiring(pd.DataFrame(columns), truth, *throats)


def _truth(
    engine: Performance, steady: Mapping[str, float], rng: np.random.Generator
) -> tuple[dict[str, float], tuple[tuple[float, float], tuple[float, float], tuple[float, float]]]:
    """Return the true results, and the throat as a test crew measures it: cold, slightly worn after, with growth known."""
    hot = engine.nozzle.si("throat_diameter")
    growth, growth_doubt, wear, doubt = 0.002, 0.0004, 4e-4, 2.5e-4
    true_growth = growth + growth_doubt * rng.standard_normal()
    middle = hot / (1.0 + true_growth)
    cold, worn = middle * (1.0 - 0.5 * wear), middle * (1.0 + 0.5 * wear)
    measured = [(value * (1.0 + doubt * rng.standard_normal()), doubt * value) for value in (cold, worn)]
    flow = steady["oxidizer_mass_flow"] + steady["fuel_mass_flow"]
    rest = engine.nozzle.chamber.si("stagnation_pressure")
    area = math.pi / 4.0 * hot**2
    truth = {
        **steady,
        "mass_flow": flow,
        "mixture_ratio": steady["oxidizer_mass_flow"] / steady["fuel_mass_flow"],
        "characteristic_velocity": rest * area / flow,
        "thrust_coefficient": steady["thrust"] / (rest * area),
        "specific_impulse": steady["thrust"] / (flow * STANDARD_GRAVITY),
        "throat_area": area,
    }
    return truth, (measured[0], measured[1], (growth, growth_doubt))


def _shape(time: Array, start: float, end: float) -> Array:
    """Return the share of the steady level: nothing, a start-up with overshoot, one, a tail-off."""
    since, left = time - start, time - end
    rise = 1.0 - np.exp(-np.maximum(since, 0.0) / 0.12) * (1.0 + 0.5 * np.sin(np.maximum(since, 0.0) * 18.0))
    shape: Array = np.where(since < 0.0, 0.0, rise) * np.where(left < 0.0, 1.0, np.exp(-np.maximum(left, 0.0) / 0.08))
    return np.maximum(shape, 0.0)


def _noise(rng: np.random.Generator, count: int, step: float, time: float) -> Array:
    """Return unit first-order autoregressive noise."""
    from scipy import signal

    rho = math.exp(-step / time)
    start = rng.standard_normal()
    white = rng.standard_normal(count)
    found, _ = signal.lfilter([math.sqrt(1.0 - rho**2)], [1.0, -rho], white, zi=[rho * start])
    return np.asarray(found)


def _spoiled(rng: np.random.Generator, values: Array, time: Array, start: float, end: float, level: float, name: str) -> Array:
    burning = np.flatnonzero((time > start + 2.0) & (time < end - 1.0))
    spoiled = values.copy()
    spoiled[rng.choice(burning, 4, replace=False)] += level * rng.choice([-0.3, 0.3, 0.5], 4)
    if name == "fuel_mass_flow":
        gap = int(rng.choice(burning[:-40]))
        spoiled[gap : gap + 25] = np.nan
    return spoiled


def main(arguments: list[str] | None = None) -> int:
    """Write a made-up recording as CSV."""
    parser = argparse.ArgumentParser(description="Write the recording of an invented firing.")
    parser.add_argument("out", help="CSV file")
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args(arguments)
    made = demo_firing(seed=options.seed)
    made.table.to_csv(options.out, index=False, float_format="%.6g")
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
