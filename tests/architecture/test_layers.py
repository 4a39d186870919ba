"""The layers of the package hold: a module imports only from layers above its own, read from the source."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import propkit

ROOT = Path(propkit.__file__).parent

LAYERS = [
    ["errors"], ["sources"], ["constants"], ["units"], ["quantities"], ["series"], ["report"], ["versions"], ["data"], ["physics"], ["bridge"],
    ["chain"], ["model"], ["view"], ["study"], ["reconcile"], ["record"], ["memo"], ["plots"], ["panels"], ["cli", "__main__"],
]  # fmt: skip
RANK = {name: rank for rank, names in enumerate(LAYERS) for name in names}


def imports_of(path: Path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names if alias.name.startswith("propkit"))
        elif isinstance(node, ast.ImportFrom) and (node.module or "").startswith("propkit"):
            for alias in node.names:
                yield f"{node.module}.{alias.name}"


def modules():
    return sorted(path for path in ROOT.rglob("*.py") if "notebooks" not in path.parts)


@pytest.mark.parametrize("path", modules(), ids=lambda path: str(path.relative_to(ROOT)))
def test_a_module_imports_only_layers_above(path):
    place = path.relative_to(ROOT).parts[0].removesuffix(".py")
    if place == "__init__":
        return
    assert place in RANK, f"{place} has no layer; see DEVELOPERS.md"
    for name in imports_of(path):
        parts = name.split(".")
        target = parts[1] if len(parts) > 1 else "__init__"
        if target in ("__version__", "__init__"):
            continue
        assert RANK.get(target, -1) <= RANK[place], f"{path.relative_to(ROOT)} imports {name}, which is below it"


def test_physics_needs_numpy_and_scipy_only():
    for path in (ROOT / "physics").glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = (
                [alias.name for alias in node.names]
                if isinstance(node, ast.Import)
                else [node.module or ""]
                if isinstance(node, ast.ImportFrom)
                else []
            )
            for name in names:
                top = name.split(".")[0]
                assert top in sys.stdlib_module_names or top in ("numpy", "scipy", "propkit", "__future__"), (
                    path.name,
                    name,
                )


def test_the_downward_table_is_the_only_way_down_and_every_entry_resolves():
    import importlib

    from propkit.model.base import DOWNWARD

    for target in DOWNWARD.values():
        module, _, function = target.partition(":")
        assert callable(getattr(importlib.import_module(module), function)), target


def run(code: str) -> str:
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_importing_propkit_is_light():
    heavy = ("pandas", "pint", "scipy.optimize", "jsonschema", "cantera", "IPython", "ipywidgets", "bokeh", "numpy")
    assert run(f"import propkit, sys; print([name for name in {heavy!r} if name in sys.modules])").strip() == "[]"


def test_everything_down_to_the_record_runs_without_notebook_packages():
    code = """
import sys, propkit as pk
perf = pk.Performance(pk.Nozzle(pk.Chamber(pk.PropellantCase("LOX", "LH2", mixture_ratio=6), pressure="7 MPa"), area_ratio=40, throat_diameter="0.1 m"), ambient="vacuum")
str(perf); perf.report()._repr_mimebundle_(); record = perf.record(title="light"); assert record.verify().ok
print([name for name in ("IPython", "ipywidgets", "traitlets", "bokeh") if name in sys.modules])
"""
    assert run(code).strip() == "[]"


def test_logging_is_silent_by_default():
    assert run("import logging, propkit; logging.getLogger('propkit').warning('hush')") == ""
