"""How the panel of a study solves its designs: anew at every move, with first guesses that it keeps.

The quick engine needs a predictor of first guesses over the box of a study. A panel makes it for a wider box than the map
has, so that it serves while a slider moves; the designs are solved all the same, every one, at every move, to the same
residual. Once the slider is let go the study is run as a line of code runs it, so that both give the same numbers bit for bit.
"""

from __future__ import annotations

import math
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from propkit.chain import case as case_stage
from propkit.chain.accelerated import FEWEST
from propkit.study.sweep import Study
from propkit.study.sweep_work import Part, spanning

Array = npt.NDArray[np.float64]

LIVE: Final = {"quick": 2500, "damped": 225, "one by one": 16}
"""Designs of a map while a slider moves: by the quick engine, by the damped solver, and object by object."""

SETTLED: Final = {"quick": 40_000, "damped": 5_000, "one by one": 100}
"""Designs once it is let go; a larger study is run by a line of code."""

_PRESSURE, _RATIO, _EXPANSION = 1.6, 1.2, 1.5
"""How far the box of kept guesses reaches, as factors on the value now."""
_MOST_KEPT = 6


class Box:
    """First guesses over a box: what they hold for."""

    def __init__(self, engine: Any, ranges: dict[str, tuple[float, float]]) -> None:
        self.engine, self.ranges = engine, ranges

    def holds(self, ranges: dict[str, tuple[float, float]]) -> bool:
        """Whether every design lies inside."""
        return all(
            path in self.ranges and self.ranges[path][0] <= low * (1.0 + 1e-12) and high <= self.ranges[path][1] * (1.0 + 1e-12)
            for path, (low, high) in ranges.items()
        )


class Solver:
    """Solves the studies of one panel.

    Attributes
    ----------
    moving : bool
        Whether a slider is moving: then the grid may be coarser, and guesses are kept.
    """

    def __init__(self) -> None:
        self.moving = False
        self._boxes: dict[Any, Box] = {}

    def forget(self) -> None:
        """Let go of every guess."""
        self._boxes.clear()

    def solve(self, plan: Any) -> Any:
        """Return the results of a plan; exactly those of ``Study.run`` unless a slider is moving."""
        whole = plan.study
        way = "one by one" if whole.one_by_one else "quick"
        if way == "quick" and len(whole) > (LIVE if self.moving else SETTLED)["damped"] and not self._is_quick(whole):
            way = "damped"
        study = self._sized(plan, (LIVE if self.moving else SETTLED)[way])
        if not self.moving:
            return study.run(progress=False)
        return study.run_with(study.work.guided(self._engines(study)), progress=False)

    def _engines(self, study: Study) -> list[Any]:
        return [self._engine(study, part, rows) for part, (_, rows) in zip(study.work.parts, study.plan.groups(), strict=True)]

    def _is_quick(self, study: Study) -> bool:
        """Whether the quick engine, or a formula, serves every design."""
        return all(engine is not None or not part.burns for engine, part in zip(self._engines(study), study.work.parts, strict=True))

    @staticmethod
    def _sized(plan: Any, most: int) -> Study:
        found: Study = plan.study if len(plan.study) <= most else plan.study_of(most)
        return found

    def _engine(self, study: Study, part: Part, rows: npt.NDArray[np.intp]) -> Any:
        """Return the quick engine for the designs of a part, one kept or a new one; None where it does not serve."""
        if part.function is None or not part.burns or len(rows) < FEWEST:
            return None
        template = part.function.template
        here = _ranges(template, study, rows)
        key = _key(template, here)
        box = self._boxes.get(key)
        if box is None or not box.holds(here):
            self._boxes.pop(key, None)
            box = self._boxes[key] = _box(study, part, rows, here)
            while len(self._boxes) > _MOST_KEPT:
                self._boxes.pop(next(iter(self._boxes)))
        return box.engine


def _spread_paths(template: Any) -> dict[str, float]:
    """Return the paths over which guesses reach further than the map, with their factors."""
    given = {f"{link.kind}.{name}" for link in template.chain() for name in link.inputs}
    amounts = {f"case.{name}": _RATIO for name in case_stage.AMOUNTS}
    factors = {"chamber.pressure": _PRESSURE, **amounts, "nozzle.area_ratio": _EXPANSION, "nozzle.exit_pressure": _EXPANSION}
    return {path: factor for path, factor in factors.items() if path in given}


def _ranges(template: Any, study: Study, rows: Any) -> dict[str, tuple[float, float]]:
    """Return the box of the designs: of what varies, and of what guesses reach beyond."""
    found = dict(study.plan.ranges(rows))
    links = {link.kind: link for link in template.chain()}
    for path in _spread_paths(template):
        if path not in found:
            kind, _, name = path.partition(".")
            value = float(links[kind]._values[name])
            found[path] = (value, value)
    return found


def _key(template: Any, ranges: dict[str, Any]) -> Any:
    """Return what must be the same for guesses to serve: everything upstream of the exit that the box does not hold."""
    free = {
        "name",
        "case",
        "chamber",
        "throat_diameter",
        "throat_area",
        "mass_flow",
        "thrust",
        "sizing_ambient",
        "contour",
        "wall_thickness",
        "wall_density",
        "cstar_efficiency",
    }
    return (
        tuple(ranges),
        *(
            (link.kind, name, repr(link.inputs[name]))
            for link in template.chain()
            if link.kind != "performance"
            for name in link.inputs
            if name not in free and f"{link.kind}.{name}" not in ranges
        ),
    )


def _box(study: Study, part: Part, rows: npt.NDArray[np.intp], here: dict[str, tuple[float, float]]) -> Box:
    """Return guesses over a box wider than the designs need; over theirs alone where those cannot be made."""
    assert part.function is not None
    places = spanning(study.plan, rows)
    own = study.plan.inputs(places)
    draw = np.random.default_rng(0)
    wide: dict[str, Array] = {}
    for path, factor in _spread_paths(part.function.template).items():
        if path in own:
            continue
        shares = draw.uniform(-1.0, 1.0, len(places))
        shares[:2] = (-1.0, 1.0) if len(wide) % 2 else (1.0, -1.0)
        wide[path] = here[path][0] * factor**shares
    for sample in ({**own, **wide}, own):
        made = part.function.prepared(sample, len(places)).quick
        if made is not None:
            ranges = {path: (float(values.min()), float(values.max())) for path, values in sample.items()}
            return Box(made, {**here, **ranges})
    return Box(None, dict.fromkeys(here, (0.0, math.inf)))
