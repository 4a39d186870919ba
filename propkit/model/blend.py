"""`blend`: a propellant mixed from others, by mass, volume or moles."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any, ClassVar, TypeAlias

from propkit import units
from propkit.data import propellants as library_data
from propkit.data.formula import formula_text, molar_mass
from propkit.data.propellant_row import TRUST, PropellantRow
from propkit.errors import InputError, Problem
from propkit.model.declare import ChoiceInput, CustomInput, QuantityInput, as_text
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant import Propellant, as_propellant
from propkit.model.sheet import in_display
from propkit.quantities import quantity
from propkit.report import Column, Section, Table, UnitSystem

Ingredient: TypeAlias = "str | Propellant"
Shares: TypeAlias = "Mapping[Ingredient, float | str] | Sequence[tuple[Ingredient, float | str]]"

WAYS = ("mass", "volume", "mole")
"""What the shares of a blend can be shares of."""

_SAME_TEMPERATURE = 0.02
_CLOSES = 1e-6


def _read_ingredients(name: str, value: Any) -> tuple[tuple[Propellant, float], ...]:
    """Return (propellant, share) pairs whose shares add up to 1."""
    pairs = list(value.items()) if isinstance(value, Mapping) else value
    allowed = 'ingredients with their shares, for example {"ethanol": 0.92, "water": 0.08}'
    if not isinstance(pairs, list | tuple) or not pairs or not all(isinstance(p, list | tuple) and len(p) == 2 for p in pairs):
        raise InputError(Problem(name, as_text(value), allowed))
    problems: list[Problem] = []
    read: list[tuple[Propellant, float]] = []
    for part, share in pairs:
        try:
            propellant = as_propellant(name, part)
            fraction = units.to_si(share, "", f"{name}[{propellant.label!r}]")
        except InputError as error:
            problems += error.problems
            continue
        if not 0.0 < fraction <= 1.0:
            hint = "Leave out what is not in it." if fraction == 0.0 else "Give fractions, or percent as text: '92 %'."
            problems.append(Problem(f"{name}[{propellant.label!r}]", as_text(share), "above 0 and at most 1", hint))
        read.append((propellant, fraction))
    labels = [propellant.label for propellant, _ in read]
    twice = sorted({label for label in labels if labels.count(label) > 1})
    problems += [Problem(f"{name}[{label!r}]", "given twice", "given once") for label in twice]
    total = math.fsum(fraction for _, fraction in read)
    if not problems and abs(total - 1.0) > _CLOSES:
        missing = f"{abs(1.0 - total):.6g} {'is missing' if total < 1.0 else 'too much'}."
        problems.append(Problem(name, f"a set of shares that add up to {total:.8g}", "shares that add up to 1", missing))
    if problems:
        raise InputError(problems)
    return tuple((propellant, fraction / total) for propellant, fraction in read)


class Blend(Propellant):
    """A propellant mixed from others; `propkit.blend` makes one.

    Notes
    -----
    Elements and enthalpies add up by mass; `mixing_enthalpy`, where given, comes on top. Without it the heat of mixing
    is neglected and the sheet says so. Density: as given, else ideal volumes.
    """

    title: ClassVar[str] = "Blend"
    undeclared: ClassVar[tuple[str, ...]] = tuple(
        name for name in Propellant.declared_inputs if name not in ("density", "role", "hazard", "source", "name")
    )

    ingredients: CustomInput = CustomInput(doc="what is blended, with shares that add up to 1", reader=_read_ingredients, kw_only=False)
    by: ChoiceInput = ChoiceInput(choices=WAYS, doc="whether the shares are of mass, volume or moles of the formulas", default="mass")
    mixing_enthalpy: QuantityInput = QuantityInput(
        doc="enthalpy of the mixture less that of its ingredients, negative when heat is released", default=None
    )

    def _check(self, bad: set[str]) -> list[Problem]:
        if bad & {"ingredients", "by"} or self._values["by"] != "volume":
            return []
        return [
            Problem(
                f"ingredients[{part.label!r}]",
                "without a density",
                "given by mass, or with a density",
                "Shares by volume need one.",
            )
            for part, _ in self._values["ingredients"]
            if part.row.density is None
        ]

    def _make_row(self) -> PropellantRow:
        values = self._values
        parts = self._mass_fractions()
        moles = math.fsum(share / row.molar_mass for row, share in parts)
        elements: dict[str, float] = {}
        for row, share in parts:
            for symbol, count in row.element_counts:
                elements[symbol] = elements.get(symbol, 0.0) + share / row.molar_mass * count / moles
        mass = molar_mass(elements)
        mixing = values["mixing_enthalpy"] or 0.0
        specific = math.fsum([mixing, *(share * row.specific_enthalpy for row, share in parts)])
        main = max(parts, key=lambda part: part[1])[0]
        name = values["name"] or _name_of(parts)
        density = values["density"] or _ideal_density(parts)
        return PropellantRow(
            name=name,
            title=values["name"] or _name_of(parts),
            roles=values["role"] or _roles_of([row for row, _ in parts]),
            phase=main.phase,
            formula=formula_text(elements),
            element_counts=tuple(elements.items()),
            molar_mass=mass,
            molar_enthalpy=specific * mass,
            temperature=main.temperature,
            pressure=max(row.pressure for row, _ in parts),
            hazard=values["hazard"] or _hazard_of(parts),
            source=values["source"] or f"sum over {', '.join(row.name for row, _ in parts)}, {self._mixing_text()}",
            trust=_trust_of([row.trust for row, _ in parts]),
            components=tuple(parts),
            mixing_enthalpy=mixing,
            density=density,
            density_source="as given" if values["density"] else "ideal volumes of its ingredients" if density else "",
        )

    def _mass_fractions(self) -> list[tuple[PropellantRow, float]]:
        """Return the rows of the ingredients with their mass fractions."""
        by = self._values["by"]
        weights = [(part.row, share * _mass_of(part.row, by)) for part, share in self._values["ingredients"]]
        total = math.fsum(weight for _, weight in weights)
        return [(row, weight / total) for row, weight in weights]

    def _mixing_text(self) -> str:
        mixing = self._values["mixing_enthalpy"]
        return "heat of mixing neglected" if mixing is None else f"heat of mixing {mixing / 1e3:.4g} kJ/kg included as given"

    def _doubts(self, row: PropellantRow) -> Iterator[Doubt]:
        weak = [part.name for part, _ in row.components if part.trust == "weak"]
        if weak:
            text = f"The enthalpy of {', '.join(weak)} is an estimate or its sources disagree."
            yield Doubt(text, code="weak-enthalpy", about="specific_enthalpy")
        known = _library_mixing(row) if self._values["mixing_enthalpy"] is None else ""
        if known:
            yield Doubt(f"Heat of mixing neglected. {known}", code="mixing-heat", about="specific_enthalpy")
        temperatures = [part.temperature for part, _ in row.components]
        if max(temperatures) - min(temperatures) > _SAME_TEMPERATURE:
            listed = ", ".join(f"{part.name} {part.temperature:g} K" for part, _ in row.components)
            text = f"The ingredients are at different temperatures ({listed}); their enthalpies are added as they are."
            yield Doubt(text, code="temperatures", about="specific_enthalpy")

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        origin = "default" if self._values["mixing_enthalpy"] is None else "given"
        made = [Assumption("mixing", f"H{self._mixing_text()[1:]}.", origin, "specific_enthalpy")]
        if self._values["density"] is None and self.row.density is not None:
            made.append(Assumption("ideal-volumes", "Volumes of the ingredients add up.", "default", "density"))
        return tuple(made)

    def attribute(self, name: str) -> Any:
        """Return what reading the attribute `name` gives."""
        if name == "ingredients":
            return {part.label: share for part, share in self._values["ingredients"]}
        if name == "mixing_enthalpy" and self._values[name] is None:
            return None
        return super().attribute(name)

    def input_text(self, name: str) -> str:
        """Return an input of a kind of its own as text."""
        if name == "ingredients":
            return ", ".join(f"{part.label} {100.0 * share:.6g} %" for part, share in self._values["ingredients"])
        return super().input_text(name)

    def typed_text(self, name: str) -> str:
        """Return an input as it was typed, as text."""
        return self.input_text(name) if name == "ingredients" else super().typed_text(name)

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield the ingredients, then what every propellant shows."""
        rows = self.row.components
        volumes = [share / row.density if row.density else None for row, share in rows]
        whole = math.fsum(volume for volume in volumes if volume is not None)
        unknown = None in volumes
        energy = quantity("specific_enthalpy")
        shown = [in_display(energy, row.specific_enthalpy, system) for row, _ in rows]
        texts = tuple(f"{value:.6g} {unit}" for value, unit in shown)
        columns = [
            Column("mass_fraction", "mass fraction", "w", "percent", 5, tuple(100.0 * share for _, share in rows)),
            Column(
                "volume_fraction", "volume fraction", "", "percent", 4,
                tuple(None if unknown or volume is None else 100.0 * volume / whole for volume in volumes),
            ),
            Column("enthalpy", energy.label, energy.symbol, "", energy.digits, texts),
            Column("trust", "trust", "", "", 0, tuple(row.trust or "as given" for row, _ in rows)),
        ]  # fmt: skip
        table = Table("ingredients", "Ingredients", "ingredient", tuple(row.name for row, _ in rows), tuple(columns))
        yield Section("ingredients", "Ingredients", table=table)
        yield from super().sections(system)
        yield Section("assumptions", "Assumptions", lines=tuple(str(entry) for entry in self._own_assumptions()))

    def _code(self, names: Mapping[int, str]) -> str:
        given = dict(self._typed)
        pairs = given.pop("ingredients")
        inside = ", ".join(f"{part!r}: {share!r}" for part, share in pairs)
        return "pk.blend({" + inside + "}" + "".join(f", {name}={value!r}" for name, value in given.items()) + ")"


def blend(
    ingredients: Shares,
    *,
    by: str = "mass",
    name: str = "",
    mixing_enthalpy: Any = None,
    density: Any = None,
    role: str | None = None,
    hazard: str | None = None,
    source: str | None = None,
) -> Blend:
    """Return a propellant mixed from others.

    Parameters
    ----------
    ingredients : mapping or sequence of pairs
        Library name or `Propellant` -> share; the shares add up to 1 (or are text in percent).
    by : str
        ``"mass"`` (default), ``"volume"`` (of the ingredients before mixing) or ``"mole"`` (of their formulas).
    name : str
        Name of the blend.
    mixing_enthalpy : quantity, optional
        Enthalpy of the mixture less that of its ingredients [J/kg]; neglected unless given.
    density : quantity, optional
        Density of the blend [kg/m3]; from ideal volumes unless given.
    role, hazard, source : str, optional
        In place of what follows from the ingredients.

    Returns
    -------
    Blend
        The blend; mass, elements and enthalpy are conserved.

    Raises
    ------
    InputError
        For an unknown ingredient, a share that is none, or shares that do not add up to 1.
    """
    pairs = ingredients.items() if isinstance(ingredients, Mapping) else ingredients
    typed = tuple((part, share) for part, share in pairs) if _is_pairs(pairs) else ingredients
    optional = {
        "mixing_enthalpy": mixing_enthalpy,
        "density": density,
        "role": role,
        "hazard": hazard,
        "source": source,
    }
    given: dict[str, Any] = {key: value for key, value in optional.items() if value is not None}
    if name:
        given["name"] = name
    if by != "mass":
        given["by"] = by
    return Blend(typed, **given)


def _is_pairs(pairs: Any) -> bool:
    if isinstance(pairs, str) or not isinstance(pairs, Iterable):
        return False
    return all(isinstance(pair, list | tuple) and len(pair) == 2 for pair in pairs)


def _mass_of(row: PropellantRow, by: str) -> float:
    """Return the mass that one unit of share stands for."""
    if by == "mole":
        return row.molar_mass
    return 1.0 if by == "mass" or row.density is None else row.density


def _name_of(parts: Sequence[tuple[PropellantRow, float]]) -> str:
    return " + ".join(f"{100.0 * share:.3g} % {row.name}" for row, share in parts)


def _trust_of(trusts: Sequence[str]) -> str:
    """Return the least of the trusts; empty when one is not known."""
    return max(trusts, key=TRUST.index) if all(trust in TRUST for trust in trusts) else ""


def _ideal_density(parts: Sequence[tuple[PropellantRow, float]]) -> float | None:
    volumes = [share / row.density for row, share in parts if row.density]
    return 1.0 / math.fsum(volumes) if len(volumes) == len(parts) else None


def _hazard_of(parts: Sequence[tuple[PropellantRow, float]]) -> str:
    return "; ".join(f"{row.name}: {row.hazard}" for row, _ in parts if row.hazard and row.roles[:1] != ("diluent",))


def _roles_of(rows: Sequence[PropellantRow]) -> tuple[str, ...]:
    """Return what a blend can serve as, from what its ingredients can; empty where one of them has no stated role."""
    if not all(row.roles for row in rows):
        return ()
    active = [row for row in rows if "diluent" not in row.roles] or list(rows)
    shared = [role for role in active[0].roles if all(role in row.roles for row in active)]
    oxidizing = any("oxidizer" in row.roles for row in active)
    burning = any("fuel" in row.roles for row in active)
    if "monopropellant" not in shared and oxidizing and burning:
        shared = ["monopropellant", *shared]
    if not shared and not oxidizing:
        shared = ["monopropellant" if any("monopropellant" in row.roles for row in active) else "ingredient"]
        shared += ["fuel"] if burning else []
    return tuple(shared or ["ingredient"])


def _library_mixing(row: PropellantRow) -> str:
    """Return what the library knows of the heat of mixing of the same ingredients; empty when nothing."""
    shares = row.mixture
    alike = [known for known in library_data.library().values() if known.mixing_enthalpy and set(known.mixture) == set(shares)]
    if not alike:
        return ""
    nearest = min(alike, key=lambda known: sum(abs(known.mixture[part] - share) for part, share in shares.items()))
    return f"The library's {nearest.name} includes {nearest.mixing_enthalpy / 1e3:.3g} kJ/kg of it."
