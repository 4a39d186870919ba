"""What a study yields: the table of designs, the failed ones with their reasons, the best one, exports and figures."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from propkit import quantities, units
from propkit.errors import InputError, Problem, RangeError, near_matches
from propkit.model import paths
from propkit.model.base import Calculation, reach, render
from propkit.model.doubts import Doubt
from propkit.report import Report, UnitSystem
from propkit.series import Figure
from propkit.study.pareto import undominated
from propkit.study.sweep_plan import QUICK

if TYPE_CHECKING:
    import pandas as pd

    from propkit.study.sweep import Study

Array = npt.NDArray[np.float64]


class StudyResult:
    """The results of a study; immutable.

    Attributes
    ----------
    plan : Study
        What was asked.
    interrupted : bool
        Whether the run was stopped: then the designs finished so far are here, and nothing else.
    seconds : float
        Time taken [s].
    notes : tuple of str
        What a reader should know about the run.
    """

    __slots__ = ("_columns", "_done", "_reasons", "interrupted", "notes", "plan", "seconds")

    plan: Study
    notes: tuple[str, ...]
    interrupted: bool
    seconds: float
    _columns: dict[str, Array]
    _done: npt.NDArray[np.bool_]
    _reasons: dict[int, str]

    def __init__(
        self,
        plan: Study,
        columns: dict[str, Array],
        done: npt.NDArray[np.bool_],
        reasons: dict[int, str],
        notes: tuple[str, ...],
        interrupted: bool,
        seconds: float,
    ) -> None:
        for column in columns.values():
            column.setflags(write=False)
        hold = object.__setattr__
        hold(self, "plan", plan)
        hold(self, "_columns", columns)
        hold(self, "_done", done)
        hold(self, "_reasons", reasons)
        hold(self, "notes", notes)
        hold(self, "interrupted", interrupted)
        hold(self, "seconds", seconds)

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a study result is immutable")

    def __reduce__(self) -> tuple[Any, ...]:
        return StudyResult, (self.plan, self._columns, self._done, self._reasons, self.notes, self.interrupted, self.seconds)

    def __len__(self) -> int:
        return int(np.count_nonzero(self._done))

    # -- tables ----------------------------------------------------------------------------------

    @property
    def results(self) -> tuple[str, ...]:
        """Names of the results."""
        return tuple(self._columns)

    @property
    def frame(self) -> pd.DataFrame:
        """Every design: one column for each path, then the results; SI floats, units in ``attrs["units"]``.

        Results of the study's own object have their bare name, upstream results their prefix. A failed design has NaN; a run
        that was interrupted has the designs finished so far. The index is the number of the design.
        """
        import pandas as pd

        rows = np.flatnonzero(self._done)
        whole = len(rows) == len(self._done)
        data: dict[str, Any] = {column.path: column.shown(rows) for column in self.plan.plan.columns}
        data |= {name: values.copy() if whole else values[rows] for name, values in self._columns.items()}
        index = pd.RangeIndex(len(rows), name="design") if whole else pd.Index(rows, name="design")
        frame = pd.DataFrame(data, index=index, copy=False)
        frame.attrs["units"] = self.units
        return frame

    @property
    def units(self) -> dict[str, str]:
        """SI unit of every column that is a number."""
        return self.plan.units

    @property
    def failed(self) -> pd.DataFrame:
        """The designs without a result: one column for each path, and ``reason``."""
        import pandas as pd

        rows = np.array(sorted(self._reasons), dtype=np.intp)
        data: dict[str, Any] = {column.path: column.shown(rows) for column in self.plan.plan.columns}
        data["reason"] = [self._reasons[int(row)] for row in rows]
        frame = pd.DataFrame(data, index=pd.Index(rows, name="design"))
        frame.attrs["units"] = {column.path: column.unit for column in self.plan.plan.numbers}
        return frame

    def values(self, name: str) -> Array:
        """Return a column as an array in SI: a result, or a path that was varied; NaN where there is none."""
        for column in self.plan.plan.numbers:
            if name == column.path or column.path.endswith(f".{name}"):
                return np.asarray(np.where(self._done, column.at(np.arange(len(self._done))), np.nan), dtype=np.float64)
        return np.where(self._done, self._columns[self.name_of(name)], np.nan)

    def name_of(self, result: str) -> str:
        """Return the column of a result, for its name or an unambiguous suffix of its path.

        Raises
        ------
        InputError
            For a result that the study does not have; candidates are listed.
        """
        if isinstance(result, str) and result in self._columns:
            return result
        ends = [name for name in self._columns if name.endswith(f".{result}")]
        own = f"{self.plan.target.kind}."
        if isinstance(result, str) and result.startswith(own) and result.removeprefix(own) in self._columns:
            return result.removeprefix(own)
        if len(ends) == 1:
            return ends[0]
        near = ends or near_matches(str(result), self._columns)
        hint = f"Did you mean {' or '.join(near)}?" if near else ""
        raise InputError(Problem("result", repr(result), "a numeric result of this study", hint), candidates=near)

    def display_frame(self, units: UnitSystem = "SI") -> pd.DataFrame:
        """Return the table for people: display units, with the unit in each column's title, rounded as on sheets.

        Parameters
        ----------
        units : str
            ``"SI"`` or ``"US"``.
        """
        from propkit import units as unit_text

        system = _system(units)
        frame = self.frame
        made: dict[str, Any] = {}
        for name in frame.columns:
            known = self.quantity(str(name))
            column = frame[name]
            if known is None or column.dtype.kind != "f":
                made[str(name)] = column.to_numpy()
                continue
            shown, factor, offset = self.display(str(name), system)
            text = unit_text.shown_unit(shown)
            values = np.asarray(column, dtype=np.float64) * factor + offset
            made[f"{name} [{text}]" if text else str(name)] = _rounded(values, max(known.digits, 4))
        import pandas as pd

        return pd.DataFrame(made, index=frame.index)

    def quantity(self, name: str) -> quantities.Quantity | None:
        """Return the catalogue row of a column; None for a choice."""
        for column in self.plan.plan.columns:
            if column.path == name:
                if column.is_choice:
                    return None
                last = name.partition(".")[2]
                if last.endswith(".enthalpy"):
                    return quantities.quantity("molar_enthalpy")
                return self.plan.target.chain()[paths.resolve(self.plan.target, name).position].declared_inputs[last].quantity
        if name in self._columns:
            owner = name.partition(".")[0]
            owner = owner if "." in name and any(link.kind == owner for link in self.plan.target.chain()) else self.plan.target.kind
            return quantities.quantity(name.rpartition(".")[2], owner)
        place = paths.resolve(self.plan.target, name)
        link = self.plan.target.chain()[place.position]
        return quantities.quantity(place.name.rpartition(".")[2], link.kind)

    def display(self, name: str, system: UnitSystem = "SI") -> tuple[str, float, float]:
        """Return display unit, factor and offset of a column, chosen for its whole range."""
        known = self.quantity(name)
        assert known is not None
        values = self.values(name)
        finite = values[np.isfinite(values)]
        shown = known.shown_in(system, (float(np.abs(finite).max()),) if len(finite) else ())
        zero = units.convert(0.0, known.unit, shown)
        return shown, units.convert(1.0, known.unit, shown) - zero, zero

    # -- choosing --------------------------------------------------------------------------------

    def best(self, result: str, minimum: bool = False, refine: bool = True) -> Calculation:
        """Return the object with the largest value of a result, refined between the designs.

        Parameters
        ----------
        result : str
            Name of the result.
        minimum : bool
            Whether the smallest is wanted.
        refine : bool
            Whether numbers are varied continuously between the smallest and the largest value of each path, with the choices
            of the best design kept; else the best design itself is returned.

        Returns
        -------
        Calculation
            The object. `maximise` says more: whether it sits on a bound, and how it was found.

        Raises
        ------
        RangeError
            When no design has that result.
        """
        from propkit.study.maximise import refined

        row, name = self.best_design(result, minimum)
        plan = self.plan.plan
        made: Calculation = self.plan.target.replace(
            {path: value for path, value in plan.design(row).items() if not path.endswith((".oxidizer.enthalpy", ".fuel.enthalpy"))}
        )
        free = {path: ends for path, ends in plan.ranges().items() if ends[0] < ends[1] and np.isfinite(ends).all()}
        return refined(made, name, free, minimum) if refine and free else made

    def best_design(self, result: str, minimum: bool = False) -> tuple[int, str]:
        """Return the number of the design with the largest (smallest) value of a result, and its column."""
        name = self.name_of(result)
        values = self.values(name)
        if not np.isfinite(values).any():
            raise RangeError(f"no design of the study has a {name}", failed=len(self._reasons))
        return int(np.nanargmin(values) if minimum else np.nanargmax(values)), name

    def pareto(self, *results: str, minimum: Sequence[str] = ()) -> pd.DataFrame:
        """Return the designs that none other beats in every result at once, in the order of the first result.

        Parameters
        ----------
        *results : str
            Two or more results to be large.
        minimum : sequence of str
            Those of them, or others, that are to be small.

        Returns
        -------
        DataFrame
            Their rows of `frame`.
        """
        if isinstance(minimum, str):
            minimum = (minimum,)
        names = tuple(dict.fromkeys(self._column_name(name) for name in (*results, *minimum)))
        small = {self._column_name(name) for name in minimum}
        if len(names) < 2:
            raise InputError(
                Problem("results", ", ".join(names) or "missing", "two results or more", "With one there is a best design: best(...).")
            )
        found = [(-1.0 if name in small else 1.0) * self.values(name) for name in names]
        table = np.stack(found, axis=1)
        usable = np.flatnonzero(np.isfinite(table).all(axis=1))
        kept = usable[undominated(table[usable])]
        order = kept[np.lexsort((kept, -table[kept, 0]))]
        frame = self.frame.loc[order]
        frame.attrs["units"] = self.units
        return frame

    def _column_name(self, name: str) -> str:
        """Return the column of a result, or of a number that varies."""
        varied = [column.path for column in self.plan.plan.numbers if name == column.path or column.path.endswith(f".{name}")]
        return varied[0] if varied else self.name_of(name)

    # -- files -----------------------------------------------------------------------------------

    def to_csv(self, path: str | os.PathLike[str]) -> Path:
        """Write the table as text, every digit kept, the SI unit in each column's title; return where.

        Raises
        ------
        StorageError
            When the file cannot be written.
        """
        from propkit.study.sweep_files import write_csv

        return write_csv(self._whole_frame(), self.units, Path(path))

    def to_parquet(self, path: str | os.PathLike[str]) -> Path:
        """Write the table as Parquet (extra ``study``), with the units in the metadata; return where.

        Raises
        ------
        MissingExtraError
            Without pyarrow.
        StorageError
            When the file cannot be written.
        """
        from propkit.study.sweep_files import write_parquet

        return write_parquet(self._whole_frame(), self.units, Path(path))

    def _whole_frame(self) -> pd.DataFrame:
        """Return the table with the reasons of failed designs as its last column."""
        frame = self.frame
        frame["failed"] = [self._reasons.get(int(row), "") for row in frame.index]
        return frame

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "", sample: int = 12, seed: int = 0) -> Any:
        """Return the record of the study: what varied, and a sample of designs that a reviewer recomputes.

        Parameters
        ----------
        title, author, purpose, notes : str
            Free text for the title block.
        sample : int
            Designs whose results are recorded and recomputed, at most 200.
        seed : int
            Seed of their choice; stated in the record.

        Raises
        ------
        RecordError
            When a recomputed design does not agree with the table to 1e-8.
        """
        from propkit.study.sweep_record import record_of_study

        return record_of_study(self, title=title, author=author, purpose=purpose, notes=notes, sample=sample, seed=seed)

    # -- display ---------------------------------------------------------------------------------

    @property
    def warnings(self) -> tuple[Doubt, ...]:
        """What to doubt about the study as a whole; which engine solved it is no doubt, and stands among `notes`."""
        found = [Doubt(note, code="run", about="frame") for note in self.notes if not note.startswith(QUICK)]
        if self._reasons:
            kinds: dict[str, int] = {}
            for text in self._reasons.values():
                kinds[text] = kinds.get(text, 0) + 1
            listed = "; ".join(f"{text} ({count})" for text, count in sorted(kinds.items(), key=lambda pair: -pair[1])[:3])
            found.append(Doubt(f"{len(self._reasons)} of {len(self)} designs have no result: {listed}", code="failed", about="frame"))
        return tuple(found)

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return the sheet of the study: what varied, and designs spread evenly over the table."""
        from propkit.study.sweep_sheet import axes_section, designs_section

        system = _system(units)
        return Report(
            kind="study",
            title="Study",
            subtitle=f"{self.plan.target.subtitle()}; {len(self)} designs",
            units=system,
            sections=(axes_section(self, system), designs_section(self, system)),
            doubts=tuple(str(doubt) for doubt in self.warnings),
            figures=self.figures(system),
            cautions=self.plan.target.cautions(),
            render=render,
        )

    def figures(self, units: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the first result of the object's headline over the longest axis of a grid; nothing for a list of designs."""
        from propkit.study.sweep_figures import curves

        numbers = [column for column in self.plan.plan.numbers if len(column.values) > 1]
        if not self.plan.plan.shape or not numbers or self.interrupted or not len(self):
            return ()
        return (curves(self, None, None, by=None, units=units),)

    def curves(self, x: str | None = None, y: str | None = None, *, by: str | None = None, units: UnitSystem = "SI") -> Figure:
        """Return a result over a path as neutral data, one curve for each value of another; arguments as for `plot`."""
        from propkit.study.sweep_figures import curves

        return curves(self, x, y, by=by, units=_system(units))

    def __str__(self) -> str:
        return str(self.report())

    def __repr__(self) -> str:
        partial = ", interrupted" if self.interrupted else ""
        return f"<results of {len(self)} designs, {len(self._reasons)} failed{partial}>"

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, Any]:
        return self.report()._repr_mimebundle_(include, exclude)

    # -- figures ---------------------------------------------------------------------------------

    def plot(self, x: str | None = None, y: str | None = None, *, by: str | None = None, units: UnitSystem = "SI") -> Any:
        """Return a Bokeh figure: a result over a path, one curve for each value of `by` (extra ``notebook``).

        Parameters
        ----------
        x : str, optional
            Path along the axis; the path with most values by default.
        y : str, optional
            Result; the first of the object's headline by default.
        by : str, optional
            Path that tells the curves apart; another path that varies by default.
        units : str
            ``"SI"`` or ``"US"``.
        """
        return reach("study_plot")(self, x, y, by=by, units=_system(units))

    def map(
        self,
        result: str | None = None,
        *,
        x: str | None = None,
        y: str | None = None,
        limits: Mapping[str, tuple[Any, Any]] | None = None,
        minimum: bool = False,
        units: UnitSystem = "SI",
    ) -> Any:
        """Return a Bokeh map of a result over two paths of a grid (extra ``notebook``).

        Parameters
        ----------
        result : str, optional
            Result whose contours are drawn; the first of the object's headline by default.
        x, y : str, optional
            Paths of the axes; the first two numbers that vary by default.
        limits : mapping of str to (low, high), optional
            Results that must stay inside a range, None for no limit; designs outside are hatched and do not count for the
            optimum. ``separation_margin`` is the ambient pressure at which the middle of three criteria predicts separation over the
            ambient pressure: ``(1, None)`` keeps to nozzles that flow full.
        minimum : bool
            Whether the smallest value is the optimum that is marked.
        units : str
            ``"SI"`` or ``"US"``.
        """
        return reach("study_map")(self, result, x=x, y=y, limits=limits, minimum=minimum, units=_system(units))

    def panel(self, result: str | None = None, *, limits: Mapping[str, tuple[Any, Any]] | None = None, minimum: bool = False) -> Any:
        """Return the interactive panel: a map or curves, solved anew while sliders move (extra ``notebook``).

        Parameters
        ----------
        result : str, optional
            Result shown first; the first of the object's headline by default.
        limits : mapping of str to (low, high), optional
            Results that must stay inside a range, None for no limit, as for `StudyResult.map`.
        minimum : bool
            Whether the smallest value is the best.
        """
        return reach("study_panel")(self, "" if result is None else self.name_of(result), limits, minimum)


def _rounded(values: Array, digits: int) -> Array:
    """Return numbers with so many significant digits."""
    with np.errstate(divide="ignore", invalid="ignore"):
        size = np.where((values != 0.0) & np.isfinite(values), np.floor(np.log10(np.abs(values))), 0.0)
    scale = 10.0 ** (digits - 1 - size)
    return np.where(np.isfinite(values), np.round(values * scale) / scale, values)


def _system(units: str) -> UnitSystem:
    if units not in ("SI", "US"):
        raise InputError(Problem("units", repr(units), "'SI' or 'US'"))
    return units  # type: ignore[return-value]
