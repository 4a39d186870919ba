"""Adjustment by hand, against scipy, and against the statistics that it must obey over many seeds."""

import math

import numpy as np
import pytest
from scipy import optimize, stats

from propkit.errors import InputError, RangeError
from propkit.reconcile.adjustment import Figure, Unknown, adjust


def balance(x):
    """Two flows that must make up a third: the smallest reconciliation there is."""
    return {"a": x["a"], "b": x["b"], "sum": x["a"] + x["b"]}


def test_by_hand():
    # a = 10 ± 1, b = 20 ± 1, sum = 33 ± 1: the gap of 3 is shared by the three equal variances, 1 each;
    # residual variance 1/3 of each, so redundancy 1/3, |w| = sqrt(3); chi-square 3 with one degree of freedom
    figures = [Figure("a", 10.0, 1.0), Figure("b", 20.0, 1.0), Figure("sum", 33.0, 1.0)]
    found = adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0)])
    np.testing.assert_allclose(found.adjusted, [11.0, 21.0, 32.0], rtol=1e-12)
    np.testing.assert_allclose(found.residual, [1.0, 1.0, -1.0], rtol=1e-10)
    np.testing.assert_allclose(found.redundancy, 1.0 / 3.0, rtol=1e-10)
    np.testing.assert_allclose(np.abs(found.normalised), math.sqrt(3.0), rtol=1e-10)
    np.testing.assert_allclose(found.adjusted_uncertainty, math.sqrt(2.0 / 3.0), rtol=1e-10)
    assert found.chi_square == pytest.approx(3.0, rel=1e-10)
    assert found.degrees_of_freedom == 1
    assert found.p_value == pytest.approx(stats.chi2.sf(3.0, 1), rel=1e-10)
    assert found.twins == (("a", "b", "sum"),)
    assert found.suspects == ()


RNG = np.random.default_rng(20)
DESIGN = RNG.standard_normal((7, 3))
NAMES = [f"f{place}" for place in range(7)]
SIGMA = np.array([0.5, 1.0, 2.0, 1.0, 0.3, 1.5, 0.8])


def linear(x):
    theta = np.array([x["p"], x["q"], x["r"]])
    return dict(zip(NAMES, DESIGN @ theta, strict=True))


THREE = [Unknown(path, 1.0) for path in "pqr"]


def linear_figures(values, sigma=SIGMA):
    return [Figure(name, value, u) for name, value, u in zip(NAMES, values, sigma, strict=True)]


def test_linear_case_against_scipy():
    given = DESIGN @ np.array([2.0, -1.0, 0.5]) + SIGMA * RNG.standard_normal(7)
    found = adjust(linear, linear_figures(given), THREE)
    expected = optimize.lsq_linear(DESIGN / SIGMA[:, None], given / SIGMA).x
    np.testing.assert_allclose(found.estimate, expected, rtol=1e-9)
    _, covariance = optimize.curve_fit(lambda x, *p: DESIGN @ np.array(p), None, given, p0=[1, 1, 1], sigma=SIGMA, absolute_sigma=True)
    np.testing.assert_allclose(found.estimate_covariance, covariance, rtol=1e-5)
    assert found.redundancy.sum() == pytest.approx(found.degrees_of_freedom, rel=1e-9)
    assert found.iterations <= 3


def test_correlated_figures_against_whitened_least_squares():
    given = DESIGN @ np.array([2.0, -1.0, 0.5]) + SIGMA * RNG.standard_normal(7)
    found = adjust(linear, linear_figures(given), THREE, correlation={("f0", "f4"): 0.8, ("f2", "f3"): -0.5})
    covariance = np.diag(SIGMA**2)
    for i, j, r in ((0, 4, 0.8), (2, 3, -0.5)):
        covariance[i, j] = covariance[j, i] = r * SIGMA[i] * SIGMA[j]
    weight = np.linalg.inv(covariance)
    expected = np.linalg.solve(DESIGN.T @ weight @ DESIGN, DESIGN.T @ weight @ given)
    np.testing.assert_allclose(found.estimate, expected, rtol=1e-9)
    np.testing.assert_allclose(found.estimate_covariance, np.linalg.inv(DESIGN.T @ weight @ DESIGN), rtol=1e-8)


def engine(x):
    """Choked flow of a perfect gas (textbook relation) with the figures that a data sheet quotes."""
    flow = x["pressure"] * math.pi / 4.0 * x["throat"] ** 2 / (x["efficiency"] * 1800.0)
    isp = x["efficiency"] * x["coefficient"] * 1800.0 / 9.80665
    return {
        "pressure": x["pressure"],
        "throat": x["throat"],
        "flow": flow,
        "isp": isp,
        "thrust": flow * isp * 9.80665,
        "oxidizer": flow * 0.72,
        "fuel": flow * 0.28,
        "efficiency": x["efficiency"],
    }


TRUTH = {"pressure": 7e6, "throat": 0.2, "efficiency": 0.97, "coefficient": 1.7}
RELATIVE = {
    "pressure": 0.01,
    "throat": 0.003,
    "flow": 0.01,
    "isp": 0.005,
    "thrust": 0.01,
    "oxidizer": 0.01,
    "fuel": 0.015,
    "efficiency": 0.01,
}
TRUE = {name: float(value) for name, value in engine({key: np.float64(value) for key, value in TRUTH.items()}).items()}
FREE = [
    Unknown("pressure", 6e6, 1e5, 1e8),
    Unknown("throat", 0.18, 1e-3, 10.0),
    Unknown("efficiency", 0.95, 0.5, 1.2),
    Unknown("coefficient", 1.6, 0.5, 3.0),
]


def engine_figures(rng, shifted=None, size=0.0):
    figures = []
    for name, u in RELATIVE.items():
        value = TRUE[name] * (1.0 + u * (rng.standard_normal() + (size if name == shifted else 0.0)))
        figures.append(Figure(name, value, u * TRUE[name], prior=name == "efficiency"))
    return figures


def test_nonlinear_case_against_scipy():
    figures = engine_figures(np.random.default_rng(1))
    found = adjust(engine, figures, FREE)
    scale = np.array([1e6, 0.1, 1.0, 1.0])

    def misfit(p):
        results = engine(dict(zip(TRUTH, p * scale, strict=True)))
        return np.array([(results[figure.name] - figure.value) / figure.uncertainty for figure in figures])

    expected = optimize.least_squares(misfit, [6.0, 1.8, 0.95, 1.6], xtol=1e-15, ftol=1e-15, gtol=1e-15)
    np.testing.assert_allclose(found.estimate, expected.x * scale, rtol=1e-8)
    assert found.chi_square == pytest.approx(2.0 * expected.cost, rel=1e-8)
    covariance = np.linalg.inv(expected.jac.T @ expected.jac) * np.outer(scale, scale)
    np.testing.assert_allclose(found.estimate_covariance, covariance, rtol=1e-4)
    assert found.redundancy.sum() == pytest.approx(found.degrees_of_freedom, rel=1e-7)


def test_supplied_jacobian_gives_the_same():
    given = DESIGN @ np.array([2.0, -1.0, 0.5]) + SIGMA * RNG.standard_normal(7)
    known = {name: dict(zip("pqr", row, strict=True)) for name, row in zip(NAMES, DESIGN, strict=True)}
    one = adjust(linear, linear_figures(given), THREE)
    two = adjust(linear, linear_figures(given), THREE, jacobian=lambda point: known)
    np.testing.assert_allclose(one.estimate, two.estimate, rtol=1e-9)


OUT = "flow"


def outlier_rates(seeds, size):
    """Return how often a shifted figure of redundancy 0.7 or more is named first, and how often it is detected."""
    named = detected = 0
    power = 0.0
    for seed in range(seeds):
        found = adjust(engine, engine_figures(np.random.default_rng(seed), OUT, size), FREE)
        assert not found.on_bound
        place = found.names.index(OUT)
        assert found.redundancy[place] >= 0.7
        detected += not found.consistent
        named += found.suspects[:1] == (OUT,)
        noncentral = size**2 * found.redundancy[place]
        power += stats.ncx2.sf(stats.chi2.ppf(0.95, found.degrees_of_freedom), found.degrees_of_freedom, noncentral)
    return named / seeds, detected / seeds, power / seeds


# a design in which every figure has a redundancy of 0.7 or more: twelve readings of three unknowns
WIDE = np.random.default_rng(8).standard_normal((12, 3))
WIDE_NAMES = [f"w{place}" for place in range(12)]
HAT = WIDE @ np.linalg.inv(WIDE.T @ WIDE) @ WIDE.T
CHECKED = int(np.argmax(1.0 - np.diag(HAT)))


def wide(x):
    return dict(zip(WIDE_NAMES, WIDE @ np.array([x["p"], x["q"], x["r"]]), strict=True))


def run_wide(seed, size):
    rng = np.random.default_rng(1000 + seed)
    values = WIDE @ np.array([3.0, 1.0, -2.0]) + rng.standard_normal(12)
    values[CHECKED] += size
    return adjust(wide, [Figure(name, value, 1.0) for name, value in zip(WIDE_NAMES, values, strict=True)], THREE)


def check_outliers(seeds):
    redundancy = 1.0 - HAT[CHECKED, CHECKED]
    assert redundancy >= 0.7
    found = [run_wide(seed, 6.0) for seed in range(seeds)]
    first = sum(entry.suspects[:1] == (WIDE_NAMES[CHECKED],) for entry in found)
    assert first >= 0.95 * seeds
    assert found[0].redundancy[CHECKED] == pytest.approx(redundancy, rel=1e-9)
    # the struck figure restores consistency, and no other does as well
    assert sum(entry.strikes()[0].name == WIDE_NAMES[CHECKED] for entry in found[:10]) >= 9


def check_power(seeds):
    redundancy = 1.0 - HAT[CHECKED, CHECKED]
    for size in (0.0, 2.0, 3.0, 4.0):
        rate = sum(not run_wide(seed, size).consistent for seed in range(seeds)) / seeds
        power = stats.ncx2.sf(stats.chi2.ppf(0.95, 9), 9, size**2 * redundancy) if size else 0.05
        assert abs(rate - power) <= 3.0 * math.sqrt(power * (1.0 - power) / seeds)


def check_coverage(seeds, low, high):
    inside = np.zeros(len(RELATIVE))
    for seed in range(seeds):
        found = adjust(engine, engine_figures(np.random.default_rng(seed)), FREE)
        truth = np.array([TRUE[name] for name in found.names])
        inside += np.abs(found.adjusted - truth) <= 1.959964 * found.adjusted_uncertainty
    assert (inside >= low * seeds).all(), inside / seeds
    assert (inside <= high * seeds).all(), inside / seeds


def test_outlier_is_named_first():
    check_outliers(50)


def test_detection_agrees_with_the_power_of_the_test():
    check_power(50)


def test_intervals_cover_the_truth():
    # 50 seeds: 95 % within three binomial standard deviations is 86 % to 100 %
    check_coverage(50, 0.86, 1.0)


@pytest.mark.full
def test_outlier_is_named_first_in_500_seeds():
    check_outliers(500)


@pytest.mark.full
def test_detection_agrees_with_the_power_of_the_test_in_500_seeds():
    check_power(500)


@pytest.mark.full
def test_intervals_cover_the_truth_in_500_seeds():
    check_coverage(500, 0.92, 0.98)


def test_nonlinear_engine_names_its_outlier():
    named, detected, power = outlier_rates(50, 6.0)
    assert detected >= power - 3.0 * math.sqrt(power * (1.0 - power) / 50)
    assert named >= 0.92


def test_what_nothing_checks_is_not_blamed():
    # two readings of b, one of a: the reading of a is not checkable however wrong it is
    figures = [Figure("a", 1e3, 1.0), Figure("b", 20.0, 1.0), Figure("b again", 29.0, 1.0, result="b")]
    found = adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0)])
    assert found.redundancy[0] == pytest.approx(0.0, abs=1e-9)
    assert not found.checkable[0]
    assert math.isnan(found.normalised[0])
    assert set(found.suspects) == {"b", "b again"}
    assert found.twins == (("b", "b again"),)


def test_no_redundancy_is_no_contradiction():
    figures = [Figure("a", 10.0, 1.0), Figure("sum", 33.0, 1.0)]
    found = adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0)])
    assert found.degrees_of_freedom == 0
    assert math.isnan(found.p_value)
    assert found.consistent
    assert found.suspects == ()


def test_fewer_figures_than_unknowns():
    with pytest.raises(InputError, match="1 figure cannot determine 2 unknowns"):
        adjust(balance, [Figure("a", 10.0, 1.0)], [Unknown("a", 5.0), Unknown("b", 5.0)])


def test_unknowns_that_the_figures_do_not_tell_apart():
    figures = [Figure("sum", 30.0, 1.0), Figure("sum again", 31.0, 1.0, result="sum")]
    with pytest.raises(InputError, match="do not tell a and b apart"):
        adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0)])
    with pytest.raises(InputError, match="no figure depends on b"):
        adjust(balance, [Figure("a", 1.0, 1.0), Figure("a2", 1.0, 1.0, result="a")], [Unknown("a", 5.0), Unknown("b", 5.0)])


def test_figures_that_cannot_all_be_true_are_named():
    # vacuum impulse of an ideal nozzle at 110 % of what complete combustion gives
    figures = [
        Figure("isp", 1.10 * TRUE["isp"] / 0.97, 0.002 * TRUE["isp"]),
        Figure("coefficient", 1.7, 0.001),
        Figure("flow", TRUE["flow"], 0.01 * TRUE["flow"]),
        Figure("pressure", TRUE["pressure"], 0.001 * TRUE["pressure"]),
        Figure("throat", TRUE["throat"], 0.001 * TRUE["throat"]),
    ]
    bounded = [Unknown("efficiency", 0.98, 0.5, 1.0) if entry.path == "efficiency" else entry for entry in FREE]
    with pytest.raises(InputError, match=r"cannot all be true.*efficiency beyond its limit 1.*isp"):
        adjust(engine, figures, bounded)


def test_estimate_on_a_bound_says_so():
    figures = [Figure("a", 10.0, 1.0), Figure("b", 0.5, 1.0), Figure("sum", 9.0, 1.0)]
    found = adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0, 0.9, 100.0)])
    assert found.on_bound == ("b",)
    assert found.estimate[1] == 0.9
    # with b held at 0.9: a is the mean of 10 and 8.1
    assert found.estimate[0] == pytest.approx(9.05, rel=1e-9)


def test_model_without_solution_at_the_start():
    with pytest.raises(RangeError, match="no root"):
        adjust(lambda x: {"root": np.full_like(x["a"], np.nan)}, [Figure("root", 1.0, 1.0)], [Unknown("a", 1.0)])


def test_steps_that_leave_the_model_are_shortened():
    def model(x):
        with np.errstate(invalid="ignore"):
            return {"log": np.log(x["a"])}

    found = adjust(model, [Figure("log", -5.0, 0.1)], [Unknown("a", 50.0)])
    assert found.estimate[0] == pytest.approx(math.exp(-5.0), rel=1e-6)


@pytest.mark.parametrize(
    ("figures", "word"),
    [
        ([Figure("a", 1.0, 0.0), Figure("b", math.nan, 1.0)], "above 0"),
        ([Figure("a", 1.0, 1.0), Figure("a", 2.0, 1.0)], "more than once"),
        ([Figure("a", 1.0, 1.0), Figure("x", 2.0, 1.0)], "no result x"),
    ],
)
def test_bad_figures_are_refused(figures, word):
    with pytest.raises(InputError, match=word):
        adjust(balance, figures, [Unknown("a", 5.0), Unknown("b", 5.0)])


def test_bad_correlations_are_refused():
    figures = [Figure("a", 10.0, 1.0), Figure("b", 20.0, 1.0), Figure("sum", 33.0, 1.0)]
    unknowns = [Unknown("a", 5.0), Unknown("b", 5.0)]
    for correlation in ({("a", "x"): 0.1}, {("a", "b"): 1.0}, {("a", "b"): 0.9, ("b", "sum"): 0.9, ("a", "sum"): -0.9}):
        with pytest.raises(InputError, match="correlation"):
            adjust(balance, figures, unknowns, correlation=correlation)
