"""Prices of assumptions: each equals what an object with the other assumption gives, on the same hardware."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

import propkit as pk
from propkit.bridge import real_products
from propkit.model.doubts import Assumption

EFFECTS = ("mass_flow", "specific_impulse", "thrust")


def fixed(perf):
    """Return the performance with its sizes given as throat area and area ratio."""
    nozzle = perf.nozzle
    return perf.replace({"nozzle.throat_area": nozzle.si("throat_area"), "nozzle.area_ratio": nozzle.si("area_ratio")})


def compare(perf, key, alternative, changes):
    if "warmer" in changes.values():
        changes = {"case.fuel_temperature": perf.case._values["fuel"].row.temperature + 10.0}
    (price,) = [price for price in perf.assumptions.of(key).prices if price.alternative == alternative]
    other = fixed(perf).replace(changes)
    for name in EFFECTS:
        assert getattr(price, name) == pytest.approx(other.si(name) / perf.si(name) - 1.0, abs=2e-9), (key, alternative, name)


CASES = [
    ("flow", "frozen from the inlet", {"nozzle.flow": "frozen"}),
    ("flow", "constant properties", {"nozzle.flow": "constant-property"}),
    ("contraction", "ratio 3, pressure at the injector", {"chamber.contraction_ratio": 3}),
    (
        "contraction",
        "ratio 3, pressure static at the inlet",
        {"chamber.contraction_ratio": 3, "chamber.pressure_at": "nozzle inlet static"},
    ),
    ("basis", "tm4513", {"case.thermo_basis": "tm4513"}),
    ("cstar-efficiency", "0.97", {"chamber.cstar_efficiency": 0.97}),
    ("discharge", "0.98", {"nozzle.discharge_coefficient": 0.98}),
    ("one-dimensional", "cone of 15°", {"nozzle.contour": pk.Cone("15 deg")}),
    ("one-dimensional", "bell of 80 % length", {"nozzle.contour": pk.Bell(0.8)}),
    ("oxidizer-state", "100.17 K", {"case.oxidizer_temperature": 90.17 + 10.0}),
    ("fuel-state", "121.64 K", {"case.fuel_temperature": "warmer"}),
    ("no-condensation", "liquids and solids may form", {"case.condensed": True}),
]


@pytest.mark.parametrize(("key", "alternative", "changes"), CASES, ids=[f"{key}: {words}" for key, words, _ in CASES])
def test_a_price_is_what_an_object_with_the_other_assumption_gives(perf, key, alternative, changes):
    compare(perf, key, alternative, changes)


def test_a_nozzle_sized_by_mass_flow_keeps_its_hardware(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa", contraction_ratio=2.5, cstar_efficiency=0.97)
    nozzle = pk.Nozzle(chamber, area_ratio=20, mass_flow="100 kg/s", contour=pk.Bell())
    perf = pk.Performance(nozzle, ambient="12 km", losses={"kinetics": 0.99})
    compare(perf, "contraction", "infinite contraction", {"chamber.contraction_ratio": None})
    compare(perf, "contraction", "pressure as stagnation at the inlet", {"chamber.pressure_at": "nozzle stagnation"})
    compare(perf, "cstar-efficiency", "1", {"chamber.cstar_efficiency": 1})
    compare(perf, "one-dimensional", "axial flow, no divergence", {"nozzle.contour": None})
    compare(perf, "losses", "none of these losses", {"performance.losses": None})


def test_finite_contraction_costs_what_published_trials_say():
    """NTO/MMH 1.9 at 2.4 MPa, injector pressure held: mass flow 0.9508 and 0.9778 of infinite contraction at ratios 2 and 3 (stated with four digits)."""
    case = pk.PropellantCase("NTO", "MMH", mixture_ratio=1.9)
    for ratio, share in ((2.0, 0.9508), (3.0, 0.9778)):
        nozzle = pk.Nozzle(pk.Chamber(case, pressure="2.4 MPa", contraction_ratio=ratio), area_ratio=20, throat_diameter="0.1 m")
        price = next(
            p
            for p in pk.Performance(nozzle, ambient="vacuum").assumptions.of("contraction").prices
            if p.alternative == "infinite contraction"
        )
        assert 1.0 / (1.0 + price.mass_flow) == pytest.approx(share, abs=1e-4)


def test_the_largest_comes_first_and_every_entry_is_an_assumption(perf):
    found = perf.assumptions
    assert found is perf.assumptions
    sizes = [entry.size for entry in found]
    assert sizes == sorted(sizes, reverse=True)
    for entry in found:
        assert isinstance(entry, Assumption)
        assert entry.key
        assert entry.statement.endswith(".")
        assert entry.origin in ("given", "default", "method")
        assert [price.size for price in entry.prices] == sorted((price.size for price in entry.prices), reverse=True)
    assert {entry.key for entry in found} >= {
        "basis",
        "ideal-gas",
        "no-condensation",
        "contraction",
        "flow",
        "one-dimensional",
        "full-flow",
    }
    assert not found.unpriced
    with pytest.raises(KeyError, match="contraction"):
        found.of("luck")


def test_every_assumption_upstream_is_among_them(perf):
    keys = [entry.key for entry in perf.nozzle.assumptions]
    assert set(keys) < {entry.key for entry in perf.assumptions}
    assert [entry.prices for entry in perf.nozzle.assumptions] == [()] * len(keys)


def test_the_table_and_the_sheet_show_them(perf):
    frame = perf.assumptions.to_frame()
    assert list(frame.columns) == ["statement", "origin", "taken", "alternative", *EFFECTS, "note"]
    assert frame.loc["flow", "thrust"].tolist() == [price.thrust for price in perf.assumptions.of("flow").prices]
    text = str(perf)
    assert "Assumptions and what they cost" in text
    assert "shifting → frozen from the inlet" in text
    html = perf.assumptions._repr_mimebundle_()["text/html"]
    assert "What each assumption costs" in html
    assert pickle.loads(pickle.dumps(perf.assumptions)) == perf.assumptions


def test_a_record_holds_the_prices_and_verifies(perf):
    record = perf.record(title="priced")
    stored = {entry["key"]: entry for entry in record.content["assumptions"]}
    assert stored["flow"]["prices"][0]["alternative"] == "frozen from the inlet"
    assert record.verify().ok


def test_condensing_has_a_price_where_something_condenses():
    """Fuel-rich methane at mixture ratio 1 forms graphite: known of hydrocarbons far from stoichiometric."""
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=1.0)
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="5 MPa"), area_ratio=20, throat_diameter="0.1 m"), ambient="vacuum")
    compare(perf, "no-condensation", "liquids and solids may form", {"case.condensed": True})
    assert abs(perf.assumptions.of("no-condensation").prices[0].specific_impulse) > 1e-3


def test_full_flow_is_priced_by_the_separated_thrust(perf):
    price = perf.assumptions.of("full-flow").prices[0]
    assert price.thrust == pytest.approx(perf.thrust_separated.to("N").magnitude / perf.si("thrust") - 1.0, rel=1e-12)
    assert perf.replace(ambient="vacuum").assumptions.of("full-flow").prices[0].size == 0.0


def test_real_gas_departures_agree_with_an_equation_of_state():
    """Hot, dense gases against CoolProp's reference equations: a cubic equation gives sign and size of Z - 1, to half of it or 0.012."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    for key, fluid, elements, temperature, pressure in (
        ("CO2", "CarbonDioxide", ("C", "O"), 1200.0, 20e6),
        ("H2O", "Water", ("H", "O"), 1200.0, 20e6),
        ("N2", "Nitrogen", ("N",), 1000.0, 20e6),
        ("H2", "Hydrogen", ("H",), 1000.0, 20e6),
    ):
        found = real_products.departure(temperature, pressure, {key: 1.0}, 10.0, "tm4513", elements)
        known = coolprop.PropsSI("Z", "T", temperature, "P", pressure, fluid)
        assert found.compressibility - 1.0 == pytest.approx(known - 1.0, abs=0.012 + 0.5 * abs(known - 1.0))
        assert abs(found.mass_flow_ratio - 1.0) < 0.05
        near = real_products.departure(temperature, 1e3, {key: 1.0}, 10.0, "tm4513", elements)
        for ratio in (near.compressibility, near.mass_flow_ratio, near.velocity_ratio, near.exit_pressure_ratio):
            assert ratio == pytest.approx(1.0, abs=1e-4)


@pytest.mark.parametrize("flow", ["frozen", "constant-property"])
def test_other_flows_are_compared_with_shifting(perf, flow):
    there = perf.replace({"nozzle.flow": flow})
    compare(there, "flow", "shifting", {"nozzle.flow": "shifting"})


def test_a_gas_given_outright_has_prices():
    chamber = pk.Chamber.from_gas(pressure="7 MPa", temperature=3000, molar_mass="22 g/mol", isentropic_exponent=1.2)
    perf = pk.Performance(pk.Nozzle(chamber, area_ratio=9, exit_area="0.1 m2"), ambient="12 km")
    compare(perf, "given-gas", "exponent 1.212, 1 % higher", {"chamber.isentropic_exponent": 1.212})
    compare(perf, "contraction", "ratio 3, pressure at the injector", {"chamber.contraction_ratio": 3})


def test_other_cases_have_prices():
    held = pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.6)
    cold = pk.PropellantCase.cold_gas("GN2", temperature="293 K")
    for case in (held, cold):
        perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="2 MPa"), area_ratio=20, throat_diameter="5 mm"), ambient="vacuum")
        assert perf.assumptions.priced
        compare(perf, "contraction", "ratio 3, pressure at the injector", {"chamber.contraction_ratio": 3})
        assert np.isfinite(perf.assumptions.of("ideal-gas").prices[0].mass_flow)


def test_a_performance_alone_stays_light(perf):
    """Prices are computed when asked for, not when the object is made."""
    fresh = perf.replace(ambient="11.5 km")
    assert "assumptions" not in fresh._cache
    assert fresh.si("thrust") > 0.0
    assert "assumptions" not in fresh._cache
