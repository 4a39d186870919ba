"""What is declared once is complete: catalogued, sourced, explained, and nobody types a label twice."""

from __future__ import annotations

import ast
import inspect
from pathlib import Path

import pytest

import propkit
import propkit as pk
from propkit import quantities
from propkit.model.chamber import GasChamber
from propkit.model.state import STATE_FIELDS
from propkit.sources import SOURCES

OBJECTS = [pk.PropellantCase, pk.Chamber, GasChamber, pk.Nozzle, pk.Performance, pk.Propellant, pk.Cone, pk.Bell]
ROOT = Path(propkit.__file__).parent


@pytest.mark.parametrize("kind", OBJECTS, ids=lambda kind: kind.__name__)
def test_every_input_and_result_is_catalogued_and_explained(kind):
    for name, entry in {**kind.declared_inputs, **kind.declared_results}.items():
        row = entry.quantity
        assert row.label, name
        assert row.definition, name
    for name, entry in kind.declared_inputs.items():
        assert entry.doc, name
        assert not entry.doc.endswith("."), name
    for name, entry in kind.declared_results.items():
        assert entry.source in SOURCES or entry.source, name


def test_every_state_property_is_catalogued():
    for name in STATE_FIELDS:
        assert quantities.quantity(name).label


@pytest.mark.parametrize("kind", OBJECTS, ids=lambda kind: kind.__name__)
def test_the_signature_is_that_of_the_declaration(kind):
    parameters = inspect.signature(kind).parameters
    assert set(parameters) == set(kind.declared_inputs)
    assert "kwargs" not in parameters


def test_display_units_convert():
    from propkit import units

    for row in quantities.CATALOGUE.values():
        for unit in (*row.kind.si, *row.kind.us):
            assert units.convert(units.convert(1.0, row.unit, unit), unit, row.unit) == pytest.approx(1.0, rel=1e-12), (
                row.name,
                unit,
            )


def test_public_names_resolve():
    for name in pk.__all__:
        assert getattr(pk, name) is not None
    with pytest.raises(AttributeError):
        _ = pk.nothing


@pytest.mark.parametrize("path", sorted(ROOT.rglob("*.py")), ids=lambda path: str(path.relative_to(ROOT)))
def test_public_functions_take_no_catch_all_keywords(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    allowed = {"replace", "__init__", "__init_subclass__"}
    for node in ast.walk(tree):
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef) and node.args.kwarg and not node.name.startswith("_"):
            assert node.name in allowed, f"{path.name}: {node.name} takes **{node.args.kwarg.arg}"


def test_modules_stay_small():
    long = {
        str(path.relative_to(ROOT)): lines
        for path in ROOT.rglob("*.py")
        if (lines := len(path.read_text(encoding="utf-8").splitlines())) > 600
    }
    assert not long
