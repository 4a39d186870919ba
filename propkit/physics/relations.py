"""Written relations: the formula a person reads beside each function that the objects show the working of.

A relation holds its formula once, as text with {names}; the same text is filled with numbers, set in LaTeX, and
evaluated by a test against the function it stands for.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

from propkit.constants import GAS_CONSTANT, STANDARD_GRAVITY
from propkit.physics import algebra, balances, gas_dynamics, stoichiometry, thrust


@dataclass(frozen=True, slots=True)
class Term:
    """One name of a relation: symbol in the LaTeX subset of the catalogue, and SI unit in pint's spelling."""

    symbol: str
    unit: str = ""


@dataclass(frozen=True, slots=True)
class Relation:
    """One written relation.

    Parameters
    ----------
    key : str
        Name of the relation in `RELATIONS`.
    result : Term
        Symbol and unit of what it gives.
    text : str
        Right-hand side with {names} in the grammar of `propkit.physics.algebra`, SI units throughout.
    terms : mapping
        Name -> symbol and unit; constants included.
    function : callable
        The function it stands for; called by keyword with the terms that are not constants.
    source : str
        Key of `propkit.sources`.
    constants : mapping
        Numbers of those terms that are constants of nature or of definition.
    """

    key: str
    result: Term
    text: str
    terms: Mapping[str, Term]
    function: Callable[..., Any]
    source: str
    constants: Mapping[str, float] = field(default_factory=dict)

    @property
    def arguments(self) -> tuple[str, ...]:
        """Names that need a value, in order of appearance."""
        return tuple(name for name in algebra.names(self.text) if name not in self.constants)

    @property
    def written(self) -> str:
        """The formula with plain names."""
        return algebra.fill(self.text, {name: name for name in self.terms})

    @property
    def latex(self) -> str:
        """The relation in LaTeX, result = formula."""
        return f"{self.result.symbol} = {algebra.latex(self.text, {n: t.symbol for n, t in self.terms.items()})}"

    def _numbers(self, values: Mapping[str, float]) -> dict[str, float]:
        missing = [name for name in self.arguments if name not in values]
        if missing:
            raise KeyError(f"relation {self.key!r} needs {', '.join(missing)}")
        return {name: float(self.constants.get(name, values.get(name, 0.0))) for name in self.terms}

    def substitute(self, values: Mapping[str, float], digits: int = 6) -> str:
        """Return the formula with numbers put in; it evaluates to the result to within the digits shown.

        Parameters
        ----------
        values : mapping
            Number [SI] of each of `arguments`.
        digits : int
            Significant digits of each number.

        Returns
        -------
        str
            The formula in numbers.

        Raises
        ------
        KeyError
            Where a number is missing.
        """
        words = {name: algebra.number_text(value, digits) for name, value in self._numbers(values).items()}
        return algebra.fill(self.text, {n: f"({w})" if w.startswith("-") else w for n, w in words.items()})

    def substitute_latex(self, values: Mapping[str, float], digits: int = 6) -> str:
        """Return the formula with numbers put in, in LaTeX; arguments as for `substitute`."""
        numbers = self._numbers(values)
        return algebra.latex(self.text, {n: algebra.number_latex(v, digits) for n, v in numbers.items()})

    def evaluate(self, values: Mapping[str, float]) -> float:
        """Return the value of the written formula; arguments as for `substitute`."""
        return algebra.evaluate(self.text, self._numbers(values))


TERMS: Mapping[str, Term] = MappingProxyType(
    {
        "ambient_pressure": Term(r"p_{a}", "Pa"),
        "ambient_pressure_ratio": Term(r"\frac{p_{a}}{p_{0}}"),
        "area": Term(r"A", "m**2"),
        "area_ratio": Term(r"\epsilon"),
        "bulk_density": Term(r"\rho_{b}", "kg/m**3"),
        "characteristic_velocity": Term(r"c^{*}", "m/s"),
        "cstar_efficiency": Term(r"\eta_{c^{*}}"),
        "density": Term(r"\rho", "kg/m**3"),
        "diameter": Term(r"d", "m"),
        "discharge_coefficient": Term(r"C_{d}"),
        "divergence_factor": Term(r"\lambda"),
        "enthalpy": Term(r"h", "J/kg"),
        "equivalence_ratio": Term(r"\phi"),
        "exit_area": Term(r"A_{e}", "m**2"),
        "exit_pressure": Term(r"p_{e}", "Pa"),
        "exit_pressure_ratio": Term(r"\frac{p_{e}}{p_{0}}"),
        "exit_velocity": Term(r"u_{e}", "m/s"),
        "frozen_specific_heat": Term(r"c_{p,f}", "J/(kg*K)"),
        "fuel_density": Term(r"\rho_{fu}", "kg/m**3"),
        "fuel_enthalpy": Term(r"h_{fu}", "J/kg"),
        "fuel_valence": Term(r"V_{fu}", "mol/kg"),
        "gas_constant": Term(r"R", "J/(kg*K)"),
        "isentropic_exponent": Term(r"\gamma"),
        "local_mass_flux": Term(r"\left(\rho u\right)", "kg/(m**2*s)"),
        "mach": Term(r"M"),
        "mass_flow": Term(r"\dot{m}", "kg/s"),
        "mixture_ratio": Term(r"r"),
        "molar_gas_constant": Term(r"\mathrm{R}", "J/(mol*K)"),
        "molar_mass": Term(r"\mathrm{M}", "kg/mol"),
        "oxidizer_density": Term(r"\rho_{ox}", "kg/m**3"),
        "oxidizer_enthalpy": Term(r"h_{ox}", "J/kg"),
        "oxidizer_valence": Term(r"V_{ox}", "mol/kg"),
        "pressure": Term(r"p", "Pa"),
        "pressure_ratio": Term(r"\frac{p}{p_{0}}"),
        "sound_speed": Term(r"a", "m/s"),
        "specific_impulse": Term(r"I_{sp}", "s"),
        "stagnation_enthalpy": Term(r"h_{0}", "J/kg"),
        "stagnation_pressure": Term(r"p_{0}", "Pa"),
        "stagnation_temperature": Term(r"T_{0}", "K"),
        "standard_gravity": Term(r"g_{0}", "m/s**2"),
        "stoichiometric_mixture_ratio": Term(r"r_{st}"),
        "temperature": Term(r"T", "K"),
        "throat_area": Term(r"A_{t}", "m**2"),
        "throat_mass_flux": Term(r"\left(\rho u\right)_{t}", "kg/(m**2*s)"),
        "thrust": Term(r"F", "N"),
        "thrust_coefficient": Term(r"C_{F}"),
        "velocity": Term(r"u", "m/s"),
    }
)
"""Symbol and SI unit of every name that a relation uses."""

_CONSTANTS = {"standard_gravity": STANDARD_GRAVITY, "molar_gas_constant": GAS_CONSTANT}


def _relation(key: str, result: Term, text: str, function: Callable[..., Any], source: str) -> Relation:
    used = algebra.names(text)
    constants = {name: value for name, value in _CONSTANTS.items() if name in used}
    return Relation(key, result, text, {name: TERMS[name] for name in used}, function, source, constants)


def _stoichiometric(fuel_valence: float, oxidizer_valence: float) -> float:
    """Return the stoichiometric mixture ratio of streams that carry these net valences per mass."""
    return stoichiometry.stoichiometric_mixture_ratio({"O": -0.5 * oxidizer_valence}, {"H": fuel_valence})


def _mixture_enthalpy(mixture_ratio: float, oxidizer_enthalpy: float, fuel_enthalpy: float) -> Any:
    return stoichiometry.mix(mixture_ratio, oxidizer_enthalpy, fuel_enthalpy)


_CHOKED = (
    "sqrt({isentropic_exponent}) * (2 / ({isentropic_exponent} + 1))"
    " ** (({isentropic_exponent} + 1) / (2 * ({isentropic_exponent} - 1)))"
)
_T_RATIO = "(1 + ({isentropic_exponent} - 1) / 2 * {mach} ** 2)"

_LIST = (
    # propellants
    _relation(
        "stoichiometric_mixture_ratio",
        TERMS["stoichiometric_mixture_ratio"],
        "{fuel_valence} / -{oxidizer_valence}",
        _stoichiometric,
        "common-practice",
    ),
    _relation(
        "equivalence_ratio",
        TERMS["equivalence_ratio"],
        "{stoichiometric_mixture_ratio} / {mixture_ratio}",
        balances.equivalence_ratio,
        "definition",
    ),
    _relation(
        "mixture_ratio",
        TERMS["mixture_ratio"],
        "{stoichiometric_mixture_ratio} / {equivalence_ratio}",
        balances.mixture_ratio,
        "definition",
    ),
    _relation(
        "mixture_enthalpy",
        TERMS["enthalpy"],
        "({mixture_ratio} * {oxidizer_enthalpy} + {fuel_enthalpy}) / (1 + {mixture_ratio})",
        _mixture_enthalpy,
        "conservation",
    ),
    _relation(
        "bulk_density",
        TERMS["bulk_density"],
        "(1 + {mixture_ratio}) / ({mixture_ratio} / {oxidizer_density} + 1 / {fuel_density})",
        stoichiometry.bulk_density,
        "definition",
    ),
    _relation(
        "oxidizer_mass_flow",
        Term(r"\dot{m}_{ox}", "kg/s"),
        "{mass_flow} * {mixture_ratio} / (1 + {mixture_ratio})",
        balances.oxidizer_mass_flow,
        "conservation",
    ),
    _relation(
        "fuel_mass_flow",
        Term(r"\dot{m}_{fu}", "kg/s"),
        "{mass_flow} / (1 + {mixture_ratio})",
        balances.fuel_mass_flow,
        "conservation",
    ),
    # gas
    _relation(
        "gas_constant",
        TERMS["gas_constant"],
        "{molar_gas_constant} / {molar_mass}",
        balances.gas_constant,
        "si-brochure",
    ),
    _relation(
        "ideal_gas_density",
        TERMS["density"],
        "{pressure} / ({gas_constant} * {temperature})",
        balances.ideal_gas_density,
        "naca1135",
    ),
    _relation(
        "sound_speed",
        TERMS["sound_speed"],
        "sqrt({isentropic_exponent} * {gas_constant} * {temperature})",
        balances.sound_speed,
        "naca1135",
    ),
    _relation(
        "frozen_isentropic_exponent",
        Term(r"\gamma_{f}"),
        "{frozen_specific_heat} / ({frozen_specific_heat} - {gas_constant})",
        balances.frozen_isentropic_exponent,
        "naca1135",
    ),
    _relation(
        "velocity",
        TERMS["velocity"],
        "sqrt(2 * ({stagnation_enthalpy} - {enthalpy}))",
        balances.velocity_from_enthalpy,
        "conservation",
    ),
    _relation("mach", TERMS["mach"], "{velocity} / {sound_speed}", balances.mach, "definition"),
    _relation("mass_flux", TERMS["local_mass_flux"], "{density} * {velocity}", balances.mass_flux, "definition"),
    # one-dimensional flow at constant properties
    _relation(
        "temperature_ratio", Term(r"\frac{T}{T_{0}}"), f"1 / {_T_RATIO}", gas_dynamics.temperature_ratio, "naca1135"
    ),
    _relation(
        "pressure_ratio",
        Term(r"\frac{p}{p_{0}}"),
        f"{_T_RATIO} ** (-{{isentropic_exponent}} / ({{isentropic_exponent}} - 1))",
        gas_dynamics.pressure_ratio,
        "naca1135",
    ),
    _relation(
        "density_ratio",
        Term(r"\frac{\rho}{\rho_{0}}"),
        f"{_T_RATIO} ** (-1 / ({{isentropic_exponent}} - 1))",
        gas_dynamics.density_ratio,
        "naca1135",
    ),
    _relation(
        "area_ratio_of_mach",
        TERMS["area_ratio"],
        f"1 / {{mach}} * (2 / ({{isentropic_exponent}} + 1) * {_T_RATIO})"
        " ** (({isentropic_exponent} + 1) / (2 * ({isentropic_exponent} - 1)))",
        gas_dynamics.area_ratio,
        "naca1135",
    ),
    _relation(
        "choked_mass_flux_function", Term(r"\Gamma"), _CHOKED, gas_dynamics.choked_mass_flux_function, "sutton-biblarz"
    ),
    _relation(
        "choked_mass_flux",
        TERMS["throat_mass_flux"],
        f"{{stagnation_pressure}} / sqrt({{gas_constant}} * {{stagnation_temperature}}) * {_CHOKED}",
        gas_dynamics.choked_mass_flux,
        "sutton-biblarz",
    ),
    _relation(
        "choked_mass_flow",
        TERMS["mass_flow"],
        f"{{stagnation_pressure}} * {{throat_area}} / sqrt({{gas_constant}} * {{stagnation_temperature}}) * {_CHOKED}",
        balances.choked_mass_flow,
        "sutton-biblarz",
    ),
    _relation(
        "characteristic_velocity_constant_properties",
        TERMS["characteristic_velocity"],
        f"sqrt({{gas_constant}} * {{stagnation_temperature}}) / ({_CHOKED})",
        gas_dynamics.characteristic_velocity,
        "sutton-biblarz",
    ),
    _relation(
        "exhaust_velocity_constant_properties",
        TERMS["velocity"],
        "sqrt(2 * {isentropic_exponent} / ({isentropic_exponent} - 1) * {gas_constant} * {stagnation_temperature}"
        " * (1 - {pressure_ratio} ** (({isentropic_exponent} - 1) / {isentropic_exponent})))",
        gas_dynamics.exhaust_velocity,
        "sutton-biblarz",
    ),
    _relation(
        "thrust_coefficient_constant_properties",
        TERMS["thrust_coefficient"],
        "sqrt(2 * {isentropic_exponent} ** 2 / ({isentropic_exponent} - 1)"
        " * (2 / ({isentropic_exponent} + 1)) ** (({isentropic_exponent} + 1) / ({isentropic_exponent} - 1))"
        " * (1 - {exit_pressure_ratio} ** (({isentropic_exponent} - 1) / {isentropic_exponent})))"
        " + ({exit_pressure_ratio} - {ambient_pressure_ratio}) * {area_ratio}",
        gas_dynamics.thrust_coefficient,
        "sutton-biblarz",
    ),
    # nozzle and performance
    _relation(
        "area_ratio_of_fluxes",
        TERMS["area_ratio"],
        "{throat_mass_flux} / {local_mass_flux}",
        balances.area_ratio_of_fluxes,
        "conservation",
    ),
    _relation("circle_area", TERMS["area"], "pi / 4 * {diameter} ** 2", thrust.circle_area, "definition"),
    _relation("circle_diameter", TERMS["diameter"], "sqrt(4 / pi * {area})", thrust.circle_diameter, "definition"),
    _relation(
        "mass_flow",
        TERMS["mass_flow"],
        "{discharge_coefficient} * {throat_mass_flux} * {throat_area} / {cstar_efficiency}",
        balances.mass_flow,
        "conservation",
    ),
    _relation(
        "characteristic_velocity",
        TERMS["characteristic_velocity"],
        "{stagnation_pressure} * {throat_area} / {mass_flow}",
        thrust.characteristic_velocity,
        "definition",
    ),
    _relation(
        "delivered_velocity",
        Term(r"u_{d}", "m/s"),
        "{exit_velocity} * {cstar_efficiency} * {divergence_factor}",
        balances.delivered_velocity,
        "cpia-246",
    ),
    _relation(
        "thrust",
        TERMS["thrust"],
        "{mass_flow} * {exit_velocity} + ({exit_pressure} - {ambient_pressure}) * {exit_area}",
        thrust.thrust,
        "conservation",
    ),
    _relation(
        "thrust_coefficient",
        TERMS["thrust_coefficient"],
        "{thrust} / ({stagnation_pressure} * {throat_area})",
        thrust.thrust_coefficient,
        "definition",
    ),
    _relation(
        "specific_impulse",
        TERMS["specific_impulse"],
        "{thrust} / ({mass_flow} * {standard_gravity})",
        thrust.specific_impulse,
        "definition",
    ),
    _relation(
        "effective_exhaust_velocity",
        Term("c", "m/s"),
        "{thrust} / {mass_flow}",
        thrust.effective_exhaust_velocity,
        "definition",
    ),
    _relation(
        "density_impulse",
        Term(r"I_{\rho}", "N*s/m**3"),
        "{specific_impulse} * {standard_gravity} * {bulk_density}",
        thrust.density_impulse,
        "definition",
    ),
    _relation(
        "throat_area_for_thrust",
        TERMS["throat_area"],
        "{thrust} / ({thrust_coefficient} * {stagnation_pressure})",
        balances.throat_area_for_thrust,
        "definition",
    ),
    _relation(
        "throat_area_for_mass_flow",
        TERMS["throat_area"],
        "{mass_flow} * {characteristic_velocity} / {stagnation_pressure}",
        balances.throat_area_for_mass_flow,
        "definition",
    ),
)

RELATIONS: Mapping[str, Relation] = MappingProxyType({relation.key: relation for relation in _LIST})
"""Every written relation by key."""
