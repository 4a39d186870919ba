"""A written relation: the formula a person reads beside a function that the objects show the working of.

A relation holds its formula once, as text with {names}; the same text is filled with numbers, set in LaTeX, and
evaluated by a test against the function it stands for.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

from propkit.constants import GAS_CONSTANT, STANDARD_GRAVITY
from propkit.physics import algebra


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
        "additive_fraction": Term(r"w_{ad}"),
        "adiabatic_wall_temperature": Term(r"T_{aw}", "K"),
        "ambient_pressure": Term(r"p_{a}", "Pa"),
        "ambient_pressure_ratio": Term(r"\frac{p_{a}}{p_{0}}"),
        "area": Term(r"A", "m**2"),
        "area_ratio": Term(r"\epsilon"),
        "bulk_density": Term(r"\rho_{b}", "kg/m**3"),
        "characteristic_velocity": Term(r"c^{*}", "m/s"),
        "coefficient": Term(r"h_{g}", "W/(m**2*K)"),
        "condensed_mass_fraction": Term(r"w_{c}"),
        "coolant_mass_flow": Term(r"\dot{m}_{co}", "kg/s"),
        "coolant_specific_heat": Term(r"c_{co}", "J/(kg*K)"),
        "cstar_efficiency": Term(r"\eta_{c^{*}}"),
        "density": Term(r"\rho", "kg/m**3"),
        "diameter": Term(r"d", "m"),
        "discharge_coefficient": Term(r"C_{d}"),
        "divergence_factor": Term(r"\lambda"),
        "drag": Term(r"\Delta F", "N"),
        "enthalpy": Term(r"h", "J/kg"),
        "equivalence_ratio": Term(r"\phi"),
        "exit_area": Term(r"A_{e}", "m**2"),
        "exit_mach": Term(r"M_{e}"),
        "exit_pressure": Term(r"p_{e}", "Pa"),
        "exit_pressure_ratio": Term(r"\frac{p_{e}}{p_{0}}"),
        "exit_radius": Term(r"r_{e}", "m"),
        "exit_velocity": Term(r"u_{e}", "m/s"),
        "film_fraction": Term(r"w_{f}"),
        "film_mixture_ratio": Term(r"r_{f}"),
        "frozen": Term(r"I_{f}", "s"),
        "frozen_specific_heat": Term(r"c_{p,f}", "J/(kg*K)"),
        "fuel_density": Term(r"\rho_{fu}", "kg/m**3"),
        "fuel_enthalpy": Term(r"h_{fu}", "J/kg"),
        "fuel_valence": Term(r"V_{fu}", "mol/kg"),
        "gas_constant": Term(r"R", "J/(kg*K)"),
        "half_angle": Term(r"\alpha", "radian"),
        "heat_load": Term(r"\dot{Q}", "W"),
        "isentropic_exponent": Term(r"\gamma"),
        "lip_angle": Term(r"\theta_{e}", "radian"),
        "local_mass_flux": Term(r"\left(\rho u\right)", "kg/(m**2*s)"),
        "mach": Term(r"M"),
        "mass_flow": Term(r"\dot{m}", "kg/s"),
        "mixture_ratio": Term(r"r"),
        "mixture_ratio_by_volume": Term(r"r_{V}"),
        "molar_enthalpy": Term(r"H", "J/mol"),
        "molar_gas_constant": Term(r"\mathrm{R}", "J/(mol*K)"),
        "molar_mass": Term(r"\mathrm{M}", "kg/mol"),
        "momentum_share": Term(r"\sigma_{m}"),
        "momentum_thickness": Term(r"\theta", "m"),
        "momentum_thrust": Term(r"F_{m}", "N"),
        "net_valence": Term(r"V", "mol/kg"),
        "oxidizer_density": Term(r"\rho_{ox}", "kg/m**3"),
        "oxidizer_enthalpy": Term(r"h_{ox}", "J/kg"),
        "oxidizer_percent": Term(r"w_{ox}", "percent"),
        "oxidizer_valence": Term(r"V_{ox}", "mol/kg"),
        "oxygen_mass": Term(r"\mathrm{M}_{O}", "kg/mol"),
        "prandtl": Term(r"\mathrm{Pr}"),
        "pressure": Term(r"p", "Pa"),
        "pressure_ratio": Term(r"\frac{p}{p_{0}}"),
        "pressure_thrust": Term(r"F_{p}", "N"),
        "property_correction": Term(r"\sigma"),
        "share": Term(r"x"),
        "shifting": Term(r"I_{s}", "s"),
        "sound_speed": Term(r"a", "m/s"),
        "specific_heat": Term(r"c_{p}", "J/(kg*K)"),
        "specific_impulse": Term(r"I_{sp}", "s"),
        "stagnation_enthalpy": Term(r"h_{0}", "J/kg"),
        "stagnation_pressure": Term(r"p_{0}", "Pa"),
        "stagnation_temperature": Term(r"T_{0}", "K"),
        "standard_gravity": Term(r"g_{0}", "m/s**2"),
        "static_temperature": Term(r"T", "K"),
        "stoichiometric_mixture_ratio": Term(r"r_{st}"),
        "temperature": Term(r"T", "K"),
        "throat_arc": Term(r"\rho_{t}"),
        "throat_arc_radius": Term(r"R_{t}", "m"),
        "throat_area": Term(r"A_{t}", "m**2"),
        "throat_diameter": Term(r"d_{t}", "m"),
        "throat_mass_flux": Term(r"\left(\rho u\right)_{t}", "kg/(m**2*s)"),
        "throat_radius": Term(r"r_{t}", "m"),
        "throat_to_lip_angle": Term(r"\theta_{c}", "radian"),
        "thrust": Term(r"F", "N"),
        "thrust_coefficient": Term(r"C_{F}"),
        "velocity": Term(r"u", "m/s"),
        "velocity_lag": Term(r"\delta"),
        "viscosity": Term(r"\mu", "Pa*s"),
        "volume": Term(r"V", "m**3"),
        "wall_temperature": Term(r"T_{w}", "K"),
    }
)
"""Symbol and SI unit of every name that a relation uses."""

_CONSTANTS = {"standard_gravity": STANDARD_GRAVITY, "molar_gas_constant": GAS_CONSTANT}


def relation(key: str, result: Term, text: str, function: Callable[..., Any], source: str) -> Relation:
    """Return a relation whose terms are looked up in `TERMS`."""
    used = algebra.names(text)
    constants = {name: value for name, value in _CONSTANTS.items() if name in used}
    return Relation(key, result, text, {name: TERMS[name] for name in used}, function, source, constants)
