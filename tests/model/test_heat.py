"""Heat flux: Bartz evaluated by hand at the throat, the integral, the coolant, and what is refused."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest

import propkit as pk


@pytest.fixture(scope="module")
def nozzle(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa", contraction_ratio=3, characteristic_length="1 m", cstar_efficiency=0.98)
    return pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m", contour=pk.Bell(length=0.8))


@pytest.fixture(scope="module")
def heat(nozzle):
    return nozzle.heat_flux(wall_temperature="800 K", coolant="fuel", coolant_limit="900 K")


def test_the_throat_by_hand(nozzle, heat):
    """Bartz (1957), h = 0.026/D^0.2 (mu^0.2 cp/Pr^0.6)(p0/c*)^0.8 (D/R)^0.1 sigma, with mu and Pr of Cantera as the sheet shows them."""
    mu, pr = heat.si("viscosity"), heat.si("prandtl_number")
    rest, throat = nozzle.chamber.held.stagnation, nozzle.throat
    t0 = float(rest.temperature[0])
    row = heat.frame.iloc[int(heat.frame["r"].idxmin())]
    assert row["area_ratio"] == pytest.approx(1.0, rel=1e-12)
    gamma = throat.si("isentropic_exponent")
    heating = 1.0 + 0.5 * (gamma - 1.0)
    sigma = (0.5 * 800.0 / t0 * heating + 0.5) ** -0.68 * heating**-0.12
    arc = 0.09 * 0.5 * (1.5 + 0.382)
    cp = float(rest.frozen_specific_heat[0])
    cstar = nozzle.si("characteristic_velocity")
    h = 0.026 / 0.18**0.2 * mu**0.2 * cp / pr**0.6 * (float(rest.pressure[0]) / cstar) ** 0.8 * (0.18 / arc) ** 0.1 * sigma
    recovered = throat.si("temperature") + pr ** (1.0 / 3.0) * (t0 - throat.si("temperature"))
    assert row["adiabatic_wall_temperature"] == pytest.approx(recovered, rel=1e-9)
    assert row["coefficient"] == pytest.approx(h, rel=2e-3)
    assert row["heat_flux"] == pytest.approx(row["coefficient"] * (recovered - 800.0), rel=1e-9)


def test_the_peak_lies_at_the_throat_and_the_flux_is_of_known_size(heat):
    """Tens of MW/m2 for a chamber of some 10 MPa with methane: common practice, no source."""
    assert abs(heat.si("peak_position")) < 0.01
    assert 30e6 < heat.si("peak_heat_flux") < 120e6
    assert heat.si("peak_heat_flux_equilibrium") > 1.5 * heat.si("peak_heat_flux")


def test_the_load_is_the_integral_of_the_table(nozzle, heat):
    table = heat.frame
    ds = np.hypot(np.diff(table["x"]), np.diff(table["r"]))
    ring = 2.0 * math.pi * (table["heat_flux"] * table["r"]).to_numpy()
    assert heat.si("heat_load") == pytest.approx(float(np.sum(0.5 * (ring[1:] + ring[:-1]) * ds)), rel=2e-3)
    assert heat.si("mean_heat_flux") * nozzle.si("wetted_area") == pytest.approx(heat.si("heat_load"), rel=1e-12)
    assert 0.005 < heat.si("heat_share") < 0.1
    assert heat.heat_load.to("MW").magnitude == pytest.approx(1e-6 * heat.si("heat_load"))


def test_the_coolant_takes_up_the_load(nozzle, heat):
    """Energy balance with CoolProp's enthalpies: a general library."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    flow = nozzle.si("mass_flow") / 4.4
    assert heat.si("coolant_mass_flow") == pytest.approx(flow, rel=1e-12)
    start = heat.si("coolant_temperature") - heat.si("coolant_temperature_rise")
    ends = [coolprop.PropsSI("H", "T", t, "P", heat.si("coolant_pressure"), "Methane") for t in (start, heat.si("coolant_temperature"))]
    assert flow * (ends[1] - ends[0]) == pytest.approx(heat.si("heat_load"), rel=1e-6)
    assert not [doubt for doubt in heat.doubts if "limit" in doubt]
    tight = nozzle.heat_flux(wall_temperature=800, coolant="fuel", coolant_limit="200 K")
    assert any("cannot take up the load" in doubt for doubt in tight.doubts)


def test_what_is_left_out_is_said(nozzle, heat):
    text = str(heat)
    for word in ("radiation", "film", "20 to 30 %"):
        assert word in text
    wide = nozzle.replace({"chamber.contraction_ratio": None, "chamber.characteristic_length": None})
    assert any("starts at the throat" in doubt for doubt in wide.heat_flux("800 K").doubts)
    with pytest.raises(pk.NotAvailableError, match="no coolant was named"):
        _ = wide.heat_flux("800 K").coolant_temperature_rise


def test_it_shows_itself_and_survives_a_pickle(heat):
    assert {"text/plain", "text/html"} <= set(heat._repr_mimebundle_())
    (figure,) = heat.figures()
    assert max(figure.layers[0].y.values) == pytest.approx(1e-6 * heat.si("peak_heat_flux"))
    assert pickle.loads(pickle.dumps(heat)).si("heat_load") == heat.si("heat_load")
    assert heat.report(units="US").headline[0].unit == "Btu/(inch**2*s)"


def test_a_hotter_wall_takes_less(nozzle, heat):
    assert nozzle.heat_flux("1200 K").si("heat_load") < heat.si("heat_load")


def test_bad_questions_are_refused_in_words(nozzle):
    with pytest.raises(pk.InputError, match="adiabatic wall temperature"):
        nozzle.heat_flux("3600 K")
    with pytest.raises(pk.InputError, match="20 K to 6000 K"):
        nozzle.heat_flux("5 K")
    with pytest.raises(pk.InputError, match="'oxidizer' or 'fuel'"):
        nozzle.heat_flux("800 K", coolant="water")
    with pytest.raises(pk.NotAvailableError, match="contour"):
        nozzle.replace(contour=None).heat_flux("800 K")


def test_a_gas_without_transport_data_has_no_heat_flux():
    case = pk.PropellantCase("LF2", "LH2", mixture_ratio=8)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="5 MPa"), area_ratio=20, throat_diameter="0.1 m", contour=pk.Cone("15 deg"))
    with pytest.raises(pk.NotAvailableError, match="transport data"):
        nozzle.heat_flux("800 K")


def test_a_gas_given_outright_takes_the_estimates_of_bartz():
    chamber = pk.Chamber.from_gas(pressure="7 MPa", temperature=3500, molar_mass="22 g/mol", isentropic_exponent=1.2)
    nozzle = pk.Nozzle(chamber, area_ratio=10, throat_diameter="0.1 m", contour=pk.Cone("15 deg"))
    heat = nozzle.heat_flux("800 K")
    assert heat.si("prandtl_number") == pytest.approx(4.0 * 1.2 / (9.0 * 1.2 - 5.0), rel=1e-12)
    assert any("estimates" in doubt for doubt in heat.doubts)


@pytest.fixture(scope="module")
def watered() -> pk.Nozzle:
    case = pk.PropellantCase("LOX", "ethanol-75", mixture_ratio=1.3)
    chamber = pk.Chamber(case, pressure="2 MPa", contraction_ratio=4, characteristic_length="1 m")
    return pk.Nozzle(chamber, area_ratio=8, throat_diameter="60 mm", contour=pk.Bell())


def test_a_blend_cools_by_what_its_ingredients_take_up(watered):
    # mass-weighted enthalpies of ethanol and water by CoolProp's high-level interface, without heat of mixing
    props = pytest.importorskip("CoolProp.CoolProp").PropsSI
    found = watered.heat_flux(wall_temperature="2000 K", coolant="fuel", coolant_pressure="30 bar", coolant_limit="320 K")
    ends = (298.15, found.si("coolant_temperature"))
    taken = sum(
        share * (props("H", "T", ends[1], "P", 3e6, fluid) - props("H", "T", ends[0], "P", 3e6, fluid))
        for fluid, share in (("Ethanol", 0.75), ("Water", 0.25))
    )
    assert taken == pytest.approx(found.si("heat_load") / found.si("coolant_mass_flow"), rel=1e-3)
    assert any("reaches its limit at 320 K" in text for text in found.warnings)
    boiling = min(props("T", "P", 3e6, "Q", 0, fluid) for fluid in ("Ethanol", "Water"))
    hot = watered.heat_flux(wall_temperature="600 K", coolant="fuel", coolant_pressure="30 bar")
    assert any(f"boils at {boiling:.5g} K" in text for text in hot.warnings)


def test_every_problem_of_a_heat_flux_is_listed_and_no_argument_is_ignored(watered):
    with pytest.raises(pk.InputError) as caught:
        watered.heat_flux(wall_temperature="x", coolant="water", coolant_pressure="-3 Pa", coolant_limit="1 kg")
    assert {problem.name for problem in caught.value.problems} == {
        "wall_temperature", "coolant", "coolant_pressure", "coolant_limit",
    }  # fmt: skip
    with pytest.raises(pk.InputError, match="left out without a coolant"):
        watered.heat_flux(wall_temperature="600 K", coolant_pressure="3 MPa")


def test_additives_are_no_part_of_the_coolant_flow():
    case = pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.4, additives={"water": 0.1})
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="4 MPa"), area_ratio=8, throat_diameter="0.1 m", contour=pk.Bell())
    found = nozzle.heat_flux(wall_temperature="800 K", coolant="fuel", coolant_limit="700 K")
    assert found.si("coolant_mass_flow") == pytest.approx(pk.Performance(nozzle, ambient="vacuum").si("fuel_mass_flow"))
