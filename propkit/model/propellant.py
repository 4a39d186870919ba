"""`Propellant`: one propellant or ingredient, from the library or of the analyst's own."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, ClassVar

from propkit import units
from propkit.bridge.stored_state import stored_state
from propkit.chain.case import Stream
from propkit.data import propellants as library_data
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.propellant_row import PHASES, PropellantRow
from propkit.errors import InputError, Problem
from propkit.model import propellant_inputs as read
from propkit.model import propellant_sheet
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import (
    Bounds,
    ChoiceInput,
    CustomInput,
    Declared,
    FlagInput,
    NumberResult,
    QuantityInput,
    QuantityResult,
    TextInput,
    as_text,
)
from propkit.model.doubts import Doubt
from propkit.model.propellant_table import propellants
from propkit.physics.stoichiometry import VALENCES, oxygen_balance
from propkit.report import Section, UnitSystem
from propkit.series import Figure

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Propellant", "as_propellant", "load_propellants", "of_row", "propellants"]

_TEMPERATURES = Bounds(above=0.0, at_most=6000.0)
_PRESSURES = Bounds(above=0.0, at_most=1e9)
_LIMITS = ("freezing_point", "boiling_point", "vapour_pressure")
_FIGURES = ("density", "temperature", "pressure", "heat_capacity", *_LIMITS)
_OWN_ONLY = ("formula", "temperature", "pressure", "phase", "saturated", "coolprop_fluid", "species")
_STATED_ELSEWHERE = "A row of the library brings its own; for another give formula and enthalpy, without library_name."
_STORED_ELSEWHERE = "A row has its own state; another stored state is an input of the case: oxidizer_temperature=, fuel_pressure=."


class Propellant(Calculation):
    """One propellant or ingredient.

    Parameters
    ----------
    formula : str
        Atoms of one formula unit, ``"C H1.95"``; the enthalpy is per mole of it.
    enthalpy : quantity
        Assigned enthalpy at `temperature`, per mole of the formula ("-24.717 kJ/mol") or per mass ("-1768 kJ/kg").
    density, temperature, pressure : quantity, optional
        The state; 298.15 K and 1 bar unless given.
    role : str, optional
        "oxidizer" | "fuel" | "monopropellant" | "cold gas" | "ingredient" | "diluent", or several with commas.
    phase, saturated, heat_capacity, heat_capacity_range, coolprop_fluid, species : optional
        What other stored states and unreacting flow need.
    freezing_point, boiling_point, vapour_pressure, hazard, source, name : optional
        What the sheet shows and warnings rest on.
    library_name : str
        A row of the library instead of formula and enthalpy; `from_library` is the usual way.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.

    Notes
    -----
    Enthalpies are on the scale of formation enthalpies at 298.15 K: zero for O2, H2, N2, F2, Cl2 gas, graphite and
    aluminium at 298.15 K and 1 bar. `row` has everything as SI floats.

    Examples
    --------
    >>> import propkit as pk
    >>> lot = pk.Propellant(name="RP-1 lot 7", formula="C H1.95", enthalpy="-24.717 kJ/mol", role="fuel")
    >>> round(lot.specific_enthalpy.to("kJ/kg").magnitude, 1)
    -1768.5
    """

    kind: ClassVar[str] = "propellant"
    title: ClassVar[str] = "Propellant"
    headline: ClassVar[tuple[str, ...]] = ("specific_enthalpy", "density")
    undeclared: ClassVar[tuple[str, ...]] = ()

    formula: CustomInput = CustomInput(doc='atoms of one formula unit: "C H1.95"', reader=read.formula, default=None)
    enthalpy: CustomInput = CustomInput(
        doc="assigned enthalpy at the given temperature, per mole of the formula or per mass",
        reader=read.enthalpy,
        default=None,
    )
    density: QuantityInput = QuantityInput(
        doc="density at the state of the propellant", default=None, bounds=Bounds(above=0.0, at_most=25_000.0)
    )
    temperature: QuantityInput = QuantityInput(
        doc="temperature that the enthalpy is for; 298.15 K unless given", default=None, bounds=_TEMPERATURES
    )
    pressure: QuantityInput = QuantityInput(doc="pressure of the propellant; 1 bar unless given", default=None, bounds=_PRESSURES)
    role: CustomInput = CustomInput(doc="what it serves as; not checked where not given", reader=read.roles, default=None)
    phase: ChoiceInput = ChoiceInput(choices=PHASES, doc="state of aggregation; liquid unless given", default=None)
    saturated: FlagInput = FlagInput(doc="whether it is a liquid at its own vapour pressure", default=False)
    heat_capacity: QuantityInput = QuantityInput(
        doc="specific heat, for other stored temperatures", default=None, bounds=Bounds(above=0.0, at_most=1e5)
    )
    heat_capacity_range: CustomInput = CustomInput(
        doc="temperatures between which the specific heat holds", reader=read.temperature_range, default=None
    )
    freezing_point: QuantityInput = QuantityInput(doc="freezing point", default=None, bounds=_TEMPERATURES)
    boiling_point: QuantityInput = QuantityInput(doc="boiling point at 101.325 kPa", default=None, bounds=_TEMPERATURES)
    vapour_pressure: QuantityInput = QuantityInput(doc="vapour pressure at 298.15 K", default=None, bounds=_PRESSURES)
    coolprop_fluid: TextInput = TextInput(doc="name of the fluid in CoolProp, for other stored states", default=None)
    species: TextInput = TextInput(doc="formula key of an unreacting gas in the species data, for cold gas", default=None)
    hazard: TextInput = TextInput(doc="one line on what can hurt", default=None)
    source: TextInput = TextInput(doc="where the enthalpy comes from", default=None)
    library_name: CustomInput = CustomInput(
        doc="name of a row of the library, instead of formula and enthalpy", reader=read.library_name, default=None
    )

    molar_mass = QuantityResult(source="Atomic weights of Cantera.", doc="mass of one mole of the formula")
    molar_enthalpy = QuantityResult(source="definition", doc="assigned enthalpy per mole of the formula")
    specific_enthalpy = QuantityResult(source="definition", doc="assigned enthalpy per mass")
    oxygen_balance = NumberResult(source="definition", doc="oxygen left over or missing, over the mass")

    @classmethod
    def from_library(cls, name: str, *, library: str | Path | None = None) -> Propellant:
        """Return a propellant of the library that comes with propkit, or of a TOML file of one's own.

        Parameters
        ----------
        name : str
            Library name.
        library : str or Path, optional
            A library file; the propellant then holds the values of the row itself and no longer needs the file.

        Returns
        -------
        Propellant
            The propellant.

        Raises
        ------
        InputError
            For an unknown name (near matches are named), or a bad file: file, row and field.
        StorageError
            When the file cannot be read.
        """
        if library is None:
            return Propellant(library_name=library_data.find(name, input_name="name").name)
        return of_row(library_data.find(name, library_data.load_library(library), "name"))

    # -- calculation -----------------------------------------------------------------------------

    def _check(self, bad: set[str]) -> list[Problem]:
        typed = self._typed
        problems = []
        if "name" in typed and not str(self._values["name"] or "").strip():
            problems.append(Problem("name", repr(typed["name"]), "a name with letters, or left out", "The formula then stands for it."))
        if "heat_capacity_range" in typed and not {"heat_capacity", "library_name"} & (set(typed) | bad):
            problems.append(Problem("heat_capacity_range", "given alone", "given together with heat_capacity"))
        if "library_name" in typed or "library_name" in bad:
            beside = [name for name in typed if name in _OWN_ONLY]
            hints = {name: _STORED_ELSEWHERE if name in ("temperature", "pressure") else _STATED_ELSEWHERE for name in beside}
            return problems + [Problem(name, "given beside library_name", "left out", hints[name]) for name in beside]
        for name, example in (("formula", '"C H1.95"'), ("enthalpy", '"-24.717 kJ/mol"')):
            if name not in typed and name not in bad:
                hint = "Or take a row of the library: pk.Propellant.from_library(name)." if name == "formula" else ""
                problems.append(Problem(name, "missing", f"given, for example {name}={example}", hint))
        return problems

    def _calculate(self) -> Outcome:
        row = self._make_row()
        results = {
            "molar_mass": row.molar_mass,
            "molar_enthalpy": row.molar_enthalpy,
            "specific_enthalpy": row.specific_enthalpy,
        }
        results |= {name: float(value) for name in _FIGURES if (value := getattr(row, name)) is not None}
        absent = {name: f"The data of {row.name} have no {name}." for name in _FIGURES if name not in results}
        if all(symbol in VALENCES for symbol in row.elements):
            per_mass = {symbol: count / row.molar_mass for symbol, count in row.element_counts}
            results["oxygen_balance"] = float(oxygen_balance(per_mass, ATOMIC_WEIGHTS["O"] * 1e-3))
        else:
            absent["oxygen_balance"] = f"An element of {row.name} has no valence here."
        return Outcome(results=results, absent=absent, doubts=tuple(self._doubts(row)), held=row)

    def _make_row(self) -> PropellantRow:
        if self._values["library_name"] is not None:
            return read.changed_row(library_data.find(self._values["library_name"]), self._values, self._typed)
        return read.row_of(self._values)

    def _doubts(self, row: PropellantRow) -> Iterator[Doubt]:
        if row.trust == "weak":
            text = f"The enthalpy of {row.name} is an estimate or its sources disagree. {row.note}".strip()
            yield Doubt(text, code="weak-enthalpy", about="specific_enthalpy")
        if row.heat_capacity is not None and row.heat_capacity_range is None:
            text = f"No range was given for the specific heat of {row.name}."
            yield Doubt(text, code="no-range", about="heat_capacity")

    # -- access ----------------------------------------------------------------------------------

    @property
    def row(self) -> PropellantRow:
        """Everything about the propellant as SI floats and texts, read-only."""
        found: PropellantRow = self._outcome.held
        return found

    @property
    def elements(self) -> pd.Series[float]:
        """Atoms of one formula unit: index element symbol, value count [1]."""
        import pandas as pd

        return pd.Series(self.row.elements, name="elements", dtype=float).rename_axis("element")

    @property
    def label(self) -> str:
        """What to call it in a line of text: the analyst's name, the library name, or the formula."""
        return self.row.name

    @property
    def roles(self) -> tuple[str, ...]:
        """Everything it can serve as, the main role first; empty where nobody stated one."""
        return self.row.roles

    def stream(self, temperature: float | None = None, pressure: float | None = None, role: str = "") -> tuple[Stream, tuple[str, ...]]:
        """Return the propellant as a stream at a stored state, and what to doubt about it.

        Parameters
        ----------
        temperature, pressure : float, optional
            State as stored or fed [K], [Pa]; that of the propellant's data unless given.
        role : str
            Use of the stream (``"fuel"``), for the name of the input in an error text.

        Returns
        -------
        Stream, tuple of str
            Atoms [mol/kg], enthalpy [J/kg], density [kg/m3]; warnings of the propellant and of the stored state.

        Raises
        ------
        InputError, RangeError, MissingExtraError
            As `propkit.bridge.stored_state.stored_state`.
        """
        row = self.row
        state = stored_state(row, temperature, pressure, f"{role}_temperature" if role else "temperature")
        atoms = {symbol: count / row.molar_mass for symbol, count in row.element_counts}
        enthalpy = row.specific_enthalpy + state.enthalpy_change / row.molar_mass
        density = float("nan") if state.density is None else state.density
        doubts = [*(str(doubt) for doubt in self.warnings), *state.warnings]
        if row.phase == "gas" and pressure is None and row.density is not None:
            where = f"; give {role}_pressure" if role else ""
            doubts.append(f"The density of {row.name} is that of the gas at {state.pressure / 1e5:.3g} bar{where}.")
        return Stream(atoms, enthalpy, density), tuple(doubts)

    def attribute(self, name: str) -> Any:
        """Return what reading `name` gives: a fresh quantity, a float or a text; None where the data have none."""
        row = self.row
        if name in (
            "name",
            "formula",
            "phase",
            "hazard",
            "source",
            "saturated",
            "coolprop_fluid",
            "species",
            "heat_capacity_range",
        ):
            return getattr(row, name)
        if name == "role":
            return row.roles[0] if row.roles else None
        if name == "enthalpy":
            return units.quantity(row.molar_enthalpy, "J/mol")
        entry: Declared | None = getattr(type(self), name, None)
        if name not in _FIGURES or entry is None:
            return super().attribute(name)
        value = self._outcome.results.get(name)
        return None if value is None else units.quantity(value, entry.quantity.unit)

    # -- display ---------------------------------------------------------------------------------

    def _code(self, names: Mapping[int, str]) -> str:
        if list(self._typed) == ["library_name"]:
            return f"pk.Propellant.from_library({self._typed['library_name']!r})"
        return super()._code(names)

    def recipe(self) -> dict[str, Any]:
        """Return a JSON-able mapping that rebuilds this propellant."""
        made = super().recipe()
        bounds = made["inputs"].get("heat_capacity_range")
        if bounds is not None:
            made["inputs"]["heat_capacity_range"] = list(bounds)
        return made

    def subtitle(self) -> str:
        """Return the propellant in plain words."""
        row = self.row
        return row.title if row.title == row.name else f"{row.name}: {row.title}"

    def shows_input(self, name: str) -> bool:
        """Show what was given."""
        return name in self._typed

    def input_text(self, name: str) -> str:
        """Return an input of a kind of its own as text."""
        value = self._values[name]
        if name == "enthalpy":
            unit, enthalpy = value
            return f"{enthalpy / 1e3:.6g} k{unit}"
        if name == "heat_capacity_range":
            return f"{value[0]:g} to {value[1]:g} K"
        return ", ".join(value) if name == "role" else str(value)

    def cautions(self) -> tuple[str, ...]:
        """Return the hazard line."""
        row = self.row
        return (f"{row.name}: {row.hazard}",) if row.hazard else ()

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield storage limits, state and sources, and what other sources give."""
        limits = propellant_sheet.limits(self, (*_FIGURES[1:3], *_LIMITS), system)
        if limits.rows:
            yield limits
        yield propellant_sheet.about(self.row)
        if self.row.other_values:
            yield propellant_sheet.other_values(self.row, system)

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return what the propellant is made of: mass fraction of each element."""
        return (propellant_sheet.element_bars(self.row),)


def of_row(row: PropellantRow) -> Propellant:
    """Return a propellant that holds the values of a row itself, so that it no longer needs its library file."""
    if not row.library:
        return Propellant(library_name=row.name)
    if row.components:
        from propkit.model.blend import Blend

        given: dict[str, Any] = {
            "mixing_enthalpy": row.mixing_enthalpy,
            "density": row.density,
            "role": ", ".join(row.roles),
        }
        given |= {"hazard": row.hazard[:200], "source": row.source[:200], "name": row.name}
        parts = tuple((of_row(part) if part.library else part.name, share) for part, share in row.components)
        return Blend(parts, **{name: value for name, value in given.items() if value is not None})
    return Propellant(**read.inputs_of(row))


def as_propellant(name: str, value: Any) -> Propellant:
    """Return a propellant from a library name, a propellant, or ingredients with their mass fractions.

    Parameters
    ----------
    name : str
        Name of the input, for the error text.
    value : str, Propellant or mapping
        What was given; ``{"LOX": 0.7, "LF2": 0.3}`` is a blend by mass.

    Returns
    -------
    Propellant
        The propellant.

    Raises
    ------
    InputError
        For an unknown name, with near matches, or a value that is none of these.
    """
    if isinstance(value, Propellant):
        return value
    if isinstance(value, str):
        return Propellant(library_name=library_data.find(value, input_name=name).name)
    if isinstance(value, Mapping):
        from propkit.model.blend import blend

        return blend(value)
    raise InputError(Problem(name, as_text(value), "a library name or a pk.Propellant", 'For example "LOX".'))


def load_propellants(path: str | Path) -> Mapping[str, Propellant]:
    """Return the propellants of a TOML file of one's own.

    Parameters
    ----------
    path : str or Path
        A library file; propkit/data/README.md has its fields.

    Returns
    -------
    Mapping
        Library name -> propellant, in the order of the file.

    Raises
    ------
    InputError
        For a bad file: file, row and field of everything wrong are listed.
    StorageError
        When the file cannot be read.
    """
    return MappingProxyType({name: of_row(row) for name, row in library_data.load_library(path).items()})
