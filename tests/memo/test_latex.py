"""The LaTeX of every object, compiled: nothing is refused, no letter is missing, little stands in the margin."""

import re
import shutil
import subprocess

import pytest

import propkit as pk
from propkit.view import render

from .test_agreement import OBJECTS

HEAD = r"\documentclass{article}\usepackage[a4paper,margin=15mm]{geometry}\usepackage[T1]{fontenc}\usepackage{amsmath}\begin{document}"
HOSTILE = r"C* 100% & more_ #1 {x} ~^ \input{/etc/passwd} $x$ é ½ ° → ≤ α Ω"

pytestmark = pytest.mark.skipif(shutil.which("pdflatex") is None, reason="needs pdflatex (Debian: texlive-latex-recommended)")


def reports():
    """Every kind of sheet: objects, workings, prices, records, analyses."""
    yield from ((name, one.report()) for name, one in OBJECTS.items())
    perf = OBJECTS["performance"]
    yield "customary units", perf.report(units="US")
    yield "working", perf.working("thrust")
    yield "working of a state", perf.nozzle.chamber.working("temperature")
    yield "record", perf.record(title=HOSTILE, notes=f"{HOSTILE}\u2003\u202f\u00a0x").report()
    study = pk.Study(perf, {"chamber.pressure": ["5 MPa", "6 MPa"], "nozzle.flow": ["shifting", "frozen"]}).run(progress=False)
    yield "study", study.report()
    yield "record of a study", study.record(title="Study").report()
    yield "uncertainty", pk.Uncertainty(perf, {"chamber.pressure": pk.Normal("1 %")}).run(samples=200, seed=1).report()
    yield "reconciliation", pk.Reconciliation(perf, {"thrust": ("80 kN", "2 %"), "mass_flow": ("24 kg/s", "2 %")}).report()
    yield "named", OBJECTS["case"].replace({"case.name": HOSTILE.rstrip()}).report()


def test_latex_of_every_sheet_compiles(tmp_path):
    listed = dict(reports())
    body = "\n\\newpage\n".join(render(report, "latex") for report in listed.values())
    (tmp_path / "all.tex").write_text(f"{HEAD}\n{body}\n\\end{{document}}\n", encoding="utf-8")
    run = subprocess.run(
        ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "-no-shell-escape", "all.tex"],
        cwd=tmp_path,
        capture_output=True,
        timeout=300,
    )
    log = (tmp_path / "all.log").read_text(encoding="utf-8", errors="replace")
    assert run.returncode == 0, re.findall(r"^!.*\n.*\n.*", log, re.MULTILINE)[:3]
    assert "Missing character" not in log
    beyond = [float(size) for size in re.findall(r"Overfull \\hbox \(([0-9.]+)pt", log)]
    assert sum(size > 20.0 for size in beyond) <= 1, sorted(beyond)  # a table as wide as its longest label
    if shutil.which("pdftotext"):
        text = subprocess.run(["pdftotext", "all.pdf", "-"], cwd=tmp_path, capture_output=True, text=True, check=True).stdout
        assert "input{/etc/passwd}" in text.replace("\n", "")
        assert "root:" not in text
