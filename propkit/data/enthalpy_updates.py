"""Enthalpies of formation newer than those of NASA TM-4513: the table behind the basis "tm4513+atct"."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources

FILE = "enthalpy_updates.csv"


@dataclass(frozen=True, slots=True)
class EnthalpyUpdate:
    """A newer enthalpy of formation of one gas species.

    Parameters
    ----------
    species : str
        Key of the species.
    cas : str
        CAS registry number.
    enthalpy : float
        Enthalpy of formation at 298.15 K, ideal gas [J/mol].
    source : str
        Key of the bibliography.
    """

    species: str
    cas: str
    enthalpy: float
    source: str


@lru_cache(maxsize=1)
def enthalpy_updates() -> tuple[EnthalpyUpdate, ...]:
    """Return the rows of the table, in the order of the file."""
    text = resources.files("propkit.data").joinpath(FILE).read_text(encoding="utf-8")
    return tuple(
        EnthalpyUpdate(row["species"], row["cas"], 1e3 * float(row["enthalpy_kJ_mol"]), row["source"])
        for row in csv.DictReader(text.splitlines())
    )
