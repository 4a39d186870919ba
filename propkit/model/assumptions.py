"""Assumptions with their prices: a tuple of entries, the one that carries most first, that shows itself as a table."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from propkit.model import alternatives
from propkit.model.doubts import Assumption, Price
from propkit.report import Column, Report, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.performance import Performance

EFFECTS = ("mass_flow", "specific_impulse", "thrust")
_SYMBOLS = {"mass_flow": r"\Delta \dot{m}", "specific_impulse": r"\Delta I_{sp}", "thrust": r"\Delta F"}
_WORDS = {"mass_flow": "change of mass flow", "specific_impulse": "change of specific impulse", "thrust": "change of thrust"}

LABELS = {
    "basis": "species data",
    "ideal-gas": "gas law",
    "no-condensation": "condensed products",
    "condensation": "condensed products",
    "oxidizer-state": "oxidizer temperature",
    "fuel-state": "fuel temperature",
    "propellant-state": "propellant temperature",
    "monopropellant-state": "propellant temperature",
    "no-combustion": "gas temperature",
    "equilibrium": "heat loss in the chamber",
    "fixed-composition": "decomposition",
    "given-gas": "gas properties",
    "contraction": "chamber contraction",
    "cstar-efficiency": "c* efficiency",
    "flow": "composition in the nozzle",
    "isentropic": "friction in the nozzle",
    "discharge": "discharge coefficient",
    "full-flow": "flow at the wall",
    "one-dimensional": "divergence",
    "losses": "losses given",
}
"""What an assumption is about, in a few words."""

NOTE = (
    "Each alternative is computed with the same hardware (throat area and area ratio) and ambient pressure; changes are against the values of this sheet. "
    "Largest first."
)


class Assumptions(tuple[Assumption, ...]):
    """The assumptions of a performance, the one whose alternatives change most first; those without a price last."""

    __slots__ = ()

    @property
    def priced(self) -> tuple[Assumption, ...]:
        """Those for which at least one alternative was computed."""
        return tuple(entry for entry in self if entry.size >= 0.0)

    @property
    def unpriced(self) -> tuple[Assumption, ...]:
        """Those for which nothing was computed."""
        return tuple(entry for entry in self if entry.size < 0.0)

    def of(self, key: str) -> Assumption:
        """Return the assumption of a key such as ``"contraction"``; KeyError where there is none."""
        for entry in self:
            if entry.key == key:
                return entry
        raise KeyError(f"no assumption {key!r}; there are {', '.join(entry.key for entry in self)}")

    def to_frame(self) -> pd.DataFrame:
        """Return the assumptions as a table: index key, one row for each alternative, changes as fractions."""
        import pandas as pd

        columns: dict[str, list[Any]] = {name: [] for name in ("statement", "origin", "taken", "alternative", *EFFECTS, "note")}
        keys = []
        for entry in self:
            for price in entry.prices or (Price(""),):
                keys.append(entry.key)
                row = (
                    entry.statement,
                    entry.origin,
                    entry.taken,
                    price.alternative,
                    price.mass_flow,
                    price.specific_impulse,
                    price.thrust,
                    price.note,
                )
                for name, value in zip(columns, row, strict=True):
                    columns[name].append(value)
        frame = pd.DataFrame(columns, index=pd.Index(keys, name="assumption"))
        for name in EFFECTS:
            frame[name] = frame[name].astype(float)
        frame.attrs["units"] = dict.fromkeys(EFFECTS, "")
        return frame

    def sections(self) -> Iterator[Section]:
        """Yield the table of prices, and the assumptions without a price in words."""
        rows = [(entry, price) for entry in self.priced for price in entry.prices if price.size >= 0.0]
        if rows:
            yield Section("assumptions", "Assumptions and what they cost", table=_table(rows))
        rest = tuple(dict.fromkeys(_line(entry) for entry in self.unpriced))
        if rest:
            yield Section("unpriced", "Assumptions without a computed alternative", lines=rest)
        yield Section("statements", "The assumptions in words", lines=tuple(f"{entry.statement}{_origin(entry)}" for entry in self.priced))

    def figures(self) -> tuple[Figure, ...]:
        """Return the largest change of the specific impulse for each assumption as bars."""
        return (_figure(self.priced),) if self.priced else ()

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return the table as a report that displays itself."""
        from propkit.model.base import render

        first = self.priced[0] if self.priced else None
        subtitle = (
            f"largest: {LABELS.get(first.key, first.key)}, {first.alternative} changes {_largest(first)}" if first is not None else ""
        )
        return Report(
            "Assumptions",
            "What each assumption costs",
            subtitle,
            units,
            sections=tuple(self.sections()),
            figures=self.figures(),
            render=render,
        )

    def __str__(self) -> str:
        return str(self.report())

    def __reduce__(self) -> tuple[Any, ...]:
        return Assumptions, (tuple(self),)

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        return self.report()._repr_mimebundle_(include, exclude)


def priced(performance: Performance, entries: Iterable[Assumption]) -> Assumptions:
    """Return assumptions with their prices, the largest first; the order of the chain decides among equals."""
    found = alternatives.prices(performance)
    made = []
    for entry in entries:
        known = tuple(found.get(entry.key, ()))
        made.append(replace(entry, prices=known, taken=entry.taken or taken(performance, entry.key)))
    return Assumptions(sorted(made, key=lambda entry: -entry.size))


def taken(performance: Performance, key: str) -> str:
    """Return what was assumed in a few words."""
    nozzle, chamber = performance.nozzle, performance.chamber
    case = chamber.case_or_none
    contraction = chamber._values["contraction_ratio"]
    words = {
        "contraction": "infinite"
        if contraction == float("inf")
        else f"ratio {contraction:g}, pressure at the {chamber._values['pressure_at']}",
        "cstar-efficiency": f"{chamber.si('cstar_efficiency'):g}",
        "flow": alternatives.FLOW_WORDS[nozzle.flow]
        if nozzle._values["freeze_at"] in (None, "chamber")
        else f"frozen from {_place(nozzle)}",
        "isentropic": "loss taken off" if "boundary layer" in performance.resolved_losses.ratios else "none",
        "discharge": f"{nozzle.si('discharge_coefficient'):g}",
        "one-dimensional": nozzle.input_text("contour") if nozzle.has("contour") else "none: axial flow",
        "full-flow": "flows full",
        "ideal-gas": "ideal gas",
        "no-condensation": "gases only",
        "condensation": "liquids and solids",
        "equilibrium": "none",
        "fixed-composition": "composition given",
        "losses": performance.input_text("losses") if performance._values["losses"] else "",
    }
    if case is None:
        return words.get(key, f"exponent {chamber.si('isentropic_exponent'):.4g}" if key == "given-gas" else "")
    role = key.removesuffix("-state")
    if key == "basis":
        return str(case.si("thermo_basis"))
    if key == "no-combustion":
        return f"{case.si('temperature'):.5g} K"
    if role in case.roles:
        return f"{case._values.get(f'{role}_temperature') or case._values[role].row.temperature:.5g} K"
    return words.get(key, "")


def _place(nozzle: Any) -> str:
    at = nozzle._values["freeze_at"]
    return "the throat" if at == "throat" else f"area ratio {at:g}"


def _origin(entry: Assumption) -> str:
    return {"default": " (default)", "given": " (given)"}.get(entry.origin, "")


def _line(entry: Assumption) -> str:
    reason = next((price.note for price in entry.prices if price.note), "")
    return f"{entry.statement}{_origin(entry)}{f' Not priced: {_clause(reason)}.' if reason else ''}"


def _clause(sentence: str) -> str:
    """Return a sentence as the end of another one."""
    first = sentence.split(maxsplit=1)[0]
    plain = first[1:].islower() or len(first) == 1
    return (f"{sentence[0].lower()}{sentence[1:]}" if plain else sentence).rstrip(".")


def _table(rows: list[tuple[Assumption, Price]]) -> Table:
    labels, changes = [], []
    shown: set[str] = set()
    for entry, price in rows:
        first = entry.key not in shown
        shown.add(entry.key)
        labels.append(LABELS.get(entry.key, entry.key.replace("-", " ")) if first else "")
        changes.append(f"{entry.taken if first else ''} → {price.alternative}".strip())
    columns = [Column("alternative", "assumed → alternative", "", "", 0, tuple(changes))]
    for name in EFFECTS:
        values = tuple(_percent(getattr(price, name)) for _, price in rows)
        columns.append(Column(name, _WORDS[name], _SYMBOLS[name], "percent", 2, values))
    return Table("assumptions", "Assumptions and what they cost", "assumption", tuple(labels), tuple(columns), NOTE)


def _percent(change: float | None) -> float | None:
    return None if change is None else round(100.0 * change, 3 if abs(change) < 1e-3 else 2) + 0.0


def _figure(entries: tuple[Assumption, ...]) -> Figure:
    sizes = [max((abs(price.specific_impulse or 0.0) for price in entry.prices), default=0.0) for entry in entries]
    ordered = sorted(zip(entries, sizes, strict=True), key=lambda pair: -pair[1])
    kept = [(entry, 100.0 * size) for entry, size in ordered if size > 0.0]
    texts = tuple(f"{value:.2f} %" if value >= 0.01 else "< 0.01 %" for _, value in kept)
    bars = Bars(
        tuple(LABELS.get(entry.key, entry.key) for entry, _ in kept),
        Series("largest change of specific impulse", tuple(value for _, value in kept), "percent"),
        texts,
    )
    alt = "Largest change of specific impulse: " + ", ".join(
        f"{category} {text}" for category, text in zip(bars.categories, texts, strict=True)
    )
    return Figure(
        "prices",
        "What carries the specific impulse",
        alt,
        Axis("largest change of specific impulse", "percent", low=0.0),
        Axis(""),
        (bars,),
    )


def _largest(entry: Assumption) -> str:
    price = entry.prices[0]
    name = max(EFFECTS, key=lambda name: abs(getattr(price, name) or 0.0))
    return f"the {name.replace('_', ' ')} by {100.0 * (getattr(price, name) or 0.0):+.2f} %"
