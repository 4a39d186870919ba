"""What a row says about specific impulse is what the chain gives: the notes are text and could grow stale."""

import re

import pytest

import propkit as pk
from propkit.data.propellants import library

ROWS = library()
PAIRED = re.compile(
    r"The other values move the vacuum specific impulse with (?P<partner>.+?) by (?P<moves>.+?)( at most)? "
    r"\(of (?P<base>[\d.]+) s; 7 MPa, area ratio 40, shifting flow, mixture ratio (?P<ratio>[\d.]+)\)"
)
ALONE = re.compile(
    r"The other value moves the vacuum specific impulse of it alone by (?P<moves>[+-][\d.]+) s "
    r"\(of (?P<base>[\d.]+) s; 7 MPa, area ratio 40, shifting flow, gas only\)"
)


def impulse(oxidizer, fuel, ratio):
    chamber = pk.Chamber(pk.PropellantCase(oxidizer, fuel, mixture_ratio=ratio), pressure="7 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=40, throat_diameter="0.1 m")
    return pk.Performance(nozzle, ambient="vacuum").si("specific_impulse")


def variants(name, role):
    """Return the propellant with its own enthalpy and with each of the others."""
    row = ROWS[name]
    listed = (row.molar_enthalpy, *(other.molar_enthalpy for other in row.other_values))
    return [pk.Propellant(formula=_exact(row), enthalpy=f"{value / row.molar_mass!r} J/kg", role=role, name=name) for value in listed]


def _exact(row):
    return " ".join(f"{symbol}{count:.12f}" for symbol, count in row.element_counts)


@pytest.mark.parametrize("name", [name for name, row in ROWS.items() if row.impulse_note])
def test_note_agrees_with_the_chain(name):
    note = ROWS[name].impulse_note
    paired, alone = PAIRED.fullmatch(note), ALONE.fullmatch(note)
    assert paired or alone, note
    found = paired or alone
    if alone:
        values = [impulse(o, f, 1.0) for o, f in zip(variants(name, "oxidizer"), variants(name, "fuel"), strict=True)]
    else:
        partner, ratio = paired["partner"], float(paired["ratio"])
        oxidizing = "oxidizer" in ROWS[name].roles
        made = variants(name, "oxidizer" if oxidizing else "fuel")
        values = [impulse(one, partner, ratio) if oxidizing else impulse(partner, one, ratio) for one in made]
    assert values[0] == pytest.approx(float(found["base"]), abs=0.06)
    moves = [value - values[0] for value in values[1:]]
    told = [float(text) for text in re.findall(r"[+-]?\d+\.\d+", found["moves"])]
    if "at most" in found["moves"]:
        assert max(abs(move) for move in moves) == pytest.approx(told[0], abs=0.006)
    else:
        for value in told:
            assert min(abs(move - value) for move in moves) < 0.006
        assert min(moves) > min(*told, 0.0) - 0.006
        assert max(moves) < max(*told, 0.0) + 0.006


def test_every_burning_row_with_another_value_has_a_note():
    burning = [name for name, row in ROWS.items() if row.other_values and row.roles[0] != "diluent"]
    without = [name for name in burning if not ROWS[name].impulse_note]
    assert without == ["nitric oxide in NTO", "CO2"]  # an ingredient of MON, which has the note; an inert gas
