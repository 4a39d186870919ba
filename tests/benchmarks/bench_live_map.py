"""How long a move of a slider takes in the panel of a study, on the kernel's side: a report, never a timed test.

    OMP_NUM_THREADS=1 python tests/benchmarks/bench_live_map.py

A map of 2 500 designs (mixture ratio over area ratio, shifting flow, every result of the chain, two limits) is solved anew at
every move of the chamber pressure. Processor time, so that other work on the machine counts less; the first move makes the first
guesses that the others keep. Parts are timed by wrapping the functions that do them.

Measured on two shared cores under a load of five (times are about twice those of a quiet machine), medians of 59 moves:

* 2 500 designs solved: LOX/LCH4 43 ms (31 at best), LOX/RP-1 50, LOX/LH2 28, NTO/MMH 66 (45 at best);
* whole move, object rebuilt, map and readouts drawn: LOX/LCH4 83 (58 at best), LOX/RP-1 100, LOX/LH2 83, NTO/MMH 120 (80 at best);
* with first guesses made anew at every move the designs alone took 56 to 80 ms; the box may be 1.6 times the pressure either
  way at 7 to 8 Newton evaluations a move, the same as for a box without room.
"""

from __future__ import annotations

import time
from collections import defaultdict
from collections.abc import Callable
from typing import Any

import numpy as np

import propkit as pk
from propkit.panels import study_panel
from propkit.panels.study_panel import StudyPanel
from propkit.study.sweep import Study

MOVES = 60
PAIRS = (("LOX", "LCH4", 3.4), ("LOX", "RP-1", 2.6), ("LOX", "LH2", 5.5), ("NTO", "MMH", 1.9))


class Clock:
    """Processor time by part, for each move."""

    def __init__(self) -> None:
        self.parts: dict[str, list[float]] = defaultdict(list)

    def wrap(self, owner: Any, name: str, part: str) -> None:
        """Time a function or method wherever it is called through `owner`."""
        plain: Callable[..., Any] = getattr(owner, name)

        def timed(*args: Any, **named: Any) -> Any:
            start = time.process_time()
            try:
                return plain(*args, **named)
            finally:
                self.parts[part].append(1e3 * (time.process_time() - start))

        setattr(owner, name, timed)

    def told(self, part: str) -> str:
        """Return median and 95th percentile of a part [ms]."""
        values = self.parts[part]
        return f"{part:34s} {np.median(values):7.1f} {np.percentile(values, 95):7.1f}"


def panel_of(oxidizer: str, fuel: str, ratio: float, points: int) -> StudyPanel:
    """Return the panel of a map."""
    case = pk.PropellantCase(oxidizer, fuel, mixture_ratio=ratio)
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=35, throat_diameter="0.18 m"), ambient="sea level")
    axes = {"case.mixture_ratio": ratio * np.linspace(0.75, 1.25, points), "nozzle.area_ratio": np.linspace(8.0, 80.0, points)}
    limits = {"separation_margin": (1, None), "nozzle.exit.temperature": (None, "2200 K")}
    made: StudyPanel = pk.Study(perf, axes).panel("specific_impulse", limits=limits)
    return made


def move(panel: StudyPanel, at: float) -> float:
    """Return the processor time of one move [ms]."""
    asked = {"do": "slide", "path": "chamber.pressure", "at": at, "phase": "drag", "run": "one", "client": "b", "number": 1}
    start = time.process_time()
    panel.widget._handle_msg({"content": {"data": {"method": "custom", "content": asked}}, "buffers": []})
    assert not panel.errors
    return 1e3 * (time.process_time() - start)


def main() -> None:
    """Print the report."""
    clock = Clock()
    clock.wrap(Study, "run_with", "2500 designs solved, all results")
    clock.wrap(study_panel, "figures_of", "map: contours, bands, optimum")
    clock.wrap(study_panel, "study_content", "controls and readouts")
    clock.wrap(pk.Performance, "replace", "object rebuilt")
    print("processor time [ms]                 median    95 %")
    for oxidizer, fuel, ratio in PAIRS:
        panel = panel_of(oxidizer, fuel, ratio, 50)
        _ = panel.widget
        clock.parts.clear()
        places = 9.7 + 2.0 * np.sin(np.linspace(0.1, 12.0, MOVES))
        first = move(panel, round(float(places[0]), 2))
        clock.parts.clear()
        whole = [move(panel, round(float(at), 2)) for at in places[1:]]
        print(f"{oxidizer}/{fuel}: {len(panel.value)} designs, first move {first:.0f} ms")
        for part in sorted(clock.parts):
            print("  " + clock.told(part))
        clock.parts["whole move"] = whole
        print("  " + clock.told("whole move"))
        panel.close()


if __name__ == "__main__":
    main()
