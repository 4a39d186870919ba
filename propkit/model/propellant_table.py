"""The library as a table: to search, to sort, to print."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from propkit.data import propellants as library_data
from propkit.data.propellant_row import PropellantRow

if TYPE_CHECKING:
    import pandas as pd


def propellants(library: str | Path | None = None) -> pd.DataFrame:
    """Return the library as a table, to search and to sort.

    Parameters
    ----------
    library : str or Path, optional
        A library file of one's own; the library that comes with propkit unless given.

    Returns
    -------
    DataFrame
        Index library name; columns title, role (the main one), roles, phase, formula, enthalpy (assigned, J/mol of the
        formula), specific_enthalpy, molar_mass, temperature and pressure of the row, density, freezing_point,
        boiling_point, vapour_pressure, hazard, source, trust, note. Numbers are SI floats; units in ``attrs["units"]``.
    """
    import pandas as pd

    rows = library_data.library() if library is None else library_data.load_library(library)
    frame = pd.DataFrame.from_records([_record_of(row) for row in rows.values()], index=pd.Index(list(rows), name="name"))
    frame.attrs["units"] = dict(_FRAME_UNITS)
    return frame


_FRAME_UNITS = {
    "enthalpy": "J/mol",
    "specific_enthalpy": "J/kg",
    "molar_mass": "kg/mol",
    "temperature": "K",
    "pressure": "Pa",
    "density": "kg/m**3",
    "freezing_point": "K",
    "boiling_point": "K",
    "vapour_pressure": "Pa",
}


def _record_of(row: PropellantRow) -> dict[str, Any]:
    nothing = float("nan")
    return {
        "title": row.title,
        "role": row.role,
        "roles": ", ".join(row.roles),
        "phase": row.phase,
        "formula": row.formula,
        "enthalpy": row.molar_enthalpy,
        "specific_enthalpy": row.specific_enthalpy,
        "molar_mass": row.molar_mass,
        "temperature": row.temperature,
        "pressure": row.pressure,
        "density": nothing if row.density is None else row.density,
        "freezing_point": nothing if row.freezing_point is None else row.freezing_point,
        "boiling_point": nothing if row.boiling_point is None else row.boiling_point,
        "vapour_pressure": nothing if row.vapour_pressure is None else row.vapour_pressure,
        "hazard": row.hazard,
        "source": row.source,
        "trust": row.trust,
        "note": " ".join(text for text in (row.note, row.impulse_note) if text),
    }
