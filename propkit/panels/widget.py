"""The widget of a panel: carries what a person does to the panel, and what the panel shows to the page."""

from __future__ import annotations

import logging
from typing import TYPE_CHECKING, Any

import traitlets

from propkit.errors import PropkitError
from propkit.panels.host import Host, static_text
from propkit.panels.session import words_of

if TYPE_CHECKING:
    from propkit.panels.panel import Panel

HEIGHT_ALONE, HEIGHT_SHARED = 340, 230
"""Heights of a live figure that stands alone, and of each of several [px]."""
log = logging.getLogger("propkit.panels")


class PanelWidget(Host):
    """Front of a panel: one widget for all its controls, results and figures."""

    height_alone = HEIGHT_ALONE
    _esm = static_text("figure.js", "panel.js")
    shown = traitlets.Dict().tag(sync=True)
    ack = traitlets.Dict().tag(sync=True)

    def __init__(self, panel: Panel) -> None:
        self._panel: Panel | None = panel
        self._dragging = False
        super().__init__()
        self.refresh()

    def refresh(self) -> None:
        """Show the panel as it stands: one message for everything that changed."""
        panel = self._panel
        if panel is None or panel.value is None:
            return
        shown = panel.content()
        titles = panel.figure_titles()
        shown["figures"] = {"titles": titles, "at": min(panel.figure, len(titles) - 1)}
        with self.hold_sync():
            self.shown = shown
            try:
                figures = panel.figures()
            except PropkitError as error:
                self.shown = {**shown, "figures": {**shown["figures"], "error": words_of(error)}}
                return
            height = self.height_alone if len(figures) == 1 else HEIGHT_SHARED
            self.show(figures, [height] * len(figures), still=not self._dragging)

    def close(self) -> None:
        """Let go of the panel, and of the page's side."""
        self._panel = None
        super().close()

    def _on_message(self, widget: Any, content: Any, buffers: Any) -> None:
        super()._on_message(widget, content, buffers)
        if not isinstance(content, dict) or "do" not in content:
            return
        with self.hold_sync():
            self.act(content)
            self.ack = {"client": content.get("client", ""), "number": content.get("number", 0)}

    def act(self, asked: dict[str, Any]) -> None:
        """Do what the page asks for. A refusal is shown by the panel; anything unforeseen is shown too, and logged."""
        panel = self._panel
        if panel is None or panel.value is None:
            return
        self._dragging = asked.get("phase") == "drag"
        try:
            _ACTIONS[asked["do"]](panel, asked)
        except PropkitError as error:
            if not panel.errors:
                self._complain(error)
        except Exception as error:
            log.exception("the panel could not do %r", asked.get("do"))
            if not panel.errors:
                self._complain(error)
        finally:
            self._dragging = False

    def _complain(self, error: Exception) -> None:
        self.shown = {**self.shown, "status": words_of(error)}


_ACTIONS: dict[str, Any] = {
    "type": lambda panel, asked: panel.type(asked["path"], asked["text"]),
    "slide": lambda panel, asked: panel.slide(asked["path"], float(asked["at"]), asked.get("run", "")),
    "choose": lambda panel, asked: panel.choose(asked["path"], asked["choice"]),
    "member": lambda panel, asked: panel.choose_member(asked["key"], asked["member"]),
    "reset": lambda panel, asked: panel.reset(asked["path"]),
    "undo": lambda panel, asked: panel.undo(),
    "redo": lambda panel, asked: panel.redo(),
    "pin": lambda panel, asked: panel.pin(asked.get("name", "")),
    "unpin": lambda panel, asked: panel.unpin(asked.get("name", "")),
    "units": lambda panel, asked: setattr(panel, "units", asked["units"]),
    "tap": lambda panel, asked: panel.tap(float(asked["x"]), float(asked["y"])),
    "press": lambda panel, asked: panel.press(asked["what"]),
    "figure": lambda panel, asked: setattr(panel, "figure", int(asked["at"])),
}
