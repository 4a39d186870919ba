"""Every row of the library with a role in combustion burns, also as a monopropellant and as a cold gas, at 1 and 10 MPa, in one batch each."""

import numpy as np
import pytest

import propkit as pk
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage
from propkit.data.propellants import library

ROWS = library()
PRESSURES = np.array([1e6, 10e6])
PARTNERS = {"oxidizer": ("RP-1", "fuel"), "fuel": ("LOX", "oxidizer")}
BURNING = [(name, role) for name, row in ROWS.items() for role in ("oxidizer", "fuel") if role in row.roles]
SINGLE = [name for name, row in ROWS.items() if "monopropellant" in row.roles]
INGREDIENTS = [name for name, row in ROWS.items() if row.role == "ingredient"]


def stream(name, role):
    return pk.Propellant.from_library(name).stream(None, None, role)[0]


def solved(mixture, phi_count):
    """Check that chamber, throat and exit of a mixture converge and keep the atoms; return the chamber."""
    repeated = [np.repeat(part, 2, axis=0) for part in (mixture.atoms, mixture.enthalpy, mixture.density)]
    both = case_stage.Mixture(mixture.symbols, *repeated, condensed=mixture.condensed)
    chamber = chamber_stage.combust(both, "tm4513+atct", pressure=np.tile(PRESSURES, phi_count))
    found = nozzle_stage.expand(chamber, flow="shifting", area_ratio=10.0)
    assert (chamber.injector.status == 0).all()
    assert (found.throat.status == 0).all()
    assert (found.exit.status == 0).all()
    made = chamber.injector.amounts @ chamber.table.composition
    assert made == pytest.approx(both.atoms, rel=1e-9, abs=1e-9)
    return chamber


@pytest.mark.parametrize("condensed", [False, True], ids=["gas", "condensed"])
@pytest.mark.parametrize(("name", "role"), BURNING)
def test_burns_from_lean_to_rich(name, role, condensed):
    partner, other = PARTNERS[role]
    streams = {role: stream(name, role), other: stream(partner, other)}
    ratios = case_stage.mixture_ratio_of(streams["oxidizer"], streams["fuel"], np.array([0.5, 1.0, 2.0]))
    solved(case_stage.two_streams(streams["oxidizer"], streams["fuel"], ratios, condensed=condensed), 3)


@pytest.mark.parametrize("condensed", [False, True], ids=["gas", "condensed"])
@pytest.mark.parametrize("name", SINGLE)
def test_burns_alone(name, condensed):
    chamber = solved(case_stage.one_stream(stream(name, ""), condensed=condensed), 1)
    assert (chamber.injector.temperature > 700.0).all()


@pytest.mark.parametrize("name", INGREDIENTS)
def test_ingredient_burns_in_a_composite(name):
    """A tenth of the ingredient in a composite of ammonium perchlorate, aluminium and binder."""
    base = {"AP": 0.68, "Al": 0.10, "HTPB": 0.12}
    shares = {**base, name: base.get(name, 0.0) + 0.10}
    chamber = solved(case_stage.one_stream(pk.blend(shares).stream(None, None, "")[0], condensed=True), 1)
    assert (chamber.injector.temperature > 2000.0).all()
    assert (chamber.injector.condensed_mass_fraction > 0.1).all()


@pytest.mark.parametrize("name", [name for name, row in ROWS.items() if "cold gas" in row.roles])
def test_expands_cold(name):
    case = pk.PropellantCase.cold_gas(name)
    for pressure in PRESSURES:
        nozzle = pk.Nozzle(pk.Chamber(case, pressure=pressure), area_ratio=10, throat_diameter="5 mm")
        assert nozzle.exit.si("temperature") < case.si("temperature")
