"""`pk.Uncertainty` on the objects: contract, published relations, and what it refuses."""

import math
import pickle
import re
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest
import uncertainties
from uncertainties import umath

import propkit as pk
from propkit.errors import InputError, NotAvailableError
from propkit.view.numbers import beside, latex, pretty, pretty_uncertainty, rounded_together

GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
NOZZLE = pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.1 m")
PERF = pk.Performance(NOZZLE, ambient="vacuum")
INPUTS = {
    "chamber.pressure": pk.Normal("1 %"),
    "chamber.temperature": pk.Normal("60 K"),
    "throat_diameter": pk.Uniform("0.2 mm"),
    "molar_mass": "0.5 %",
}
PLAN = pk.Uncertainty(PERF, INPUTS)


def test_first_order_against_the_uncertainties_package():
    # choked mass flow m' = p A / sqrt(R T) * gamma function, a textbook relation; R is CODATA's molar gas constant
    found = PLAN.run()
    p = uncertainties.ufloat(7e6, 7e4)
    t = uncertainties.ufloat(3500.0, 60.0)
    d = uncertainties.ufloat(0.1, 0.2e-3 / math.sqrt(3.0))
    molar = uncertainties.ufloat(0.022, 0.022 * 0.005)
    g = 1.2
    factor = math.sqrt(g) * (2.0 / (g + 1.0)) ** ((g + 1.0) / (2.0 * (g - 1.0)))
    flow = p * math.pi / 4.0 * d**2 / umath.sqrt(8.31446261815324 / molar * t) * factor
    row = found.table.loc["mass_flow"]
    assert row["value"] == pytest.approx(flow.n, rel=1e-10)
    assert row["standard_uncertainty"] == pytest.approx(flow.s, rel=1e-6)
    budget = found.budget("mass_flow")
    assert budget.loc["chamber.pressure", "sensitivity"] == pytest.approx(flow.derivatives[p], rel=1e-6)
    assert budget.loc["chamber.temperature", "share"] == pytest.approx((flow.derivatives[t] * 60.0 / flow.s) ** 2, rel=1e-5)
    assert budget["share"].sum() == pytest.approx(1.0)
    assert list(budget["share"]) == sorted(budget["share"], reverse=True)
    assert found.expanded_uncertainty("mass_flow") == pytest.approx(2.0 * flow.s, rel=1e-6)


def test_table_has_the_columns_of_the_contract():
    found = PLAN.run(samples=2_000, seed=1, progress=False)
    assert list(found.table.columns) == ["value", "standard_uncertainty", "low", "high"]
    assert found.table.index.name == "result"
    assert found.table.attrs["units"]["thrust"] == "N"
    assert found.seed == 1
    assert found.samples == 2_000
    assert found.table.loc["thrust", "value"] == pytest.approx(PERF.si("thrust"), rel=1e-12)


def test_trials_agree_with_first_order_on_the_chain():
    found = PLAN.run(samples=40_000, seed=3, progress=False)
    linear = PLAN.run()
    # nearly linear: 0.5 % is three standard errors of the deviation of 40 000 trials with some room for curvature
    np.testing.assert_allclose(found.table["standard_uncertainty"][:3], linear.table["standard_uncertainty"][:3], rtol=1.5e-2)
    np.testing.assert_allclose(found.correlation(), linear.correlation(), atol=0.02)


def test_seed_and_executor_give_the_same_bits():
    one = PLAN.run(samples=6_000, seed=5, progress=False)
    with ThreadPoolExecutor(2) as pool:
        two = PLAN.run(samples=6_000, seed=5, executor=pool, progress=False)
    assert np.array_equal(one.values("thrust"), two.values("thrust"))
    assert not np.array_equal(one.values("thrust"), PLAN.run(samples=6_000, seed=6, progress=False).values("thrust"))


def test_adaptive_says_what_was_reached():
    found = PLAN.run(samples="adaptive", seed=1, progress=False)
    assert found.samples % 10_000 == 0
    assert any("one significant digit" in str(doubt) for doubt in found.warnings)


def test_correlated_inputs():
    both = pk.Uncertainty(
        PERF, {"chamber.pressure": "1 %", "throat_diameter": "0.5 %"}, {("chamber.pressure", "throat_diameter"): -1.0}
    ).run()
    # m' goes with p d^2: one percent of p exactly against half a percent of d
    assert both.table.loc["mass_flow", "standard_uncertainty"] == pytest.approx(0.0, abs=1e-7 * PERF.si("mass_flow"))


def test_assigned_enthalpy_is_an_input():
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.6)
    chamber = pk.Chamber(case, pressure="10 MPa")
    found = pk.Uncertainty(chamber, {"case.fuel.enthalpy": "1 kJ/mol"}, results=["temperature"]).run()
    slope = found.budget("temperature").loc["case.fuel.enthalpy", "sensitivity"]
    # energy balance: dT = dh_fuel / (M (1 + r) cp) with the equilibrium heat capacity at constant pressure
    expected = 1.0 / (case.fuel.si("molar_mass") * 3.6 * chamber.si("specific_heat"))
    assert slope == pytest.approx(expected, rel=1e-4)


def test_sobol_indices_on_the_chain():
    pytest.importorskip("SALib")
    found = pk.Uncertainty(PERF, INPUTS, results=["mass_flow"]).sobol(seed=1, base=1024, progress=False)
    shares = PLAN.run().budget("mass_flow")["share"]
    table = found.table("mass_flow")
    for path in table.index:
        assert table.loc[path, "first"] == pytest.approx(shares[path], abs=0.02)
    assert found.seed == 1


def test_sheet_shows_what_was_found():
    found = PLAN.run(samples=2_000, seed=1, progress=False)
    report = found.report()
    row = next(row for row in report.headline if row.name == "thrust")
    assert row.unit == "kN"
    assert row.uncertainty == pytest.approx(found.standard_uncertainty("thrust") / 1e3)
    text = str(found)
    assert str(found.rounded("thrust").uncertainty) in text
    assert "seed 1" in text
    assert found._repr_mimebundle_()["text/html"]
    assert found.rounded("thrust", "US").value != found.rounded("thrust").value


@pytest.mark.parametrize("medium", ["plain", "html", "markdown", "latex"])
def test_every_medium_rounds_a_value_to_the_place_of_its_uncertainty(medium):
    """GUM 7.2.6: two digits of the uncertainty, the value to the same decimal place."""
    report = PLAN.run().report()
    page = re.sub(r"<[^>]+>", "", report._repr_mimebundle_()[f"text/{medium}"])
    page = re.sub(r"\s|\\,", "", page).replace(r"\pm", "±")
    doubted = [row for row in (*report.headline, *report.results, *report.given) if row.uncertainty]
    assert len(doubted) >= 8
    for row in doubted:
        pair = rounded_together(row.value, row.uncertainty)
        assert len(pair.uncertainty.replace(".", "").strip("0")) <= 2
        assert len(pair.value.partition(".")[2]) == len(pair.uncertainty.partition(".")[2])
        assert f"{pair.value}±{pair.uncertainty}" in page, row.name


def test_very_large_and_small_values_share_their_power_of_ten():
    assert str(beside(2.903e-9, 1.2e-11)) == "2.903e-9 ± 0.012e-9"
    assert pretty(2.903e-9, 4, 1.2e-11) == "2.903\u202f×\u202f10⁻⁹"
    assert pretty_uncertainty(2.903e-9, 1.2e-11) == "0.012\u202f×\u202f10⁻⁹"
    assert latex(4.12345e8, 6, 3.3e6) == r"4.123 \times 10^{8} \pm 0.033 \times 10^{8}"
    assert pretty(402.05, 5, 5.2) == "402.0"
    assert pretty(402.05, 5, 0.0) == pretty(402.05, 5, math.inf) == "402.05"


def test_figures():
    found = PLAN.run(samples=2_000, seed=1, progress=False)
    tornado = found.tornado("thrust")
    heights = tornado.layers[0].values.values
    assert list(heights) == sorted(heights, reverse=True)
    assert math.sqrt(sum(height**2 for height in heights)) == pytest.approx(PLAN.run().standard_uncertainty("thrust") / 1e3)
    assert "chamber.pressure" in tornado.alt
    histogram = found.histogram("thrust")
    x, y = histogram.layers[0].x.values, histogram.layers[0].y.values
    assert np.trapezoid(y, x) == pytest.approx(1.0, rel=1e-9)
    with pytest.raises(NotAvailableError, match="samples"):
        PLAN.run().histogram("thrust")


def test_plan_and_result_are_immutable_and_pickle():
    found = PLAN.run(samples=500, seed=2, progress=False)
    with pytest.raises(AttributeError):
        PLAN.anything = 1
    with pytest.raises(AttributeError):
        found.trials = None
    again = pickle.loads(pickle.dumps(found))
    assert again.table.equals(found.table)
    assert repr(again.plan) == repr(PLAN)


def test_every_bad_input_is_named_at_once():
    with pytest.raises(InputError) as caught:
        pk.Uncertainty(PERF, {"chamber.presure": "1 %", "ambient": "1 %", "throat_diameter": "-1 mm", "temperature": "1 K"})
    text = str(caught.value)
    for word in ("presure", "percentage", "above 0"):
        assert word in text
    assert len(caught.value.problems) == 3


def test_other_refusals():
    with pytest.raises(InputError, match="seed"):
        PLAN.run(samples=1_000)
    with pytest.raises(InputError, match="mapping"):
        pk.Uncertainty(PERF, {})
    with pytest.raises(InputError, match="propkit object"):
        pk.Uncertainty("perf", {"x": "1 %"})
    with pytest.raises(InputError, match="given once"):
        pk.Uncertainty(PERF, {"chamber.pressure": "1 %", "pressure": "2 %"})
    with pytest.raises(InputError, match="Did you mean thrust"):
        PLAN.run().budget("thrst")
    full = PERF.replace({"chamber.cstar_efficiency": 0.995})
    plan = pk.Uncertainty(full, {"chamber.cstar_efficiency": "1 %"})
    with pytest.raises(InputError, match=r"reaches illegal values: 31 % of its distribution, \d+ trials"):
        plan.run(samples=1_000, seed=1)
    found = plan.run(samples=1_000, seed=1, illegal="leave out", progress=False)
    assert any("are left out" in str(doubt) for doubt in found.warnings)


def test_trials_on_an_equilibrium_chain_agree_with_the_damped_solver():
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.6)
    chamber = pk.Chamber(case, pressure="10 MPa", cstar_efficiency=0.96)
    perf = pk.Performance(pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m"), ambient="sea level")
    inputs = {"chamber.pressure": "2 %", "mixture_ratio": "3 %", "nozzle.area_ratio": pk.Uniform(2.0)}
    plan = pk.Uncertainty(perf, inputs, results=["thrust", "chamber.temperature"])
    found = plan.run(samples=3000, seed=4, progress=False)
    drawn = plan._joint.draw(4, 0, 2500)
    expected = plan.function(drawn)
    for name in found.results:
        # accuracy that studies promise against the damped solver
        np.testing.assert_allclose(found.values(name)[:2500], expected[name], rtol=1e-8)
    assert found.table.loc["thrust", "value"] == pytest.approx(perf.si("thrust"), rel=1e-12)
