"""What the sheets of the propellant cases show: propellants, elements, shares, assumptions."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import units
from propkit.bridge import basis as bases
from propkit.data.formula import formula_text
from propkit.model.doubts import Assumption
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    from propkit.model.propellant_case import PropellantCase


def parts_of(case: PropellantCase) -> list[tuple[str, Any, Any, float]]:
    """Return (role, propellant, stream, mass fraction of the whole) of everything that flows."""
    held = case.held
    added = sum(share for _, share in held.additives)
    ratio = held.mixture_ratio
    shares = {"oxidizer": ratio / (1.0 + ratio), "fuel": 1.0 / (1.0 + ratio)} if len(case.roles) == 2 else {}
    listed = [(role, case._values[role], held.stream(role), (1.0 - added) * shares.get(role, 1.0)) for role in case.roles]
    named = case._values.get("additives") or ()
    listed += [("additive", part, stream, share) for (part, _), (stream, share) in zip(named, held.additives, strict=True)]
    return listed


def _formula(part: Any) -> str:
    """Return the formula of a propellant; that of a blend, which is made of shares, to four digits."""
    row = part.row
    return formula_text(dict(row.element_counts), 4) if row.components else str(row.formula)


def propellant_section(case: PropellantCase, system: UnitSystem) -> Section:
    """Return the propellants as stored."""
    rows = parts_of(case)
    energy_unit = "kJ/kg" if system == "SI" else "Btu/pound"
    density_unit = "kg/m**3" if system == "SI" else "pound/foot**3"

    def density(stream: Any) -> float | None:
        known = bool(np.isfinite(stream.density))
        return units.convert(float(stream.density), "kg/m**3", density_unit) if known else None

    columns = (
        Column("propellant", "propellant", "", "", 0, tuple(part.label for _, part, _, _ in rows)),
        Column("formula", "formula", "", "", 0, tuple(_formula(part) for _, part, _, _ in rows)),
        Column("share", "share by mass", "w", "percent", 4, tuple(100.0 * share for *_, share in rows)),
        Column(
            "enthalpy", "enthalpy", "h", energy_unit, 6,
            tuple(units.convert(float(stream.enthalpy), "J/kg", energy_unit) for _, _, stream, _ in rows),
        ),
        Column("density", "density", r"\rho", density_unit, 4, tuple(density(stream) for _, _, stream, _ in rows)),
        Column("source", "source of the enthalpy", "", "", 0, tuple(part.source for _, part, _, _ in rows)),
    )  # fmt: skip
    table = Table("propellants", "Propellants", "stream", tuple(role for role, *_ in rows), columns)
    return Section("propellants", "Propellants", table=table)


def element_section(case: PropellantCase) -> Section:
    """Return the atoms per mass."""
    mixture = case.whole
    columns = (Column("elements", "atoms", "b", "mol/kg", 6, tuple(float(value) for value in mixture.atoms[0])),)
    return Section("elements", "Elements", table=Table("elements", "Elements", "element", mixture.symbols, columns))


def share_figure(case: PropellantCase) -> Figure:
    """Return the shares of the propellants by mass and, where densities are known, by volume."""
    rows = parts_of(case)
    categories = [f"{part.label}, mass" for _, part, _, _ in rows]
    shares = [share for *_, share in rows]
    if case.has("bulk_density"):
        bulk = case.si("bulk_density")
        categories += [f"{part.label}, volume" for _, part, _, _ in rows]
        shares += [share * bulk / float(stream.density) for _, _, stream, share in rows]
    percent = tuple(100.0 * share for share in shares)
    texts = tuple(f"{value:.1f} %" for value in percent)
    bars = Bars(tuple(categories), Series("share", percent, "percent"), texts)
    alt = "Shares of the propellants: " + ", ".join(f"{c} {t}" for c, t in zip(categories, texts, strict=True))
    limits = Axis("share", "percent", low=0.0, high=100.0)
    return Figure("shares", "Shares in the tanks", alt, limits, Axis(""), (bars,))


def gas_figure(fractions: Mapping[str, float]) -> Figure:
    """Return the mole fractions of a gas as stored, the largest first."""
    pairs = sorted(fractions.items(), key=lambda pair: -pair[1])
    percent = tuple(100.0 * value for _, value in pairs)
    texts = tuple(f"{value:.4g} %" for value in percent)
    bars = Bars(tuple(name for name, _ in pairs), Series("mole fraction", percent, "percent", "x"), texts)
    alt = "Mole fractions of the gas: " + ", ".join(f"{name} {text}" for (name, _), text in zip(pairs, texts, strict=True))
    limits = Axis("mole fraction", "percent", "x", low=0.0, high=100.0)
    return Figure("composition", "Composition of the gas", alt, limits, Axis(""), (bars,))


def assumptions(case: PropellantCase) -> tuple[Assumption, ...]:
    """Return what a case of burning propellants assumes."""
    made = [
        basis_assumption(case),
        Assumption("ideal-gas", "Gases are a mixture of ideal gases.", "method", "enthalpy"),
    ]
    made.append(condensed_assumption(case))
    for role in case.roles:
        made.append(state_assumption(case, role))
    for part, _ in case._values.get("additives") or ():
        text = f"Additive {part.label} enters at {part.row.temperature:.5g} K."
        made.append(Assumption("additive-state", text, "default", "enthalpy"))
    scope = scope_assumption(case)
    return (*made, scope) if scope is not None else tuple(made)


def basis_assumption(case: PropellantCase) -> Assumption:
    """Return on which species data the case rests."""
    basis = str(case.si("thermo_basis"))
    text = f"Thermodynamic basis {basis}: {bases.load_basis(basis).title}."
    return Assumption("basis", text, case.kind_of("thermo_basis"), "enthalpy")


def condensed_assumption(case: PropellantCase) -> Assumption:
    """Return whether liquids and solids are among the products, and what then holds for them."""
    if case._values["condensed"]:
        text = (
            "Liquids and solids form in equilibrium, each pure and without volume; they move with the gas at its velocity and temperature. "
            "Mole fractions are over all moles, the molar mass is mass over moles of gas."
        )
        return Assumption("condensation", text, "given", "composition")
    text = "Products are gases only: no liquid or solid forms."
    return Assumption("no-condensation", text, case.kind_of("condensed"), "composition")


def state_assumption(case: PropellantCase, role: str) -> Assumption:
    """Return at which temperature a propellant enters."""
    propellant = case._values[role]
    origin = "given" if f"{role}_temperature" in case.inputs else "default"
    temperature = case._values[f"{role}_temperature"] or propellant.row.temperature
    text = f"{role.capitalize()} {propellant.label} enters at {temperature:.5g} K."
    return Assumption(f"{role}-state", text, origin, "enthalpy")


def scope_assumption(case: PropellantCase) -> Assumption | None:
    """Return what is outside the calculation for a solid propellant or a hybrid; None for liquids and gases."""
    solid = [role for role in case.roles if case._values[role].row.phase == "solid"]
    if not solid:
        return None
    if len(solid) == len(case.roles):
        text = (
            "Thermochemistry of one burning stream: burning rate, grain and what they do to the pressure over time are outside this "
            "calculation."
        )
    else:
        text = "A hybrid at one instant: regression rate, grain and the shift of mixture ratio over time are outside this calculation."
    return Assumption("scope", text, "method", "")
