"""Panels of analyses: the window of a firing turned by hand, figures of a reconciliation struck out and put back.

Event, new analysis, redraw: the panel holds state, the analysis never does. All logic is in plain methods.
"""

from __future__ import annotations

from typing import Any

import ipywidgets
import traitlets

from propkit.errors import PropkitError


class AnalysisPanel(ipywidgets.VBox):
    """Controls under the sheet of an analysis.

    Two outputs: the sheet, which is static and stays when no kernel is there, and the controls, which redraw it.

    Parameters
    ----------
    analysis : HotFire or Reconciliation
        The analysis to start from.
    """

    value = traitlets.Any(help="the current analysis: observe it")

    def __init__(self, analysis: Any) -> None:
        self._sheets: list[Any] = []
        self._words = ipywidgets.HTML()
        super().__init__()
        self.start = analysis
        self.value = analysis
        self.children = (ipywidgets.HBox(self.controls(), layout={"flex_flow": "row wrap"}), self._words)

    def controls(self) -> list[ipywidgets.Widget]:
        """Return the controls."""
        raise NotImplementedError

    @property
    def error(self) -> str:
        """Why the last change was refused, in words; empty when it was not."""
        return str(self._words.value)

    def attempt(self, make: Any) -> None:
        """Take the analysis that `make` gives; a refusal is shown and the last one kept."""
        import html

        try:
            self.value = make()
            self._words.value = ""
        except PropkitError as error:
            self._words.value = f"<span role='alert'>{html.escape(error.message)}</span>"
        self.redraw()

    def redraw(self) -> None:
        """Show the sheet of the current analysis wherever the panel is displayed."""
        for sheet in self._sheets:
            sheet.update(self.value._repr_mimebundle_(), raw=True)

    def _ipython_display_(self) -> None:
        from IPython.display import display

        self._sheets.append(display(self.value._repr_mimebundle_(), raw=True, display_id=True))
        display(self._repr_mimebundle_(), raw=True)


class FiringPanel(AnalysisPanel):
    """Panel of a firing: the steady window, chosen or found."""

    def controls(self) -> list[ipywidgets.Widget]:
        """Return a slider over the burn and a button that finds the window again."""
        window = self.value.window
        low, high = float(self.value.recording.time[0]), float(self.value.recording.time[-1])
        step = max(self.value.recording.interval, (high - low) / 2000.0)
        self.slider = ipywidgets.FloatRangeSlider(
            value=(window.start, window.end),
            min=low,
            max=high,
            step=step,
            description="window, s",
            continuous_update=False,
            readout_format=".2f",
            layout={"width": "32em"},
        )
        self.button = ipywidgets.Button(description="Find the window", tooltip=str(window.criterion))
        self.slider.observe(self._slid, names="value")
        self.button.on_click(lambda _: self.find())
        return [self.slider, self.button]

    def choose(self, start: float, end: float) -> None:
        """Evaluate the firing over the window from `start` to `end` [s]."""
        window = self.value.window
        if (round(window.start, 9), round(window.end, 9)) != (round(start, 9), round(end, 9)):
            self.attempt(lambda: self.value.replace(window=(start, end)))

    def find(self) -> None:
        """Let the criterion find the window."""
        self.attempt(lambda: self.value.replace(window=None))
        window = self.value.window
        self.slider.unobserve(self._slid, names="value")
        self.slider.value = (window.start, window.end)
        self.slider.observe(self._slid, names="value")

    def _slid(self, change: Any) -> None:
        self.choose(*change["new"])

    def as_code(self) -> str:
        """Return the expression that makes the current firing from the one that the panel started with."""
        window = self.value.window
        chosen = "None" if window.found else f"({window.start!r}, {window.end!r})"
        return f"firing.replace(window={chosen})"


class ReconciliationPanel(AnalysisPanel):
    """Panel of a reconciliation: each figure can be struck out and put back."""

    def controls(self) -> list[ipywidgets.Widget]:
        """Return one box for each figure."""
        self.boxes = {}
        for name in self.start.figures:
            box = ipywidgets.Checkbox(value=True, description=name, indent=False, layout={"width": "auto"})
            box.observe(lambda change: self.apply(), names="value")
            self.boxes[name] = box
        return list(self.boxes.values())

    @property
    def struck(self) -> tuple[str, ...]:
        """Figures that are struck out."""
        return tuple(name for name, box in self.boxes.items() if not box.value)

    def strike(self, name: str) -> None:
        """Strike a figure out."""
        self.boxes[name].value = False

    def put_back(self, name: str) -> None:
        """Put a figure back."""
        self.boxes[name].value = True

    def apply(self) -> None:
        """Adjust the figures that are left."""

        def rest() -> Any:
            found = self.start
            for name in self.struck:
                found = found.struck(name)
            return found

        self.attempt(rest)

    def as_code(self) -> str:
        """Return the expression that makes the current reconciliation from the one that the panel started with."""
        return "fit" + "".join(f".struck({name!r})" for name in self.struck)
