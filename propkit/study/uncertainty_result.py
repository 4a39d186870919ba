"""What an uncertainty run yields: a table, a budget, intervals, figures, and a sheet with ± beside the numbers."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt
from scipy import special

from propkit import quantities, units
from propkit.errors import InputError, NotAvailableError, Problem, near_matches
from propkit.model.base import reach
from propkit.model.doubts import Doubt
from propkit.report import Column, Report, Row, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Line, Rule, Series
from propkit.study.coverage import COVERAGE
from propkit.study.evaluation import result_quantity
from propkit.study.propagation import NOTHING, FirstOrder, Trials, curvature
from propkit.study.sensitivity import SobolIndices
from propkit.view.numbers import Rounded, rounded_together

if TYPE_CHECKING:
    import pandas as pd

    from propkit.study.uncertainty import Uncertainty

Array = npt.NDArray[np.float64]

COVERAGE_FACTOR = float(special.ndtri(0.5 + 0.5 * COVERAGE))
"""Coverage factor of a normal distribution for the coverage probability of the intervals."""


class UncertaintyResult:
    """Uncertainty of results; immutable.

    Attributes
    ----------
    plan : Uncertainty
        What was asked.
    first_order : FirstOrder or None
        First-order analysis; None where it cannot be made (a warning says why).
    trials : Trials or None
        Trials, where they were asked for.
    asked : int, "adaptive" or None
        Number of trials as asked for.
    """

    __slots__ = ("_curvature", "_illegal", "_reason", "asked", "first_order", "plan", "trials")

    plan: Uncertainty
    first_order: FirstOrder | None
    trials: Trials | None
    asked: int | str | None
    _curvature: Array | None
    _illegal: str
    _reason: str

    def __init__(
        self,
        plan: Uncertainty,
        linear: FirstOrder | None,
        trials: Trials | None,
        reason: str = "",
        asked: int | str | None = None,
        illegal: str = "refuse",
    ) -> None:
        object.__setattr__(self, "_curvature", None)
        object.__setattr__(self, "asked", asked)
        object.__setattr__(self, "_illegal", illegal)
        object.__setattr__(self, "plan", plan)
        object.__setattr__(self, "first_order", linear)
        object.__setattr__(self, "trials", trials)
        object.__setattr__(self, "_reason", reason)

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("an uncertainty result is immutable")

    def __reduce__(self) -> tuple[Any, ...]:
        return UncertaintyResult, (self.plan, self.first_order, self.trials, self._reason, self.asked, self._illegal)

    # -- numbers -------------------------------------------------------------------------------------

    @property
    def seed(self) -> int | None:
        """Seed of the trials; None without trials."""
        return self.trials.seed if self.trials is not None else None

    @property
    def samples(self) -> int:
        """Number of trials evaluated; 0 without trials."""
        return self.trials.samples if self.trials is not None else 0

    @property
    def results(self) -> tuple[str, ...]:
        """Names of the results."""
        return self.plan.function.results

    @property
    def warnings(self) -> tuple[Doubt, ...]:
        """What to doubt about the uncertainties."""
        found = [Doubt(note, code="trials", about="trials") for note in (self.trials.notes if self.trials else ())]
        if self._reason:
            found.append(Doubt(f"There is no first-order analysis: {self._reason}", code="first-order", about="budget"))
        if self.first_order is not None:
            for result, path in self.first_order.bent(self.curvature):
                text = f"{result} bends noticeably over the uncertainty of {path}: first order is doubtful"
                hint = "" if self.trials is not None else "; use trials (samples=...)"
                found.append(Doubt(f"{text}{hint}.", code="curvature", about=result))
        return tuple(found)

    @property
    def curvature(self) -> Array:
        """What second order adds to first order over one standard uncertainty, shape (results, inputs) [1]; found when asked for."""
        if self._curvature is None:
            found = curvature(self.plan.function, self.plan._joint, self._linear())
            object.__setattr__(self, "_curvature", found)
        assert self._curvature is not None
        return self._curvature

    @property
    def table(self) -> pd.DataFrame:
        """Results by name: value (nominal), standard_uncertainty, low and high end of the 95 % interval, in SI."""
        import pandas as pd

        value, deviation, low, high = self._columns()
        frame = pd.DataFrame(
            {"value": value, "standard_uncertainty": deviation, "low": low, "high": high},
            index=pd.Index(self.results, name="result"),
        )
        frame.attrs["units"] = {name: self._quantity(name).unit for name in self.results}
        frame.attrs["coverage"] = COVERAGE
        return frame

    def _columns(self) -> tuple[Array, Array, Array, Array]:
        if self.trials is not None:
            return self.trials.nominal, self.trials.standard_uncertainty, self.trials.low, self.trials.high
        assert self.first_order is not None
        value, deviation = self.first_order.nominal, self.first_order.standard_uncertainty
        return value, deviation, value - COVERAGE_FACTOR * deviation, value + COVERAGE_FACTOR * deviation

    def standard_uncertainty(self, result: str) -> float:
        """Return the standard uncertainty of a result [SI]."""
        return float(self._columns()[1][self._place(result)])

    def expanded_uncertainty(self, result: str, k: float = 2.0) -> float:
        """Return the expanded uncertainty of a result [SI]: `k` standard uncertainties (GUM 6.2.1)."""
        return k * self.standard_uncertainty(result)

    def rounded(self, result: str, units_shown: UnitSystem = "SI") -> Rounded:
        """Return value and standard uncertainty of a result in display units, rounded together (GUM 7.2.6)."""
        place = self._place(result)
        value, deviation, _, _ = self._columns()
        _, factor = self._display(result, units_shown)
        return rounded_together(float(value[place]) * factor, float(deviation[place]) * factor)

    def budget(self, result: str) -> pd.DataFrame:
        """Return the first-order budget of a result, the largest share first.

        Parameters
        ----------
        result : str
            Name of the result.

        Returns
        -------
        DataFrame
            Index input; columns value, standard_uncertainty, sensitivity (result per input, SI), contribution (SI of the
            result), share of the variance [1] and derivative ("exact" or "differences": how the sensitivity was found); with
            correlated inputs shares may be negative.

        Raises
        ------
        NotAvailableError
            When there is no first-order analysis.
        """
        import pandas as pd

        linear = self._linear()
        place = self._place(result)
        joint = self.plan._joint
        frame = pd.DataFrame(
            {
                "value": list(joint.nominal.values()),
                "standard_uncertainty": joint.deviations,
                "sensitivity": linear.derivatives[place],
                "contribution": np.abs(linear.derivatives[place]) * joint.deviations,
                "share": linear.shares[place],
                "derivative": ["exact" if path in linear.exact else "differences" for path in linear.paths],
            },
            index=pd.Index(linear.paths, name="input"),
        )
        frame.attrs["units"] = {path: entry.unit for path, entry in self.plan._variables.items()}
        order = np.argsort(-np.abs(linear.shares[place]), kind="stable")
        return frame.iloc[order]

    def correlation(self) -> pd.DataFrame:
        """Return the correlation of the results with each other."""
        import pandas as pd

        if self.trials is not None:
            good = np.isfinite(self.trials.values).all(axis=0)
            covariance = np.cov(self.trials.values[:, good])
        else:
            covariance = self._linear().covariance
        covariance = np.atleast_2d(covariance)
        deviations = np.sqrt(np.diag(covariance))
        deviations = np.where(deviations > NOTHING * np.abs(self._columns()[0]), deviations, 0.0)
        outer = np.outer(deviations, deviations)
        matrix = np.divide(covariance, outer, out=np.zeros_like(covariance), where=outer > 0.0)
        return pd.DataFrame(matrix, index=list(self.results), columns=list(self.results))

    def values(self, result: str) -> Array:
        """Return the result of every trial [SI]; NaN where a trial has no solution."""
        if self.trials is None:
            raise NotAvailableError("there were no trials; run(samples=..., seed=...) makes them")
        found: Array = self.trials.values[self._place(result)].copy()
        return found

    def _linear(self) -> FirstOrder:
        if self.first_order is None:
            raise NotAvailableError(f"there is no first-order analysis: {self._reason}")
        return self.first_order

    def _place(self, result: str) -> int:
        if result in self.results:
            return self.results.index(result)
        near = near_matches(result, self.results)
        hint = f" Did you mean {' or '.join(near)}?" if near else ""
        raise InputError(f"{result!r} is not among the results of this run.{hint}", candidates=near)

    def _quantity(self, result: str) -> quantities.Quantity:
        return result_quantity(self.plan.target, result)

    def _display(self, result: str, system: UnitSystem) -> tuple[str, float]:
        """Return display unit of a result, and the factor from SI for values and differences (none has an offset)."""
        quantity = self._quantity(result)
        if system not in ("SI", "US"):
            raise InputError(Problem("units", repr(system), "'SI' or 'US'"))
        unit = quantity.shown_in(system, (float(self._columns()[0][self._place(result)]),))
        return unit, units.convert(1.0, quantity.unit, unit)

    # -- what people see -------------------------------------------------------------------------------

    def __repr__(self) -> str:
        how = f"{self.samples} trials, seed {self.seed}" if self.trials is not None else "first order"
        return f"<uncertainty of {len(self.results)} results of a {self.plan.target.kind}: {how}>"

    def __str__(self) -> str:
        return str(self.report())

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        return self.report()._repr_mimebundle_(include, exclude)

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return the object's sheet with ± beside its numbers, and the uncertainty tables below."""
        sheet = self.plan.target.report(units=units)
        doubts = (*(str(doubt) for doubt in self.warnings), *sheet.doubts)
        tables = (self._result_section(units), self._input_section(units), *self._budget_sections(units))
        return replace(
            sheet,
            subtitle=f"{sheet.subtitle + ', ' if sheet.subtitle else ''}{self._how()}",
            headline=tuple(self._with_uncertainty(row) for row in sheet.headline),
            given=tuple(self._with_input(row) for row in sheet.given),
            results=tuple(self._with_uncertainty(row) for row in sheet.results),
            sections=(*tables, *sheet.sections),
            doubts=doubts,
        )

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the record of the chain with this uncertainty, which a reviewer can recompute (trials are run again)."""
        from propkit.study.recorded import RecordedUncertainty, record_of

        plan = self.plan
        options = {
            "inputs": plan.inputs,
            "correlation": [[first, second, value] for (first, second), value in plan._correlation.items()] or None,
            "results": list(self.results),
            "samples": self.asked,
            "seed": self.seed,
            "illegal": self._illegal,
        }
        texts = {"title": title, "author": author, "purpose": purpose, "notes": notes}
        return record_of(RecordedUncertainty, plan.target, options, texts)

    def _how(self) -> str:
        if self.trials is None:
            return "± standard uncertainty in first order"
        return f"± standard uncertainty from {self.trials.valid} trials, seed {self.seed}"

    def _with_uncertainty(self, row: Row) -> Row:
        if row.name not in self.results or not isinstance(row.value, float):
            return row
        factor = units.convert(1.0, self._quantity(row.name).unit, row.unit)
        return replace(row, uncertainty=self.standard_uncertainty(row.name) * factor)

    def _with_input(self, row: Row) -> Row:
        path = f"{self.plan.target.kind}.{row.name}"
        entry = self.plan._variables.get(path)
        if entry is None or not isinstance(row.value, float):
            return row
        deviation = self.plan._joint.distributions[path].standard_uncertainty
        return replace(row, uncertainty=deviation * units.convert(1.0, entry.unit, row.unit))

    def _result_section(self, system: UnitSystem) -> Section:
        _, _, low, high = self._columns()
        rows, shown_units, ends = [], [], []
        for place, name in enumerate(self.results):
            unit, factor = self._display(name, system)
            rows.append(self.rounded(name, system))
            shown_units.append(units.shown_unit(unit))
            decimals = len(rows[-1].uncertainty.partition(".")[2])
            ends.append(tuple(f"{end * factor:.{decimals}f}" for end in (low[place], high[place])))
        columns = (
            Column("value", "value", "", "", 0, tuple(row.value for row in rows)),
            Column("standard_uncertainty", "standard uncertainty", "", "", 0, tuple(row.uncertainty for row in rows)),
            Column("low", "95 % from", "", "", 0, tuple(end[0] for end in ends)),
            Column("high", "95 % to", "", "", 0, tuple(end[1] for end in ends)),
            Column("unit", "unit", "", "", 0, tuple(shown_units)),
        )
        labels = tuple(self._quantity(name).label for name in self.results)
        kind = "probabilistically symmetric, from the trials" if self.trials is not None else "1.96 standard uncertainties"
        table = Table("uncertainties", "Uncertainty of the results", "result", labels, columns, f"95 % interval: {kind}.")
        return Section("uncertainties", "Uncertainty of the results", table=table)

    def _input_section(self, system: UnitSystem) -> Section:
        paths, nominals, deviations, kinds, shown_units = [], [], [], [], []
        for path, entry in self.plan._variables.items():
            quantity = quantities.quantity(entry.quantity.rpartition(".")[2], entry.quantity.partition(".")[0])
            unit = quantity.shown_in(system, (entry.nominal,))
            factor = units.convert(1.0, entry.unit, unit)
            pair = rounded_together(entry.nominal * factor, self.plan._joint.distributions[path].standard_uncertainty * factor)
            paths.append(path)
            nominals.append(pair.value)
            deviations.append(pair.uncertainty)
            kinds.append(type(self.plan._inputs[path]).__name__.lower())
            shown_units.append(units.shown_unit(unit))
        columns = (
            Column("value", "value", "", "", 0, tuple(nominals)),
            Column("standard_uncertainty", "standard uncertainty", "", "", 0, tuple(deviations)),
            Column("unit", "unit", "", "", 0, tuple(shown_units)),
            Column("distribution", "distribution", "", "", 0, tuple(kinds)),
        )
        pairs = [f"{a} with {b}: {value:g}" for (a, b), value in self.plan._correlation.items()]
        note = f"Correlations: {'; '.join(pairs)}." if pairs else "The inputs are not correlated."
        table = Table("uncertain_inputs", "Uncertain inputs", "input", tuple(paths), columns, note)
        return Section("uncertain_inputs", "Uncertain inputs", table=table)

    def _budget_sections(self, system: UnitSystem) -> tuple[Section, ...]:
        if self.first_order is None:
            return ()
        shown = [name for name in self.plan.target.headline if name in self.results] or list(self.results[:3])
        columns = tuple(
            Column(
                name,
                self._quantity(name).label,
                "",
                "percent",
                3,
                tuple(100.0 * float(share) for share in self.first_order.shares[self._place(name)]),
            )
            for name in shown
        )
        note = f"Share of each input in the variance of a result, first order, {self._how_derived()}; see budget(result) for any other."
        table = Table("budget", "Budget", "input", self.first_order.paths, columns, note)
        return (Section("budget", "Budget", table=table),)

    def _how_derived(self) -> str:
        """Return how the sensitivities were found."""
        linear = self._linear()
        left = [path for path in linear.paths if path not in linear.exact]
        if not left:
            return "derivatives exact"
        return f"derivatives by differences in {', '.join(left)}{', exact in the others' if linear.exact else ''}"

    # -- figures ---------------------------------------------------------------------------------------

    def tornado(self, result: str, units_shown: UnitSystem = "SI") -> Figure:
        """Return the contributions of the inputs to the standard uncertainty of a result, the largest first."""
        frame = self.budget(result)
        unit, factor = self._display(result, units_shown)
        quantity = self._quantity(result)
        heights = tuple(float(value) * factor for value in frame["contribution"])
        texts = tuple(
            f"±{value:.3g} {units.shown_unit(unit)} ({100.0 * share:.0f} %)" for value, share in zip(heights, frame["share"], strict=True)
        )
        bars = Bars(tuple(map(str, frame.index)), Series("contribution", heights, unit, quantity.symbol), texts)
        listed = ", ".join(f"{path} {text}" for path, text in zip(frame.index, texts, strict=True))
        title = f"What makes the uncertainty of the {quantity.label}"
        axis = Axis(f"one standard uncertainty of the input moves the {quantity.label} by", unit, "", low=0.0)
        return Figure(f"tornado-{result}", title, f"{title}: {listed}", axis, Axis(""), (bars,))

    def histogram(self, result: str, units_shown: UnitSystem = "SI") -> Figure:
        """Return the distribution of a result over the trials, with nominal value and 95 % interval."""
        values = self.values(result)
        values = values[np.isfinite(values)]
        unit, factor = self._display(result, units_shown)
        quantity = self._quantity(result)
        bins = int(np.clip(np.sqrt(len(values)), 10, 80))
        counts, edges = np.histogram(values * factor, bins=bins, density=True)
        steps = np.repeat(edges, 2)[1:-1]
        line = Line(
            Series(quantity.label, tuple(map(float, steps)), unit, quantity.symbol),
            Series("density", tuple(map(float, np.repeat(counts, 2)))),
            fill=True,
        )
        nominal, _, low, high = (float(column[self._place(result)]) * factor for column in self._columns())
        marked = ((nominal, "nominal"), (low, "2.5 %"), (high, "97.5 %"))
        rules = tuple(Rule("x", place, text) for place, text in marked)
        title = f"{quantity.label.capitalize()} over {len(values)} trials"
        alt = f"{title}: nominal {nominal:.6g}, 95 % between {low:.6g} and {high:.6g}"
        axes = Axis(quantity.label, unit, quantity.symbol), Axis("probability density", low=0.0)
        return Figure(f"histogram-{result}", title, f"{alt} {units.shown_unit(unit)}", *axes, (line, *rules))

    def panel(self, result: str | None = None) -> Any:
        """Return the interactive panel: sliders for the uncertainties and inputs, the budget redrawn live (extra ``notebook``).

        Parameters
        ----------
        result : str, optional
            Result shown first; the first of the object's headline by default.
        """
        return reach("uncertainty_panel")(self, "" if result is None else self.results[self._place(result)])

    def plot(self, result: str, kind: str = "tornado", units: UnitSystem = "SI") -> Any:
        """Return a Bokeh figure of a result: ``"tornado"`` or ``"histogram"``."""
        if kind not in ("tornado", "histogram"):
            raise InputError(f"kind is {kind!r}; it must be 'tornado' or 'histogram'.")
        made = self.tornado(result, units) if kind == "tornado" else self.histogram(result, units)
        return reach("figure")(made).figure


class SobolResult:
    """Variance-based sensitivities by result; immutable."""

    __slots__ = ("indices", "plan")

    plan: Uncertainty
    indices: SobolIndices

    def __init__(self, plan: Uncertainty, indices: SobolIndices) -> None:
        object.__setattr__(self, "plan", plan)
        object.__setattr__(self, "indices", indices)

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a result is immutable")

    def __reduce__(self) -> tuple[Any, ...]:
        return SobolResult, (self.plan, self.indices)

    @property
    def seed(self) -> int:
        """Seed of the design."""
        return self.indices.seed

    def table(self, result: str) -> pd.DataFrame:
        """Return the indices of a result: index input; columns first, first_half_width, total, total_half_width [1]."""
        import pandas as pd

        found = self.indices
        if result not in found.results:
            near = near_matches(result, found.results)
            raise InputError(f"{result!r} is not among the results of this run.", candidates=near)
        place = found.results.index(result)
        return pd.DataFrame(
            {
                "first": found.first[place],
                "first_half_width": found.first_half_width[place],
                "total": found.total[place],
                "total_half_width": found.total_half_width[place],
            },
            index=pd.Index(found.paths, name="input"),
        )

    def __repr__(self) -> str:
        return f"<Sobol indices of {len(self.indices.results)} results, {self.indices.evaluations} evaluations, seed {self.seed}>"
