"""The mixture ratio of largest specific impulse, 1000 psia to 14.7 psia, against a table computed with Cantera on the same species.

The table is in tests/reference/optimum_mixture_ratio.csv; the impulse is flat at the optimum, so the ratio is judged by what it costs:
within 1e-4 of our own maximum. The rows of red fuming nitric acid are left out, for their make-up is not told.
"""

import csv
from pathlib import Path

import numpy as np
import pytest

import propkit as pk
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage

PSI = 6894.757293168361
NAMES = {"N2H4": "hydrazine", "A50": "A-50", "HTP90": "HTP-90"}
with (Path(__file__).parents[1] / "reference" / "optimum_mixture_ratio.csv").open(encoding="utf-8") as file:
    ROWS = [row for row in csv.DictReader(file) if row["oxidizer"] != "RFNA"]


def impulse(row, ratios, basis):
    """Return the specific impulse [s] at the exit pressure, and the chamber temperature [K], at every mixture ratio."""
    oxidizer, fuel = (
        pk.Propellant.from_library(NAMES.get(row[role], row[role])).stream(None, None, role)[0] for role in ("oxidizer", "fuel")
    )
    chamber = chamber_stage.combust(case_stage.two_streams(oxidizer, fuel, ratios), basis, pressure=1000 * PSI)
    found = nozzle_stage.expand(chamber, flow=row["mode"], freeze_at="chamber", exit_pressure=14.7 * PSI)
    assert (found.exit.status == 0).all()
    return found.exit.velocity / 9.80665, chamber.injector.temperature


@pytest.mark.parametrize("basis", ["tm4513+atct", "tm4513"])
@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['oxidizer']}-{row['fuel']}-{row['mode']}")
def test_the_tabulated_ratio_costs_less_than_1e_4(row, basis):
    tabulated = float(row["OF_opt_Isp"])
    ratios = np.concatenate([[tabulated], tabulated * np.linspace(0.8, 1.25, 91)])
    found, temperature = impulse(row, ratios, basis)
    best = int(np.argmax(found))
    assert 1 < best < len(ratios) - 2 or best == 0
    assert found[0] > found.max() * (1.0 - 1e-4)
    if basis == "tm4513":
        # 1.5e-3: assigned enthalpies of the table are not ours to the last digit (peroxide, hydrazines)
        assert found[0] == pytest.approx(float(row["Isp_s_max"]), rel=1.5e-3)
        assert temperature[0] == pytest.approx(float(row["Tc_K"]), rel=4e-3)
