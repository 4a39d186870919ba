"""One row of a propellant library: plain data in SI, and what the rest of propkit asks of it."""

from __future__ import annotations

from dataclasses import dataclass

ROLES = ("oxidizer", "fuel", "monopropellant", "cold gas", "ingredient", "diluent")
"""What a propellant can be used as; the first role of a row is its main one."""

PHASES = ("liquid", "gas", "solid")
"""State of aggregation of a row at its own temperature and pressure."""

TRUST = ("good", "fair", "weak")
"""How far the assigned enthalpy of a row can be trusted; the meaning is in propkit/data/README.md."""


@dataclass(frozen=True, slots=True)
class OtherValue:
    """An assigned enthalpy that another source gives for the same row.

    Parameters
    ----------
    source : str
        Where the other value comes from.
    molar_enthalpy : float
        Assigned enthalpy at the state of the row [J/mol of the formula].
    """

    source: str
    molar_enthalpy: float


@dataclass(frozen=True, slots=True)
class PropellantRow:
    """One propellant or ingredient of a library, in SI.

    `molar_enthalpy` and `molar_mass` are for one mole of `formula`; `specific_enthalpy` is the assigned enthalpy
    (formation at 298.15 K and the change to the state of the row) of one kilogram. `components` has the rows that it
    was summed from with their mass fractions, and is empty for a row of its own.
    """

    name: str
    title: str
    roles: tuple[str, ...]
    phase: str
    formula: str
    element_counts: tuple[tuple[str, float], ...]
    molar_mass: float
    molar_enthalpy: float
    temperature: float
    pressure: float
    hazard: str
    source: str
    trust: str
    saturated: bool = False
    aliases: tuple[str, ...] = ()
    components: tuple[tuple[PropellantRow, float], ...] = ()
    mixing_enthalpy: float = 0.0
    coolprop_fluid: str | None = None
    species: str | None = None
    density: float | None = None
    density_temperature: float | None = None
    density_slope: float | None = None
    density_source: str = ""
    heat_capacity: float | None = None
    heat_capacity_range: tuple[float, float] | None = None
    heat_capacity_source: str = ""
    freezing_point: float | None = None
    boiling_point: float | None = None
    vapour_pressure: float | None = None
    other_values: tuple[OtherValue, ...] = ()
    note: str = ""
    impulse_note: str = ""
    library: str = ""

    @property
    def role(self) -> str:
        """Return the main role."""
        return self.roles[0]

    @property
    def mixture(self) -> dict[str, float]:
        """Return ingredient name -> mass fraction; empty for a row of its own."""
        return {row.name: share for row, share in self.components}

    @property
    def gas_composition(self) -> dict[str, float]:
        """Return species -> mole fraction of a gas of known composition; empty where it is not known."""
        if self.species is not None:
            return {self.species: 1.0}
        found: dict[str, float] = {}
        for row, share in self.components:
            inside = row.gas_composition
            if not inside:
                return {}
            for species, fraction in inside.items():
                found[species] = found.get(species, 0.0) + share * self.molar_mass / row.molar_mass * fraction
        return found

    @property
    def elements(self) -> dict[str, float]:
        """Return element symbol -> count per formula unit [1]."""
        return dict(self.element_counts)

    @property
    def specific_enthalpy(self) -> float:
        """Return the assigned enthalpy [J/kg] at the state of the row."""
        return self.molar_enthalpy / self.molar_mass

    @property
    def state_text(self) -> str:
        """Return the state of the row in words."""
        if self.phase == "gas":
            return f"gas, {self.temperature:g} K, ideal at 1 bar"
        kind = "saturated liquid" if self.saturated else self.phase
        return f"{kind}, {self.temperature:g} K, {self.pressure / 1e5:.3g} bar"
