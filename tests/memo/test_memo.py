import json
import re
import subprocess
from html.parser import HTMLParser

import pytest

import propkit as pk
from propkit.memo.blocks import blocks_of, plain_text
from propkit.memo.clean import clean
from propkit.memo.equations import put_back, take_out
from propkit.memo.notebook import write_memo
from propkit.record.files import verify_file

from .conftest import SETUP, notebook


class Page(HTMLParser):
    """Everything in a page that could run or load something."""

    def __init__(self, text):
        super().__init__()
        self.tags, self.loads, self.handlers, self.css, self.in_style = set(), [], [], [], False
        self.feed(text)

    def handle_starttag(self, tag, attributes):
        self.tags.add(tag)
        self.in_style = tag == "style"
        self.css += [value for name, value in attributes if name == "style"]
        for name, value in attributes:
            if name in ("src", "srcset", "poster", "data", "action", "background") or (name == "href" and tag != "a"):
                self.loads.append(value)
            if name.startswith("on"):
                self.handlers.append(name)

    def handle_data(self, data):
        if self.in_style:
            self.css.append(data)

    def handle_endtag(self, tag):
        self.in_style = False


def assert_self_contained(text):
    page = Page(text)
    assert not page.tags & {"script", "iframe", "object", "embed", "link", "base", "form", "svg", "math"}
    assert all(load.startswith("data:image/") for load in page.loads)
    assert not page.handlers
    css = "\n".join(page.css)
    assert "@import" not in css
    assert not re.search(r"url\(\s*['\"]?(?!data:)", css)


def test_what_is_written(memo_folder):
    names = sorted(path.name for path in memo_folder.iterdir())
    assert names == ["memo-engine.record.json", "memo-engine.zip", "said.txt", "small.html", "small.ipynb", "small.pdf"]
    said = (memo_folder / "said.txt").read_text()
    assert "runs its code" in said
    assert "cell 2 of 3" in said
    assert "thrust" in said


def test_page_is_self_contained(memo_folder):
    text = (memo_folder / "small.html").read_text()
    assert_self_contained(text)
    assert "<h1>A small memo &amp; more</h1>" in text
    assert "printed &lt;b&gt;text&lt;/b&gt;" in text
    assert "kept" in text
    assert text.count('class="equation"') == 2


def test_files_verify(memo_folder):
    for name in ("small.ipynb", "small.html", "memo-engine.record.json", "memo-engine.zip"):
        result = verify_file(memo_folder / name)
        assert result.status == "verified", str(result)


def test_notebook_says_which_cell(memo_folder, tmp_path):
    data = json.loads((memo_folder / "small.ipynb").read_text())
    code = [cell for cell in data["cells"] if cell["cell_type"] == "code"]
    code[1]["source"] = ["perf  # changed"]
    changed = tmp_path / "changed.ipynb"
    changed.write_text(json.dumps(data))
    result = verify_file(changed)
    assert result.status == "verified with notes"
    assert "changed or removed" in str(result)
    code[0]["execution_count"] = 7
    changed.write_text(json.dumps(data))
    assert "did not run once each" in str(verify_file(changed))
    code[1]["source"] = ["print('printed <b>text</b>')\n", "perf"]
    code[2]["outputs"] = code[1]["outputs"]
    code[1]["outputs"] = []
    changed.write_text(json.dumps(data))
    assert "shown by cell 3" in str(verify_file(changed))


def test_an_edit_and_save_in_the_browser_keeps_the_seal(memo_folder, tmp_path):
    text = (memo_folder / "small.ipynb").read_text()
    edited = json.dumps(
        json.loads(text, parse_float=lambda number: int(float(number)) if float(number).is_integer() else float(number)), indent=4
    )
    assert edited != text
    path = tmp_path / "edited.ipynb"
    path.write_text(edited)
    assert verify_file(path).exit_code == 0


def test_pdf(memo_folder):
    data = (memo_folder / "small.pdf").read_bytes()
    assert data.startswith(b"%PDF-1.7")
    text = subprocess.run(["pdftotext", "-layout", str(memo_folder / "small.pdf"), "-"], capture_output=True, text=True, check=True).stdout
    assert "A small memo & more" in text
    assert "printed <b>text</b>" in text
    assert "page 1 of" in text
    narrative = text.partition("Code\n")[0]
    assert "kept" in narrative
    assert "alert" not in narrative


def test_as_is_executes_nothing(memo_folder, tmp_path):
    said = []
    outcome = write_memo(memo_folder / "small.ipynb", tmp_path, execute=False, say=said.append)
    assert not any("runs" in line for line in said)
    assert [path.suffix for path in outcome.written] == [".html", ".pdf", ".json"]
    assert (tmp_path / "small.pdf").read_bytes() == (memo_folder / "small.pdf").read_bytes()
    assert (tmp_path / "small.html").read_bytes() == (memo_folder / "small.html").read_bytes()


def test_a_cell_that_raises_keeps_the_partial_notebook(tmp_path):
    source = tmp_path / "broken.ipynb"
    source.write_text(json.dumps(notebook(("code", "x = 1\nx"), ("code", "1 / 0"), ("code", "y = 2"))))
    before = source.read_bytes()
    outcome = write_memo(source, tmp_path / "out", say=lambda text: None)
    assert outcome.error.startswith("broken.ipynb, cell 2 of 3 (1 / 0): ZeroDivisionError")
    kept = json.loads((tmp_path / "out" / "broken.ipynb").read_text())
    assert [len(cell["outputs"]) for cell in kept["cells"]] == [1, 1, 0]
    assert "ZeroDivisionError" in (tmp_path / "out" / "broken.html").read_text()
    assert source.read_bytes() == before


def test_a_broken_notebook_is_not_overwritten_in_place(tmp_path):
    source = tmp_path / "broken.ipynb"
    source.write_text(json.dumps(notebook(("code", "1 / 0"))))
    before = source.read_bytes()
    write_memo(source, say=lambda text: None)
    assert source.read_bytes() == before
    assert (tmp_path / "broken.partial.ipynb").exists()


def test_rerun(memo_folder, tmp_path):
    from propkit.memo.rerun import rerun

    result = rerun(verify_file(memo_folder / "small.ipynb"), say=lambda text: None)
    assert result.checks[-1].status == "same", str(result)
    data = json.loads((memo_folder / "small.ipynb").read_text())
    next(cell for cell in data["cells"] if cell["cell_type"] == "code")["source"] = SETUP.replace("0.18 m", "0.19 m")
    path = tmp_path / "other.ipynb"
    path.write_text(json.dumps(data))
    other = rerun(verify_file(path), say=lambda text: None)
    assert other.exit_code == 1
    assert "results" in other.checks[-1].detail


@pytest.mark.parametrize("hostile", [
    "<script>x</script>",
    "<SCRIPT>x</SCRIPT >",
    "<img src=x onerror=alert(1)>",
    "<img src='https://example.invalid/a.png'>",
    "<img src='data:text/html;base64,PHNjcmlwdD4='>",
    "<a href='javascript:alert(1)'>x</a>",
    "<a href=' \tjavascript:alert(1)'>x</a>",
    "<svg><script>x</script></svg>",
    "<style>@import 'http://example.invalid/';</style>",
    "<style>p{background:url(http://example.invalid/)}</style>",
    "<style></style><p style='background:\\75rl(x)'>",
    "<iframe src=x></iframe>",
    "<link rel=stylesheet href=http://example.invalid/>",
    "<meta http-equiv=refresh content=0>",
    "<base href=http://example.invalid/>",
    "<form action=http://example.invalid/><input></form>",
    "<p onclick=x>",
    "<template data-propkit-record>e30=</template>",
    "</article></body><script>x</script>",
    "<!--<script>--><script>x</script>",
    "<style><!--</style><script>x</script>-->",
])  # fmt: skip
def test_hostile_html_is_made_harmless(hostile):
    text, styles = clean(f"<p>before</p>{hostile}<p>after</p>")
    assert_self_contained(text)
    assert "javascript" not in text
    assert "template" not in text
    assert "</body" not in text
    assert not styles or "example" not in "".join(styles)
    assert text.count("<p>") == text.count("</p>") or "<p>" not in hostile


def test_clean_html_is_stable():
    text, _ = clean("<div class='a'><table><tr><td>1 &lt; 2</td></tr></table><b>x")
    assert text == '<div class="a"><table><tr><td>1 &lt; 2</td></tr></table><b>x</b></div>'
    assert clean(text)[0] == text


def test_equations_leave_code_alone():
    marked, found = take_out("`$a$` and $b_1$, 5$ and 6$\n```\n$$c$$\n```\n$$d$$")
    assert found == [("b_1", True), ("d", False)]
    assert "propkitequation0mark" in marked
    assert put_back("propkitequation9mark", found) == "propkitequation9mark"


def test_terminal_text():
    assert plain_text("a\x1b[31mred\x1b[0m\x07\r\nbar 10%\rbar 100%\n") == "ared\nbar 100%"
    assert plain_text("12\u202f000\u00a0N\u202e\x00") == "12\u202f000\u00a0N"


def test_widget_views_are_left_out():
    outputs = [
        {"output_type": "display_data", "data": {"application/vnd.jupyter.widget-view+json": {}, "text/plain": "Slider"}, "metadata": {}}
    ]
    made = list(blocks_of({"cells": [{"cell_type": "code", "source": "x", "outputs": outputs}]}))
    assert [block.kind for block in made] == ["code"]


@pytest.mark.parametrize(
    "text", ["{}", "{", '{"cells": 3}', '{"cells": [{"cell_type": "code"}]}', "[]", '{"cells": [{"cell_type": "raw", "source": 3}]}']
)
def test_what_is_no_notebook(tmp_path, text):
    path = tmp_path / "x.ipynb"
    path.write_text(text)
    with pytest.raises(pk.PropkitError, match=r"x\.ipynb"):
        write_memo(path, tmp_path / "out", execute=False, say=lambda line: None)


def test_records_are_recomputed_while_the_notebook_runs(memo_folder):
    from propkit.memo.ahead import Ahead
    from propkit.record.canonical import digest_of
    from propkit.record.containers import documents_of

    cells = [cell for cell in json.loads((memo_folder / "small.ipynb").read_text())["cells"] if cell["cell_type"] == "code"]
    carrying = next(cell for cell in cells if list(documents_of(cell)))
    broken = json.loads(json.dumps(carrying))
    next(iter(documents_of(broken)))["content"] = 3
    known = {}
    with Ahead(known, fluids=False) as ahead:
        for cell in (broken, *cells):
            ahead.finished(cell)
    recipe = next(iter(documents_of(carrying)))["content"]["recipe"]
    assert list(known) == [digest_of(recipe)]


def displayed(value):
    """Return the output that a notebook keeps of a value."""
    from IPython.core.formatters import DisplayFormatter

    data, metadata = DisplayFormatter().format(value)
    return {"output_type": "execute_result", "data": data, "metadata": metadata, "execution_count": 1}


def test_a_live_plot_leaves_its_drawing_in_page_and_pdf():
    pytest.importorskip("bokeh")
    from propkit.memo.notebook_pdf import notebook_pdf
    from propkit.memo.page import NotebookMemo, notebook_page
    from propkit.view.svg import data_uri

    gas = pk.Chamber.from_gas(pressure="2 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    nozzle = pk.Nozzle(gas, area_ratio=10, throat_diameter="50 mm")
    fit = pk.Reconciliation(pk.Performance(nozzle, ambient="vacuum"), {"mass_flow": ("2.4 kg/s", "5 %"), "thrust": ("6 kN", "5 %")})
    for one, figure in ((nozzle.plot(), None), (fit.plot("mass_flow"), fit.drawing("mass_flow"))):
        cells = [{"cell_type": "code", "source": "x", "outputs": [displayed(one)]}]
        memo = NotebookMemo("Plot", "x.ipynb", tuple(blocks_of({"cells": cells})), ())
        page = notebook_page(memo)
        assert_self_contained(page)
        assert "live figure" not in page
        assert 'src="data:image/svg+xml;base64,' in page
        if figure is not None:
            assert data_uri(figure) in page
        assert len(notebook_pdf(memo)) > len(notebook_pdf(NotebookMemo("Plot", "x.ipynb", (), ()))) + 2000


def test_a_figure_shown_live_is_told_in_a_line():
    outputs = [
        {
            "output_type": "display_data",
            "data": {"application/vnd.bokehjs_load.v0+json": "", "application/javascript": "x"},
            "metadata": {},
        },
        {
            "output_type": "display_data",
            "data": {"application/vnd.bokehjs_exec.v0+json": "", "text/html": "<div id='a'></div>"},
            "metadata": {},
        },
    ]
    made = list(blocks_of({"cells": [{"cell_type": "code", "source": "show(x)", "outputs": outputs}]}))
    assert [block.kind for block in made] == ["code", "markdown"]
    assert "leaves its drawing" in made[1].text


@pytest.mark.parametrize(("heading", "title"), [
    ("From a recording to c*, thrust and p_value_two", "From a recording to c*, thrust and p_value_two"),
    (r"A \*star\* and **bold** `code` $x$", "A *star* and bold code x"),
    ("_Linnet_: first", "Linnet: first"),
])  # fmt: skip
def test_title_is_plain_text(heading, title):
    from propkit.memo.blocks import Block, title_of

    assert title_of([Block("markdown", f"# {heading}\n\ntext")], "x") == title


def test_a_hostile_title_stays_in_the_foot_of_the_page():
    from propkit.memo.page import whole_page

    page = whole_page('"}</style><script>x</script>\\41 é' + "x" * 100, "")
    assert_self_contained(page)
    assert page.count("</style>") == 1
    assert "\\3c \\2f script" in page


def test_tables_are_set_to_fit():
    from propkit.memo.typeset import typeset_blocks

    frame = "<table class='dataframe'><thead><tr><th></th><th>a_very_long_name</th><th>b</th></tr></thead><tbody><tr><th>x</th><td>-1.5e+03</td><td>1 2</td></tr><tr><th>y</th><td>NaN</td><td>word</td></tr></tbody></table>"
    (table,) = typeset_blocks(frame)
    assert table["numbers"] == [False, True, False]
    assert table["demand"] == pytest.approx(1.1 * (1 + 16) + 4)
    drawings = "".join(f"<img alt='{n}' src='data:image/svg+xml;base64,PHN2Zy8+'>" for n in range(3))
    assert [block["kind"] for block in typeset_blocks(f"<div>{drawings}</div>")] == ["gallery"]
    text, whole = typeset_blocks(
        "<p>Leads to</p><table><tr><td class='digest'>"
        + "0123456789abcdef" * 4
        + "</td></tr></table><div class='formula'><p>a</p><p>b</p></div>"
    )[0::2]
    assert text["leads"]
    assert whole["kind"] == "whole"


def test_paper_of_a_notebook_memo(memo_folder, tmp_path):
    from propkit import cli

    assert cli.main(["memo", str(memo_folder / "small.ipynb"), "--as-is", "--paper", "letter", "--out", str(tmp_path)]) == 0
    info = subprocess.run(["pdfinfo", str(tmp_path / "small.pdf")], capture_output=True, text=True, check=True).stdout
    assert "612 x 792" in info
    with pytest.raises(pk.InputError, match="paper"):
        write_memo(memo_folder / "small.ipynb", tmp_path, execute=False, paper="us-letter")
