"""Records of reconciliations, firings and uncertainties: they verify, and a changed number does not."""

import copy
import subprocess
import sys

import numpy as np
import pytest

import propkit as pk
from propkit.reconcile.firing_demo import CALIBRATION, HEADERS, demo_firing, demo_target

GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3400 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
PERF = pk.Performance(pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.2 m"), ambient="sea level")


def reconciliation():
    return pk.Reconciliation(
        PERF,
        {
            "thrust": ("372 kN", pk.Normal("2 %", k=2)),
            "mass_flow": ("130 kg/s", "1 %"),
            "chamber.pressure": "7.0 MPa",
            "throat_diameter": ("200 mm", "0.2 mm"),
        },
        name="Data sheet",
    )


def firing():
    target = demo_target()
    made = demo_firing(target, 4)
    channels = {name: header.partition(" [")[0] for name, header in HEADERS.items()}
    calibration = {name: f"{100.0 * share:g} %" for name, share in CALIBRATION.items()}
    return pk.HotFire(target, made.table, channels, throat_before=made.throat_before, calibration=calibration, name="Firing 4")


def uncertainty():
    inputs = {"chamber.pressure": "1 %", "throat_diameter": pk.Uniform("0.2 mm"), "molar_mass": pk.Triangular(1e-4)}
    plan = pk.Uncertainty(PERF, inputs, {("chamber.pressure", "molar_mass"): 0.3}, results=["thrust", "mass_flow"])
    return plan.run(samples=2000, seed=7, progress=False)


@pytest.mark.parametrize("make", [reconciliation, firing, uncertainty])
def test_record_is_saved_loaded_and_verified(make, tmp_path):
    analysis = make()
    path = tmp_path / "record.json"
    analysis.record(title="A record of the test").save(path)
    loaded = pk.Record.load(path)
    assert loaded.verify().ok, str(loaded.verify())
    assert "A record of the test" in loaded._repr_mimebundle_()["text/html"]
    again = loaded.calculation.analysis
    frame = "adjusted" if hasattr(analysis, "adjusted") else "table"
    columns = getattr(analysis, frame).columns[:2]
    np.testing.assert_allclose(getattr(again, frame)[columns], getattr(analysis, frame)[columns], rtol=1e-9)


def test_changed_result_is_found():
    document = reconciliation().record().document
    changed = copy.deepcopy(document)
    changed["content"]["objects"]["reconciliation"]["results"]["adjusted thrust"]["value"] *= 1.001
    found = pk.Record(changed).verify()
    assert not found.ok
    assert "adjusted thrust" in str(found)


def test_record_verifies_in_a_fresh_process(tmp_path):
    path = tmp_path / "record.json"
    uncertainty().record().save(path)
    code = f"import propkit as pk; assert pk.Record.load({str(path)!r}).verify().ok"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
