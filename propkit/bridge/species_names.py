"""From the names of a species data file to the formulas that propkit shows: "H2O", "C2H2 (acetylene)", "Al2O3 (liquid)"."""

from __future__ import annotations

import re
from typing import Final

_PHASES: Final = {
    "L": "liquid", "s": "solid", "cr": "crystal", "gr": "graphite", "a": "alpha", "b": "beta", "c": "gamma",
    "d": "delta", "b,c": "beta-gamma", "1": "solid 1", "2": "solid 2", "3": "solid 3", "cr1": "crystal 1",
    "cr2": "crystal 2", "I": "solid I", "II": "solid II", "III": "solid III", "IV": "solid IV", "V": "solid V",
    "an": "andalusite", "caL": "calcite", "Lqz": "low quartz", "hqz": "high quartz", "rd": "red", "yw": "yellow",
    "ru": "rutile",
}  # fmt: skip

_DESCRIPTIONS: Final = {
    "ethylen": "ethylene oxide", "1propanol": "1-propanol", "2propanol": "2-propanol", "1,3-cyclo-": "1,3-cyclobutadiene",
    "1,3cyclo-": "1,3-cyclopentadiene", "cis2-buten": "cis-2-butene", "tr2-butene": "trans-2-butene",
    "ethylbenz": "ethylbenzene", "naphthale": "naphthalene", "o-bipheny": "o-biphenyl", "bipheny": "biphenyl",
    "fluorodisu": "thiothionyl fluoride isomer", "thiothiony": "thiothionyl fluoride", "formaldehy": "formaldehyde",
    "n-octa": "n-octane",
}  # fmt: skip

_RINGS: Final = {"C3H4": "cyclopropene", "C3H6": "cyclopropane", "C4H6": "cyclobutene", "C4H8": "cyclobutane",
                 "C5H8": "cyclopentene", "C5H10": "cyclopentane", "C6H10": "cyclohexene", "C6H12": "cyclohexane"}  # fmt: skip

_WHOLE: Final = {"Jet-A(g)": "C12H23 (jet fuel)", "Jet-A(L)": "C12H23 (jet fuel, liquid)", "cis-N2D2": "N2D2 (cis)",
                 "O-C12D9": "C12D9 (o-biphenyl)"}  # fmt: skip


def formula_key(name: str) -> str:
    """Return the key of a species: its formula, with a word in parentheses where the formula alone is not enough.

    Parameters
    ----------
    name : str
        The name in the data file.

    Returns
    -------
    str
        An ASCII formula key.
    """
    if name in _WHOLE:
        return _WHOLE[name]
    body, _, description = name.partition(",") if not name.endswith(")") else (name, "", "")
    words = []
    phase = re.search(r"\(([^()]*)\)$", body)
    if phase is not None and phase.group(1) in _PHASES:
        body = body[: phase.start()]
        words.append(_PHASES[phase.group(1)])
    formula = _symbols(body)
    if description:
        words.insert(0, _RINGS[formula] if description == "cyclo-" else _DESCRIPTIONS.get(description, description))
    return f"{formula} ({', '.join(words)})" if words else formula


def _symbols(formula: str) -> str:
    """Return a formula with aluminium and chlorine spelled as chemists spell them."""
    return re.sub(r"CL(?![a-z])", "Cl", re.sub(r"AL(?![a-z])", "Al", formula))
