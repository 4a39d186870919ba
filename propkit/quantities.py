"""The catalogue: one row per quantity, read by sheets, tables, axes, panels and records.

A row is found by public name, optionally qualified by the object (``chamber.pressure`` before ``pressure``).
Symbols are a small subset of LaTeX that `propkit.view.symbols` sets for every medium. Definitions follow
the trade's usual ones; the ISO 80000 symbol is used where it has one.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from propkit import units
from propkit.errors import near_matches


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of quantity: its SI unit and the units it is shown in, smallest first."""

    name: str
    unit: str
    si: tuple[str, ...]
    us: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Quantity:
    """One catalogue row.

    Parameters
    ----------
    name : str
        Public name, full words.
    kind : Kind
        Kind of quantity: SI unit and display units.
    symbol : str
        Symbol in the LaTeX subset.
    label : str
        What a person reads, lower case.
    definition : str
        One line that says what is meant.
    digits : int
        Significant digits shown.
    source : str
        Key of `propkit.sources`, or empty.
    """

    name: str
    kind: Kind
    symbol: str
    label: str
    definition: str
    digits: int = 5
    source: str = ""

    @property
    def unit(self) -> str:
        """SI unit in pint's spelling."""
        return self.kind.unit

    def shown_in(self, system: str = "SI", values: Iterable[float] = ()) -> str:
        """Return the display unit for `values` (SI floats) in the system ``"SI"`` or ``"US"``."""
        choices = self.kind.si if system == "SI" else self.kind.us
        largest = max((abs(value) for value in values if value == value), default=0.0)
        chosen = choices[0]
        for unit in choices[1:]:
            if largest and abs(units.convert(largest, self.unit, unit)) >= 1.0:
                chosen = unit
        return chosen


NUMBER = Kind("number", "", ("",), ("",))
PRESSURE = Kind("pressure", "Pa", ("Pa", "kPa", "MPa"), ("psi",))
TEMPERATURE = Kind("temperature", "K", ("K",), ("degR",))
LENGTH = Kind("length", "m", ("mm", "m"), ("inch",))
ALTITUDE = Kind("altitude", "m", ("m", "km"), ("foot",))
AREA = Kind("area", "m**2", ("mm**2", "cm**2", "m**2"), ("inch**2",))
VOLUME = Kind("volume", "m**3", ("liter", "m**3"), ("foot**3",))
MASS = Kind("mass", "kg", ("kg",), ("pound",))
MASS_FLOW = Kind("mass flow", "kg/s", ("g/s", "kg/s"), ("pound/s",))
MASS_FLUX = Kind("mass flux", "kg/(m**2*s)", ("kg/(m**2*s)",), ("pound/(foot**2*s)",))
FORCE = Kind("force", "N", ("N", "kN", "MN"), ("lbf",))
SPEED = Kind("speed", "m/s", ("m/s",), ("foot/s",))
TIME = Kind("time", "s", ("ms", "s"), ("ms", "s"))
DURATION = Kind("specific impulse", "s", ("s",), ("s",))
DENSITY = Kind("density", "kg/m**3", ("kg/m**3",), ("pound/foot**3",))
DENSITY_IMPULSE = Kind("density impulse", "N*s/m**3", ("N*s/m**3", "kN*s/m**3", "MN*s/m**3"), ("lbf*s/foot**3",))
MOLAR_MASS = Kind("molar mass", "kg/mol", ("g/mol",), ("g/mol",))
SPECIFIC_ENERGY = Kind("specific energy", "J/kg", ("kJ/kg", "MJ/kg"), ("Btu/pound",))
MOLAR_ENERGY = Kind("molar energy", "J/mol", ("kJ/mol",), ("kJ/mol",))
SPECIFIC_HEAT = Kind("specific heat", "J/(kg*K)", ("J/(kg*K)", "kJ/(kg*K)"), ("Btu/(pound*degR)",))
ANGLE = Kind("angle", "radian", ("degree",), ("degree",))
AMOUNT = Kind("amount per mass", "mol/kg", ("mol/kg",), ("mol/kg",))
HEAT_FLUX = Kind("heat flux", "W/m**2", ("kW/m**2", "MW/m**2"), ("Btu/(inch**2*s)",))
POWER = Kind("power", "W", ("kW", "MW"), ("Btu/s",))
IMPULSE = Kind("impulse", "N*s", ("N*s", "kN*s", "MN*s"), ("lbf*s",))
HEAT_TRANSFER = Kind("heat transfer coefficient", "W/(m**2*K)", ("kW/(m**2*K)",), ("Btu/(inch**2*s*degR)",))
TEMPERATURE_DIFFERENCE = Kind("temperature difference", "K", ("K",), ("degR",))
VISCOSITY = Kind("viscosity", "Pa*s", ("mPa*s",), ("mPa*s",))
BURN_TIME = Kind("time", "s", ("s",), ("s",))
TEXT = Kind("choice", "", ("",), ("",))

_ROWS = (
    # propellant case
    Quantity("mixture_ratio", NUMBER, r"r", "mixture ratio", "oxidizer mass flow over fuel mass flow", 4),
    Quantity(
        "stoichiometric_mixture_ratio",
        NUMBER,
        r"r_{st}",
        "stoichiometric mixture ratio",
        "mixture ratio at which the valences balance",
        4,
    ),
    Quantity(
        "equivalence_ratio",
        NUMBER,
        r"\phi",
        "equivalence ratio",
        "stoichiometric over actual mixture ratio; above 1 is fuel-rich",
        4,
    ),
    Quantity(
        "bulk_density",
        DENSITY,
        r"\rho_{b}",
        "bulk density",
        "mass of both propellants over the volume they fill in the tanks",
        4,
    ),
    Quantity(
        "enthalpy",
        SPECIFIC_ENERGY,
        r"h",
        "enthalpy",
        "specific enthalpy on the scale of formation enthalpies at 298.15 K",
        6,
    ),
    Quantity("elements", AMOUNT, r"b", "elements", "moles of atoms of each element per mass of propellant", 6),
    Quantity("oxidizer", TEXT, r"", "oxidizer", "propellant that supplies the oxidizing elements"),
    Quantity("fuel", TEXT, r"", "fuel", "propellant that is burnt"),
    Quantity("thermo_basis", TEXT, r"", "thermodynamic basis", "species data that the equilibrium rests on"),
    Quantity(
        "oxidizer_temperature",
        TEMPERATURE,
        r"T_{ox}",
        "oxidizer temperature",
        "temperature at which the oxidizer is stored or fed",
        5,
    ),
    Quantity(
        "fuel_temperature",
        TEMPERATURE,
        r"T_{fu}",
        "fuel temperature",
        "temperature at which the fuel is stored or fed",
        5,
    ),
    Quantity(
        "oxidizer_pressure",
        PRESSURE,
        r"p_{ox}",
        "oxidizer pressure",
        "pressure at which the oxidizer is stored or fed",
        4,
    ),
    Quantity("fuel_pressure", PRESSURE, r"p_{fu}", "fuel pressure", "pressure at which the fuel is stored or fed", 4),
    Quantity(
        "mixture_ratio_by_volume",
        NUMBER,
        r"r_{V}",
        "mixture ratio by volume",
        "oxidizer volume flow over fuel volume flow, as stored",
        4,
    ),
    Quantity(
        "oxidizer_percent",
        NUMBER,
        r"w_{ox}",
        "percent oxidizer",
        "oxidizer mass flow over that of both propellants, in percent",
        4,
    ),
    Quantity(
        "case.oxygen_balance",
        NUMBER,
        r"B_{O}",
        "oxygen balance",
        "mass of oxygen left over (or missing, when negative) for complete combustion, over the mass",
        4,
    ),
    Quantity("additives", TEXT, r"", "additives", "what is added, as mass fractions of the whole propellant flow"),
    Quantity("additive_fraction", NUMBER, r"w_{ad}", "additive fraction", "mass of all additives over the whole mass", 4),
    Quantity("condensed", TEXT, r"", "condensed products", "whether liquids and solids may form among the products"),
    Quantity("propellant", TEXT, r"", "propellant", "the single propellant, or the mixture that burns as one"),
    Quantity("propellant_pressure", PRESSURE, r"p_{pr}", "propellant pressure", "pressure as stored or fed", 4),
    Quantity(
        "case.propellant_temperature",
        TEMPERATURE,
        r"T_{pr}",
        "propellant temperature",
        "temperature at which the propellant is stored or fed",
        5,
    ),
    Quantity(
        "ammonia_dissociation",
        NUMBER,
        r"x",
        "ammonia dissociation",
        "part of the ammonia from hydrazine that dissociates to nitrogen and hydrogen",
        4,
    ),
    Quantity("gas", TEXT, r"", "gas", "the gas that expands as it is, without combustion"),
    Quantity("case.temperature", TEMPERATURE, r"T", "temperature", "temperature of the gas as stored", 5),
    Quantity("tank_pressure", PRESSURE, r"p_{tk}", "tank pressure", "pressure at which the gas is stored", 5),
    Quantity("film_fraction", NUMBER, r"w_{f}", "film fraction", "mass flow of the film over the whole mass flow", 4),
    Quantity("film_mixture_ratio", NUMBER, r"r_{f}", "film mixture ratio", "oxidizer over fuel mass flow in the film", 4),
    Quantity("core_mixture_ratio", NUMBER, r"r_{c}", "core mixture ratio", "oxidizer over fuel mass flow in the core", 4),
    # chamber
    Quantity(
        "chamber.pressure",
        PRESSURE,
        r"p_{c}",
        "chamber pressure",
        "quoted chamber pressure, read as `pressure_at` says",
        5,
    ),
    Quantity("pressure_at", TEXT, r"", "pressure quoted at", "where the quoted chamber pressure holds"),
    Quantity("contraction_ratio", NUMBER, r"\epsilon_{c}", "contraction ratio", "chamber cross-section over throat area", 4),
    Quantity(
        "cstar_efficiency",
        NUMBER,
        r"\eta_{c^{*}}",
        "c* efficiency",
        "delivered over theoretical characteristic velocity",
        4,
    ),
    Quantity(
        "stagnation_pressure",
        PRESSURE,
        r"p_{0}",
        "stagnation pressure",
        "stagnation pressure at the nozzle inlet, the reference of c* and CF",
        6,
    ),
    Quantity(
        "characteristic_velocity",
        SPEED,
        r"c^{*}",
        "characteristic velocity",
        "stagnation pressure times throat area over mass flow",
        6,
    ),
    Quantity("composition", NUMBER, r"x", "composition", "mole fractions of the gas", 5),
    Quantity("gas_constant", SPECIFIC_HEAT, r"R", "gas constant", "molar gas constant over molar mass", 5),
    Quantity(
        "specific_heat",
        SPECIFIC_HEAT,
        r"c_{p}",
        "specific heat, equilibrium",
        "isobaric heat capacity with the composition following equilibrium",
        5,
    ),
    Quantity(
        "frozen_specific_heat",
        SPECIFIC_HEAT,
        r"c_{p,f}",
        "specific heat, frozen",
        "isobaric heat capacity at fixed composition",
        5,
    ),
    Quantity(
        "frozen_isentropic_exponent",
        NUMBER,
        r"\gamma_{f}",
        "isentropic exponent, frozen",
        "ratio of the heat capacities at fixed composition",
        5,
    ),
    # state
    Quantity("pressure", PRESSURE, r"p", "pressure", "static pressure, absolute", 5),
    Quantity("temperature", TEMPERATURE, r"T", "temperature", "static temperature, absolute", 6),
    Quantity("density", DENSITY, r"\rho", "density", "static density", 5),
    Quantity("velocity", SPEED, r"u", "velocity", "flow velocity along the axis", 6),
    Quantity("mach", NUMBER, r"M", "Mach number", "velocity over sound speed", 5),
    Quantity("sound_speed", SPEED, r"a", "sound speed", "speed of sound of the flow model", 6),
    Quantity("molar_mass", MOLAR_MASS, r"\mathrm{M}", "molar mass", "mass over moles of gas", 6),
    Quantity("isentropic_exponent", NUMBER, r"\gamma", "isentropic exponent", "d ln p / d ln rho at constant entropy", 5),
    Quantity("entropy", SPECIFIC_HEAT, r"s", "entropy", "specific entropy, 1 bar standard state", 6),
    Quantity("mass_flux", MASS_FLUX, r"\rho u", "mass flux", "mass flow per area", 6),
    Quantity(
        "condensed_mass_fraction",
        NUMBER,
        r"w_{c}",
        "condensed mass fraction",
        "mass of liquids and solids over total mass",
        4,
    ),
    # nozzle
    Quantity("flow", TEXT, r"", "flow model", "how composition behaves in the nozzle"),
    Quantity("freeze_at", TEXT, r"", "frozen from", "where the composition freezes"),
    Quantity("exponent", TEXT, r"", "exponent used", "which isentropic exponent constant-property flow takes"),
    Quantity("area_ratio", NUMBER, r"\epsilon", "area ratio", "exit area over throat area", 5),
    Quantity("exit_pressure", PRESSURE, r"p_{e}", "exit pressure", "static pressure at the nozzle exit", 5),
    Quantity("throat_diameter", LENGTH, r"d_{t}", "throat diameter", "geometric throat diameter", 5),
    Quantity("throat_area", AREA, r"A_{t}", "throat area", "geometric throat area", 5),
    Quantity("exit_diameter", LENGTH, r"d_{e}", "exit diameter", "geometric exit diameter", 5),
    Quantity("exit_area", AREA, r"A_{e}", "exit area", "geometric exit area", 5),
    Quantity("discharge_coefficient", NUMBER, r"C_{d}", "discharge coefficient", "effective over geometric throat area", 4),
    Quantity(
        "sizing_ambient",
        PRESSURE,
        r"p_{a}",
        "ambient pressure of the sizing",
        "ambient pressure at which the thrust is asked for",
        5,
    ),
    Quantity("mass_flow", MASS_FLOW, r"\dot{m}", "mass flow", "propellant mass flow through the throat", 5),
    Quantity("stations", TEXT, r"", "stations", "flow state at the stations of the nozzle"),
    # contour and wall
    Quantity("contour", TEXT, r"", "contour", "shape of the wall: a cone or a bell"),
    Quantity("half_angle", ANGLE, r"\alpha", "half-angle", "angle of the cone's wall against the axis", 4),
    Quantity("contour.length", NUMBER, r"L_{f}", "length fraction", "length from throat to lip over that of a 15 degree cone", 4),
    Quantity("throat_angle", ANGLE, r"\theta_{n}", "throat angle", "wall angle where the parabola starts", 4),
    Quantity("exit_angle", ANGLE, r"\theta_{e}", "exit angle", "wall angle at the lip", 4),
    Quantity("throat_arc", NUMBER, r"", "throat arc", "radius of the arc downstream of the throat over the throat radius", 4),
    Quantity("upstream_arc", NUMBER, r"", "upstream arc", "radius of the arc upstream of the throat over the throat radius", 4),
    Quantity("inlet_arc", NUMBER, r"", "inlet arc", "radius of the arc between cylinder and convergent over the throat radius", 4),
    Quantity("convergent_angle", ANGLE, r"", "convergent angle", "half-angle of the convergent", 4),
    Quantity("characteristic_length", LENGTH, r"L^{*}", "characteristic length", "chamber volume over throat area", 4),
    Quantity("stay_time", TIME, r"t_{s}", "stay time", "mean time that the gas spends in the chamber", 4),
    Quantity("chamber_volume", VOLUME, r"V_{c}", "chamber volume", "volume from the injector face to the throat", 4),
    Quantity("chamber_length", LENGTH, r"L_{c}", "chamber length", "axial length from the injector face to the throat", 4),
    Quantity("wall_thickness", LENGTH, r"t_{w}", "wall thickness", "thickness of the wall, normal to it", 4),
    Quantity("wall_density", DENSITY, r"\rho_{w}", "wall density", "density of the wall; the default is a usual copper or nickel alloy", 4),
    Quantity("divergent_length", LENGTH, r"L_{n}", "divergent length", "axial length from throat to lip", 5),
    Quantity("contour_length", LENGTH, r"L", "contour length", "axial length of the whole wall", 5),
    Quantity("wetted_area", AREA, r"A_{w}", "wetted area", "inner surface of the wall", 5),
    Quantity("contour_volume", VOLUME, r"V", "contour volume", "volume inside the wall", 5),
    Quantity("divergence_factor", NUMBER, r"\lambda", "divergence factor", "share of the exit momentum that is along the axis", 5),
    Quantity("throat_wall_angle", ANGLE, r"\theta_{n}", "wall angle after the throat", "wall angle at the end of the throat arc", 4),
    Quantity("lip_angle", ANGLE, r"\theta_{e}", "wall angle at the lip", "wall angle at the exit", 4),
    Quantity("wall_mass", MASS, r"m_{w}", "wall mass", "mass of a wall of even thickness along the contour", 4),
    # performance
    Quantity("ambient", PRESSURE, r"p_{a}", "ambient pressure", "pressure of the surroundings", 5),
    Quantity("ambient_pressure", PRESSURE, r"p_{a}", "ambient pressure", "pressure of the surroundings", 5),
    Quantity("thrust", FORCE, r"F", "thrust", "full-flowing thrust at the given ambient pressure", 5),
    Quantity("thrust_vacuum", FORCE, r"F_{vac}", "thrust in vacuum", "full-flowing thrust against no ambient pressure", 5),
    Quantity(
        "specific_impulse",
        DURATION,
        r"I_{sp}",
        "specific impulse",
        "thrust over weight flow of propellant at standard gravity",
        5,
    ),
    Quantity(
        "specific_impulse_vacuum",
        DURATION,
        r"I_{sp,vac}",
        "specific impulse in vacuum",
        "vacuum thrust over weight flow of propellant at standard gravity",
        5,
    ),
    Quantity(
        "thrust_coefficient",
        NUMBER,
        r"C_{F}",
        "thrust coefficient",
        "thrust over stagnation pressure times throat area",
        5,
    ),
    Quantity(
        "thrust_coefficient_vacuum",
        NUMBER,
        r"C_{F,vac}",
        "thrust coefficient in vacuum",
        "vacuum thrust over stagnation pressure times throat area",
        5,
    ),
    Quantity("effective_exhaust_velocity", SPEED, r"c", "effective exhaust velocity", "thrust over mass flow", 6),
    Quantity(
        "density_impulse",
        DENSITY_IMPULSE,
        r"I_{\rho}",
        "density impulse",
        "specific impulse times standard gravity times bulk density",
        5,
    ),
    Quantity(
        "oxidizer_mass_flow",
        MASS_FLOW,
        r"\dot{m}_{ox}",
        "oxidizer mass flow",
        "oxidizer part of the propellant mass flow",
        5,
    ),
    Quantity("fuel_mass_flow", MASS_FLOW, r"\dot{m}_{fu}", "fuel mass flow", "fuel part of the propellant mass flow", 5),
    Quantity("losses", TEXT, r"", "losses", "what is lost from ideal to delivered, by name"),
    Quantity(
        "minimum_pressure",
        PRESSURE,
        r"p_{c,min}",
        "minimum chamber pressure",
        "lowest chamber pressure at which the chamber is known to run",
        4,
    ),
    Quantity("altitude", ALTITUDE, r"h", "altitude", "geometric altitude in the standard atmosphere", 4),
    # answers: heat load, burn, throttling
    Quantity("wall_temperature", TEMPERATURE, r"T_{w}", "wall temperature", "temperature of the gas-side wall", 5),
    Quantity("heat_load", POWER, r"\dot{Q}", "heat load", "heat flow into the wetted wall", 4),
    Quantity("peak_heat_flux", HEAT_FLUX, r"q_{max}", "largest heat flux", "largest convective heat flux along the wall", 4),
    Quantity(
        "peak_heat_flux_equilibrium",
        HEAT_FLUX,
        r"q_{max,eq}",
        "largest heat flux, equilibrium heat capacity",
        "the same with the heat capacity of a reacting gas: the price of the frozen one",
        4,
    ),
    Quantity("peak_position", LENGTH, r"x_{max}", "position of the largest flux", "axial position of the largest flux, throat at zero", 4),
    Quantity(
        "heat_transfer_coefficient",
        HEAT_TRANSFER,
        r"h",
        "heat transfer coefficient",
        "heat flux over adiabatic less actual wall temperature",
        4,
    ),
    Quantity("mean_heat_flux", HEAT_FLUX, r"q_{m}", "mean heat flux", "heat load over wetted area", 4),
    Quantity(
        "heat_share", NUMBER, r"", "share of the chamber power", "heat load over the power that cooling the gas to 298.15 K would give", 3
    ),
    Quantity("viscosity", VISCOSITY, r"\mu", "viscosity at rest", "dynamic viscosity of the gas at rest", 4),
    Quantity("prandtl_number", NUMBER, r"Pr", "Prandtl number", "Prandtl number of the gas at rest, frozen", 4),
    Quantity("coolant", TEXT, r"", "coolant", "propellant that takes up the heat"),
    Quantity("coolant_mass_flow", MASS_FLOW, r"\dot{m}_{k}", "coolant mass flow", "mass flow of the coolant", 4),
    Quantity("coolant_pressure", PRESSURE, r"p_{k}", "coolant pressure", "pressure of the coolant in the jacket", 4),
    Quantity(
        "coolant_temperature_rise",
        TEMPERATURE_DIFFERENCE,
        r"\Delta T_{k}",
        "coolant temperature rise",
        "temperature of the coolant after less before the jacket",
        4,
    ),
    Quantity("coolant_temperature", TEMPERATURE, r"T_{k}", "coolant temperature after", "temperature of the coolant after the jacket", 5),
    Quantity("coolant_limit", TEMPERATURE, r"T_{k,max}", "limit of the coolant", "temperature that the coolant must stay below", 5),
    Quantity("duration", BURN_TIME, r"t_{b}", "burn duration", "time of steady burning", 4),
    Quantity("answer.propellant_mass", MASS, r"m_{p}", "propellant mass", "propellant loaded, residuals included", 5),
    Quantity("consumed_mass", MASS, r"m_{b}", "propellant burnt", "mass flow times duration", 5),
    Quantity("oxidizer_mass", MASS, r"m_{ox}", "oxidizer mass", "oxidizer loaded, residuals included", 5),
    Quantity("fuel_mass", MASS, r"m_{fu}", "fuel mass", "fuel loaded, residuals included", 5),
    Quantity("oxidizer_tank_volume", VOLUME, r"V_{ox}", "oxidizer tank volume", "volume of the loaded oxidizer and its ullage", 4),
    Quantity("fuel_tank_volume", VOLUME, r"V_{fu}", "fuel tank volume", "volume of the loaded fuel and its ullage", 4),
    Quantity("propellant_tank_volume", VOLUME, r"V_{p}", "propellant tank volume", "volume of the loaded propellant and its ullage", 4),
    Quantity("ullage", NUMBER, r"", "ullage", "share of the tank volume that holds gas when loaded", 3),
    Quantity("residuals", NUMBER, r"", "residuals", "share of the loaded propellant that is left", 3),
    Quantity(
        "full_flow_pressure",
        PRESSURE,
        r"p_{c,full}",
        "full-flow chamber pressure",
        "chamber pressure below which the middle of three criteria predicts separation at sea level",
        4,
    ),
    # propellants
    Quantity("formula", TEXT, r"", "formula", "atoms of one formula unit"),
    Quantity("role", TEXT, r"", "role", "what the propellant serves as"),
    Quantity("name", TEXT, r"", "name", "the analyst's name for the object"),
    Quantity(
        "molar_enthalpy",
        MOLAR_ENERGY,
        r"H",
        "assigned enthalpy",
        "enthalpy per mole on the scale of formation enthalpies at 298.15 K",
        6,
    ),
    Quantity("propellant_temperature", TEMPERATURE, r"T", "temperature", "temperature of the propellant", 5),
    Quantity("propellant.pressure", PRESSURE, r"p", "pressure", "pressure of the propellant", 4),
    Quantity("propellant.density", DENSITY, r"\rho", "density", "density at the state of the propellant", 5),
    Quantity("propellant.molar_mass", MOLAR_MASS, r"\mathrm{M}", "molar mass", "mass of one mole of the formula", 6),
    Quantity(
        "propellant.enthalpy",
        TEXT,
        r"",
        "assigned enthalpy as given",
        "formation at 298.15 K and the change to the state of the propellant",
    ),
    Quantity("specific_enthalpy", SPECIFIC_ENERGY, r"h", "assigned enthalpy by mass", "assigned enthalpy over molar mass", 6),
    Quantity(
        "oxygen_balance",
        NUMBER,
        r"\Omega",
        "oxygen balance",
        "oxygen left over (positive) or missing after full oxidation, over the mass",
        4,
    ),
    Quantity("heat_capacity", SPECIFIC_HEAT, r"c_{p}", "specific heat", "specific heat used for other stored temperatures", 4),
    Quantity(
        "heat_capacity_range",
        TEXT,
        r"",
        "range of the specific heat",
        "temperatures between which the specific heat holds",
    ),
    Quantity("freezing_point", TEMPERATURE, r"T_{m}", "freezing point", "temperature at which the propellant freezes", 5),
    Quantity(
        "boiling_point",
        TEMPERATURE,
        r"T_{b}",
        "boiling point",
        "temperature at which the propellant boils at 101.325 kPa",
        5,
    ),
    Quantity("vapour_pressure", PRESSURE, r"p_{v}", "vapour pressure", "vapour pressure at 298.15 K", 3),
    Quantity(
        "mixing_enthalpy",
        SPECIFIC_ENERGY,
        r"\Delta h_{mix}",
        "heat of mixing",
        "enthalpy of the mixture less that of its ingredients",
        4,
    ),
    Quantity("saturated", TEXT, r"", "saturated", "whether a liquid is at its own vapour pressure"),
    Quantity("species", TEXT, r"", "species", "formula key of an unreacting gas in the species data"),
    Quantity("coolprop_fluid", TEXT, r"", "CoolProp fluid", "name of the equation of state that gives other stored states"),
    Quantity("phase", TEXT, r"", "phase", "state of aggregation"),
    Quantity("hazard", TEXT, r"", "hazard", "what can hurt"),
    Quantity("source", TEXT, r"", "source", "where the enthalpy comes from"),
    Quantity("library_name", TEXT, r"", "library name", "name of the row of the library"),
    Quantity("ingredients", TEXT, r"", "ingredients", "what is blended, with shares"),
    Quantity("by", TEXT, r"", "shares by", "whether the shares are of mass, volume or moles"),
    # reconciliation and firings
    Quantity("thrust_sea_level", FORCE, r"F_{sl}", "thrust at sea level", "full-flowing thrust against 101.325 kPa", 5),
    Quantity(
        "specific_impulse_sea_level",
        DURATION,
        r"I_{sp,sl}",
        "specific impulse at sea level",
        "thrust at sea level over weight flow of propellant at standard gravity",
        5,
    ),
    Quantity("total_impulse", IMPULSE, r"I", "total impulse", "thrust times burn time", 5),
    Quantity("burn_time", Kind("duration", "s", ("s",), ("s",)), r"t_{b}", "burn time", "duration of the burn", 5),
    Quantity("propellant_mass", MASS, r"m_{p}", "propellant mass", "propellant used in the burn", 5),
    Quantity(
        "thrust_coefficient_efficiency",
        NUMBER,
        r"\eta_{C_{F}}",
        "thrust coefficient efficiency",
        "delivered over ideal vacuum thrust coefficient",
        4,
    ),
    Quantity(
        "dump_flow_fraction",
        NUMBER,
        r"f_{d}",
        "dump flow fraction",
        "turbine flow dumped overboard over the mass flow of the engine",
        3,
    ),
    Quantity(
        "dump_specific_impulse",
        DURATION,
        r"I_{sp,d}",
        "specific impulse of the dump flow",
        "thrust of the dumped turbine flow over its weight flow",
        4,
    ),
)

CATALOGUE: dict[str, Quantity] = {row.name: row for row in _ROWS}


def quantity(name: str, owner: str = "") -> Quantity:
    """Return the catalogue row of a public name; `owner` (``"chamber"``) is tried first as a prefix.

    Raises
    ------
    KeyError
        For a name that is not catalogued.
    """
    row = CATALOGUE.get(f"{owner}.{name}") if owner else None
    row = row or CATALOGUE.get(name)
    if row is None:
        raise KeyError(f"no quantity {name!r} in the catalogue; nearest: {near_matches(name, CATALOGUE)}")
    return row
