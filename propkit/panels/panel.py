"""The panel: a view of an immutable object that can be turned, dragged and typed into.

Event, `replace`, new object, redraw: the panel holds state, objects never do. All logic is in plain methods; the
widget only carries their arguments and what they lead to.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

import traitlets

from propkit.errors import InputError, Problem
from propkit.model import paths
from propkit.panels.content import content
from propkit.panels.faces import Face
from propkit.panels.session import Session, face_of
from propkit.plots import live_figures

if TYPE_CHECKING:
    import pandas as pd

    from propkit.panels.widget import PanelWidget


class Control:
    """One control of a panel, as code sees it: reading gives what it shows, setting acts at once."""

    def __init__(self, panel: Panel, path: str) -> None:
        self._panel = panel
        self.path = path

    @property
    def value(self) -> Any:
        """What is given at the control now, as typed; None where nothing is."""
        kind, _, name = self.path.partition(".")
        return self._panel.session.link(kind).inputs.get(name)

    @value.setter
    def value(self, given: Any) -> None:
        self._panel.set(self.path, given)

    @property
    def error(self) -> str:
        """Why the last change was refused, in words; empty when it was not."""
        refusal = self._panel.session.refusals.get(self.path)
        return refusal.words if refusal else ""

    def reset(self) -> None:
        """Go back to the default, or to what was given when the panel was opened."""
        self._panel.reset(self.path)

    def slide(self, position: float) -> None:
        """Move the slider; the position snaps to its step."""
        self._panel.slide(self.path, position)

    def __repr__(self) -> str:
        return f"<Control {self.path}: {self.value!r}>"


class Panel(traitlets.HasTraits):
    """Interactive view of an object and of everything upstream of it.

    Parameters
    ----------
    calculation : Calculation
        The object to start from.
    session : Session, optional
        The state of a chain that another panel shows already.
    """

    value = traitlets.Any(help="the current object: observe it, or set it")
    units = traitlets.Enum(("SI", "US"), default_value="SI", help="the units of this panel's display")
    figure = traitlets.Int(0, help="which of the live figures is shown")

    def __init__(self, calculation: Any, session: Session | None = None) -> None:
        self.session = session or Session(calculation)
        self.kind = str(calculation.kind)
        self._widget: PanelWidget | None = None
        self._quiet = True
        super().__init__(value=self.shown())
        self._quiet = False
        self.session.attach(self._refresh)

    def shown(self) -> Any:
        """Return what `value` is: the current object of this panel's kind."""
        return self.session.link(self.kind)

    # -- what a person does, as methods ------------------------------------------------------------

    @property
    def controls(self) -> Mapping[str, Control]:
        """The controls by path, as they stand now."""
        return {face.path(name): Control(self, face.path(name)) for face in self._faces() for name in face.names()}

    def set(self, path: str, value: Any) -> None:
        """Give an input another value; the chain is rebuilt and every view redrawn before this returns.

        Raises
        ------
        PropkitError
            When the value is refused; the panel shows the reason beside the control and keeps the last good result.
        """
        self._apply(path, value, f"{value}")

    def type(self, path: str, text: str) -> None:
        """Type a text into the field of a control."""
        face, name = self._place(path)
        self._apply(path, face.read(name, text, self.units), text)

    def slide(self, path: str, position: float, run: str = "") -> None:
        """Move the slider of a control; moves with the same `run` are one step of undo."""
        face, name = self._place(path)
        unit = face.unit(name, self.units)
        scale = self.session.ranges.get((path, unit.text)) or face.scale(name, unit)
        if scale is None:
            raise InputError(f"{path} has no slider")
        value = face.slide(name, unit, scale, position)
        self._apply(path, value, f"{value}", run)

    def choose(self, path: str, choice: str) -> None:
        """Choose one of the words of a control."""
        face, name = self._place(path)
        self._apply(path, face.chosen(name, choice), choice)

    def choose_member(self, key: str, member: str) -> None:
        """Make `member` the input of a group that is given, at the value it has now."""
        kind = key.partition(":")[0]
        face = face_of(self.session.link(kind))
        group = next(group for group in face.groups() if group.key == key)
        if member not in group.members:
            raise InputError(Problem(key, repr(member), f"one of {', '.join(group.members)}"))
        if member != group.member:
            self._raise(self.session.apply(key, member, face.choose(group, member)))

    def reset(self, path: str) -> None:
        """Go back: from a refused value to the last accepted one, else to the default, else to what it was when opened."""
        if path in self.session.refusals:
            self.session.withdraw(path)
            return
        face, name = self._place(path)
        opened = next((link for link in self.session.opened.chain() if link.kind == face.kind), None)
        value = None
        if face.declared(name).required or any(name in group.members for group in face.groups()):
            value = None if opened is None else opened.inputs.get(name)
            if value is None:
                raise InputError(f"{path} has no value to go back to: it was not given when the panel was opened")
        self._apply(path, value, "")

    def undo(self) -> None:
        """Go back one step."""
        self.session.undo()

    def redo(self) -> None:
        """Go forward one step."""
        self.session.redo()

    def pin(self, name: str = "") -> str:
        """Keep the current object as the baseline that results are compared with; return its name."""
        return self.session.pin(name)

    def unpin(self, name: str = "") -> None:
        """Let go of a pin; of all without a name."""
        self.session.unpin(name)

    @property
    def pins(self) -> Mapping[str, Any]:
        """The pinned objects of this panel's kind, by name."""
        return {name: _link(pinned, self.kind) for name, pinned in self.session.pins.items()}

    def comparison(self) -> pd.DataFrame:
        """Return the results of the current object and of every pin side by side: SI floats, units in ``attrs["units"]``."""
        import pandas as pd

        from propkit.panels.content import result_names

        columns = {"current": self.value, **self.pins}
        names = result_names(self.value)
        frame = pd.DataFrame(
            {label: [link.given_or_result(name) if link.has(name) else float("nan") for name in names] for label, link in columns.items()},
            index=pd.Index(names, name="result"),
        )
        declared = {**self.value.declared_inputs, **self.value.declared_results}
        frame.attrs["units"] = {name: declared[name].quantity.unit for name in names}
        return frame

    def as_code(self) -> str:
        """Return the script that reproduces exactly what the panel shows."""
        return str(self.value.as_code())

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the record of the current object."""
        return self.value.record(title=title, author=author, purpose=purpose, notes=notes)

    def view(self, kind: str) -> Panel:
        """Return a second panel of the same chain, for one of its objects; both stay in step.

        Parameters
        ----------
        kind : str
            ``"case"``, ``"chamber"``, ``"nozzle"`` or ``"performance"``.
        """
        kinds = [link.kind for link in self.session.value.chain()]
        if kind not in kinds:
            raise InputError(Problem("kind", repr(kind), f"one of {', '.join(map(repr, kinds))}"))
        return Panel(self.session.link(kind), self.session)

    @property
    def errors(self) -> dict[str, str]:
        """What is refused now: path to words."""
        return {path: refusal.words for path, refusal in self.session.refusals.items()}

    def close(self) -> None:
        """Close this view; with the last view of a chain its objects are let go."""
        last = self.session.detach(self._refresh)
        if self._widget is not None:
            self._widget.close()
            self._widget = None
        self.unobserve_all()
        self._quiet = True
        self.value = None
        if last:
            self.session.forget()

    # -- inside ------------------------------------------------------------------------------------

    def _faces(self) -> Iterator[Face]:
        return self.session.faces(self.kind)

    def _place(self, path: str) -> tuple[Face, str]:
        place = paths.resolve(self.session.link(self.kind), path, results=False)
        kind, _, name = place.path.partition(".")
        return face_of(self.session.link(kind)), name

    def _apply(self, path: str, value: Any, text: str, run: str = "") -> None:
        face, name = self._place(path)
        companions = getattr(face, "companions", None)
        changes = {face.path(name): value, **(companions(name) if companions else {})}
        self._raise(self.session.apply(face.path(name), text, changes, run))

    @staticmethod
    def _raise(error: Exception | None) -> None:
        if error is not None:
            raise error

    def _refresh(self) -> None:
        self._quiet = True
        try:
            self.value = self.shown()
        finally:
            self._quiet = False
            if self._widget is not None:
                self._widget.refresh()

    @traitlets.observe("value")
    def _value_set(self, change: Any) -> None:
        if self._quiet:
            return
        try:
            self._replace_value(change["new"])
        except Exception:
            self._quiet = True
            self.value = change["old"]
            self._quiet = False
            raise

    def _replace_value(self, value: Any) -> None:
        last = self.session.value
        if last.kind == self.kind:
            self.session.set_value(value)
            return
        below = last.chain()[len(value.chain()) :]
        rebuilt = value
        for link in below:
            rebuilt = link.replace({link.upstream_input: rebuilt})
        self.session.set_value(rebuilt)

    @traitlets.observe("units", "figure")
    def _display_set(self, change: Any) -> None:
        if self._widget is not None:
            self._widget.refresh()

    def content(self) -> dict[str, Any]:
        """Return what the panel shows, as plain data; the widget and tests read it."""
        return content(self.session, self.kind, self.units)

    def figure_titles(self) -> list[str]:
        """Return the titles of the live figures."""
        return [title for title, _ in live_figures(self.value)]

    def figures(self) -> tuple[Any, ...]:
        """Return the live figures shown, as neutral data."""
        listed = live_figures(self.value)
        made = listed[min(self.figure, len(listed) - 1)][1](self.value, self.units)
        return tuple(made)

    @property
    def widget(self) -> PanelWidget:
        """The widget that shows the panel (made on first use)."""
        if self._widget is None:
            from propkit.panels.widget import PanelWidget

            self._widget = PanelWidget(self)
        return self._widget

    def twin(self) -> Any:
        """Return what stands in for the panel where no kernel is."""
        return self.value

    def _ipython_display_(self) -> None:
        from IPython.display import display

        from propkit.panels.twin import twin_bundle

        display(twin_bundle(self.twin()), raw=True)  # type: ignore[no-untyped-call]
        display(self.widget)  # type: ignore[no-untyped-call]

    def __repr__(self) -> str:
        return f"<Panel of {self.value!r}>"


def _link(calculation: Any, kind: str) -> Any:
    return next(link for link in calculation.chain() if link.kind == kind)
