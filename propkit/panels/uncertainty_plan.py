"""An uncertainty as its panel sees it: the last link of the chain, whose settings are the spreads of the uncertain inputs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any, ClassVar, Self

from propkit import quantities
from propkit.errors import InputError
from propkit.model.declare import Bounds, CustomInput
from propkit.panels.last_link import ChoiceSetting, LastLink, NumberSetting, numeric_inputs, told_apart
from propkit.panels.steps import value_text
from propkit.plots.study import result_label
from propkit.study.distributions import Distribution, Empirical, Normal
from propkit.study.uncertainty import Uncertainty

SAMPLES, SEED = 10_000, 1
MOST_SAMPLES = 1_000_000
FIRST_ORDER, TRIALS = "first order", "trials"
ILLEGAL = {"refuse": "refuse the trials", "leave out": "leave out and count"}
METHODS = {FIRST_ORDER: "first order", TRIALS: "trials (Monte Carlo)"}


class SpreadSetting(CustomInput):
    """The spread of an uncertain input, as its distribution is written: ``"1 %"`` or ``"0.05 MPa"``.

    Parameters
    ----------
    path : str
        Path of the input.
    label : str
        What a person reads.
    value : Distribution
        The distribution where none is given.
    """

    def __init__(self, path: str, label: str, quantity: quantities.Quantity, value: Distribution) -> None:
        short = "uncertainty" if isinstance(value, Normal) else "values" if isinstance(value, Empirical) else "half-width"
        what = "standard uncertainty" if isinstance(value, Normal) else "half-width"
        if isinstance(value, Normal) and value.k != 1.0:
            what = f"expanded uncertainty, k = {value.k:g}"
        doc = f"the {what} of the {label} ({type(value).__name__.lower()} distribution); in % it is of the value"
        super().__init__(doc=doc, reader=lambda name, given: spread_of(value, given), default=spread_text(value, quantity))
        self.name, self.owner, self.value = path, "", value
        self.label = f"{short} of {label}"
        self._row = quantity

    @property
    def quantity(self) -> quantities.Quantity:
        """Row of the catalogue."""
        return self._row


def spread_of(distribution: Distribution, given: Any) -> Distribution:
    """Return a distribution of the same kind with another spread."""
    if isinstance(distribution, Empirical):
        raise InputError("the spread of observed values is that of the values; give other values in code")
    field = "uncertainty" if isinstance(distribution, Normal) else "half_width"
    changed: Distribution = replace(distribution, **{field: given})  # type: ignore[type-var]
    return changed


def spread_text(distribution: Distribution, quantity: quantities.Quantity) -> str:
    """Return the spread of a distribution as it could be typed."""
    from propkit import units

    if isinstance(distribution, Empirical):
        return f"{len(distribution.samples)} observed values"
    given = distribution.uncertainty if isinstance(distribution, Normal) else distribution.half_width  # type: ignore[attr-defined]
    if isinstance(given, str):
        return given
    if isinstance(given, int | float):
        unit = units.shown_unit(quantity.unit)
        return f"{value_text(float(given))}{f' {unit}' if unit else ''}"
    return f"{given}"


@dataclass(frozen=True, slots=True, eq=False)
class Opened:
    """The uncertainty that a panel was opened on."""

    inputs: Mapping[str, Distribution]
    correlation: Mapping[tuple[str, str], float]
    results: tuple[str, ...]
    result: str
    samples: Any
    seed: int
    illegal: str
    method: str


class UncertaintyPlan(LastLink):
    """An uncertainty of the results of a chain.

    Parameters
    ----------
    target : Calculation
        The object whose results are wanted.
    typed : mapping
        Settings as given: result, method, samples, seed, and the spread of each uncertain input by its path.
    opened : Opened
        The uncertainty that the panel was opened on.
    """

    kind: ClassVar[str] = "uncertainty"
    title: ClassVar[str] = "Uncertainty"

    def __init__(self, target: Any, typed: Mapping[str, Any], opened: Opened) -> None:
        self.opened = opened
        super().__init__(target, typed)

    def declare(self) -> None:
        """Declare result, spreads and how the trials are run."""
        known = numeric_inputs(self.target)
        opened = self.opened
        labels = told_apart({name: result_label(self.target, name) for name in opened.results})
        self.result_labels = labels
        first = opened.result or next((name for name in self.target.headline if name in labels), opened.results[0])
        self.setting(ChoiceSetting("result", "result shown", "the result whose budget and interval are drawn", labels, first))
        self.labels = {path: known.get(path, path.replace(".", " ")) for path in opened.inputs}
        inputs = {path: self._spread(path, value) for path, value in opened.inputs.items()}
        self.uncertainty = Uncertainty(self.target, inputs, opened.correlation or None, list(opened.results))
        self.setting(ChoiceSetting("method", "method", "first order, or trials of the whole distributions", METHODS, opened.method))
        self.setting(
            ChoiceSetting(
                "illegal", "draws outside the legal range", "what trials do with a draw that an input cannot have", ILLEGAL, opened.illegal
            )
        )
        for name, label, value, bounds in (
            ("samples", "trials", opened.samples, Bounds(at_least=100, at_most=MOST_SAMPLES)),
            ("seed", "seed", opened.seed, Bounds(at_least=0, at_most=2**31)),
        ):
            row = quantities.Quantity(name, quantities.NUMBER, "", label, label, 6)
            start = float(value) if isinstance(value, int) else float(SAMPLES)
            self.setting(
                NumberSetting(name, row, label, f"the {'number' if name == 'samples' else 'seed'} of the trials", start, bounds, whole=True)
            )

    def _spread(self, path: str, distribution: Distribution) -> Distribution:
        entry = self._row(path)
        found: Distribution = self.setting(SpreadSetting(path, self.labels[path], entry, distribution))  # type: ignore[arg-type]
        return found

    def _row(self, path: str) -> quantities.Quantity:
        from propkit.study.evaluation import variable

        found = variable(self.target, path)
        return quantities.quantity(found.quantity.rpartition(".")[2], found.quantity.partition(".")[0])

    def tidied(self, typed: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
        """Go back to first order when a spread changes: trials are run on demand."""
        if not changes.keys() & {"method", "result", "samples", "seed", "illegal"}:
            typed["method"] = FIRST_ORDER
        return typed

    def rebuilt(self, target: Any, typed: Mapping[str, Any]) -> Self:
        """Return the same uncertainty of another target or with other settings, solved."""
        if target is not self.target:
            typed = {**typed, "method": FIRST_ORDER}
        made = type(self)(target, typed, self.opened)
        if target is self.target and self._only_shown(made):
            made.hold(self.result)
        _ = made.result
        return made

    def _only_shown(self, other: UncertaintyPlan) -> bool:
        """Whether another plan has the same numbers, and only shows another result of them."""
        if other.method != self.method or (
            self.method == TRIALS and (other.trials, other.si("illegal")) != (self.trials, self.si("illegal"))
        ):
            return False
        return dict(other.uncertainty.inputs) == dict(self.uncertainty.inputs)

    @property
    def method(self) -> str:
        """How the uncertainty is found."""
        return str(self._values["method"])

    @property
    def trials(self) -> tuple[Any, int]:
        """Number of trials and seed."""
        asked = self._values["samples"] if "samples" in self._typed or not isinstance(self.opened.samples, str) else self.opened.samples
        return (asked if isinstance(asked, str) else int(asked)), int(self._values["seed"])

    @property
    def result_name(self) -> str:
        """Result that is shown."""
        return str(self._values["result"])

    def solved(self) -> Any:
        """Return the uncertainty of the results."""
        if self.method == FIRST_ORDER:
            return self.uncertainty.run()
        samples, seed = self.trials
        return self.uncertainty.run(samples=samples, seed=seed, progress=False, illegal=self._values["illegal"])  # type: ignore[arg-type]

    def subtitle(self) -> str:
        """Return what is uncertain, in a line."""
        listed = list(self.labels.values())
        return ", ".join(listed) if len(listed) < 4 else f"{len(listed)} inputs"
