"""Every result of every kind of chain has a working that says something true: a relation that gives it, or conditions that hold."""

from __future__ import annotations

import math

import pytest

import propkit as pk


def _gas(**more) -> pk.Chamber:
    return pk.Chamber.from_gas(pressure="1 MPa", temperature="1200 K", molar_mass="20 g/mol", isentropic_exponent=1.25, **more)


def _pair(**more) -> pk.Chamber:
    return pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4), pressure="9.7 MPa", **more)


def _one(case, **more) -> pk.Chamber:
    return pk.Chamber(case, pressure="2 MPa", **more)


CASE = pk.PropellantCase
CHAINS = {
    "bell": (lambda: _pair(contraction_ratio=3, characteristic_length="0.9 m"), {"contour": pk.Bell(0.8), "wall_thickness": "2 mm"}),
    "own angles": (_pair, {"contour": pk.Bell(0.8, throat_angle="33 deg", exit_angle="9 deg")}),
    "cone": (_pair, {"contour": pk.Cone("15 deg")}),
    "chamber": (lambda: _pair(contraction_ratio=2.5, characteristic_length="1 m", pressure_at="nozzle inlet static"), {}),
    "frozen late": (_pair, {"flow": "frozen", "freeze_at": 3}),
    "given gas": (_gas, {}),
    "given gas, finite": (lambda: _gas(contraction_ratio=2, characteristic_length="0.5 m"), {"contour": pk.Cone("12 deg")}),
    "monopropellant": (lambda: _one(CASE.monopropellant("hydrazine", ammonia_dissociation=0.6)), {"flow": "frozen"}),
    "composite": (lambda: _one(CASE.monopropellant(pk.blend({"AP": 0.7, "Al": 0.18, "HTPB": 0.12}), condensed=True)), {}),
    "cold gas": (lambda: _one(CASE.cold_gas("GN2", temperature="293 K")), {}),
    "film": (lambda: _one(CASE.with_film("LOX", "RP-1", mixture_ratio=2.4, film_fraction=0.05)), {}),
}


@pytest.mark.parametrize("chain", CHAINS)
def test_every_result_has_a_working_that_holds(chain):
    chamber, sizes = CHAINS[chain]
    nozzle = pk.Nozzle(chamber(), **{"area_ratio": 20, "throat_diameter": "0.1 m", **sizes})
    for link in pk.Performance(nozzle, ambient="20 km").chain():
        for name in (*link.declared_results, *link.state_paths()):
            try:
                report = link.working(name)
            except pk.NotAvailableError:
                continue
            assert report.steps, f"{link.kind}.{name} has an empty working"
            shown = report.headline[0].value
            first = report.steps[0].result
            if first is not None and isinstance(first.value, float) and isinstance(shown, float):
                assert first.value == pytest.approx(shown, rel=1e-9), f"{link.kind}.{name}: {report.steps[0].text}"
            for step in report.steps:
                if step.residual is not None:
                    assert math.isfinite(step.residual)
                    assert step.residual < 1e-7, f"{link.kind}.{name}: {step.text}"
