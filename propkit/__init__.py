"""propkit: thrust-chamber calculations as composable, displayable, recomputable objects.

    import propkit as pk

    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    chamber = pk.Chamber(case, pressure="9.7 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m")
    perf = pk.Performance(nozzle, ambient="sea level")

Names are resolved on first use, so that importing propkit stays light.
"""

from __future__ import annotations

import importlib
import logging
from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

_PUBLIC = {
    "PropellantCase": "propkit.model.propellant_case",
    "Chamber": "propkit.model.chamber",
    "Cone": "propkit.model.contour",
    "Bell": "propkit.model.contour",
    "Nozzle": "propkit.model.nozzle",
    "Performance": "propkit.model.performance",
    "State": "propkit.model.state",
    "Propellant": "propkit.model.propellant",
    "blend": "propkit.model.blend",
    "propellants": "propkit.model.propellant",
    "load_propellants": "propkit.model.propellant",
    "Study": "propkit.study.sweep",
    "solve_for": "propkit.study.solve",
    "maximise": "propkit.study.maximise",
    "Uncertainty": "propkit.study.uncertainty",
    "Normal": "propkit.study.distributions",
    "Uniform": "propkit.study.distributions",
    "Triangular": "propkit.study.distributions",
    "Empirical": "propkit.study.distributions",
    "Reconciliation": "propkit.reconcile.reconciliation",
    "HotFire": "propkit.reconcile.firing",
    "Record": "propkit.record",
    "show_versions": "propkit.versions",
    "PropkitError": "propkit.errors",
    "InputError": "propkit.errors",
    "RangeError": "propkit.errors",
    "ConvergenceError": "propkit.errors",
    "NotAvailableError": "propkit.errors",
    "RecordError": "propkit.errors",
    "StorageError": "propkit.errors",
    "MissingExtraError": "propkit.errors",
}

__all__ = ["__version__", *sorted(_PUBLIC)]

logging.getLogger("propkit").addHandler(logging.NullHandler())


def __getattr__(name: str) -> Any:
    if name in _PUBLIC:
        value = getattr(importlib.import_module(_PUBLIC[name]), name)
        globals()[name] = value
        return value
    raise AttributeError(f"module 'propkit' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted({*globals(), *_PUBLIC})


if TYPE_CHECKING:
    from propkit.errors import ConvergenceError as ConvergenceError
    from propkit.errors import InputError as InputError
    from propkit.errors import MissingExtraError as MissingExtraError
    from propkit.errors import NotAvailableError as NotAvailableError
    from propkit.errors import PropkitError as PropkitError
    from propkit.errors import RangeError as RangeError
    from propkit.errors import RecordError as RecordError
    from propkit.errors import StorageError as StorageError
    from propkit.model.blend import blend as blend
    from propkit.model.chamber import Chamber as Chamber
    from propkit.model.contour import Bell as Bell
    from propkit.model.contour import Cone as Cone
    from propkit.model.nozzle import Nozzle as Nozzle
    from propkit.model.performance import Performance as Performance
    from propkit.model.propellant import Propellant as Propellant
    from propkit.model.propellant import load_propellants as load_propellants
    from propkit.model.propellant import propellants as propellants
    from propkit.model.propellant_case import PropellantCase as PropellantCase
    from propkit.model.state import State as State
    from propkit.reconcile.firing import HotFire as HotFire
    from propkit.reconcile.reconciliation import Reconciliation as Reconciliation
    from propkit.record import Record as Record
    from propkit.study.distributions import Empirical as Empirical
    from propkit.study.distributions import Normal as Normal
    from propkit.study.distributions import Triangular as Triangular
    from propkit.study.distributions import Uniform as Uniform
    from propkit.study.maximise import maximise as maximise
    from propkit.study.solve import solve_for as solve_for
    from propkit.study.sweep import Study as Study
    from propkit.study.uncertainty import Uncertainty as Uncertainty
    from propkit.versions import show_versions as show_versions
