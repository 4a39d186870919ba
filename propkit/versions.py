"""Versions of propkit and of what a number depends on."""

from __future__ import annotations

import platform
from importlib import metadata

NUMERIC = ("numpy", "scipy", "cantera")
OTHERS = (
    "pandas",
    "pint",
    "rfc8785",
    "jsonschema",
    "CoolProp",
    "ipywidgets",
    "anywidget",
    "bokeh",
    "jupyterlab",
    "nbclient",
    "nbconvert",
    "typst",
)


def version_of(package: str) -> str | None:
    """Return the installed version of a package, or None; nothing is imported."""
    try:
        return metadata.version(package)
    except metadata.PackageNotFoundError:
        return None


def numeric_versions() -> dict[str, str]:
    """Return the versions that a number may depend on: propkit, Python, numpy, scipy, cantera, platform."""
    from propkit import __version__

    found = {"propkit": __version__, "python": platform.python_version()}
    found |= {name: version_of(name) or "absent" for name in NUMERIC}
    found["platform"] = f"{platform.system()} {platform.machine()}"
    return found


def show_versions() -> None:
    """Print the versions of propkit, Python and every package that propkit can use: put it into a question or report."""
    shown = {**numeric_versions(), **{name: version_of(name) or "not installed" for name in OTHERS}}
    width = max(len(name) for name in shown)
    for name, version in shown.items():
        print(f"{name:<{width}}  {version}")
