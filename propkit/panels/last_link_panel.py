"""What the panels of a study and of an uncertainty share: results held for what is shown, and a value that is a result."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from propkit.panels.faces import Face
from propkit.panels.last_link import LastLink
from propkit.panels.panel import Panel
from propkit.panels.session import Session


class LastLinkSession(Session):
    """An analysis under change: its chain and its settings are one state; results are held for what is shown and for pins."""

    def faces(self, down_to: str) -> Iterator[Face]:
        """Yield the faces, that of the analysis first: without inputs that have no value of their own in it."""
        varied = self.value.varied
        listed = list(super().faces(down_to))
        if down_to == self.value.kind:
            listed = [listed[-1], *listed[:-1]]
        for face in listed:
            face.varied = frozenset(path.partition(".")[2] for path in varied if path.startswith(f"{face.kind}."))
            yield face

    def _put(self, value: Any, run: str = "") -> None:
        before = self.value
        super()._put(value, run)
        if self.value is before:
            # a slider is let go where it stood: what was solved on the way is now solved as a line of code does it
            if before.unsettled and not value.unsettled:
                before.hold(value.result)
        else:
            self._let_go(before)

    def _step(self, here: list[Any], there: list[Any]) -> None:
        before = self.value
        super()._step(here, there)
        if before is not self.value:
            self._let_go(before)

    def _let_go(self, plan: LastLink) -> None:
        if all(plan is not pinned for pinned in self.pins.values()):
            plan.release()


class LastLinkPanel(Panel):
    """Interactive view of an analysis: its value is a result."""

    def shown(self) -> Any:
        """Return what `value` is: the results."""
        return self.session.value.result

    @property
    def pins(self) -> Mapping[str, Any]:
        """The pinned results, by name."""
        return {name: plan.result for name, plan in self.session.pins.items()}
