"""The thermodynamic data bases: NASA TM-4513 species as Cantera ships them, at 1 bar, with newer enthalpies where asked.

A `Basis` hands out plain tables of numbers; no Cantera object outlives the call that made it. Charged species are left
out, and so are the four solids whose data have another form (chromium, nickel, alpha iron, alpha zinc sulfate).
"""

from __future__ import annotations

import hashlib
import threading
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import lru_cache
from typing import Any, Final

import numpy as np

from propkit.bridge.species_names import formula_key
from propkit.constants import GAS_CONSTANT, REFERENCE_PRESSURE
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.enthalpy_updates import enthalpy_updates
from propkit.errors import InputError, Problem, near_matches
from propkit.physics.thermodynamics import SpeciesTable

BASES: Final = ("tm4513+atct", "tm4513")
"""Names of the bases, the default first."""

_TITLES: Final = {
    "tm4513": "NASA TM-4513 species data at 1 bar",
    "tm4513+atct": "NASA TM-4513 species data at 1 bar, radical enthalpies from the Active Thermochemical Tables",
}
_FILES: Final = {False: "nasa_gas.yaml", True: "nasa_condensed.yaml"}
_CONDENSED_MOLAR_VOLUME: Final = 1e-12
"""Molar volume [m3/kmol] that stands for zero where Cantera needs one."""

_lock = threading.Lock()


@dataclass(frozen=True, slots=True)
class _Record:
    """One species as read: key, name in the file, atoms, the range [K] and the seven coefficients of each half."""

    key: str
    file_name: str
    atoms: tuple[tuple[str, float], ...]
    temperatures: tuple[float, float, float]
    low: tuple[float, ...]
    high: tuple[float, ...]
    condensed: bool


@dataclass(frozen=True, eq=False)
class Basis:
    """A thermodynamic data basis.

    Parameters
    ----------
    name : str
        One of `BASES`.
    title : str
        One line for people.
    """

    name: str
    title: str
    _records: tuple[_Record, ...] = field(repr=False)
    _tables: dict[tuple[tuple[str, ...], bool], SpeciesTable] = field(default_factory=dict, repr=False)

    def table(self, elements: Sequence[str], condensed: bool = False) -> SpeciesTable:
        """Return every neutral species whose elements all occur in `elements`.

        Parameters
        ----------
        elements : sequence of str
            Chemical symbols; they fix the order of the columns of the composition.
        condensed : bool
            Whether liquids and solids follow the gases.

        Returns
        -------
        SpeciesTable
            The table; the same object for the same question.

        Raises
        ------
        InputError
            When a symbol is not an element of the data.
        """
        key = (tuple(elements), condensed)
        with _lock:
            if key not in self._tables:
                self._tables[key] = self._build(*key)
            return self._tables[key]

    def _build(self, elements: tuple[str, ...], condensed: bool) -> SpeciesTable:
        if len(set(elements)) != len(elements):
            raise InputError(Problem("elements", str(elements), "different chemical symbols"))
        records = self._chosen(elements, condensed)
        known = {symbol for record in records for symbol, _ in record.atoms}
        missing = [symbol for symbol in elements if symbol not in known]
        if missing:
            hint = "Neither basis has a species that holds it."
            raise InputError([Problem("elements", repr(symbol), "an element of the species data", hint) for symbol in missing])
        composition = np.array([[dict(record.atoms).get(symbol, 0.0) for symbol in elements] for record in records])
        weights = np.array([atomic_weight(symbol) for symbol in elements])
        temperatures = np.array([record.temperatures for record in records])
        return SpeciesTable(
            names=tuple(record.key for record in records),
            elements=elements,
            composition=composition,
            molar_mass=composition @ weights,
            temperature_low=temperatures[:, 0].copy(),
            temperature_mid=temperatures[:, 1].copy(),
            temperature_high=temperatures[:, 2].copy(),
            coefficients_low=np.array([record.low for record in records]),
            coefficients_high=np.array([record.high for record in records]),
            condensed=np.array([record.condensed for record in records]),
            reference_pressure=REFERENCE_PRESSURE,
        )

    def _chosen(self, elements: Sequence[str], condensed: bool) -> list[_Record]:
        inside = set(elements)
        return [
            record
            for record in self._records
            if (condensed or not record.condensed) and all(symbol in inside for symbol, _ in record.atoms)
        ]

    def checksum(self, elements: Sequence[str], condensed: bool = False) -> str:
        """Return the checksum of the data of a case, over canonical arrays and not over a file.

        Parameters
        ----------
        elements : sequence of str
            Chemical symbols, in any order.
        condensed : bool
            Whether liquids and solids are included.

        Returns
        -------
        str
            "sha256:" and the digest of names, compositions, ranges, coefficients, gas constant and reference pressure.
        """
        table = self.table(tuple(sorted(elements)), condensed)
        order = sorted(range(len(table.names)), key=table.names.__getitem__)
        digest = hashlib.sha256()
        digest.update("\n".join([*table.elements, *(table.names[row] for row in order)]).encode())
        for part in (table.composition, table.molar_mass, table.temperature_low, table.temperature_mid, table.temperature_high,
                     table.coefficients_low, table.coefficients_high, table.condensed.astype(np.float64)):  # fmt: skip
            digest.update(np.ascontiguousarray(part[order], dtype="<f8").tobytes())
        digest.update(np.array([table.reference_pressure, GAS_CONSTANT], dtype="<f8").tobytes())
        return f"sha256:{digest.hexdigest()}"

    def cantera_solution(self, elements: Sequence[str]) -> Any:
        """Return a fresh `cantera.Solution` of the gas species of a case: 1 bar, the enthalpies of this basis.

        Parameters
        ----------
        elements : sequence of str
            Chemical symbols; they fix the order of the elements.

        Returns
        -------
        cantera.Solution
            An ideal-gas phase whose species carry the keys of `table(elements)`, in the same order.
        """
        import cantera

        return cantera.Solution(thermo="ideal-gas", kinetics="none", species=self.cantera_species(elements))

    def cantera_species(self, elements: Sequence[str], condensed: bool = False) -> list[Any]:
        """Return fresh `cantera.Species` with the data of `table(elements, condensed)`, in the same order.

        Parameters
        ----------
        elements : sequence of str
            Chemical symbols.
        condensed : bool
            Whether liquids and solids follow the gases. They carry a molar volume of nearly zero, because Cantera
            would else take a density of 0.001 kg/m3.

        Returns
        -------
        list of cantera.Species
            The species.
        """
        import cantera

        made = []
        for record in self._chosen(elements, condensed):
            low, mid, high = record.temperatures
            species = cantera.Species(record.key, dict(record.atoms))
            coefficients = np.concatenate([[mid], record.high, record.low])
            species.thermo = cantera.NasaPoly2(low, high, REFERENCE_PRESSURE, coefficients)
            made.append(species)
        return made


def atomic_weight(symbol: str) -> float:
    """Return the atomic weight of an element [kg/mol], Cantera's.

    Parameters
    ----------
    symbol : str
        Chemical symbol.

    Returns
    -------
    float
        Atomic weight [kg/mol].

    Raises
    ------
    InputError
        When there is no such element with an atomic weight.
    """
    if symbol == "D":
        return _DEUTERIUM
    if symbol not in ATOMIC_WEIGHTS:
        near = ", ".join(near_matches(symbol, ATOMIC_WEIGHTS))
        raise InputError(Problem("element", repr(symbol), "a chemical symbol", f"Near: {near}." if near else ""))
    return ATOMIC_WEIGHTS[symbol] * 1e-3


_DEUTERIUM: Final = 2.0141017781e-3
"""Atomic mass of deuterium [kg/mol], Cantera's isotope value."""


@lru_cache(maxsize=len(BASES))
def load_basis(name: str = BASES[0]) -> Basis:
    """Return a thermodynamic data basis.

    Parameters
    ----------
    name : str
        One of `BASES`.

    Returns
    -------
    Basis
        The basis; loaded once, safe to share between threads.

    Raises
    ------
    InputError
        When there is no such basis.
    """
    if name not in BASES:
        raise InputError(Problem("thermo_basis", repr(name), "one of " + ", ".join(repr(known) for known in BASES)))
    records = _read()
    if name.endswith("+atct"):
        records = _updated(records)
    return Basis(name=name, title=_TITLES[name], _records=records)


@lru_cache(maxsize=1)
def _read() -> tuple[_Record, ...]:
    """Return all species of both files in the order of the files, gases first."""
    import cantera

    records = []
    for condensed, file in _FILES.items():
        for species in cantera.Species.list_from_file(file):
            usable = isinstance(species.thermo, cantera.NasaPoly2) and not species.charge and not species.name.endswith("+")
            if usable and "E" not in species.composition:
                records.append(_record(species, condensed))
    return tuple(records)


def _record(species: Any, condensed: bool) -> _Record:
    coefficients = species.thermo.coeffs
    mid = min(float(coefficients[0]), float(species.thermo.max_temp))
    return _Record(
        key=formula_key(species.name),
        file_name=species.name,
        atoms=tuple((symbol, float(count)) for symbol, count in species.composition.items()),
        temperatures=(float(species.thermo.min_temp), mid, float(species.thermo.max_temp)),
        low=tuple(float(value) for value in coefficients[8:15]),
        high=tuple(float(value) for value in coefficients[1:8]),
        condensed=condensed,
    )


def _updated(records: tuple[_Record, ...]) -> tuple[_Record, ...]:
    """Return the records with the enthalpy constant of both ranges shifted to the newer enthalpy of formation."""
    updates = {update.species: update.enthalpy for update in enthalpy_updates()}
    changed = []
    for record in records:
        if record.condensed or record.key not in updates:
            changed.append(record)
            continue
        shift = updates[record.key] / GAS_CONSTANT - reference_enthalpy(record)
        low, high = ((*part[:5], part[5] + shift, *part[6:]) for part in (record.low, record.high))
        changed.append(replace(record, low=low, high=high))
    return tuple(changed)


def reference_enthalpy(record: _Record, temperature: float = 298.15) -> float:
    """Return h/R [K] of a record at 298.15 K, from the coefficients of its lower range."""
    a, t = record.low, temperature
    return t * (a[0] + t * (a[1] / 2 + t * (a[2] / 3 + t * (a[3] / 4 + t * a[4] / 5)))) + a[5]
