"""`pk.Reconciliation`: quoted figures of an engine, made consistent with each other through the model."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import quantities
from propkit.errors import InputError, Problem, near_matches
from propkit.model.base import reach
from propkit.model.doubts import Doubt
from propkit.model.performance import Performance
from propkit.reconcile import sheet
from propkit.reconcile.adjustment import LARGE_RESIDUAL, Adjustment, Figure, Unknown, adjust
from propkit.reconcile.figures import QuotedFigure, read_figure
from propkit.reconcile.model import (
    EXTRA_UNKNOWNS,
    LEVELLED,
    FigureModel,
    default_free,
    figure_key,
    figure_quantity,
    name_of,
)
from propkit.reconcile.route_values import route_values
from propkit.reconcile.routes import RouteValue
from propkit.study.evaluation import variable

if TYPE_CHECKING:
    import pandas as pd

    from propkit.report import Report, UnitSystem
    from propkit.series import Figure as Drawing

Free = Sequence[str] | Mapping[str, Any]


class Reconciliation:
    """Quoted or measured figures that must agree with each other; immutable, the constructor is the calculation.

    Parameters
    ----------
    target : Performance
        The chain that ties the figures together; its inputs are first guesses where they are freed, and hold else.
    figures : mapping of str to figure
        Name or path -> ``("812 kN", "1 %")``, one standard uncertainty (or a distribution) beside the value;
        ``"812 kN"`` alone has its uncertainty inferred from the printed digits; a third entry is the level,
        ``"chamber"`` or ``"engine"``.
    free : sequence of str, or mapping of str to prior, optional
        Inputs that may move; a mapping gives each a prior like a figure, or None. Default: the inputs quoted directly
        or through a figure of the same group. Efficiencies and the mixture ratio move only when listed;
        ``thrust_coefficient_efficiency`` is known here beside the inputs of the chain.
    dump_flow_fraction, dump_specific_impulse : figure, optional
        Open cycles: turbine flow dumped over engine flow, and its specific impulse; with an uncertainty they may move.
        Thrust, specific impulse and flows then are engine figures unless they say otherwise.
    correlation : mapping of pair of str to float, optional
        Correlation of two figures [1].
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        For figures that are none, fewer figures than unknowns, unknowns that the figures do not determine, and figures
        that cannot all be true.
    """

    __slots__ = (
        "_adjustment", "_correlation", "_dump", "_figures", "_free", "_given", "_model", "_name", "_priors", "_strikes", "_target",
    )  # fmt: skip

    _adjustment: Adjustment
    _correlation: dict[tuple[str, str], float]
    _dump: dict[str, Any]
    _figures: dict[str, QuotedFigure]
    _free: tuple[str, ...]
    _given: dict[str, Any]
    _model: FigureModel
    _name: str
    _priors: dict[str, Any]
    _strikes: Any
    _target: Performance

    def __init__(
        self,
        target: Performance,
        figures: Mapping[str, Any],
        free: Free | None = None,
        *,
        dump_flow_fraction: Any = None,
        dump_specific_impulse: Any = None,
        correlation: Mapping[tuple[str, str], float] | None = None,
        name: str = "",
    ) -> None:
        if not isinstance(target, Performance):
            raise InputError(Problem("target", f"{target!r}"[:60], "a pk.Performance"))
        if not isinstance(figures, Mapping) or not figures:
            raise InputError(
                Problem(
                    "figures",
                    f"{figures!r}"[:60],
                    "a mapping of names to figures",
                    'For example {"thrust": ("812 kN", "1 %")}.',
                )
            )
        hold = object.__setattr__
        hold(self, "_target", target)
        hold(self, "_given", dict(figures))
        hold(self, "_name", name)
        hold(self, "_correlation", dict(correlation or {}))
        dump = {"dump_flow_fraction": dump_flow_fraction, "dump_specific_impulse": dump_specific_impulse}
        hold(self, "_dump", {key: value for key, value in dump.items() if value is not None})
        hold(self, "_free", ())
        hold(self, "_priors", {})
        hold(self, "_figures", self._read(figures))
        self._set_free(free)
        hold(self, "_adjustment", self._adjust())
        hold(self, "_strikes", None)

    # -- reading -------------------------------------------------------------------------------------

    def _read(self, figures: Mapping[str, Any]) -> dict[str, QuotedFigure]:
        problems: list[Problem] = []
        read: dict[str, QuotedFigure] = {}
        if len(self._dump) == 1:
            missing = ({"dump_flow_fraction", "dump_specific_impulse"} - set(self._dump)).pop()
            problems.append(Problem(missing, "missing", f"given with {next(iter(self._dump))}"))
        for name, given in figures.items():
            try:
                key = figure_key(self._target, name)
                level = "engine" if self._dump and key in LEVELLED else "chamber"
                figure = read_figure(name, key, given, figure_quantity(self._target, key), level)
                _check_level(figure, bool(self._dump))
                if any(other.key == key and other.level == figure.level for other in read.values()):
                    raise InputError(Problem(name, "given twice", "given once at each level"))
                read[name] = figure
            except InputError as error:
                problems.extend(error.problems or (Problem(name, "not understood", "a figure of this engine", str(error)),))
        if problems:
            raise InputError(problems)
        return read

    def _set_free(self, free: Free | None) -> None:
        keys = [figure.key for figure in self._figures.values()]
        priors: dict[str, Any] = {}
        if free is None:
            names: tuple[str, ...] = default_free(self._target, keys)
            if not names:
                raise InputError(
                    'none of the quoted figures frees an input by itself; list what may move, for example free=["chamber.pressure"]'
                )
        else:
            listed = [free] if isinstance(free, str) else list(free)
            names = tuple(dict.fromkeys(self._unknown(name) for name in listed))
            if isinstance(free, Mapping):
                priors = {self._unknown(name): prior for name, prior in free.items() if prior is not None}
        for key, given in self._dump.items():
            if isinstance(given, tuple | list):
                names, priors = (*names, key), {**priors, key: given}
        if any(key in ("propellant_mass", "total_impulse", "burn_time") for key in keys) and "burn_time" not in names:
            names = (*names, "burn_time")
        object.__setattr__(self, "_free", tuple(dict.fromkeys(names)))
        object.__setattr__(self, "_priors", priors)

    def _unknown(self, name: str) -> str:
        if name in EXTRA_UNKNOWNS:
            return name
        try:
            return variable(self._target, name).path
        except InputError as error:
            near = near_matches(name, EXTRA_UNKNOWNS)
            hint = f" Did you mean {', '.join(near)}?" if near else ""
            raise InputError(f"free: {error}{hint}", path=name) from None

    def _adjust(self) -> Adjustment:
        keys = tuple(dict.fromkeys((figure.key, figure.level) for figure in self._figures.values()))
        fixed = {
            key: read_figure(key, key, (given, 1.0), quantities.quantity(key), "engine").value
            for key, given in self._dump.items()
            if not isinstance(given, tuple | list)
        }
        model = FigureModel(self._target, self._free, keys, fixed)
        object.__setattr__(self, "_model", model)
        entries = [
            Figure(figure.name, figure.value, figure.uncertainty, name_of(figure.key, figure.level)) for figure in self._figures.values()
        ]
        unknowns = []
        for path in self._free:
            prior = self._priors.get(path)
            start, low, high = self._start(path)
            if prior is not None:
                quantity = quantities.quantity(path) if path in EXTRA_UNKNOWNS else figure_quantity(self._target, path)
                read = read_figure(f"prior of {path}", path, prior, quantity, "chamber")
                entries.append(Figure(read.name, read.value, read.uncertainty, path, prior=True))
                start = min(max(read.value, low), high)
            unknowns.append(Unknown(path, start, low, high))
        pairs = {(str(a), str(b)): float(value) for (a, b), value in self._correlation.items()}
        return adjust(model, entries, unknowns, correlation=pairs)

    def _start(self, path: str) -> tuple[float, float, float]:
        if path not in EXTRA_UNKNOWNS:
            found = variable(self._target, path)
            return found.nominal, found.low, found.high
        start, low, high = EXTRA_UNKNOWNS[path]
        if path == "burn_time":
            quoted = {figure.key: figure.value for figure in self._figures.values()}
            flow = quoted.get("mass_flow", self._target.si("mass_flow"))
            force = quoted.get("thrust", self._target.si("thrust"))
            start = quoted.get("burn_time", quoted.get("propellant_mass", 0.0) / flow or quoted.get("total_impulse", 0.0) / force)
        return start, low, high

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a Reconciliation is immutable; make another one")

    def __reduce__(self) -> tuple[Any, ...]:
        free: Free = {path: self._priors.get(path) for path in self._free if path not in self._dump}
        return _rebuild, (self._target, self._given, free, self._dump, self._correlation, self._name)

    # -- results -------------------------------------------------------------------------------------

    @property
    def target(self) -> Performance:
        """The chain as it was given."""
        return self._target

    @property
    def figures(self) -> dict[str, QuotedFigure]:
        """Figures as read, by the names they were given by."""
        return dict(self._figures)

    @property
    def free(self) -> tuple[str, ...]:
        """What was free to move."""
        return self._free

    @property
    def adjustment(self) -> Adjustment:
        """The adjustment with all its matrices."""
        return self._adjustment

    @property
    def adjusted(self) -> pd.DataFrame:
        """Adjusted figures: value, standard_uncertainty, given, given_uncertainty in SI; level; inferred."""
        import pandas as pd

        found = self._adjustment
        read = [self._figures.get(name) for name in found.names]
        frame = pd.DataFrame(
            {
                "value": found.adjusted,
                "standard_uncertainty": found.adjusted_uncertainty,
                "given": [figure.value for figure in found.figures],
                "given_uncertainty": [figure.uncertainty for figure in found.figures],
                "level": [figure.level if figure is not None else "prior" for figure in read],
                "inferred": [figure.inferred if figure is not None else False for figure in read],
            },
            index=pd.Index(found.names, name="figure"),
        )
        frame.attrs["units"] = {name: self.unit_of(name) for name in found.names}
        return frame

    @property
    def residuals(self) -> pd.DataFrame:
        """Residuals: residual (adjusted less given, SI), normalised [1], redundancy [1], checkable."""
        import pandas as pd

        found = self._adjustment
        return pd.DataFrame(
            {
                "residual": found.residual,
                "normalised": found.normalised,
                "redundancy": found.redundancy,
                "checkable": found.checkable,
            },
            index=pd.Index(found.names, name="figure"),
        )

    @property
    def unknowns(self) -> pd.DataFrame:
        """What was free: value and standard_uncertainty in SI, first guess, and whether it sits on an end of its range."""
        import pandas as pd

        found = self._adjustment
        return pd.DataFrame(
            {
                "value": found.estimate,
                "standard_uncertainty": np.sqrt(np.diag(found.estimate_covariance)),
                "start": [entry.start for entry in found.unknowns],
                "on_bound": [entry.path in found.on_bound for entry in found.unknowns],
            },
            index=pd.Index([entry.path for entry in found.unknowns], name="unknown"),
        )

    @property
    def p_value(self) -> float:
        """Probability of figures that differ this much or more although all are right; NaN without redundancy."""
        return self._adjustment.p_value

    @property
    def chi_square(self) -> float:
        """Sum of squares of the residuals in standard uncertainties."""
        return self._adjustment.chi_square

    @property
    def degrees_of_freedom(self) -> int:
        """Figures and priors less unknowns."""
        return self._adjustment.degrees_of_freedom

    @property
    def suspects(self) -> tuple[str, ...]:
        """Figures that may be out, by |normalised residual|; empty unless the global test gives p below 0.05."""
        return self._adjustment.suspects

    @property
    def strikes(self) -> pd.DataFrame:
        """What striking each checkable figure out leaves: chi_square, degrees_of_freedom, p_value, restores."""
        import pandas as pd

        if self._strikes is None:
            object.__setattr__(self, "_strikes", self._adjustment.strikes())
        rows = self._strikes
        return pd.DataFrame(
            {
                "chi_square": [row.chi_square for row in rows],
                "degrees_of_freedom": [row.degrees_of_freedom for row in rows],
                "p_value": [row.p_value for row in rows],
                "restores": [row.restores for row in rows],
            },
            index=pd.Index([row.name for row in rows], name="figure"),
        )

    @property
    def reconciled(self) -> Performance:
        """The chain at the adjusted inputs (a freed thrust-coefficient efficiency is not part of it)."""
        changes = {
            path: float(value) for path, value in zip(self._free, self._adjustment.estimate, strict=True) if path not in EXTRA_UNKNOWNS
        }
        return self._target.replace(changes)

    def struck(self, name: str) -> Reconciliation:
        """Return the reconciliation without one figure."""
        if name not in self._given:
            near = near_matches(name, self._given)
            raise InputError(f"{name!r} is not among the figures.", candidates=near)
        rest = {key: value for key, value in self._given.items() if key != name}
        pairs = {pair: value for pair, value in self._correlation.items() if name not in pair}
        free: Free = {path: self._priors.get(path) for path in self._free if path not in self._dump}
        return _rebuild(self._target, rest, free, self._dump, pairs, self._name)

    def routes(self, quantity: str) -> pd.DataFrame:
        """Return each independent way of getting a quantity from the quoted figures.

        Parameters
        ----------
        quantity : str
            ``"mass_flow"``, ``"throat_diameter"``, ``"throat_area"``, ``"specific_impulse"`` or
            ``"specific_impulse_vacuum"``.

        Returns
        -------
        DataFrame
            Index route; columns value and standard_uncertainty (SI, at chamber level), low and high (95 %), figures.
        """
        import pandas as pd

        found = self.route_values(quantity)
        frame = pd.DataFrame(
            {
                "value": [entry.value for entry in found],
                "standard_uncertainty": [entry.standard_uncertainty for entry in found],
                "low": [entry.value - LARGE_RESIDUAL * entry.standard_uncertainty for entry in found],
                "high": [entry.value + LARGE_RESIDUAL * entry.standard_uncertainty for entry in found],
                "figures": [", ".join(entry.figures) or "none" for entry in found],
            },
            index=pd.Index([entry.words for entry in found], name="route"),
        )
        frame.attrs["units"] = quantities.quantity(quantity).unit
        return frame

    def route_values(self, quantity: str) -> tuple[RouteValue, ...]:
        """Return the routes as neutral data (see `routes`)."""
        return route_values(self, quantity)

    def unit_of(self, name: str) -> str:
        """Return the SI unit of a figure or prior, in pint's spelling."""
        return self.quantity_of(name).unit

    def quantity_of(self, name: str) -> quantities.Quantity:
        """Return the catalogue row of a figure or prior."""
        if name in self._figures:
            return self._figures[name].quantity
        path = name.removeprefix("prior of ")
        return quantities.quantity(path) if path in EXTRA_UNKNOWNS else figure_quantity(self._target, path)

    @property
    def warnings(self) -> tuple[Doubt, ...]:
        """What to doubt about the figures and their adjustment."""
        return tuple(sheet.doubts(self))

    # -- what people see -------------------------------------------------------------------------------

    @property
    def title(self) -> str:
        """The analyst's name for it, or the chain."""
        return self._name or self._target.given_name() or self._target.subtitle()

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return routes, adjusted figures, residuals and tests as neutral data that displays itself."""
        return sheet.report_of(self, units, reach("render"))

    kind = "reconciliation"

    def panel(self) -> Any:
        """Return the interactive panel: figures struck out and put back (extra ``notebook``)."""
        return reach("panel")(self)

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the record of the chain with this reconciliation, which a reviewer can recompute."""
        from propkit.reconcile.recorded import RecordedReconciliation
        from propkit.study.recorded import record_of

        options = {
            "figures": self._given,
            "free": {path: self._priors.get(path) for path in self._free if path not in self._dump},
            **self._dump,
            "correlation": [[first, second, value] for (first, second), value in self._correlation.items()] or None,
            "name": self._name or None,
        }
        texts = {"title": title or self._name, "author": author, "purpose": purpose, "notes": notes}
        return record_of(RecordedReconciliation, self._target, options, texts)

    def __str__(self) -> str:
        return str(self.report())

    def __repr__(self) -> str:
        listed = ", ".join(f"{name!r}: {given!r}" for name, given in self._given.items())
        return f"pk.Reconciliation({self._target.kind}, {{{listed}}}, free={list(self._free)!r})"

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        return self.report()._repr_mimebundle_(include, exclude)

    def drawing(self, quantity: str, units: UnitSystem = "SI") -> Drawing:
        """Return the routes to a quantity as intervals, neutral data for a drawing or a plot."""
        return sheet.interval_figure(self, quantity, units)

    def plot(self, quantity: str = "mass_flow", units: UnitSystem = "SI") -> Any:
        """Return a Bokeh figure of the routes to a quantity with their 95 % intervals."""
        return reach("figure")(self.drawing(quantity, units)).figure


def _rebuild(
    target: Performance,
    figures: Mapping[str, Any],
    free: Free,
    dump: Mapping[str, Any],
    correlation: Mapping[tuple[str, str], float],
    name: str,
) -> Reconciliation:
    return Reconciliation(target, figures, free, **dump, correlation=correlation, name=name)


def _check_level(figure: QuotedFigure, dumped: bool) -> None:
    if figure.level != "engine":
        return
    if not dumped:
        raise InputError(
            Problem(
                figure.name,
                "at engine level",
                "at chamber level",
                "Give dump_flow_fraction and dump_specific_impulse to tell the two apart.",
            )
        )
    if figure.key not in LEVELLED:
        raise InputError(Problem(figure.name, "at engine level", "at chamber level", "This model knows it for the chamber alone."))
