"""The widget of a study's panel: says whether a slider is moving, so that the map may be coarser then."""

from __future__ import annotations

from typing import Any

from propkit.panels.widget import PanelWidget


class StudyWidget(PanelWidget):
    """Front of the panel of a study."""

    height_alone = 440

    def act(self, asked: dict[str, Any]) -> None:
        """Do what the page asks for."""
        panel: Any = self._panel
        if panel is None or panel.value is None:
            return
        # under the lock of the session: what code sets meanwhile is no move
        with panel.session.lock:
            panel.solver.moving = asked.get("do") == "slide" and asked.get("phase") == "drag"
            try:
                super().act(asked)
            finally:
                panel.solver.moving = False
