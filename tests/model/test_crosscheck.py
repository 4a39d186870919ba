"""The second engine agrees wherever it solves, and says why where it does not."""

from __future__ import annotations

import pytest

import propkit as pk
from propkit.model import crosscheck

CHANGES = [
    {},
    {"nozzle.flow": "frozen"},
    {"nozzle.flow": "frozen", "nozzle.freeze_at": "throat"},
    {"nozzle.flow": "frozen", "nozzle.freeze_at": 3.0, "nozzle.discharge_coefficient": 0.97},
    {"chamber.contraction_ratio": 2, "nozzle.flow": "frozen"},
    {"chamber.contraction_ratio": 3, "case.thermo_basis": "tm4513", "nozzle.exit_pressure": "40 kPa"},
]


@pytest.mark.parametrize("change", CHANGES, ids=str)
def test_the_two_engines_agree(perf, change):
    """Cantera's equilibrium is iterated to 1e-10 and its searches to about 1e-8: 1e-6 is far above both."""
    check = perf.replace(change).cross_check()
    assert set(check.stations) == {"chamber", "throat", "exit"}
    assert check.largest < 1e-6
    assert "solved chamber, throat and exit independently" in str(check)


def test_it_says_why_it_does_not_compare(perf):
    closed = perf.replace({"nozzle.flow": "constant-property"})
    with pytest.raises(pk.NotAvailableError, match="closed form"):
        closed.cross_check()
    assert "not compared" in crosscheck.one_line(closed)
    cold = pk.Performance(
        pk.Nozzle(
            pk.Chamber(pk.PropellantCase("LOX", "LH2", mixture_ratio=2), pressure="7 MPa"),
            area_ratio=800,
            throat_diameter=0.1,
            flow="frozen",
        ),
        ambient="vacuum",
    )
    assert any(doubt.code == "data-range" for doubt in cold.warnings)
    with pytest.raises(pk.NotAvailableError, match="outside the range"):
        cold.cross_check()
