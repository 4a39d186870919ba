"""A real JupyterLab in a real browser: started on loopback with folders of its own, without a network.

The page is driven by commands of the lab, by the keyboard and by what a person sees; nothing reaches into the panel's code.
"""

from __future__ import annotations

import json
import os
import shutil
import socket
import subprocess
import sys
import time
import urllib.request
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

BROWSERS = ("/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome")
FLAGS = (
    "--no-sandbox", "--disable-gpu", "--no-first-run", "--disable-background-networking", "--disable-component-update",
    "--disable-sync", "--host-resolver-rules=MAP * ~NOTFOUND, EXCLUDE 127.0.0.1",
)  # fmt: skip
INSTALL = "apt-get install chromium, and pip install 'propkit[notebook,memo,test]'"
SETTINGS = {
    "@jupyterlab/apputils-extension/notification.jupyterlab-settings": {"fetchNews": "false", "checkForUpdates": False},
    "@jupyterlab/docmanager-extension/plugin.jupyterlab-settings": {"autosave": False},
}
QUIET_ERRORS = ("favicon", "ResizeObserver loop")
SETUP = """import propkit as pk
case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
chamber = pk.Chamber(case, pressure="9.7 MPa")
nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m")
perf = pk.Performance(nozzle, ambient="sea level")"""
"""What every notebook of the tests begins with: one invented engine."""
READ_FIGURES = """() => {
  const found = [];
  const walk = (node) => {
    for (const child of node.querySelectorAll('*')) {
      if (child.__propkit && child.__propkit.document) {
        const figure = child.__propkit, sources = {};
        for (let n = 0; figure.document.get_model_by_name(`layer-${n}`); n++) {
          const data = figure.document.get_model_by_name(`layer-${n}`).data;
          sources[`layer-${n}`] = Object.fromEntries(Object.entries(data).map(([k, v]) => [k, Array.from(v)]));
        }
        const box = child.getBoundingClientRect();
        found.push({name: figure.root.name, title: figure.root.title.text, sources, limits: [figure.root.x_range.start, figure.root.x_range.end],
                    width: box.width, height: box.height});
      }
      if (child.shadowRoot) walk(child.shadowRoot);
    }
  };
  walk(document);
  return found;
}"""
READ_CANVASES = """() => {
  const found = [];
  const walk = (node) => {
    for (const child of node.querySelectorAll('*')) {
      if (child.tagName === 'CANVAS' && child.width) found.push(child.toDataURL());
      if (child.shadowRoot) walk(child.shadowRoot);
    }
  };
  document.querySelectorAll('.pk-live').forEach(walk);
  return found;
}"""


def why_not() -> str:
    """Return why no browser test can run here; empty when it can."""
    try:
        import jupyterlab  # noqa: F401
        import playwright  # noqa: F401
    except ImportError as error:
        return f"{error.name} is not installed; install with: {INSTALL}"
    return "" if browser_path() else f"no Chromium at {', '.join(BROWSERS)}; install with: {INSTALL}"


def browser_path() -> str:
    """Return the path of a browser, or an empty text."""
    return next((path for path in BROWSERS if Path(path).exists()), "")


def notebook(cells: Sequence[str]) -> dict[str, Any]:
    """Return a notebook of code cells."""
    made = [
        {"cell_type": "code", "id": f"cell-{n}", "metadata": {}, "execution_count": None, "outputs": [], "source": source}
        for n, source in enumerate(cells)
    ]
    kernel = {"kernelspec": {"name": "python3", "display_name": "Python 3", "language": "python"}}
    return {"cells": made, "metadata": kernel, "nbformat": 4, "nbformat_minor": 5}


class Lab:
    """A running JupyterLab with its folder of notebooks."""

    def __init__(self, folder: Path) -> None:
        self.root = folder
        self.work = folder / "work"
        self.work.mkdir(parents=True)
        self.port = _free_port()
        self._write_settings()
        self.process = self._start()

    def _write_settings(self) -> None:
        for name, settings in SETTINGS.items():
            path = self.root / "settings" / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(json.dumps(settings))

    def _start(self) -> subprocess.Popen[bytes]:
        place = {name: str(self.root / name.lower()) for name in ("config", "data", "runtime")}
        environment = {
            **os.environ,
            "JUPYTER_CONFIG_DIR": place["config"],
            "JUPYTER_DATA_DIR": place["data"],
            "JUPYTER_RUNTIME_DIR": place["runtime"],
            "JUPYTERLAB_SETTINGS_DIR": str(self.root / "settings"),
            "JUPYTERLAB_WORKSPACES_DIR": str(self.root / "workspaces"),
            "IPYTHONDIR": str(self.root / "ipython"),
            "OMP_NUM_THREADS": "1",
            "PYTHONPATH": os.pathsep.join(
                path for path in (os.environ.get("PROPKIT_TREE", str(Path(__file__).parents[2])), os.environ.get("PYTHONPATH", "")) if path
            ),
        }
        command = [
            sys.executable, "-m", "jupyterlab", "--no-browser", f"--ServerApp.port={self.port}", "--ServerApp.ip=127.0.0.1", "--ServerApp.port_retries=0",
            "--IdentityProvider.token=", "--ServerApp.password=", "--LabApp.expose_app_in_browser=True", f"--ServerApp.root_dir={self.work}",
            "--LabApp.news_url=None", "--allow-root", "--ServerApp.disable_check_xsrf=True",
        ]  # fmt: skip
        self.log = (self.root / "lab.log").open("wb")
        return subprocess.Popen(command, env=environment, cwd=self.work, stdout=self.log, stderr=subprocess.STDOUT)

    @property
    def address(self) -> str:
        """Address of the server."""
        return f"http://127.0.0.1:{self.port}"

    def wait(self, seconds: float = 60.0) -> None:
        """Wait until the server answers."""
        end = time.monotonic() + seconds
        while time.monotonic() < end:
            if self.process.poll() is not None:
                break
            try:
                with urllib.request.urlopen(f"{self.address}/api", timeout=2):
                    return
            except OSError:
                time.sleep(0.2)
        raise RuntimeError(f"JupyterLab did not start:\n{(self.root / 'lab.log').read_text()[-3000:]}")

    def write(self, name: str, cells: Sequence[str]) -> None:
        """Write a notebook into the lab's folder."""
        (self.work / name).write_text(json.dumps(notebook(cells)))

    def stop_kernels(self) -> None:
        """Stop every kernel of the server."""
        with urllib.request.urlopen(f"{self.address}/api/kernels", timeout=10) as answer:
            kernels = json.load(answer)
        for kernel in kernels:
            request = urllib.request.Request(f"{self.address}/api/kernels/{kernel['id']}", method="DELETE")
            with urllib.request.urlopen(request, timeout=20):
                pass

    def stop(self) -> None:
        """Stop the server and its kernels."""
        self.process.terminate()
        try:
            self.process.wait(15)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait(5)
        self.log.close()


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


@contextmanager
def lab(folder: Path) -> Iterator[Lab]:
    """Run a JupyterLab in `folder` as long as the block lasts."""
    shutil.rmtree(folder, ignore_errors=True)
    made = Lab(folder)
    try:
        made.wait()
        yield made
    finally:
        made.stop()


class Page:
    """One page of a lab with what it asked for and complained about."""

    def __init__(self, browser: Any, lab: Lab, *, width: int = 1400, height: int = 1100) -> None:
        self.lab = lab
        self.context = browser.new_context(viewport={"width": width, "height": height})
        self.page = self.context.new_page()
        self.outside: list[str] = []
        self.complaints: list[str] = []
        self.context.route("**/*", self._only_loopback)
        self.page.on("console", self._hear)
        self.page.on("pageerror", lambda error: self.complaints.append(f"page error: {error}"))

    def _only_loopback(self, route: Any) -> None:
        address = route.request.url
        if address.startswith((self.lab.address, "blob:", "data:")):
            route.continue_()
        else:
            self.outside.append(address)
            route.abort()

    def _hear(self, message: Any) -> None:
        if message.type == "error" and not any(word in f"{message.text} {message.location}" for word in QUIET_ERRORS):
            self.complaints.append(message.text)

    def open(self, name: str) -> None:
        """Open a notebook and wait until its kernel is there."""
        self.page.goto(f"{self.lab.address}/lab/tree/{name}?reset")
        self.page.wait_for_selector(".jp-Notebook", timeout=60_000)
        self.wait_idle()

    def wait_idle(self, seconds: float = 60.0) -> None:
        """Wait until the kernel of the notebook is ready and idle."""
        self.page.wait_for_function(
            """() => {
              const panel = window.jupyterapp?.shell?.currentWidget;
              const session = panel?.sessionContext;
              return session?.isReady && session?.session?.kernel?.status === 'idle';
            }""",
            timeout=seconds * 1000,
        )

    def start(self, name: str, *cells: str, count: int = 2) -> PanelPage:
        """Write a notebook of the common beginning and `cells`, open and run it; return its first panel once it is drawn."""
        self.lab.write(name, [SETUP, *cells])
        self.open(name)
        self.run_all()
        self.wait_figures(count)
        return self.panel()

    def run_all(self, *, wait: bool = True) -> None:
        """Run every cell."""
        self.page.evaluate("() => { window.jupyterapp.commands.execute('notebook:run-all-cells'); }")
        if wait:
            self.page.wait_for_timeout(300)
            self.wait_idle()

    def command(self, name: str) -> None:
        """Execute a command of the lab."""
        self.page.evaluate("(name) => window.jupyterapp.commands.execute(name)", name)

    def figures(self) -> list[dict[str, Any]]:
        """Return the data that BokehJS holds for every live figure."""
        return list(self.page.evaluate(READ_FIGURES))

    def canvases(self) -> list[str]:
        """Return the pixels of every canvas of the live figures."""
        return list(self.page.evaluate(READ_CANVASES))

    def wait_figures(self, count: int = 1) -> None:
        """Wait until `count` live figures are drawn."""
        end = time.monotonic() + 40.0
        while time.monotonic() < end:
            if len(self.figures()) >= count:
                return
            self.page.wait_for_timeout(100)
        seen = self.page.locator(".jp-OutputArea-output").all_inner_texts()
        raise AssertionError(
            f"{count} live figures expected, {len(self.figures())} drawn; complaints: {self.complaints}; outputs: {str(seen)[-1500:]}"
        )

    def panel(self, number: int = 0) -> PanelPage:
        """Return a panel of the page."""
        return PanelPage(self, number)

    def shoot(self, path: Path, number: int = 0) -> None:
        """Save a picture of a panel."""
        self.page.locator(".pk-panel").nth(number).screenshot(path=str(path))

    def close(self) -> None:
        """Close the page, and the kernels it leaves."""
        self.context.close()
        self.lab.stop_kernels()


class PanelPage:
    """One panel as a person meets it."""

    def __init__(self, page: Page, number: int) -> None:
        self.on = page
        self.root = page.page.locator(".pk-panel").nth(number)

    def control(self, path: str) -> Any:
        """Return the control of a path."""
        return self.root.locator(f'.pk-control[data-path="{path}"]')

    def field(self, path: str) -> Any:
        """Return the field of a control."""
        return self.control(path).locator(".pk-text, .pk-choice").first

    def type(self, path: str, text: str) -> None:
        """Type a text into the field of a control, as a person would."""
        field = self.field(path)
        field.click()
        field.press("Control+a")
        field.type(text)
        field.press("Enter")
        self.settle()

    def press_slider(self, path: str, key: str, times: int = 1) -> None:
        """Press a key on the slider of a control."""
        slider = self.control(path).locator(".pk-slider")
        slider.focus()
        for _ in range(times):
            slider.press(key)
        self.settle()

    def button(self, text: str) -> Any:
        """Return a button by its text."""
        return self.root.get_by_role("button", name=text, exact=True)

    def click(self, text: str) -> None:
        """Press a button and wait for what it leads to."""
        self.button(text).click()
        self.settle()

    def settle(self, quiet: int = 150, seconds: float = 20.0) -> None:
        """Wait until what the panel shows has not changed for `quiet` milliseconds."""
        end, last, since = time.monotonic() + seconds, "", time.monotonic()
        while time.monotonic() < end:
            now = f"{self.root.get_attribute('data-busy')}{self.root.inner_text()}"
            if now != last or self.root.get_attribute("data-busy") is not None:
                last, since = now, time.monotonic()
            elif time.monotonic() - since > quiet / 1000:
                return
            self.on.page.wait_for_timeout(40)

    def result(self, name: str) -> tuple[str, str]:
        """Return number and unit of a result as shown."""
        row = self.root.locator(f'.pk-results tr[data-name="{name}"]').first
        return row.locator("td").nth(0).inner_text().replace("\n", ""), row.locator("td").nth(1).inner_text()

    def number(self, name: str) -> float:
        """Return a result as shown, as a number."""
        return float(self.result(name)[0].replace("\N{MINUS SIGN}", "-").replace("\N{NARROW NO-BREAK SPACE}", ""))

    def error(self, path: str) -> str:
        """Return the error beside a control."""
        return str(self.control(path).locator(".pk-error").inner_text())

    def status(self) -> str:
        """Return what the status line says."""
        return str(self.root.locator(".pk-status").inner_text())
