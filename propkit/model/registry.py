"""From a recipe (plain data) back to an object: the classes that a recipe may name, and nothing else."""

from __future__ import annotations

import importlib
from collections.abc import Mapping
from typing import Any

from propkit.errors import InputError, RecordError

CLASSES = {
    "PropellantCase": "propkit.model.propellant_case",
    "MonopropellantCase": "propkit.model.monopropellant_case",
    "FilmCase": "propkit.model.film_case",
    "ColdGasCase": "propkit.model.cold_gas_case",
    "Chamber": "propkit.model.chamber",
    "GasChamber": "propkit.model.chamber",
    "Cone": "propkit.model.contour",
    "Bell": "propkit.model.contour",
    "Nozzle": "propkit.model.nozzle",
    "Performance": "propkit.model.performance",
    "Propellant": "propkit.model.propellant",
    "Blend": "propkit.model.blend",
    "RecordedReconciliation": "propkit.reconcile.recorded",
    "RecordedFiring": "propkit.reconcile.recorded",
    "RecordedUncertainty": "propkit.study.recorded",
    "RecordedStudy": "propkit.study.sweep_record",
    "Normal": "propkit.study.distributions",
    "Uniform": "propkit.study.distributions",
    "Triangular": "propkit.study.distributions",
    "Empirical": "propkit.study.distributions",
}
"""Class name -> module. A recipe that names anything else is refused."""

DEEPEST = 12


def build(recipe: Mapping[str, Any], depth: int = 0) -> Any:
    """Return the object of a recipe; nothing but the classes of `CLASSES` is ever called.

    Raises
    ------
    RecordError
        When the recipe is not of that form.
    """
    if depth > DEEPEST:
        raise RecordError("the recipe is nested too deeply")
    if not isinstance(recipe, Mapping) or set(recipe) != {"object", "inputs"} or not isinstance(recipe["inputs"], Mapping):
        raise RecordError("a recipe has the two entries 'object' and 'inputs'")
    name = recipe["object"]
    if not isinstance(name, str) or name not in CLASSES:
        raise RecordError(f"a recipe cannot name {name!r}; it names one of {', '.join(CLASSES)}")
    maker = getattr(importlib.import_module(CLASSES[name]), name)
    inputs = {str(key): _value(value, depth) for key, value in recipe["inputs"].items()}
    try:
        return maker(**inputs)
    except TypeError as error:
        raise RecordError(f"the inputs of {name} in the recipe are not those of a {name}: {error}") from error
    except InputError as error:
        raise RecordError(f"the inputs of {name} in the recipe are refused: {error}", problems=error.problems) from error


def _value(value: Any, depth: int) -> Any:
    if isinstance(value, Mapping):
        if set(value) == {"object", "inputs"}:
            return build(value, depth + 1)
        return {key: _value(entry, depth + 1) for key, entry in value.items()}
    if isinstance(value, list):
        return [_value(entry, depth + 1) for entry in value]
    return value
