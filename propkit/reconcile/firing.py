"""`pk.HotFire`: what a firing delivered, from its recording."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import units
from propkit.errors import InputError, NotAvailableError, Problem, RangeError, near_matches
from propkit.model.base import reach
from propkit.model.doubts import Doubt
from propkit.model.performance import Performance
from propkit.reconcile import firing_sheet
from propkit.reconcile.firing_inputs import (
    KNOWN,
    ChannelMean,
    calibration_of,
    measured,
    quantity_of,
    require_channels,
    result_unit,
    stretch_of,
)
from propkit.reconcile.firing_results import AMBIENT, FLOW, FUEL, OXIDIZER, PRESSURE, THROAT, DeliveredFunction
from propkit.reconcile.firing_series import Recording, read_recording
from propkit.reconcile.firing_statistics import FEWEST, Zero, mean_of, throat_at, zero_of
from propkit.reconcile.firing_window import Criterion, Window, burns, find_window
from propkit.study.distributions import Normal
from propkit.study.joint import JointInputs
from propkit.study.propagation import FirstOrder, first_order
from propkit.study.uncertainty_result import COVERAGE_FACTOR

if TYPE_CHECKING:
    import pandas as pd

    from propkit.report import Report, UnitSystem
    from propkit.series import Figure

_AFTER = 0.25
"""Share of the burn left out after the cutoff before the zero after is taken (tail-off)."""
_BEFORE = 0.05
"""Share of the burn left out before the ignition."""
_SURROUNDINGS = 1.2
"""Chamber over ambient pressure below which nothing burns; a choked throat needs 1.7 at the least."""


class HotFire:
    """A firing: steady window, means, delivered results and efficiencies; immutable, the constructor is the calculation.

    Parameters
    ----------
    target : Performance
        Geometry, propellants and ambient pressure; the references are computed from it.
    recording : path or DataFrame
        CSV file or table with the unit of each column in its header, as in ``thrust [kN]``.
    channels : mapping of str to str
        What is measured -> column: ``"chamber.pressure"``, ``"oxidizer_mass_flow"``, ``"fuel_mass_flow"``,
        ``"mass_flow"``, ``"thrust"``, ``"ambient"``, or any other name of a quantity, which is only averaged.
    throat_before : (diameter, standard uncertainty)
        Cold throat diameter before the firing; default: the target's, taken as exact to 0.1 %.
    throat_after : (diameter, standard uncertainty), optional
        Cold throat diameter after it.
    throat_growth : (share, standard uncertainty) or float
        Growth of the diameter while hot [1].
    calibration : mapping of str to uncertainty, optional
        Channel -> standard uncertainty of its calibration, common to all samples.
    window : (start, end), optional
        Steady window [s], as numbers, texts or quantities; found by the criterion where not given.
    criterion : Criterion, optional
        What counts as steady.
    zero_before, zero_after : (start, end), optional
        Stretches in which nothing flows [s]; found from the burn where not given.
    correct_zero : bool
        Whether zeros are subtracted.
    time : str, optional
        Column of time.
    full_scale : mapping of str to (low, high), optional
        Measuring range of a channel, as texts, quantities or SI numbers.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        For columns, units, windows or throats that are none; all problems of the recording at once.
    RangeError
        When nothing burns or no stretch is steady.
    """

    __slots__ = ("_given", "_linear", "_name", "_recording", "_target", "_throat", "_window", "_means")  # noqa: RUF023

    _given: dict[str, Any]
    _linear: FirstOrder
    _means: dict[str, ChannelMean]
    _name: str
    _recording: Recording
    _target: Performance
    _throat: tuple[float, float]
    _window: Window

    def __init__(
        self,
        target: Performance,
        recording: Any,
        channels: Mapping[str, str],
        *,
        throat_before: Any = None,
        throat_after: Any = None,
        throat_growth: Any = 0.0,
        calibration: Mapping[str, Any] | None = None,
        window: tuple[Any, Any] | None = None,
        criterion: Criterion | None = None,
        zero_before: tuple[Any, Any] | None = None,
        zero_after: tuple[Any, Any] | None = None,
        correct_zero: bool = True,
        time: str | None = None,
        full_scale: Mapping[str, tuple[Any, Any]] | None = None,
        name: str = "",
    ) -> None:
        if not isinstance(target, Performance):
            raise InputError(Problem("target", f"{target!r}"[:60], "a pk.Performance"))
        given = {
            "throat_before": throat_before,
            "throat_after": throat_after,
            "throat_growth": throat_growth,
            "calibration": dict(calibration or {}),
            "window": None if window is None else stretch_of("window", window),
            "criterion": criterion,
            "zero_before": None if zero_before is None else stretch_of("zero_before", zero_before),
            "zero_after": None if zero_after is None else stretch_of("zero_after", zero_after),
            "correct_zero": correct_zero,
            "time": time,
            "full_scale": dict(full_scale or {}),
        }
        hold = object.__setattr__
        hold(self, "_target", target)
        hold(self, "_name", name)
        hold(self, "_given", {"recording": recording, "channels": dict(channels), **given})
        wanted = {channel: quantity_of(channel) for channel in channels}
        require_channels(channels)
        scales = {
            channel: tuple(units.to_si(end, wanted[channel].unit, f"full_scale of {channel}") for end in ends)
            for channel, ends in (full_scale or {}).items()
            if channel in wanted
        }
        read = read_recording(
            recording,
            channels,
            {channel: row.unit for channel, row in wanted.items()},
            time=time,
            full_scale=scales,  # type: ignore[arg-type]
        )
        hold(self, "_recording", read)
        watched = [channel for channel in KNOWN if channel in channels and channel != AMBIENT]
        hold(self, "_window", find_window(read, PRESSURE, watched, criterion, given["window"]))
        self._average(correct_zero, calibration or {})
        self._throats(throat_before, throat_after, throat_growth)
        self._deliver()

    # -- the calculation -------------------------------------------------------------------------------

    def _average(self, correct_zero: bool, calibration: Mapping[str, Any]) -> None:
        unknown = [channel for channel in calibration if channel not in self._recording.channels]
        if unknown:
            listed = ", ".join(self._recording.channels)
            raise InputError(Problem("calibration", f"given for {', '.join(unknown)}", f"for channels of the recording ({listed})"))
        inside = self._recording.within(self._window.start, self._window.end)
        means = {}
        for name, channel in self._recording.channels.items():
            mean = mean_of(channel.values[inside & channel.good], name)
            zero = self._zero(name) if correct_zero else None
            means[name] = ChannelMean(mean, zero, calibration_of(calibration.get(name), mean.value, channel.unit, name))
        object.__setattr__(self, "_means", means)

    def _zero(self, name: str) -> Zero | None:
        if name == AMBIENT or quantity_of(name).kind.name not in ("pressure", "force", "mass flow"):
            return None
        stretches = []
        time, window = self._recording.time, self._window
        quiet = np.ones(len(time), dtype=bool)
        for start, end in burns(self._recording, PRESSURE):
            length = end - start
            quiet &= (time < start - _BEFORE * length) | (time > end + _AFTER * length)
        found = (quiet & (time < window.ignition), quiet & (time > window.cutoff))
        channel = self._recording.channels[name]
        for key, default in zip(("zero_before", "zero_after"), found, strict=True):
            stretch = self._given[key]
            use = (default if stretch is None else self._recording.within(*stretch)) & channel.good
            enough = np.count_nonzero(use) >= FEWEST
            if stretch is not None and not enough:
                raise InputError(Problem(key, f"{np.count_nonzero(use)} good samples of {name}", f"at least {FEWEST}"))
            stretches.append(channel.values[use] if enough else None)
        pressure = quantity_of(name).kind.name == "pressure"
        expected = self._ambient() if pressure else 0.0
        zero = zero_of(stretches[0], stretches[1], expected, name)
        return zero if zero.before is not None or zero.after is not None else None

    def _ambient(self) -> float:
        channel = self._recording.channels.get(AMBIENT)
        return float(np.median(channel.values[channel.good])) if channel is not None else self._target.si("ambient")

    def _throats(self, before: Any, after: Any, growth: Any) -> None:
        own = self._target.nozzle.si("throat_diameter")
        cold = (own, 1e-3 * own) if before is None else measured("throat_before", before, "m")
        worn = None if after is None else measured("throat_after", after, "m")
        hot = measured("throat_growth", growth, "") if isinstance(growth, tuple | list) else (units.to_si(growth, "", "throat_growth"), 0.0)
        if not -0.1 < hot[0] < 0.1:
            raise InputError(Problem("throat_growth", f"{growth!r}", "between -0.1 and 0.1", "It is a share of the diameter."))
        if worn is not None and not 0.8 < worn[0] / cold[0] < 1.25:
            raise InputError(Problem("throat_after", f"{worn[0]:g} m", f"like the {cold[0]:g} m before", "Is one of them a radius?"))
        share = min(max(self._window.share_of_burn, 0.0), 1.0)
        object.__setattr__(self, "_throat", throat_at(cold, worn, share, hot))

    def _deliver(self) -> None:
        used = [name for name in KNOWN if name in self._means and not self._redundant(name)]
        entries = {name: (self._means[name].value, self._means[name].standard_uncertainty) for name in used}
        entries[THROAT] = self._throat
        bad = [
            Problem(name, f"{value:g} on average", "above 0", "Check the sign, the zero and the window.")
            for name, (value, _) in entries.items()
            if not value > 0.0 and name != AMBIENT
        ]
        ambient, pressure = self._ambient(), entries[PRESSURE][0]
        if pressure < _SURROUNDINGS * ambient:
            raise RangeError(
                f"nothing burns: chamber.pressure is {pressure:.4g} Pa, that of the surroundings ({ambient:.4g} Pa)",
                pressure=pressure,
            )
        if bad:
            raise InputError(bad)
        resolved = {
            name: Normal(max(uncertainty, 1e-9 * abs(value), 1e-12)).resolve(value, "", name)
            for name, (value, uncertainty) in entries.items()
        }
        names = tuple(resolved)
        function = self._target.lazily(f"delivered from {names}", lambda: DeliveredFunction(self._target, names))
        object.__setattr__(self, "_linear", first_order(function, JointInputs(resolved)))

    def _redundant(self, name: str) -> bool:
        """Whether a total flow is measured beside both of its parts: the parts are used, the total is compared."""
        return name == FLOW and OXIDIZER in self._means and FUEL in self._means

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a HotFire is immutable; use .replace(window=...) for a new one")

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (self._target, self._given, self._name)

    def replace(self, **changes: Any) -> HotFire:
        """Return the firing with other options, for instance ``window=(start, end)``."""
        unknown = [name for name in changes if name not in (*self._given, "target", "name")]
        if unknown:
            near = near_matches(unknown[0], self._given)
            raise TypeError(f"replace() got an unexpected keyword {unknown[0]!r}; near: {', '.join(near)}")
        given = {**self._given, **{key: value for key, value in changes.items() if key not in ("target", "name")}}
        return _rebuild(changes.get("target", self._target), given, changes.get("name", self._name))

    # -- results ---------------------------------------------------------------------------------------

    @property
    def target(self) -> Performance:
        """Geometry and references."""
        return self._target

    @property
    def recording(self) -> Recording:
        """The recording with its flags."""
        return self._recording

    @property
    def window(self) -> Window:
        """The steady window."""
        return self._window

    @property
    def title(self) -> str:
        """The analyst's name for it."""
        return self._name or self._target.given_name() or self._target.subtitle()

    @property
    def channel_means(self) -> dict[str, ChannelMean]:
        """Means of the channels with the parts of their uncertainty."""
        return dict(self._means)

    @property
    def throat_diameter(self) -> tuple[float, float]:
        """Hot throat diameter in the middle of the window [m] and its standard uncertainty [m]."""
        return self._throat

    @property
    def table(self) -> pd.DataFrame:
        """Delivered results: value, standard_uncertainty, low and high end of the 95 % interval, in SI."""
        import pandas as pd

        value, deviation = self._linear.nominal, self._linear.standard_uncertainty
        frame = pd.DataFrame(
            {
                "value": value,
                "standard_uncertainty": deviation,
                "low": value - COVERAGE_FACTOR * deviation,
                "high": value + COVERAGE_FACTOR * deviation,
            },
            index=pd.Index(self._linear.results, name="result"),
        )
        frame.attrs["units"] = {name: result_unit(name) for name in self._linear.results}
        return frame

    @property
    def means(self) -> pd.DataFrame:
        """Means of the channels in SI, with the parts of their standard uncertainty and what they rest on."""
        import pandas as pd

        rows = self._means
        inside = self._recording.within(self._window.start, self._window.end)
        return pd.DataFrame(
            {
                "value": [row.value for row in rows.values()],
                "standard_uncertainty": [row.standard_uncertainty for row in rows.values()],
                "random": [row.mean.standard_uncertainty for row in rows.values()],
                "zero": [row.zero_uncertainty for row in rows.values()],
                "calibration": [row.calibration for row in rows.values()],
                "correction": [-row.zero.correction if row.zero is not None else 0.0 for row in rows.values()],
                "samples": [row.mean.count for row in rows.values()],
                "independent": [row.mean.independent for row in rows.values()],
                "left_out": [int(np.count_nonzero(inside & ~self._recording.channels[name].good)) for name in rows],
            },
            index=pd.Index(list(rows), name="channel"),
        )

    @property
    def zeros(self) -> pd.DataFrame:
        """Zeros of the channels in SI: expected, before, after, drift, whether it is significant."""
        import pandas as pd

        rows = {name: row.zero for name, row in self._means.items() if row.zero is not None}
        return pd.DataFrame(
            {
                "expected": [zero.expected for zero in rows.values()],
                "before": [zero.before.value if zero.before else math.nan for zero in rows.values()],
                "after": [zero.after.value if zero.after else math.nan for zero in rows.values()],
                "drift": [zero.drift for zero in rows.values()],
                "drifted": [zero.drifted for zero in rows.values()],
            },
            index=pd.Index(list(rows), name="channel"),
        )

    def budget(self, result: str) -> pd.DataFrame:
        """Return the share of each measured mean in the variance of a result, the largest first."""
        import pandas as pd

        linear = self._linear
        if result not in linear.results:
            near = near_matches(result, linear.results)
            hint = f" Did you mean {' or '.join(near)}?" if near else ""
            raise NotAvailableError(f"{result!r} is not among the results of this firing.{hint}")
        place = linear.results.index(result)
        frame = pd.DataFrame(
            {"sensitivity": linear.derivatives[place], "share": linear.shares[place]},
            index=pd.Index(linear.paths, name="input"),
        )
        return frame.sort_values("share", ascending=False, kind="stable")

    def as_figures(self) -> dict[str, tuple[float, float]]:
        """Return the means as figures for a `Reconciliation`: (value, standard uncertainty) in SI."""
        found = {name: (row.value, row.standard_uncertainty) for name, row in self._means.items() if name in KNOWN and name != AMBIENT}
        return {**found, "throat_diameter": self._throat}

    @staticmethod
    def together(firings: Sequence[HotFire]) -> pd.DataFrame:
        """Return several firings in one table: a row for each, value and standard_uncertainty of each result (SI)."""
        import pandas as pd

        if not firings:
            raise InputError("there are no firings to put in a table")
        rows = {}
        for number, firing in enumerate(firings):
            frame = firing.table[["value", "standard_uncertainty"]]
            title = firing._name or f"firing {number + 1}"
            rows[title if title not in rows else f"{title} ({number + 1})"] = frame.stack()
        made = pd.DataFrame(rows).T
        made.index.name = "firing"
        made.columns.names = ["result", "statistic"]
        order = list(dict.fromkeys(name for firing in firings for name in firing.table.index))
        return made.reindex(columns=pd.MultiIndex.from_product([order, ["value", "standard_uncertainty"]], names=made.columns.names))

    @property
    def warnings(self) -> tuple[Doubt, ...]:
        """What to doubt about recording, window and means."""
        return tuple(firing_sheet.doubts(self))

    # -- what people see -------------------------------------------------------------------------------

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return the sheet of the firing as neutral data that displays itself."""
        return firing_sheet.report_of(self, units, reach("render"))

    kind = "firing"

    def panel(self) -> Any:
        """Return the interactive panel: the window turned by hand (extra ``notebook``)."""
        return reach("panel")(self)

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the record of the chain with this firing and its recording, which a reviewer can recompute."""
        import pandas as pd

        from propkit.reconcile.recorded import RecordedFiring, recorded_frame
        from propkit.study.recorded import record_of

        recording, options = self._recording, dict(self._given)
        headers = {name: f"{name} [{channel.unit or '-'}]" for name, channel in recording.channels.items()}
        columns = {headers[name]: channel.values for name, channel in recording.channels.items()}
        options["recording"] = recorded_frame(pd.DataFrame({"time [s]": recording.time, **columns}))
        options["channels"] = headers
        rule = options.pop("criterion")
        options |= {
            "criterion": None if rule is None else [rule.drift, rule.band],
            "name": self._name or None,
            "time": None,
        }
        texts = {"title": title or self._name, "author": author, "purpose": purpose, "notes": notes}
        return record_of(RecordedFiring, self._target, options, texts)

    def __str__(self) -> str:
        return str(self.report())

    def __repr__(self) -> str:
        listed = ", ".join(self._recording.channels)
        return f"<firing with {listed}: window {self._window.start:.4g} s to {self._window.end:.4g} s>"

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        return self.report()._repr_mimebundle_(include, exclude)

    def trace(self, channel: str = PRESSURE, units: UnitSystem = "SI") -> Figure:
        """Return a channel over time with the window marked, neutral data for a drawing or a plot."""
        if channel not in self._recording.channels:
            near = near_matches(channel, self._recording.channels)
            raise InputError(f"{channel!r} is no channel of this recording.", candidates=near)
        return firing_sheet.trace_figure(self, channel, units)

    def plot(self, channel: str = PRESSURE, units: UnitSystem = "SI") -> Any:
        """Return a Bokeh figure of a channel over time with the window marked."""
        return reach("figure")(self.trace(channel, units)).figure


def _rebuild(target: Performance, given: Mapping[str, Any], name: str) -> HotFire:
    return HotFire(target, name=name, **given)
