"""Propagation against the worked examples of the GUM and its supplement 1, and against the `uncertainties` package.

The published inputs and results of the examples are from memory; each test names its clause.
"""

import math

import numpy as np
import pytest
import uncertainties
from scipy import stats
from uncertainties import umath

from propkit.errors import ConvergenceError, InputError
from propkit.study.coverage import interval_ranks, tolerance
from propkit.study.distributions import Normal, Triangular, Uniform
from propkit.study.joint import JointInputs
from propkit.study.propagation import curvature, first_order, monte_carlo
from propkit.view.numbers import rounded_together


def inputs_of(entries, **options):
    return JointInputs({path: entry.resolve(nominal, "") for path, (nominal, entry) in entries.items()}, **options)


# -- the GUM, JCGM 100:2008 ---------------------------------------------------------------------------


def impedance(x):
    return {
        "resistance": x["voltage"] / x["current"] * np.cos(x["phase"]),
        "reactance": x["voltage"] / x["current"] * np.sin(x["phase"]),
        "impedance": x["voltage"] / x["current"],
    }


IMPEDANCE = inputs_of(
    {
        "voltage": (4.9990, Normal(0.0032)),
        "current": (19.661e-3, Normal(0.0095e-3)),
        "phase": (1.04446, Normal(0.00075)),
    },
    correlation={("voltage", "current"): -0.36, ("voltage", "phase"): 0.86, ("current", "phase"): -0.65},
)


def test_gum_h2_correlated_inputs():
    found = first_order(impedance, IMPEDANCE)
    # tolerance: one unit of the last printed digit (the printed inputs are rounded too)
    np.testing.assert_allclose(found.nominal, [127.732, 219.847, 254.260], atol=1.1e-3)
    np.testing.assert_allclose(found.standard_uncertainty, [0.071, 0.295, 0.236], atol=1.1e-3)
    deviations = found.standard_uncertainty
    correlation = found.covariance / np.outer(deviations, deviations)
    # printed -0.588, -0.485, 0.993; the rounded input correlations move the second figure by 0.004
    assert correlation[0, 1] == pytest.approx(-0.588, abs=5e-3)
    assert correlation[0, 2] == pytest.approx(-0.485, abs=6e-3)
    assert correlation[1, 2] == pytest.approx(0.993, abs=1e-3)
    np.testing.assert_allclose(found.shares.sum(axis=1), 1.0, rtol=1e-12)


def test_gum_h1_end_gauge():
    def length(x):
        expansion = x["difference_alpha"] * x["theta"] + x["alpha"] * x["difference_theta"]
        return {"length": x["standard"] + x["difference"] - x["standard"] * expansion}

    inputs = inputs_of(
        {
            "standard": (50_000_623.0, Normal(25.0)),
            "difference": (215.0, Normal(9.7)),
            "alpha": (11.5e-6, Uniform(2e-6)),
            "theta": (-0.1, Normal(0.41)),
            "difference_alpha": (0.0, Uniform(1e-6)),
            "difference_theta": (0.0, Uniform(0.05)),
        }
    )
    found = first_order(length, inputs)
    assert found.nominal[0] == pytest.approx(50_000_838.0, abs=0.5)
    assert found.standard_uncertainty[0] == pytest.approx(32.0, abs=0.5)


def test_gum_7_2_6_rounding():
    # 7.2.6: 10.47 mΩ is rounded to 10.5 or 11 mΩ; y = 10.057 62 Ω with u = 27 mΩ is 10.058 Ω; u = 28.05 kHz is 28 kHz
    assert str(rounded_together(10.05762, 0.027)) == "10.058 ± 0.027"
    assert rounded_together(0.0, 28.05).uncertainty == "28"
    assert rounded_together(0.0, 10.47).uncertainty == "10"
    # 7.2.2: m_S = 100.021 47 g with u_c = 0.35 mg
    assert str(rounded_together(100.02147, 0.00035)) == "100.02147 ± 0.00035"


@pytest.mark.parametrize(
    ("value", "uncertainty", "text"),
    [
        (812345.0, 4126.0, "812300 ± 4100"),
        (0.99, 0.0996, "0.99 ± 0.10"),
        (1234.5, 0.996, "1234.5 ± 1.0"),
        (-0.0004, 0.02, "0.000 ± 0.020"),
        (1e-9, 3.14e-11, "0.000000001000 ± 0.000000000031"),
    ],
)
def test_rounding_keeps_value_and_uncertainty_in_step(value, uncertainty, text):
    assert str(rounded_together(value, uncertainty)) == text


# -- supplement 1, JCGM 101:2008 ------------------------------------------------------------------------


def total(x):
    return {"y": x["a"] + x["b"] + x["c"] + x["d"]}


@pytest.mark.parametrize(
    ("kinds", "deviation", "end"),
    [
        # 9.2.2: four standard normal; 9.2.3: four rectangular of unit deviation; 9.2.4: the last of deviation 10
        ([Normal(1.0)] * 4, 2.00, 3.92),
        ([Uniform(math.sqrt(3.0))] * 4, 2.00, 3.88),
        ([Uniform(math.sqrt(3.0))] * 3 + [Uniform(10.0 * math.sqrt(3.0))], 10.1, 17.0),
    ],
)
def test_supplement_9_2_additive_model(kinds, deviation, end):
    inputs = inputs_of({name: (0.0, kind) for name, kind in zip("abcd", kinds, strict=True)})
    found = monte_carlo(total, inputs, 200_000, seed=1, progress=False)
    # tolerance: printed digits plus four standard errors of 200 000 trials
    assert found.standard_uncertainty[0] == pytest.approx(deviation, abs=0.005 * deviation + 0.05 * (deviation > 5))
    assert found.high[0] == pytest.approx(end, abs=0.04 * (1 + (end > 5)))
    assert found.low[0] == pytest.approx(-end, abs=0.04 * (1 + (end > 5)))
    assert first_order(total, inputs).standard_uncertainty[0] == pytest.approx(deviation, abs=0.051)


def mass(x):
    buoyancy = (x["air"] - 1.2) * (1.0 / x["weight"] - 1.0 / x["reference"])
    return {"deviation": (x["mass"] + x["small"]) * (1.0 + buoyancy) - 100_000.0}


MASS = inputs_of(
    {
        "mass": (100_000.0, Normal(0.050)),
        "small": (1.234, Normal(0.020)),
        "air": (1.20, Uniform(0.10)),
        "weight": (8000.0, Uniform(1000.0)),
        "reference": (8000.0, Uniform(50.0)),
    }
)


def test_supplement_9_3_mass_calibration():
    linear = first_order(mass, MASS)
    # first order sees no effect of the densities: u = 0.0539 mg; trials find 0.0754 mg (both in mg here)
    assert linear.standard_uncertainty[0] == pytest.approx(0.0539, abs=5e-5)
    found = monte_carlo(mass, MASS, 400_000, seed=2, progress=False)
    assert found.mean[0] == pytest.approx(1.2341, abs=5e-4)
    assert found.standard_uncertainty[0] == pytest.approx(0.0754, abs=3e-4)
    # table 5 prints the shortest interval 1.0834 to 1.3825; the distribution is symmetric, so that both agree
    assert found.low[0] == pytest.approx(1.0834, abs=1.5e-3)
    assert found.high[0] == pytest.approx(1.3825, abs=1.5e-3)


@pytest.mark.parametrize(("correlation", "deviation"), [(0.0, 50e-6), (0.9, 67e-6)])
def test_supplement_9_4_comparison_loss(correlation, deviation):
    inputs = inputs_of(
        {"x": (0.0, Normal(0.005)), "y": (0.0, Normal(0.005))},
        correlation={("x", "y"): correlation} if correlation else {},
    )
    found = monte_carlo(lambda v: {"loss": v["x"] ** 2 + v["y"] ** 2}, inputs, 200_000, seed=3, progress=False)
    assert found.mean[0] == pytest.approx(50e-6, abs=0.6e-6)
    assert found.standard_uncertainty[0] == pytest.approx(deviation, abs=1.0e-6)
    if not correlation:  # 25e-6 times chi-square with two degrees of freedom
        assert found.low[0] == pytest.approx(25e-6 * stats.chi2.ppf(0.025, 2), rel=0.05)
        assert found.high[0] == pytest.approx(25e-6 * stats.chi2.ppf(0.975, 2), rel=0.02)


def test_supplement_7_7_ranks():
    # M = 10^5, p = 0.95: the interval runs from the 2 500th to the 97 500th ordered value (from memory)
    assert interval_ranks(100_000) == (2499, 97_499)
    low, high = interval_ranks(101)
    assert high - low == 96  # integer part of 0.95 * 101 + 1/2


def test_supplement_7_9_tolerance():
    # 7.9.2 examples: u = 0.35 mg with two digits: 0.005 mg; u = 2 K with one digit: 0.5 K
    assert tolerance(0.35, 2) == pytest.approx(0.005)
    assert tolerance(2.0, 1) == pytest.approx(0.5)
    assert tolerance(0.96, 1) == pytest.approx(0.5)
    assert tolerance(0.0) == 0.0


def test_adaptive_reaches_its_tolerance_and_says_so():
    found = monte_carlo(mass, MASS, "adaptive", seed=4, progress=False)
    assert found.samples % 10_000 == 0
    assert all(entry.stable for entry in found.stability)
    assert found.stability[0].tolerance == pytest.approx(0.005)
    assert f"is reached for every result after {found.samples} trials" in found.notes[-1]
    # the promise, checked: runs of that size really scatter by less than the tolerance
    others = [monte_carlo(mass, MASS, found.samples, seed=seed, progress=False) for seed in range(40, 50)]
    for name in ("mean", "standard_uncertainty", "low", "high"):
        assert 2.0 * np.std([getattr(entry, name)[0] for entry in others]) < 2.0 * found.stability[0].tolerance


def test_adaptive_says_when_it_does_not_reach_it():
    heavy = inputs_of({"x": (0.0, Uniform(0.999999)), "y": (0.0, Normal(1.0))})
    found = monte_carlo(
        lambda v: {"tail": 1.0 / (1.0 - v["x"]) ** 2, "tame": v["y"]},
        heavy,
        "adaptive",
        seed=5,
        most=30_000,
        progress=False,
    )
    assert not found.stability[0].stable
    assert found.stability[1].stable
    assert "not reached for tail after 30000 trials" in found.notes[-1]


# -- our own demands -------------------------------------------------------------------------------------


def thrust_chain(x, cos=np.sqrt):
    """Choked flow and ideal thrust coefficient at constant properties (perfect-gas relations, as in any textbook)."""
    g = x["gamma"]
    flow = x["pressure"] * x["area"] / cos(x["gas_constant"] * x["temperature"])
    flow = flow * cos(g) * (2.0 / (g + 1.0)) ** ((g + 1.0) / (2.0 * (g - 1.0)))
    velocity = cos(2.0 * g / (g - 1.0) * x["gas_constant"] * x["temperature"] * (1.0 - 0.01 ** ((g - 1.0) / g)))
    return {"flow": flow, "thrust": flow * velocity, "velocity": velocity}


CHAIN = {
    "pressure": (7e6, Normal("1 %")),
    "area": (0.02, Normal("0.4 %")),
    "temperature": (3500.0, Normal("1.5 %")),
    "gas_constant": (370.0, Normal("0.5 %")),
    "gamma": (1.2, Normal("0.3 %")),
}


def test_first_order_agrees_with_the_uncertainties_package():
    found = first_order(thrust_chain, inputs_of(CHAIN))
    exact = {
        path: uncertainties.ufloat(nominal, entry.resolve(nominal, "").standard_uncertainty) for path, (nominal, entry) in CHAIN.items()
    }
    expected = thrust_chain(exact, umath.sqrt)
    for place, name in enumerate(found.results):
        assert found.nominal[place] == pytest.approx(expected[name].n, rel=1e-14)
        # fourth-order differences over one standard uncertainty: 1e-6 is far inside what they leave
        assert found.standard_uncertainty[place] == pytest.approx(expected[name].s, rel=1e-6)
        for column, path in enumerate(found.paths):
            part = expected[name].error_components().get(exact[path], 0.0)
            assert found.shares[place, column] == pytest.approx((part / expected[name].s) ** 2, abs=1e-6)
    correlation = uncertainties.correlation_matrix([expected[name] for name in found.results])
    deviations = found.standard_uncertainty
    np.testing.assert_allclose(found.covariance / np.outer(deviations, deviations), correlation, atol=1e-6)


def test_supplied_derivatives_are_used():
    inputs = inputs_of({"x": (2.0, Normal(0.1))})
    found = first_order(lambda v: {"y": v["x"] ** 2}, inputs, derivatives={"y": {"x": 40.0}})
    assert found.standard_uncertainty[0] == pytest.approx(4.0)


def test_differences_stay_inside_the_legal_range():
    seen = []

    def evaluate(v):
        seen.append(v["x"])
        return {"y": np.exp(v["x"])}

    for nominal in (1.0, 0.9999999, 0.95, 0.5):
        inputs = inputs_of({"x": (nominal, Normal(0.1))}, bounds={"x": (0.5, 1.0)})
        found = first_order(evaluate, inputs)
        assert found.derivatives[0, 0] == pytest.approx(math.exp(nominal), rel=1e-5)
        assert curvature(evaluate, inputs, found)[0, 0] == pytest.approx(0.05, rel=1e-2)
    assert min(map(np.min, seen)) >= 0.5
    assert max(map(np.max, seen)) <= 1.0


def test_curvature_names_where_first_order_is_doubtful():
    inputs = inputs_of({"x": (1.0, Normal(0.3)), "z": (0.0, Normal(0.3))})

    def evaluate(v):
        return {"y": v["x"] ** 2 + v["z"]}

    found = first_order(evaluate, inputs)
    assert found.bent(curvature(evaluate, inputs, found)) == (("y", "x"),)


def test_trials_and_first_order_agree_where_the_model_is_linear():
    inputs = inputs_of(
        {"a": (1.0, Normal(0.1)), "b": (2.0, Uniform(0.3)), "c": (3.0, Triangular(0.5)), "d": (0.0, Normal(0.2))},
        correlation={("a", "b"): 0.5, ("c", "d"): -0.3},
    )
    linear = first_order(total, inputs)
    found = monte_carlo(total, inputs, 200_000, seed=6, progress=False)
    # standard error of a deviation over n trials is about 1/sqrt(2 n) = 0.16 %; four of them
    assert found.standard_uncertainty[0] == pytest.approx(linear.standard_uncertainty[0], rel=6.4e-3)


def test_seed_reproduces_bit_for_bit():
    one = monte_carlo(mass, MASS, 12_345, seed=9, progress=False)
    two = monte_carlo(mass, MASS, 12_345, seed=9, progress=False)
    other = monte_carlo(mass, MASS, 12_345, seed=10, progress=False)
    assert np.array_equal(one.values, two.values)
    assert not np.array_equal(one.values, other.values)
    assert one.samples == one.valid == 12_345


def test_illegal_draws_refuse_the_run_or_are_counted():
    inputs = inputs_of({"x": (0.98, Normal(0.01))}, bounds={"x": (0.5, 1.0)})
    called = []

    def evaluate(v):
        called.append(v)
        return {"y": np.sqrt(1.0 - v["x"])}

    with pytest.raises(InputError, match=r"`x` reaches illegal values: 2.3 % of its distribution, \d+ trials") as caught:
        monte_carlo(evaluate, inputs, 5000, seed=1, progress=False)
    assert len(called) == 1  # the nominal values alone
    count = caught.value.data["reach"][0].count
    found = monte_carlo(evaluate, inputs, 5000, seed=1, illegal="leave out", progress=False)
    assert found.samples - found.valid == count > 50
    assert any(f"{count} trials with illegal inputs are left out" in note for note in found.notes)


def test_trials_without_solution_are_counted_and_most_of_them_refused():
    def root(shift):
        def evaluate(v):
            with np.errstate(invalid="ignore"):
                return {"y": np.sqrt(v["x"] - shift)}

        return evaluate

    inputs = inputs_of({"x": (1.0, Normal(1.0))})
    found = monte_carlo(root(0.0), inputs, 4000, seed=1, progress=False)
    assert found.valid == np.isfinite(found.values[0]).sum() < 4000
    assert any("have no solution" in note for note in found.notes)
    with pytest.raises(ConvergenceError, match="have a solution"):
        monte_carlo(root(2.0), inputs, 4000, seed=1, progress=False)
    with pytest.raises(InputError, match="y cannot be computed"):
        first_order(root(0.5), inputs)


@pytest.mark.parametrize("samples", [None, 10, True, 1e4, "many"])
def test_number_of_trials_is_checked(samples):
    with pytest.raises(InputError, match="samples"):
        monte_carlo(mass, MASS, samples, seed=1)


def test_interruption_gives_a_partial_result_that_says_so():
    done = []

    def evaluate(v):
        done.append(len(v["mass"]))
        return mass(v)

    found = monte_carlo(evaluate, MASS, 50_000, seed=1, progress=False, should_stop=lambda: sum(done) > 12_000)
    assert found.interrupted
    assert 2500 <= found.samples < 50_000
    assert any("partial result" in note for note in found.notes)
    whole = monte_carlo(mass, MASS, 50_000, seed=1, progress=False)
    assert np.array_equal(found.values, whole.values[:, : found.samples])
