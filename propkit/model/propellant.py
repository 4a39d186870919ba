"""`Propellant`: one propellant or ingredient, from the library or of the analyst's own."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace as changed
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar, Self

from propkit import units
from propkit.bridge.stored_state import stored_state
from propkit.chain.case import Stream
from propkit.constants import REFERENCE_PRESSURE, REFERENCE_TEMPERATURE
from propkit.data import propellants as library_data
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.formula import molar_mass, parse_formula
from propkit.data.propellant_row import PHASES, ROLES, PropellantRow
from propkit.errors import InputError, Problem
from propkit.model import propellant_sheet
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import (
    Bounds,
    ChoiceInput,
    CustomInput,
    Declared,
    NumberResult,
    QuantityInput,
    QuantityResult,
    TextInput,
    as_text,
)
from propkit.model.doubts import Doubt
from propkit.model.propellant_table import propellants
from propkit.physics.stoichiometry import VALENCES, net_valence
from propkit.report import Section, UnitSystem
from propkit.series import Figure

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Propellant", "as_propellant", "of_row", "propellants"]

_WITH_LIBRARY_NAME = (
    "name",
    "library_name",
    "enthalpy",
    "density",
    "role",
    "hazard",
    "source",
    "heat_capacity",
    "heat_capacity_range",
)
_STATED_ELSEWHERE = (
    "A row of the library brings its own; give formula and enthalpy instead of library_name for another."
)


def _read_enthalpy(name: str, value: Any) -> tuple[str, float]:
    """Return (unit, value in it): J/mol of the formula or J/kg; a bare number could be either and is refused."""
    if not isinstance(value, str) and not hasattr(value, "units"):
        hint = 'A number alone could be per mole or per mass: write "-24.717 kJ/mol" (of the formula) or "-1768 kJ/kg".'
        raise InputError(Problem(name, as_text(value), "an enthalpy with its unit", hint))
    for unit in ("J/mol", "J/kg"):
        try:
            return unit, units.to_si(value, unit, name)
        except InputError:
            continue
    try:
        units.to_si(value, "J/mol", name)
    except InputError as error:
        problem = error.problems[0]
        allowed = 'an enthalpy per mole of the formula or per mass, for example "-24.717 kJ/mol" or "-1768 kJ/kg"'
        raise InputError(Problem(name, problem.value, allowed, problem.hint)) from error
    raise AssertionError


def _read_range(name: str, value: Any) -> tuple[float, float]:
    """Return two temperatures [K], the lower first."""
    allowed = 'two temperatures, the lower first, for example ("260 K", "340 K")'
    if not isinstance(value, list | tuple) or len(value) != 2:
        raise InputError(Problem(name, as_text(value), allowed))
    low, high = (units.to_si(entry, "K", name) for entry in value)
    if not 0.0 < low < high:
        raise InputError(Problem(name, as_text(value), allowed))
    return low, high


def _read_formula(name: str, value: Any) -> str:
    parse_formula(value, name)
    return str(value)


def _read_library_name(name: str, value: Any) -> str:
    return library_data.find(value, input_name=name).name


class Propellant(Calculation):
    """One propellant or ingredient.

    Notes
    -----
    Enthalpies are on the scale of formation enthalpies at 298.15 K: zero for O2, H2, N2, F2, Cl2 gas, graphite and
    aluminium at 298.15 K and 1 bar. `row` has everything as SI floats.
    """

    kind: ClassVar[str] = "propellant"
    title: ClassVar[str] = "Propellant"
    headline: ClassVar[tuple[str, ...]] = ("specific_enthalpy", "density")

    formula: CustomInput = CustomInput(
        doc='atoms of one formula unit, for example "C H1.95"', reader=_read_formula, default=None
    )
    enthalpy: CustomInput = CustomInput(
        doc="assigned enthalpy at the given temperature, per mole of the formula or per mass",
        reader=_read_enthalpy,
        default=None,
    )
    density: QuantityInput = QuantityInput(
        doc="density at the state of the propellant", default=None, bounds=Bounds(above=0.0, at_most=25_000.0)
    )
    temperature: QuantityInput = QuantityInput(
        doc="temperature that the enthalpy is for; 298.15 K unless given",
        default=None,
        bounds=Bounds(above=0.0, at_most=2000.0),
    )
    pressure: QuantityInput = QuantityInput(
        doc="pressure of the propellant; 1 bar unless given", default=None, bounds=Bounds(above=0.0, at_most=1e9)
    )
    role: ChoiceInput = ChoiceInput(choices=ROLES, doc="what it serves as; not checked where not given", default=None)
    phase: ChoiceInput = ChoiceInput(choices=PHASES, doc="state of aggregation; liquid unless given", default=None)
    heat_capacity: QuantityInput = QuantityInput(
        doc="specific heat, for other stored temperatures", default=None, bounds=Bounds(above=0.0, at_most=1e5)
    )
    heat_capacity_range: CustomInput = CustomInput(
        doc="temperatures between which the specific heat holds", reader=_read_range, default=None
    )
    hazard: TextInput = TextInput(doc="one line on what can hurt", default=None)
    source: TextInput = TextInput(doc="where the enthalpy comes from", default=None)
    library_name: CustomInput = CustomInput(
        doc="name of a row of the library, instead of formula and enthalpy", reader=_read_library_name, default=None
    )

    molar_mass: QuantityResult = QuantityResult(
        source="Atomic weights of Cantera.", doc="mass of one mole of the formula"
    )
    molar_enthalpy: QuantityResult = QuantityResult(doc="assigned enthalpy per mole of the formula")
    specific_enthalpy: QuantityResult = QuantityResult(doc="assigned enthalpy per mass")
    oxygen_balance: NumberResult = NumberResult(doc="oxygen left over or missing, over the mass")
    freezing_point: QuantityResult = QuantityResult(doc="freezing point")
    boiling_point: QuantityResult = QuantityResult(doc="boiling point at 101.325 kPa")
    vapour_pressure: QuantityResult = QuantityResult(doc="vapour pressure at 298.15 K")

    @classmethod
    def from_library(cls, name: str, *, library: str | Path | None = None) -> Propellant:
        """Return a propellant of the library that comes with propkit, or of a TOML file of one's own.

        Parameters
        ----------
        name : str
            Library name.
        library : str or Path, optional
            A library file; the propellant then holds the values of the row itself and no longer needs the file.

        Raises
        ------
        InputError
            For an unknown name (near matches are named), or a bad file: file, row and field.
        StorageError
            When the file cannot be read.
        """
        if library is None:
            return Propellant(library_name=name)
        row = library_data.find(name, library_data.load_library(library), "name")
        return of_row(row)

    # -- calculation -----------------------------------------------------------------------------

    def _check(self, bad: set[str]) -> list[Problem]:
        typed = self._typed
        if "library_name" in typed or "library_name" in bad:
            return [
                Problem(name, "given beside library_name", "left out", _STATED_ELSEWHERE)
                for name in typed
                if name not in _WITH_LIBRARY_NAME
            ]
        problems = []
        if "formula" not in typed and "formula" not in bad:
            problems.append(
                Problem(
                    "formula", "missing", 'given, for example formula="C H1.95"', "Or pk.Propellant.from_library(name)."
                )
            )
        if "enthalpy" not in typed and "enthalpy" not in bad:
            problems.append(Problem("enthalpy", "missing", 'given, for example enthalpy="-24.717 kJ/mol"', ""))
        if "heat_capacity_range" in typed and "heat_capacity" not in typed and "heat_capacity" not in bad:
            problems.append(Problem("heat_capacity_range", "given alone", "given together with heat_capacity"))
        return problems

    def _calculate(self) -> Outcome:
        row = self._make_row()
        results = {
            "molar_mass": row.molar_mass,
            "molar_enthalpy": row.molar_enthalpy,
            "specific_enthalpy": row.specific_enthalpy,
        }
        for name in (
            "density",
            "temperature",
            "pressure",
            "heat_capacity",
            "freezing_point",
            "boiling_point",
            "vapour_pressure",
        ):
            value = getattr(row, name)
            if value is not None:
                results[name] = float(value)
        absent = {
            name: f"{row.name} has no {name} in its data"
            for name in ("density", "freezing_point", "boiling_point", "vapour_pressure")
        }
        if all(symbol in VALENCES for symbol in row.elements):
            results["oxygen_balance"] = -net_valence(row.elements) / 2.0 * ATOMIC_WEIGHTS["O"] * 1e-3 / row.molar_mass
        return Outcome(results=results, absent=absent, doubts=tuple(self._doubts(row)), held=row)

    def _make_row(self) -> PropellantRow:
        values = self._values
        if values["library_name"] is not None:
            return self._with_changes(library_data.find(values["library_name"]))
        elements = parse_formula(values["formula"])
        mass = molar_mass(elements)
        unit, enthalpy = values["enthalpy"]
        bounds = values["heat_capacity_range"]
        return PropellantRow(
            name=values["name"] or values["formula"],
            title=values["name"] or values["formula"],
            roles=() if values["role"] is None else (values["role"],),
            phase=values["phase"] or "liquid",
            formula=" ".join(values["formula"].split()),
            element_counts=tuple(elements.items()),
            molar_mass=mass,
            molar_enthalpy=enthalpy if unit == "J/mol" else enthalpy * mass,
            temperature=values["temperature"] or REFERENCE_TEMPERATURE,
            pressure=values["pressure"] or REFERENCE_PRESSURE,
            hazard=values["hazard"] or "",
            source=values["source"] or "as given",
            trust="",
            density=values["density"],
            density_source="as given" if values["density"] is not None else "",
            heat_capacity=values["heat_capacity"],
            heat_capacity_range=bounds,
            heat_capacity_source="as given" if values["heat_capacity"] is not None else "",
        )

    def _with_changes(self, row: PropellantRow) -> PropellantRow:
        """Return a library row with what the analyst gave instead."""
        values, typed = self._values, self._typed
        changes: dict[str, Any] = {
            name: values[name] for name in ("hazard", "source", "heat_capacity_range") if name in typed
        }
        for name in ("density", "heat_capacity"):
            if name in typed:
                changes |= {name: values[name], f"{name}_source": "as given"}
        if "density" in typed:
            changes["density_temperature"] = None
        if "role" in typed:
            changes["roles"] = (values["role"],)
        if "enthalpy" in typed:
            unit, enthalpy = values["enthalpy"]
            changes["molar_enthalpy"] = enthalpy if unit == "J/mol" else enthalpy * row.molar_mass
            changes.setdefault("source", "as given")
        if values["name"]:
            changes["name"] = values["name"]
        return changed(row, **changes) if changes else row

    def _doubts(self, row: PropellantRow) -> Iterator[Doubt]:
        if row.trust == "weak":
            yield Doubt(
                f"The enthalpy of {row.name} is an estimate or its sources disagree. {row.note}".strip(),
                code="weak enthalpy",
                about="specific_enthalpy",
            )
        if row.heat_capacity is not None and row.heat_capacity_range is None:
            yield Doubt(
                f"No range was given for the specific heat of {row.name}.", code="no range", about="heat_capacity"
            )

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

    def stream(
        self, temperature: float | None = None, pressure: float | None = None, role: str = ""
    ) -> tuple[Stream, tuple[str, ...]]:
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
            Atoms [mol/kg], enthalpy [J/kg], density [kg/m3]; warnings.
        """
        row = self.row
        name = f"{role}_temperature" if role else "temperature"
        state = stored_state(row, temperature, pressure, name)
        atoms = {symbol: count / row.molar_mass for symbol, count in row.element_counts}
        enthalpy = row.specific_enthalpy + state.enthalpy_change / row.molar_mass
        density = float("nan") if state.density is None else state.density
        return Stream(atoms, enthalpy, density), state.warnings

    def attribute(self, name: str) -> Any:
        """Return what reading `name` gives: a fresh quantity, a float or a text; None where the data have none."""
        if name == "name":
            return self.row.name
        if name == "role":
            return self.row.roles[0] if self.row.roles else None
        if name in ("formula", "phase", "hazard", "source"):
            return getattr(self.row, name)
        if name == "heat_capacity_range":
            return self.row.heat_capacity_range
        if name == "enthalpy":
            return units.quantity(self.row.molar_enthalpy, "J/mol")
        entry: Declared | None = getattr(type(self), name, None)
        if not isinstance(entry, Declared):
            return super().attribute(name)
        value = self._outcome.results.get(name, self._values.get(name))
        if isinstance(value, int | float) and entry.quantity.unit:
            return units.quantity(value, entry.quantity.unit)
        return value

    # -- display ---------------------------------------------------------------------------------

    @property
    def _from_row_alone(self) -> bool:
        return [name for name in self._typed if name != "name"] == ["library_name"] and not self._values["name"]

    def _code(self, names: Mapping[int, str]) -> str:
        if self._from_row_alone:
            return f"pk.Propellant.from_library({self._typed['library_name']!r})"
        return super()._code(names)

    def subtitle(self) -> str:
        """Return the propellant in plain words."""
        row = self.row
        return row.title if row.title == row.name else f"{row.name}: {row.title}"

    def input_text(self, name: str) -> str:
        """Return an input of a kind of its own as text."""
        value = self._values[name]
        if name == "enthalpy":
            unit, enthalpy = value
            return f"{enthalpy / 1e3:.6g} k{unit}"
        if name == "heat_capacity_range":
            return f"{value[0]:g} to {value[1]:g} K"
        return str(value)

    def cautions(self) -> tuple[str, ...]:
        """Return the hazard line."""
        row = self.row
        return (f"{row.name}: {row.hazard}",) if row.hazard else ()

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield identity, storage and source of the row, and what other sources give."""
        yield propellant_sheet.about(self.row)
        if self.row.other_values:
            yield propellant_sheet.other_values(self.row, system)

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return what the propellant is made of: mass fraction of each element."""
        return (propellant_sheet.element_bars(self.row),)

    def recipe(self) -> dict[str, Any]:
        """Return a JSON-able mapping that rebuilds this propellant."""
        made = super().recipe()
        made["object"] = "Propellant"
        return made

    def with_name(self, name: str) -> Self:
        """Return the same propellant under another name."""
        return self.replace(name=name)


def of_row(row: PropellantRow) -> Propellant:
    """Return a propellant that holds the values of a row itself, so that it no longer needs its library file."""
    if not row.library:
        return Propellant(library_name=row.name)
    from propkit.data.formula import formula_text

    given: dict[str, Any] = {
        "name": row.name,
        "formula": formula_text(row.elements, digits=17),
        "enthalpy": f"{row.molar_enthalpy!r} J/mol",
        "temperature": row.temperature,
        "pressure": row.pressure,
        "phase": row.phase,
        "role": row.role,
        "hazard": row.hazard[:200],
        "source": row.source[:200],
    }
    for name in ("density", "heat_capacity", "heat_capacity_range"):
        if (value := getattr(row, name)) is not None:
            given[name] = value
    return Propellant(**given)


def as_propellant(name: str, value: Any) -> Propellant:
    """Return a propellant from a library name or a propellant: the reader of inputs that take one.

    Raises
    ------
    InputError
        For an unknown name, with near matches, or a value that is neither.
    """
    if isinstance(value, Propellant):
        return value
    if isinstance(value, str):
        return Propellant(library_name=library_data.find(value, input_name=name).name)
    raise InputError(Problem(name, as_text(value), "a library name or a pk.Propellant", 'For example "LOX".'))
