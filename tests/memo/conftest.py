import json

import pytest

SETUP = """import propkit as pk

case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
chamber = pk.Chamber(case, pressure="9.7 MPa")
nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m")
perf = pk.Performance(nozzle, ambient="sea level", name="Memo engine")"""

HOSTILE = "<script>alert(1)</script><img src='http://example.invalid/x.png' onerror='alert(1)'>"


def cell(kind, source, **more):
    extra = {"execution_count": None, "outputs": []} if kind == "code" else {}
    return {"cell_type": kind, "id": more.pop("id"), "metadata": {}, "source": source, **extra, **more}


def notebook(*cells):
    kernel = {"kernelspec": {"display_name": "Other", "language": "python", "name": "a kernel that is not here"}}
    made = [cell(kind, source, id=f"c{place}") for place, (kind, source) in enumerate(cells)]
    return {"cells": made, "metadata": kernel, "nbformat": 4, "nbformat_minor": 5}


@pytest.fixture(scope="session")
def small_notebook(tmp_path_factory):
    """A notebook with text, an equation, printed text, a table, hostile HTML and a record."""
    path = tmp_path_factory.mktemp("source") / "small.ipynb"
    cells = [
        (
            "markdown",
            f"# A small memo & more\n\nMass flow $\\dot m = p_0 A_t / c^*$ and {HOSTILE}\n\n$$F = C_F p_0 A_t$$\n\n| a | b |\n|---|---|\n| 1 | 2 |",
        ),
        ("code", SETUP),
        ("code", "print('printed <b>text</b>')\nperf"),
        (
            "code",
            f"from IPython.display import HTML, SVG\nHTML({HOSTILE!r} + '<p style=\"background:url(http://example.invalid/)\">kept</p>')",
        ),
    ]
    path.write_text(json.dumps(notebook(*cells)))
    return path


@pytest.fixture(scope="session")
def memo_folder(small_notebook, tmp_path_factory):
    """The memo of that notebook, made once."""
    from propkit.memo.notebook import write_memo

    folder = tmp_path_factory.mktemp("memo")
    said = []
    outcome = write_memo(small_notebook, folder, crate=True, say=said.append)
    assert outcome.error == ""
    (folder / "said.txt").write_text("\n".join(said))
    return folder
