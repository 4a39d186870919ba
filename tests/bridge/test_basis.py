"""The data bases: standard pressure, newer enthalpies, names, checksums."""

from __future__ import annotations

import re
import threading

import cantera
import chemicals
import numpy as np
import pytest

from propkit.bridge import basis
from propkit.bridge.basis import BASES, load_basis
from propkit.bridge.species_names import formula_key
from propkit.constants import GAS_CONSTANT
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.enthalpy_updates import enthalpy_updates
from propkit.errors import InputError


def test_the_standard_pressure_is_one_bar_everywhere() -> None:
    for name in BASES:
        table = load_basis(name).table(("C", "H", "O"), condensed=True)
        assert table.reference_pressure == 100_000.0
        for species in load_basis(name).cantera_species(("C", "H", "O"), condensed=True):
            assert species.thermo.reference_pressure == 100_000.0


def test_species_of_a_case_are_all_neutral_gases_of_its_elements() -> None:
    table = load_basis("tm4513").table(("C", "H", "O"))
    assert len(table.names) == 111
    assert not any("+" in name or name.endswith("-") for name in table.names)
    assert load_basis("tm4513").table(("C", "H", "O")) is table
    shipped = {species.name: species for species in cantera.Species.list_from_file("nasa_gas.yaml")}
    neutral = [s for s in shipped.values() if set(s.composition) <= {"C", "H", "O"} and s.charge == 0]
    assert sorted(formula_key(species.name) for species in neutral) == sorted(table.names)


@pytest.mark.parametrize("file", ["nasa_gas.yaml", "nasa_condensed.yaml"])
def test_keys_are_formulas_with_the_right_atoms(file: str) -> None:
    """The atoms counted from the key are those of the data file; keys are ASCII and all different."""
    species = [item for item in cantera.Species.list_from_file(file) if not item.charge]
    keys = [formula_key(item.name) for item in species]
    assert len(set(keys)) == len(keys)
    for item, key in zip(species, keys, strict=True):
        assert key.isascii()
        counts: dict[str, float] = {}
        flat = re.sub(r"\(([A-Za-z0-9]+)\)(\d+)", lambda found: found.group(1) * int(found.group(2)), key.split(" ")[0])
        for symbol, count in re.findall(r"([A-Z][a-z]?)(\d*)", flat):
            counts[symbol] = counts.get(symbol, 0.0) + float(count or 1)
        assert counts == dict(item.composition), key


def test_expected_keys() -> None:
    gas, solid = load_basis().table(("Al", "C", "H", "O")), load_basis().table(("Al", "C", "H", "O"), condensed=True)
    assert {"H2O", "C2H2 (acetylene)", "AlOH", "HCHO (formaldehyde)"} <= set(gas.names)
    assert {"Al2O3 (liquid)", "Al2O3 (alpha)", "C (graphite)", "H2O (liquid)"} <= set(solid.names)
    assert solid.names[: len(gas.names)] == gas.names


@pytest.mark.parametrize("update", enthalpy_updates(), ids=lambda update: update.species)
def test_newer_enthalpies_are_those_of_the_active_thermochemical_tables(update) -> None:  # type: ignore[no-untyped-def]
    """Source: ATcT as packaged in `chemicals`. Tolerance: a unit in the last digit written; both values differ by 0.3."""
    assert update.enthalpy == pytest.approx(chemicals.Hfg(update.cas, method="ATCT_G"), abs=1.0)
    values = {}
    for name in BASES:
        table = load_basis(name).table(("C", "H", "N", "O"))
        row = table.names.index(update.species)
        values[name] = float(table.properties(298.15).enthalpy[0, row]) * GAS_CONSTANT * 298.15
    assert values["tm4513+atct"] == pytest.approx(update.enthalpy, abs=40.0)
    assert abs(values["tm4513+atct"] - values["tm4513"]) > 290.0


def test_checksums_are_of_the_data() -> None:
    base, other = load_basis("tm4513"), load_basis("tm4513+atct")
    first = base.checksum(("C", "H", "O"))
    assert re.fullmatch(r"sha256:[0-9a-f]{64}", first)
    assert first == base.checksum(("O", "C", "H"))
    assert len({first, other.checksum(("C", "H", "O")), base.checksum(("H", "O")), base.checksum(("C", "H", "O"), True)}) == 4
    assert base.checksum(("He",)) == other.checksum(("He",))


def test_atomic_weights_are_canteras() -> None:
    for symbol, weight in ATOMIC_WEIGHTS.items():
        assert basis.atomic_weight(symbol) == pytest.approx(1e-3 * weight, rel=1e-15)
    assert basis.atomic_weight("C") == pytest.approx(1e-3 * cantera.Element("C").weight, rel=1e-12)
    assert pytest.approx(cantera.gas_constant, rel=1e-15) == 1e3 * GAS_CONSTANT


def test_cantera_gets_the_same_data() -> None:
    gas = load_basis().cantera_solution(("H", "N", "O"))
    table = load_basis().table(("H", "N", "O"))
    assert tuple(gas.species_names) == table.names
    gas.TPX = 2500.0, 100_000.0, {"H2O": 1.0}
    np.testing.assert_allclose(gas.standard_gibbs_RT, table.properties(2500.0).gibbs_energy[0], rtol=1e-11)


def test_threads_get_the_same_table() -> None:
    found: list[int] = []
    threads = [threading.Thread(target=lambda: found.append(id(load_basis().table(("C", "F", "H"))))) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(set(found)) == 1


def test_bad_names_are_refused() -> None:
    with pytest.raises(InputError, match="tm4513"):
        load_basis("tm4514")
    with pytest.raises(InputError, match="'Xx'"):
        load_basis().table(("C", "Xx"))
    with pytest.raises(InputError, match="different"):
        load_basis().table(("C", "C"))
    with pytest.raises(InputError):
        basis.atomic_weight("Q")
