"""`pk.Reconciliation` on the objects: contract, hand-worked cases, statistics over seeds, refusals."""

import math
import pickle

import numpy as np
import pytest

import propkit as pk
from propkit.errors import InputError
from propkit.model import paths
from propkit.quantities import quantity
from propkit.reconcile.figures import printed_uncertainty, read_figure
from propkit.reconcile.model import default_free, figure_key

G0 = 9.80665
GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3400 K", molar_mass="22 g/mol", isentropic_exponent=1.2, cstar_efficiency=0.97)
PERF = pk.Performance(pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.2 m"), ambient="sea level")
CASE = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.6)
ENGINE = pk.Performance(
    pk.Nozzle(pk.Chamber(CASE, pressure="7 MPa", cstar_efficiency=0.97), area_ratio=20, throat_diameter="0.2 m"),
    ambient="sea level",
)

RELATIVE = {
    "chamber.pressure": 0.01,
    "throat_diameter": 0.003,
    "exit_diameter": 0.003,
    "mass_flow": 0.01,
    "thrust": 0.013,
    "thrust_vacuum": 0.01,
    "specific_impulse": 0.01,
    "specific_impulse_vacuum": 0.006,
}
FREE = {
    "chamber.pressure": None,
    "throat_diameter": None,
    "area_ratio": None,
    "cstar_efficiency": (0.97, 0.015),
}
TRUTH = {name: paths.value_of(PERF, name) for name in RELATIVE}


def figures_of(seed, shifted="", size=0.0):
    rng = np.random.default_rng(seed)
    made = {}
    for name, u in RELATIVE.items():
        error = u * (rng.standard_normal() + (size if name == shifted else 0.0))
        made[name] = (TRUTH[name] * (1.0 + error), u * TRUTH[name])
    efficiency = min(0.97 + 0.015 * rng.standard_normal(), 1.0)
    return made, {**FREE, "cstar_efficiency": (efficiency, 0.015)}


def test_contract():
    figures, free = figures_of(1)
    fit = pk.Reconciliation(PERF, figures, free=free)
    assert list(fit.adjusted.index) == [*RELATIVE, "prior of chamber.cstar_efficiency"]
    assert list(fit.adjusted.columns[:2]) == ["value", "standard_uncertainty"]
    assert {"residual", "normalised", "redundancy", "checkable"} == set(fit.residuals.columns)
    assert 0.0 <= fit.p_value <= 1.0
    assert fit.adjusted.attrs["units"]["thrust"] == "N"
    assert (fit.adjusted["standard_uncertainty"] <= fit.adjusted["given_uncertainty"] * (1.0 + 1e-9)).all()
    assert fit.residuals["redundancy"].sum() == pytest.approx(fit.degrees_of_freedom, rel=1e-6)
    # the adjusted set is consistent: the chain at the adjusted inputs has the adjusted figures
    for name in RELATIVE:
        assert paths.value_of(fit.reconciled, name) == pytest.approx(fit.adjusted.loc[name, "value"], rel=1e-9)


def test_two_figures_by_hand():
    # thrust is proportional to mass flow when only the throat may move: k = F/m of the chain. With relative
    # uncertainties a and b in log terms the best flow is close to the weighted mean of m and F/k
    k = PERF.si("thrust") / PERF.si("mass_flow")
    flow, force = 80.0, 81.0 * k
    fit = pk.Reconciliation(PERF, {"thrust": (force, 0.01 * force), "mass_flow": (flow, 1.6)})
    assert fit.free == ("nozzle.throat_diameter",)
    weights = np.array([1.0 / (0.01 * 81.0) ** 2, 1.0 / 1.6**2])
    best = float(weights @ [81.0, 80.0] / weights.sum())
    assert fit.adjusted.loc["mass_flow", "value"] == pytest.approx(best, rel=1e-9)
    assert fit.adjusted.loc["mass_flow", "standard_uncertainty"] == pytest.approx(1.0 / math.sqrt(weights.sum()), rel=1e-6)
    assert fit.chi_square == pytest.approx(1.0 / (0.81**2 + 1.6**2), rel=1e-6)
    assert fit.degrees_of_freedom == 1


def test_outlier_is_named_and_striking_it_restores_consistency():
    figures, free = figures_of(3, "mass_flow", 8.0)
    fit = pk.Reconciliation(PERF, figures, free=free)
    assert fit.p_value < 0.05
    assert fit.suspects[0] == "mass_flow"
    assert fit.strikes.index[0] == "mass_flow"
    assert fit.strikes["restores"].iloc[0]
    assert fit.struck("mass_flow").p_value == pytest.approx(fit.strikes["p_value"].iloc[0], rel=1e-6)
    assert any(doubt.code == "inconsistent" for doubt in fit.warnings)
    clean = pk.Reconciliation(PERF, *figures_of(3))
    assert clean.p_value >= 0.05
    assert clean.suspects == ()


def check_coverage(seeds, low, high):
    inside = dict.fromkeys(RELATIVE, 0)
    for seed in range(seeds):
        figures, free = figures_of(seed)
        frame = pk.Reconciliation(PERF, figures, free=free).adjusted
        for name in RELATIVE:
            row = frame.loc[name]
            inside[name] += abs(row["value"] - TRUTH[name]) <= 1.959964 * row["standard_uncertainty"]
    assert all(low * seeds <= count <= high * seeds for count in inside.values()), inside


def test_intervals_cover_the_truth():
    # 95 % of 50 within three binomial standard deviations
    check_coverage(50, 0.86, 1.0)


@pytest.mark.full
def test_intervals_cover_the_truth_in_500_seeds():
    check_coverage(500, 0.92, 0.98)


def check_named_first(seeds, share):
    first, redundancy = 0, math.inf
    for seed in range(seeds):
        fit = pk.Reconciliation(PERF, *figures_of(seed, "thrust", 6.0))
        redundancy = min(redundancy, fit.residuals.loc["thrust", "redundancy"])
        first += fit.suspects[:1] == ("thrust",)
    assert redundancy >= 0.7
    assert first >= share * seeds, first / seeds


def test_six_sigma_error_is_named_first():
    check_named_first(50, 0.92)


@pytest.mark.full
def test_six_sigma_error_is_named_first_in_500_seeds():
    check_named_first(500, 0.95)


def test_default_freedom():
    def free(*names):
        return default_free(PERF, [figure_key(PERF, name) for name in names])

    assert free("thrust", "mass_flow") == ("nozzle.throat_diameter",)
    assert free("throat_diameter", "exit_diameter") == ("nozzle.throat_diameter", "nozzle.area_ratio")
    assert free("chamber.pressure", "area_ratio") == ("chamber.pressure", "nozzle.area_ratio")
    assert free("cstar_efficiency", "specific_impulse") == ()
    assert free("propellant_mass", "mass_flow") == ("nozzle.throat_diameter", "burn_time")
    with pytest.raises(InputError, match="list what may move"):
        pk.Reconciliation(PERF, {"specific_impulse": ("280 s", "1 %")})


def test_routes_against_hand_values():
    fit = pk.Reconciliation(
        ENGINE,
        {
            "thrust": ("360 kN", "1 %"),
            "specific_impulse": ("285 s", "0.5 %"),
            "mass_flow": ("130 kg/s", "1 %"),
            "chamber.pressure": ("7.1 MPa", "1 %"),
            "throat_diameter": ("0.201 m", "0.2 %"),
            "oxidizer_mass_flow": ("93 kg/s", "1 %"),
            "fuel_mass_flow": ("36 kg/s", "1 %"),
            "propellant_mass": ("13 t", "0.5 %"),
            "burn_time": ("100 s", "0.2 %"),
        },
    )
    table = fit.routes("mass_flow")
    assert table.loc["as quoted", "value"] == 130.0
    row = table.loc["thrust over specific impulse"]
    assert row["value"] == pytest.approx(360e3 / (285.0 * G0), rel=1e-12)
    assert row["standard_uncertainty"] / row["value"] == pytest.approx(math.hypot(0.01, 0.005), rel=1e-8)
    assert table.loc["oxidizer and fuel flow", "standard_uncertainty"] == pytest.approx(math.hypot(0.93, 0.36), rel=1e-8)
    row = table.loc["propellant mass over burn time"]
    assert row["value"] == pytest.approx(130.0)
    assert row["standard_uncertainty"] / row["value"] == pytest.approx(math.hypot(0.005, 0.002), rel=1e-8)
    row = table.loc["chamber pressure, throat and c* of the model"]
    cstar = ENGINE.nozzle.si("characteristic_velocity")
    assert row["value"] == pytest.approx(7.1e6 * math.pi / 4.0 * 0.201**2 / cstar, rel=1e-12)
    assert row["standard_uncertainty"] / row["value"] == pytest.approx(math.hypot(0.01, 0.004), rel=1e-8)
    assert "burn_time" in fit.free
    diameters = fit.routes("throat_diameter")
    assert diameters.loc["as quoted", "value"] == pytest.approx(0.201, rel=1e-12)
    assert diameters.loc["as quoted", "standard_uncertainty"] == pytest.approx(0.201 * 0.002, rel=1e-8)
    with pytest.raises(InputError, match="Did you mean mass_flow"):
        fit.routes("massflow")
    assert len(fit.drawing("mass_flow").layers) == 2 * len(table)


def test_dumped_turbine_flow_ties_engine_and_chamber_figures():
    share, dump = 0.04, 120.0
    flow = ENGINE.si("mass_flow") / (1.0 - share)
    force = ENGINE.si("thrust") + share * flow * G0 * dump
    figures = {
        "thrust": (force, 0.01 * force),
        "mass_flow": (flow, 0.01 * flow),
        "specific_impulse": (force / flow / G0, "0.5 %"),
        "oxidizer_mass_flow": (ENGINE.si("oxidizer_mass_flow"), "1 %"),
    }
    fit = pk.Reconciliation(ENGINE, figures, dump_flow_fraction=share, dump_specific_impulse="120 s")
    # figures computed from the equations above are consistent exactly
    assert fit.chi_square == pytest.approx(0.0, abs=1e-9)
    assert list(fit.adjusted["level"]) == ["engine", "engine", "engine", "chamber"]
    quoted = fit.routes("mass_flow").loc["as quoted", "value"]
    assert quoted == pytest.approx(ENGINE.si("mass_flow"), rel=1e-9)
    moved = pk.Reconciliation(ENGINE, figures, dump_flow_fraction=(share, 0.01), dump_specific_impulse=(dump, "10 %"))
    assert "dump_flow_fraction" in moved.free
    assert moved.adjusted.loc["prior of dump_flow_fraction", "value"] == pytest.approx(share, rel=1e-6)
    mixed = pk.Reconciliation(
        ENGINE,
        {**figures, "mass_flow": (ENGINE.si("mass_flow"), "1 %", "chamber")},
        dump_flow_fraction=share,
        dump_specific_impulse="120 s",
    )
    assert mixed.chi_square == pytest.approx(0.0, abs=1e-9)


def test_thrust_coefficient_efficiency_can_be_freed_with_a_prior():
    figures = {name: (0.96 * TRUTH[name], "0.2 %") for name in ("thrust_vacuum", "specific_impulse_vacuum")}
    figures |= {
        "mass_flow": (TRUTH["mass_flow"], "0.2 %"),
        "throat_diameter": (0.2, "0.1 %"),
        "chamber.pressure": (7e6, "0.2 %"),
    }
    fit = pk.Reconciliation(
        PERF,
        figures,
        free={"chamber.pressure": None, "throat_diameter": None, "thrust_coefficient_efficiency": (0.98, 0.02)},
    )
    assert fit.unknowns.loc["thrust_coefficient_efficiency", "value"] == pytest.approx(0.96, abs=0.002)
    assert fit.p_value > 0.05


def test_sea_level_and_vacuum_figures_whatever_the_ambient():
    vacuum = PERF.replace(ambient="vacuum")
    fit = pk.Reconciliation(
        vacuum,
        {
            "thrust_sea_level": (TRUTH["thrust"], "1 %"),
            "specific_impulse_sea_level": (TRUTH["specific_impulse"], "1 %"),
            "thrust": (TRUTH["thrust_vacuum"], "1 %"),
        },
    )
    assert fit.chi_square == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize(
    ("text", "unit", "expected"),
    [
        ("812 kN", "N", 500.0),
        ("9.70 MPa", "Pa", 5e3),
        ("3.4", "", 0.05),
        ("1.2e3 kg", "kg", 50.0),
        ("35", "", 0.5),
        ("20.0 °C", "K", 0.05),
    ],
)
def test_uncertainty_inferred_from_printed_digits(text, unit, expected):
    # half a unit of the last digit, uniform: over the square root of three (GUM 4.3.7)
    assert printed_uncertainty(text, unit) == pytest.approx(expected / math.sqrt(3.0), rel=1e-9)


def test_inferred_uncertainties_are_marked():
    fit = pk.Reconciliation(PERF, {"thrust": "270 kN", "mass_flow": ("97 kg/s", "1 %"), "throat_diameter": "0.20 m"})
    assert fit.adjusted["inferred"].tolist() == [True, False, True]
    assert any(doubt.code == "inferred" for doubt in fit.warnings)
    row = quantity("thrust")
    figure = read_figure("thrust", "thrust", ("812 kN", pk.Normal("2 %", k=2)), row, "chamber")
    assert figure.uncertainty == pytest.approx(8120.0)
    assert read_figure("thrust", "thrust", ("812 kN", "engine"), row, "chamber").level == "engine"


def test_sheet_pickle_and_immutability():
    figures, free = figures_of(3, "mass_flow", 8.0)
    fit = pk.Reconciliation(PERF, figures, free=free, name="Data sheet of the test")
    text = str(fit)
    for word in (
        "Data sheet of the test",
        "Routes to the mass flow",
        "redundancy",
        "suspect",
        "If one figure is struck out",
    ):
        assert word in text
    assert fit._repr_mimebundle_()["text/html"]
    again = pickle.loads(pickle.dumps(fit))
    assert again.adjusted.equals(fit.adjusted)
    with pytest.raises(AttributeError):
        fit.free = ()


def test_every_bad_figure_is_named_at_once():
    with pytest.raises(InputError) as caught:
        pk.Reconciliation(
            PERF,
            {
                "thurst": ("812 kN", "1 %"),
                "mass_flow": 80.0,
                "throat_diameter": ("20 kg", "1 %"),
                "thrust": ("812 kN", "1 %", "stage"),
                "specific_impulse": ("280 s", "1 %", "engine"),
            },
        )
    assert len(caught.value.problems) == 5
    text = str(caught.value)
    for word in ("thurst", "printed digits", "length", "'chamber' or 'engine'", "dump_flow_fraction"):
        assert word in text


def test_figures_that_cannot_all_be_true():
    # delivered c* at a given pressure, throat and flow above the theoretical one: the efficiency would have to exceed 1
    figures = {
        "chamber.pressure": ("7 MPa", "0.5 %"),
        "throat_diameter": ("0.2 m", "0.1 %"),
        "mass_flow": (0.8 * TRUTH["mass_flow"], "0.5 %"),
    }
    with pytest.raises(InputError, match=r"cannot all be true.*cstar_efficiency beyond its limit 1.*mass_flow"):
        pk.Reconciliation(PERF, figures, free=["chamber.pressure", "throat_diameter", "cstar_efficiency"])


def test_other_refusals():
    with pytest.raises(InputError, match="2 figures cannot determine 3 unknowns"):
        pk.Reconciliation(
            PERF,
            {"thrust": ("270 kN", "1 %"), "mass_flow": ("97 kg/s", "1 %")},
            free=["chamber.pressure", "throat_diameter", "area_ratio"],
        )
    with pytest.raises(InputError, match="apart"):
        pk.Reconciliation(
            PERF,
            {"thrust_vacuum": ("270 kN", "1 %"), "mass_flow": ("97 kg/s", "1 %")},
            free=["chamber.pressure", "throat_diameter"],
        )
    with pytest.raises(InputError, match=r"pk\.Performance"):
        pk.Reconciliation(PERF.nozzle, {"thrust": ("270 kN", "1 %")})
    with pytest.raises(InputError, match="dump_specific_impulse"):
        pk.Reconciliation(PERF, {"thrust": ("270 kN", "1 %")}, dump_flow_fraction=0.03)
    with pytest.raises(InputError, match="free"):
        pk.Reconciliation(PERF, {"thrust": ("270 kN", "1 %")}, free=["chamber.presure"])
    with pytest.raises(InputError, match="given once"):
        pk.Reconciliation(PERF, {"thrust": ("270 kN", "1 %"), "performance.thrust": ("271 kN", "1 %")})


def test_held_mixture_ratio_is_said():
    fit = pk.Reconciliation(ENGINE, {"mixture_ratio": ("2.56", "1 %"), "mass_flow": ("130 kg/s", "1 %"), "thrust": ("375 kN", "1 %")})
    assert any(doubt.code == "held" for doubt in fit.warnings)
    free = pk.Reconciliation(
        ENGINE,
        {
            "mixture_ratio": ("2.56", "1 %"),
            "oxidizer_mass_flow": ("93 kg/s", "1 %"),
            "fuel_mass_flow": ("36 kg/s", "1 %"),
        },
        free=["mixture_ratio", "throat_diameter"],
    )
    expected = 1.0 / (1.0 / 0.01**2 + 1.0 / (2.0 * 0.01**2))
    logs = np.log([2.56, 93.0 / 36.0])
    best = math.exp(expected * (logs[0] / 0.01**2 + logs[1] / (2.0 * 0.01**2)))
    assert free.adjusted.loc["mixture_ratio", "value"] == pytest.approx(best, rel=2e-4)


def test_a_figure_that_nothing_free_moves_has_no_uncertainty_of_rounding():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=35, throat_diameter="0.18 m")
    perf = pk.Performance(nozzle, ambient="sea level")
    fit = pk.Reconciliation(
        perf, {"thrust": ("800 kN", "0.1 %"), "mass_flow": ("130 kg/s", "0.1 %"), "specific_impulse": ("290 s", "0.1 %")}
    )
    assert fit.adjusted.loc["specific_impulse", "standard_uncertainty"] == 0.0
    assert fit.residuals.loc["specific_impulse", "redundancy"] == 1.0
    sheet = str(fit)
    assert "297.75714" not in sheet
    assert "p below 1e-15" in sheet
    one = str(pk.Reconciliation(perf, {"thrust": ("380 kN", "1 %")}))
    assert "1 figure, free" in one
