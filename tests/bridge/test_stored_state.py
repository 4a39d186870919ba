"""Stored states: enthalpy change, density, phase and warnings."""

import contextlib
import itertools
import subprocess
import sys
from dataclasses import replace

import pytest

from propkit.bridge.stored_state import stored_state, vapour_pressure_estimate
from propkit.data.propellants import library
from propkit.errors import InputError, MissingExtraError, RangeError

ROWS = library()
FLUIDS = [name for name, row in ROWS.items() if row.coolprop_fluid]


def state(name, temperature=None, pressure=None):
    row = ROWS[name]
    if row.coolprop_fluid or row.components:
        pytest.importorskip("CoolProp")
    return stored_state(row, temperature, pressure)


@pytest.mark.parametrize("name", list(ROWS))
def test_a_row_at_its_own_state_is_the_row(name):
    row = ROWS[name]
    same = stored_state(row)
    assert (same.enthalpy_change, same.density, same.phase, same.warnings) == (0.0, row.density, row.phase, ())
    assert stored_state(row, row.temperature).enthalpy_change == 0.0


@pytest.mark.parametrize("name", FLUIDS)
def test_the_change_is_continuous_at_the_row(name):
    row = ROWS[name]
    if row.phase == "gas":
        # ideal gas: the slope is the heat capacity, 2.5 R or more
        near = state(name, row.temperature + 0.1)
        assert 20.7 * 0.1 * 0.99 < near.enthalpy_change < 200 * 0.1
    else:
        near = state(name, row.temperature - 0.01, row.pressure * 1.001)
        assert abs(near.enthalpy_change) < 20.0
        assert near.density == pytest.approx(row.density, rel=2e-3)
    assert near.warnings == ()


@pytest.mark.parametrize(
    ("name", "temperature", "vaporisation"),
    [  # kJ/mol at the normal boiling point, handbook values from memory; 0.8 %: pressures either side of boiling
        ("LOX", 90.188, 6.82), ("LN2", 77.355, 5.57), ("LCH4", 111.667, 8.17), ("ammonia", 239.82, 23.33),
        ("propane", 231.04, 18.78), ("water", 373.12, 40.65), ("methanol", 337.63, 35.21),
    ],
)  # fmt: skip
def test_heat_of_vaporisation(name, temperature, vaporisation):
    liquid, vapour = state(name, temperature, 1.05e5), state(name, temperature, 0.98e5)
    assert vapour.phase == "gas"
    assert (vapour.enthalpy_change - liquid.enthalpy_change) / 1e3 == pytest.approx(vaporisation, rel=8e-3)
    assert "the heat of vaporisation is in the enthalpy" in vapour.warnings[0]


@pytest.mark.parametrize(
    ("liquid", "gas", "within"),
    [  # two rows of the library with independent values, joined by CoolProp [kJ/mol]
        ("LOX", "GOX", 0.04), ("LF2", None, 0.0), ("LCH4", "GCH4", 0.03), ("propane", "propane-gas", 0.07),
        ("propane", "propane-ambient", 0.08), ("ammonia", "ammonia-ambient", 0.02), ("N2O", "N2O-gas", 0.01),
        ("N2O-cold", "N2O", 0.01), ("butane", "butane-gas", 0.01), ("LH2-normal", "GH2", 0.01),
    ],
)  # fmt: skip
def test_rows_agree_through_stored_states(liquid, gas, within):
    if gas is None:
        warm = state(liquid, 298.15)
        assert (ROWS[liquid].molar_enthalpy + warm.enthalpy_change) / 1e3 == pytest.approx(0.0, abs=0.04)
        return
    target = ROWS[gas]
    pressure = 1.0 if target.phase == "gas" else target.pressure
    change = state(liquid, target.temperature, pressure).enthalpy_change
    assert (ROWS[liquid].molar_enthalpy + change) / 1e3 == pytest.approx(target.molar_enthalpy / 1e3, abs=within)


def test_para_hydrogen_stays_para():
    """Warmed without a catalyst it ends 0.058 kJ/mol below normal gas (see tests/data/test_assigned_enthalpies.py)."""
    warm = state("LH2", 298.15, 1.0)
    assert (ROWS["LH2"].molar_enthalpy + warm.enthalpy_change) / 1e3 == pytest.approx(-0.058, abs=0.04)


def test_heated_fuel_above_the_critical_point():
    """Methane from a cooling jacket: 300 K, 15 MPa. Denser than the ideal gas (96.5 kg/m3)."""
    hot = state("LCH4", 300.0, 15e6)
    assert hot.phase == "supercritical"
    assert "is supercritical, the library row is a liquid" in hot.warnings[0]
    assert 12.0e3 < hot.enthalpy_change < 14.7e3  # below the ideal gas, by the departure at high pressure
    assert hot.density > 15e6 * ROWS["LCH4"].molar_mass / (8.314462618 * 300.0)


def test_without_a_pressure_a_superheated_feed_is_an_ideal_gas_and_says_so():
    hot = state("LCH4", 300.0)
    assert hot.phase == "gas"
    assert "no pressure was given" in hot.warnings[0]
    assert "Give the pressure it is fed at" in hot.warnings[0]
    assert len(hot.warnings) == 1


def test_liquid_above_its_boiling_point_is_taken_as_saturated_and_says_so():
    warm = state("propane", 298.15)
    assert warm.phase == "liquid"
    assert warm.pressure == pytest.approx(9.52e5, rel=2e-3)
    assert "liquid only above 9.52 bar" in warm.warnings[0]
    assert state("propane", 298.15, 12e5).warnings == ()


def test_subcooled_liquid_needs_no_warning():
    dense = state("LOX", 66.0)
    assert dense.warnings == ()
    assert dense.density == pytest.approx(1255.0, abs=2.0)  # densified LOX at 66 K, common practice, no source
    assert dense.enthalpy_change < 0.0


def test_pressure_near_the_vapour_pressure_is_saturation():
    row = ROWS["propane-ambient"]
    assert state("propane-ambient", 298.15, row.pressure * 0.998).phase == "liquid"
    assert state("propane-ambient", 298.15, row.pressure * 0.98).phase == "gas"
    assert state("propane-gas", 298.15, row.pressure * 1.002).phase == "gas"


def test_gas_that_condenses_says_so():
    cold = state("GN2", 70.0)
    assert cold.phase == "liquid"
    assert "the heat of condensation is in the enthalpy" in cold.warnings[0]
    assert state("CO2", 290.0, 8e6).phase == "liquid"


def test_real_gas_at_pressure():
    """Joule-Thomson signs: oxygen at 200 bar lies below its ideal-gas enthalpy, helium above."""
    assert state("GOX", 298.15, 2e7).enthalpy_change < -1000.0
    assert state("GHe", 298.15, 2e7).enthalpy_change > 100.0
    assert state("GHe", 298.15, 2e7).warnings == ()


def test_below_freezing_is_refused_where_the_equation_of_state_ends():
    with pytest.raises(RangeError, match=r"LOX has no fluid state at 40 K .*below the freezing point, 54\.36 K") as caught:
        state("LOX", 40.0)
    assert caught.value.data["temperature"] == 40.0
    with pytest.raises(RangeError, match="no fluid state"):
        state("LOX", 5000.0, 1e5)


def test_unknown_fluid_of_a_user_row_is_named():
    pytest.importorskip("CoolProp")
    row = replace(ROWS["LOX"], coolprop_fluid="Oxygyn")
    with pytest.raises(InputError, match="a fluid that CoolProp knows"):
        stored_state(row, 80.0)


def test_missing_extra_names_the_install_line(monkeypatch):
    monkeypatch.setitem(sys.modules, "CoolProp.CoolProp", None)
    with pytest.raises(MissingExtraError, match=r"pip install 'propkit\[fluids\]'"):
        stored_state(ROWS["LOX"], 80.0)
    # what needs no CoolProp still works
    assert stored_state(ROWS["LOX"]).enthalpy_change == 0.0
    assert stored_state(ROWS["RP-1"], 320.0).enthalpy_change > 0.0


def test_coolprop_is_imported_on_first_use_only():
    code = "import sys, propkit.bridge.stored_state; print('CoolProp' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


# ---- a specific heat ------------------------------------------------------------------------------------------------


def test_specific_heat_gives_the_enthalpy():
    """Hydrazine warmed by 40 K takes 40 K times 98.9 J/(mol K), its heat capacity (CRC Handbook, via chemicals)."""
    warm = state("hydrazine", 338.15)
    assert warm.enthalpy_change == pytest.approx(40.0 * 98.9, rel=2e-4)
    assert warm.warnings == ()
    assert "98.9" not in warm.source
    assert "CRC" in warm.source


def test_specific_heat_out_of_range_warns():
    assert "outside the range of its specific heat, 230 to 370 K" in state("RP-1", 400.0).warnings[0]
    assert state("RP-1", 360.0).warnings == ()


def test_liquid_without_an_equation_of_state_against_one_that_has_it():
    """n-Dodecane with its own heat capacity, density and slope only, against CoolProp: 30 K and 20 MPa away."""
    props = pytest.importorskip("CoolProp.CoolProp").PropsSI
    row = ROWS["n-dodecane"]
    heat_capacity = props("Cpmass", "T", 313.15, "P", 1e5, "n-Dodecane")
    slope = (props("Dmass", "T", 303.15, "P", 1e5, "n-Dodecane") - props("Dmass", "T", 293.15, "P", 1e5, "n-Dodecane")) / 10
    plain = replace(row, coolprop_fluid=None, heat_capacity=heat_capacity, heat_capacity_range=(270.0, 400.0), density_slope=slope)
    for temperature, pressure, tolerance in ((328.15, None, 2e-3), (298.15, 2e7, 0.05), (328.15, 2e7, 0.02)):
        ours, theirs = stored_state(plain, temperature, pressure), stored_state(row, temperature, pressure)
        assert ours.enthalpy_change == pytest.approx(theirs.enthalpy_change, rel=tolerance)
        assert ours.density == pytest.approx(theirs.density, rel=0.025)  # compression by 20 MPa is left out: 2 %


@pytest.mark.parametrize(
    ("name", "temperature", "pressure", "words"),
    [
        ("hydrazine", 270.0, None, "below its freezing point (274.69 K)"),
        ("paraffin", 360.0, None, "above its melting point (343 K)"),
        ("NTO", 320.0, None, "a liquid only under pressure"),
        ("NTO", 320.0, 1e5, "it would boil"),
        ("MMH", 380.0, None, "above its boiling point at 1 atm (360.8 K)"),
        ("HTP-90", 255.0, None, "below its freezing point (261.7 K)"),
        ("ethanol-75", 370.0, None, "a liquid only under pressure"),
    ],
)
def test_limits_are_told(name, temperature, pressure, words):
    assert any(words in text for text in state(name, temperature, pressure).warnings)


def test_no_data_is_a_clear_error():
    with pytest.raises(InputError) as caught:
        stored_state(ROWS["isopropyl nitrate"], 310.0, None, "fuel_temperature")
    assert caught.value.problems[0].name == "fuel_temperature"
    assert "heat_capacity=" in str(caught.value)
    assert stored_state(ROWS["isopropyl nitrate"], 298.16).enthalpy_change == 0.0


@pytest.mark.parametrize(("name", "temperature"), [("n-heptane", 330.0), ("ethanol", 330.0), ("methanol", 320.0), ("water", 350.0)])
def test_vapour_pressure_estimate_against_coolprop(name, temperature):
    props = pytest.importorskip("CoolProp.CoolProp").PropsSI
    row = ROWS[name]
    exact = props("P", "T", temperature, "Q", 0, row.coolprop_fluid)
    assert vapour_pressure_estimate(row, temperature) == pytest.approx(exact, rel=0.05)
    trouton = replace(row, vapour_pressure=None)
    assert vapour_pressure_estimate(trouton, temperature) == pytest.approx(exact, rel=0.6)


def test_vapour_pressure_of_a_row_without_a_boiling_point():
    with pytest.raises(InputError, match="no boiling point"):
        vapour_pressure_estimate(ROWS["HTPB"], 300.0)


# ---- mixtures -------------------------------------------------------------------------------------------------------


def test_mixture_is_the_sum_of_its_ingredients():
    mixture, parts = state("A-50", 320.0), [state("hydrazine", 320.0), state("UDMH", 320.0)]
    by_mass = [part.enthalpy_change / ROWS[name].molar_mass for part, name in zip(parts, ("hydrazine", "UDMH"), strict=True)]
    assert mixture.enthalpy_change / ROWS["A-50"].molar_mass == pytest.approx(sum(by_mass) / 2, rel=1e-12)
    assert mixture.density < ROWS["A-50"].density


def test_gas_mixture_near_its_parts_and_honest_at_pressure():
    warm = state("natural gas", 350.0)
    methane = state("GCH4", 350.0)
    assert warm.enthalpy_change / ROWS["natural gas"].molar_mass == pytest.approx(
        methane.enthalpy_change / ROWS["GCH4"].molar_mass, rel=0.06
    )
    assert warm.warnings == ()
    assert "real-gas change of its enthalpy is neglected" in state("natural gas", 350.0, 5e6).warnings[0]


def test_water_in_a_blend_may_be_colder_than_ice():
    cold, warm = state("ethanol-75", 250.0), state("ethanol-75", 290.0)
    assert cold.warnings == ()
    slope = (warm.enthalpy_change - cold.enthalpy_change) / 40.0 / ROWS["ethanol-75"].molar_mass
    assert 2500.0 < slope < 3300.0  # between ethanol (2.4) and water (4.2 kJ/(kg K)) by mass


def test_peroxide_solution_heat_capacity():
    """90 % peroxide: about 2.77 kJ/(kg K) near room temperature (mass-weighted; 2.7 to 2.8 from memory)."""
    warm = state("HTP-90", 308.15)
    assert warm.enthalpy_change / ROWS["HTP-90"].molar_mass / 10.0 == pytest.approx(2770.0, rel=0.02)


def test_an_ingredient_without_a_specific_heat_is_told():
    import propkit as pk

    made = pk.blend({"RDX": 0.5, "HTPB": 0.5})
    assert any("No specific heat of RDX is known" in text for text in made.stream(310.0)[1])
    assert not any("specific heat" in text for text in made.stream()[1])


# ---- over the whole range -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("pressure", [1e5, 5e6, 3e7])
@pytest.mark.parametrize("name", FLUIDS)
def test_enthalpy_rises_with_temperature(name, pressure):
    """Heat capacities are positive, through boiling as well; density is positive and a state is one of four phases."""
    row = ROWS[name]
    low = max(row.freezing_point * 1.08, 15.0)
    temperatures = [low + (520.0 - low) * step / 40 for step in range(41)]
    states = []
    for temperature in temperatures:
        with contextlib.suppress(RangeError):  # solid under pressure, or below the range: refused, never wrong
            states.append(state(name, temperature, pressure))
    assert len(states) >= 30
    changes = [found.enthalpy_change for found in states]
    assert all(later > sooner for sooner, later in itertools.pairwise(changes))
    assert all(found.density > 0.0 for found in states)
    assert {found.phase for found in states} <= {"liquid", "gas", "supercritical"}
    crossed = [any("the library row is" in text for text in found.warnings) for found in states]
    assert all(warned == (found.phase != row.phase) for warned, found in zip(crossed, states, strict=True))


def test_above_the_range_of_the_equation_of_state():
    assert "extrapolated" in state("ethylene", 500.0, 5e6).warnings[0]
    with pytest.raises(RangeError, match="CoolProp has it up to 450 K"):
        state("ethylene", 700.0, 5e6)
