"""Reconciliations and firings as links of a chain, for their records (see `propkit.study.recorded`)."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit.study.recorded import Recorded, brief, plain_data

if TYPE_CHECKING:
    import pandas as pd

    from propkit.reconcile.firing import HotFire
    from propkit.reconcile.reconciliation import Reconciliation


class RecordedReconciliation(Recorded):
    """A reconciliation as a link of a chain."""

    kind = "reconciliation"
    title = "Reconciliation"
    ordered = ("figures", "free")
    statement = "Quoted figures are adjusted by weighted least squares with the model as constraint (VDI 2048)."

    def _make(self, options: dict[str, Any]) -> Reconciliation:
        from propkit.reconcile.reconciliation import Reconciliation

        pairs = {(first, second): value for first, second, value in options.pop("correlation", [])}
        return Reconciliation(self._values["target"], options.pop("figures"), correlation=pairs, **options)

    def _listed(self, analysis: Reconciliation) -> dict[str, tuple[float, str]]:
        listed = {
            "p_value": (analysis.p_value, ""),
            "chi_square": (analysis.chi_square, ""),
            "degrees_of_freedom": (float(analysis.degrees_of_freedom), ""),
        }
        adjusted, residuals = analysis.adjusted, analysis.residuals
        for name in adjusted.index:
            unit = analysis.unit_of(name)
            listed[f"adjusted {name}"] = (float(adjusted.loc[name, "value"]), unit)
            listed[f"uncertainty of adjusted {name}"] = (float(adjusted.loc[name, "standard_uncertainty"]), unit)
            # residuals of figures that nothing checks are rounding over rounding
            sound = bool(residuals.loc[name, "checkable"])
            listed[f"normalised residual of {name}"] = (
                float(residuals.loc[name, "normalised"]) if sound else math.nan,
                "",
            )
        for path, row in analysis.unknowns.iterrows():
            listed[f"estimate of {path}"] = (float(row["value"]), analysis.unit_of(f"prior of {path}"))
        return listed


class RecordedFiring(Recorded):
    """A firing as a link of a chain; its recording is part of the record."""

    kind = "firing"
    title = "Hot firing"
    ordered = ("recording", "channels", "calibration", "full_scale")
    statement = "Means over a steady window; delivered results with the hot throat area; ideal references."

    def _make(self, options: dict[str, Any]) -> HotFire:
        import pandas as pd

        from propkit.reconcile.firing import HotFire
        from propkit.reconcile.firing_window import Criterion

        columns = {name: pd.array(values, dtype="Float64") for name, values in options.pop("recording").items()}
        frame = pd.DataFrame(columns).astype(float)
        if options.get("criterion") is not None:
            options["criterion"] = Criterion(*options["criterion"])
        return HotFire(self._values["target"], frame, options.pop("channels"), **options)

    def _listed(self, analysis: HotFire) -> dict[str, tuple[float, str]]:
        table, means = analysis.table, analysis.means
        listed = {"window start": (analysis.window.start, "s"), "window end": (analysis.window.end, "s")}
        for name in table.index:
            unit = table.attrs["units"][name]
            listed[name] = (float(table.loc[name, "value"]), unit)
            listed[f"uncertainty of {name}"] = (float(table.loc[name, "standard_uncertainty"]), unit)
        for name in means.index:
            unit = analysis.recording.channels[name].unit
            listed[f"mean of {name}"] = (float(means.loc[name, "value"]), unit)
            listed[f"uncertainty of mean of {name}"] = (float(means.loc[name, "standard_uncertainty"]), unit)
        return listed

    def input_text(self, name: str) -> str:
        """Return the inputs with the recording in a few words."""
        if name == self.upstream_input:
            return super().input_text(name)
        options = dict(self._values[name])
        recording = options.pop("recording")
        headers = ", ".join(header for header, _ in recording)
        text = ", ".join(f"{key}: {brief(value)}" for key, value in sorted(options.items()) if value not in (None, []))
        return f"{len(recording[0][1])} samples of {headers}; {text}"[:1900]


def recorded_frame(frame: pd.DataFrame) -> dict[str, Any]:
    """Return a table of numbers as plain data."""
    return {str(name): plain_data(frame[name].to_numpy(dtype=np.float64)) for name in frame.columns}
