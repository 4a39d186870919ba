"""Time from a slider event to the readout and the redrawn plot, in the page, over many moves of the Performance panel."""

from __future__ import annotations

from typing import Any

MOVE = """async (path) => {
  const root = document.querySelector('.pk-panel');
  const slider = root.querySelector(`.pk-control[data-path="${path}"] .pk-slider`);
  // the text beside the slider and the readouts are written together; a readout alone may stand still at a maximum
  const text = root.querySelector(`.pk-control[data-path="${path}"] .pk-text`);
  const plots = [...root.querySelectorAll('.pk-figure')].map((figure) => figure.__propkit);
  const frame = () => new Promise((done) => requestAnimationFrame(done));
  const times = [];
  let direction = 1;
  for (let move = 0; move < COUNT; move++) {
    const before = text.value, drawn = plots.map((plot) => plot.count);
    const step = Number(slider.step);
    if (slider.valueAsNumber + 3 * direction * step > Number(slider.max) || slider.valueAsNumber + 3 * direction * step < Number(slider.min)) direction = -direction;
    slider.valueAsNumber += 2 * direction * step;
    const start = performance.now();
    slider.dispatchEvent(new Event('input', {bubbles: true}));
    while (text.value === before || plots.some((plot, n) => plot.count === drawn[n])) {
      if (performance.now() - start > 5000) return {times, stuck: move};
      await new Promise((done) => setTimeout(done, 1));
    }
    await frame();
    times.push(performance.now() - start);
    await new Promise((done) => setTimeout(done, 30));
  }
  return {times, stuck: -1};
}"""


def slider_times(page: Any, path: str, count: int = 100) -> list[float]:
    """Return the milliseconds of `count` moves of a slider of the first panel.

    Parameters
    ----------
    page : Page
        A page of the rig with a Performance panel.
    path : str
        The control to move.
    count : int
        How many moves.
    """
    found = page.page.evaluate(MOVE.replace("COUNT", str(count)), path)
    assert found["stuck"] == -1, f"move {found['stuck']} led to nothing within 5 s"
    return [float(time) for time in found["times"]]
