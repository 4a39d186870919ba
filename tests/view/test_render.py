"""The four media say the same, number by number; nothing a user typed gets out of its place; the same report, the same bytes."""

from __future__ import annotations

import ast
import html
import math
import re
import subprocess
import sys
import xml.dom.minidom
from collections import Counter
from collections.abc import Callable
from decimal import ROUND_HALF_EVEN, Context, Decimal
from html.parser import HTMLParser

import pytest

from propkit.errors import InputError
from propkit.report import Report
from propkit.view import MEDIA, render

SUPERSCRIPTS = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")
NUMBER = re.compile(r"(?<![\w.])-?\d+(?:\.\d+)?(?:e-?\d+)?(?![\w.]*\w)")
VOID = {"img", "br", "wbr"}


def expected(value: float, digits: int) -> float:
    """Return a number at its significant digits, rounded by decimal arithmetic of its own."""
    return float(Context(prec=digits, rounding=ROUND_HALF_EVEN).create_decimal(Decimal(value)))


def plain(medium: str, text: str) -> str:
    """Return a rendering as plain lines with numbers in machine form."""
    if medium == "html":
        text = re.sub(r"<style>.*?</style>|<svg.*?</svg>", "", text)
        text = re.sub(r"</(?:tr|p|li|caption)>", "\n", text)
        text = html.unescape(re.sub(r"</?(?:span|b|i|sub|sup|wbr)\b[^>]*>", "", text))
        text = re.sub(r"<[^>]*>", " ", text)
    if medium == "latex":
        text = text.replace("\\,", "")
        text = re.sub(r"(\S+) \\times 10\^\{(-?\d+)\}", r"\1e\2", text)
        text = re.sub(r"\\pm", " ± ", text)
        text = re.sub(r"[$&{}\\]", " ", text)
    if medium == "markdown":
        text = text.replace("\\", "").replace("|", " ")
    text = re.sub("\u202f×\u202f10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)", lambda power: f"e{power[1].translate(SUPERSCRIPTS)}", text).replace("\u2212", "-")
    return re.sub(r"(?<=\d)\u202f(?=\d)", "", text)


def numbers(medium: str, text: str) -> Counter[float]:
    """Return every number of a rendering with its count."""
    return Counter(float(match) for match in NUMBER.findall(plain(medium, text)))


def told(report: Report) -> Counter[float]:
    """Return every number that a report tells, at its digits; a row of the headline is told once."""
    answered = {row.name for row in report.headline}
    rows = [row for row in report.rows() if row not in report.results or row.name not in answered]
    found = [
        # JCGM 100:2008, 7.2.6: two digits of the uncertainty, the value to the same decimal place
        round(row.value, 1 - math.floor(math.log10(row.uncertainty))) if row.uncertainty else expected(row.value, row.digits)
        for row in rows
        if isinstance(row.value, float)
    ]
    for section in report.sections:
        if section.table is not None:
            for column in section.table.columns:
                found += [expected(value, column.digits) for value in column.values if isinstance(value, float)]
    return Counter(found)


@pytest.mark.parametrize("medium", MEDIA)
@pytest.mark.parametrize("name", ["performance", "long", "nasty"])
def test_every_medium_tells_every_number(reports: dict[str, Report], name: str, medium: str) -> None:
    missing = told(reports[name]) - numbers(medium, render(reports[name], medium))
    assert not missing, f"{medium} does not tell {missing}"


@pytest.mark.parametrize("medium", MEDIA)
def test_a_number_stands_behind_its_label_with_its_unit(reports: dict[str, Report], medium: str) -> None:
    report = reports["performance"]
    lines = plain(medium, render(report, medium)).splitlines()
    units = {"mm**2": "mm²", "foot/s": "ft/s", "degR": "°R", "psi": "psia"}
    for row in report.results:
        if not isinstance(row.value, float) or row.name == "thrust":
            continue
        line = next(line for line in lines if row.label in line)
        behind = line.partition(row.label)[2]
        assert float(NUMBER.findall(behind)[0]) == expected(row.value, row.digits), (medium, line)
        unit = units.get(row.unit, row.unit)
        shown = re.sub(r"[$^{}\\ ]|circ", "", behind) if medium == "latex" else behind
        latex = unit.replace("²", "2").replace("°", "")
        assert (latex if medium == "latex" else unit) in shown, (medium, line)


def test_the_test_of_numbers_can_fail(reports: dict[str, Report]) -> None:
    shown = render(reports["performance"], "html").replace("286.78", "287.78")
    assert told(reports["performance"]) - numbers("html", shown) == Counter([286.78])


@pytest.mark.parametrize("medium", MEDIA)
def test_same_report_same_bytes_in_another_process(reports: dict[str, Report], medium: str) -> None:
    assert render(reports["nasty"], medium) == render(reports["nasty"], medium)
    code = (
        "import importlib.util, sys, hashlib\n"
        "spec = importlib.util.spec_from_file_location('samples', sys.argv[1])\n"
        "samples = importlib.util.module_from_spec(spec); spec.loader.exec_module(samples)\n"
        "from propkit.view import render\n"
        "print(ascii(render(samples.performance(), sys.argv[2])))"
    )
    where = __file__.replace("test_render.py", "conftest.py")
    run = subprocess.run(
        [sys.executable, "-c", code, where, medium],
        capture_output=True,
        text=True,
        check=True,
        env={"PYTHONHASHSEED": "7"},
    )
    assert ast.literal_eval(run.stdout) == render(reports["performance"], medium)


class Reader(HTMLParser):
    """Reads a fragment strictly: every element closed in turn; keeps tags and attributes."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[str] = []
        self.attributes: list[tuple[str, str | None]] = []
        self.text: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.attributes += attrs
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open, f"</{tag}> closes nothing"
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if not self.open or self.open[-1] != "style":
            self.text.append(data)


def read(markup: str) -> Reader:
    reader = Reader()
    reader.feed(markup)
    reader.close()
    assert reader.open == []
    return reader


@pytest.mark.parametrize("name", ["performance", "long", "nasty", "working", "bare"])
def test_html_is_well_formed_and_keeps_its_promises(reports: dict[str, Report], name: str) -> None:
    markup = render(reports[name], "html")
    reader = read(markup)
    allowed = {
        "div",
        "style",
        "p",
        "span",
        "b",
        "i",
        "sub",
        "sup",
        "small",
        "wbr",
        "br",
        "table",
        "caption",
        "thead",
        "tbody",
        "tr",
        "th",
        "td",
        "img",
        "ul",
        "li",
        "code",
    }
    assert set(reader.tags) <= allowed
    assert reader.tags.count("style") == 1
    names = {attribute for attribute, _ in reader.attributes}
    assert names <= {"class", "style", "scope", "colspan", "title", "src", "alt", "aria-hidden", "role"}
    for attribute, value in reader.attributes:
        if attribute == "class":
            assert all(part.startswith("propkit-") for part in (value or "").split())
        if attribute == "src":
            assert (value or "").startswith("data:image/svg+xml;base64,")
    assert reader.tags.count("img") == sum(attribute == "alt" and bool(value) for attribute, value in reader.attributes)
    style = markup[markup.index("<style>") : markup.index("</style>")]
    assert not re.search(r"https?:|url\(|@import", style)
    for rule in re.findall(r"(?<=[{}])([^{}@]+)(?=\{)", style):
        assert all(".propkit-" in selector for selector in rule.split(",")), rule


def test_table_cells_have_the_headers_that_a_screen_reader_needs(reports: dict[str, Report]) -> None:
    markup = render(reports["performance"], "html")
    for table in re.findall(r"<table.*?</table>", markup):
        assert "<caption>" in table
        for body_row in re.findall(r"<tr.*?</tr>", table.partition("<tbody>")[2]):
            assert "scope='row'" in body_row or "propkit-doubt" in body_row
        for head in re.findall(r"<thead>.*?</thead>", table):
            assert "<td" not in head


def test_html_says_the_same_without_style_sheet_and_drawings(reports: dict[str, Report]) -> None:
    """What a sanitiser leaves: no style element, no inline style, no class, no inline svg."""
    markup = render(reports["performance"], "html")
    left = re.sub(r"<style>.*?</style>|<svg.*?</svg>| (?:style|class)='[^']*'", "", markup)
    assert "<svg" not in markup
    assert not told(reports["performance"]) - numbers("html", left)
    for word in (
        "Given",
        "Results",
        "●",
        "○",
        "Separation is likely",
        "H<sub>2</sub>O",
        "Below the range",
        "Not known for this gas",
    ):
        assert word in left


def test_nothing_typed_escapes_in_html(reports: dict[str, Report], nasty: str) -> None:
    markup = render(reports["nasty"], "html")
    reader = read(markup)
    assert "script" not in reader.tags
    assert nasty in "".join(reader.text)


def test_nothing_typed_escapes_in_markdown(reports: dict[str, Report], nasty: str) -> None:
    shown = render(reports["nasty"], "markdown")
    assert "<script" not in shown
    assert "<img" not in shown
    assert not re.search(r"(?<!\\)`", shown)
    assert not re.search(r"(?<!\\)\$", shown)
    rows = [line for line in shown.splitlines() if line.startswith("|") and "name of stand" in line]
    assert [len(re.findall(r"(?<!\\)\|", line)) for line in rows] == [6]


def test_nothing_typed_escapes_in_latex(reports: dict[str, Report]) -> None:
    shown = render(reports["nasty"], "latex")
    outside = re.sub(r"\$[^$]*\$", "", re.sub(r"\\[$&%#_{}]", "", shown))
    assert not re.search(r"[#%~^_<>]", outside)
    assert shown.replace(r"\{", "").replace(r"\}", "").count("{") == shown.replace(r"\{", "").replace(r"\}", "").count("}")
    assert len(re.findall(r"(?<!\\)\$", shown)) % 2 == 0


def test_a_long_name_does_not_widen_the_text(reports: dict[str, Report]) -> None:
    table_free = [line for line in render(reports["performance"], "text").splitlines() if "name of stand" not in line]
    assert max(map(len, table_free)) <= 104


@pytest.mark.parametrize("medium", MEDIA)
def test_doubts_stand_in_every_medium(reports: dict[str, Report], medium: str) -> None:
    shown = plain(medium, render(reports["performance"], medium))
    flat = " ".join(shown.split())
    for doubt in (
        "Separation is likely",
        "outside the range of the data",
        "Below the range of the correlation",
        "cryogenic",
    ):
        assert doubt in flat


def test_a_doubt_of_two_answers_is_said_once_in_html(reports: dict[str, Report]) -> None:
    assert render(reports["performance"], "html").count("Separation is likely") == 1


@pytest.mark.parametrize("medium", MEDIA)
def test_a_working_shows_relation_numbers_and_both_sides(reports: dict[str, Report], medium: str) -> None:
    shown = render(reports["working"], medium)
    told_numbers = numbers(medium, shown)
    assert told_numbers[-1577549.832] > 0
    assert told_numbers[-1577549.831] > 0
    assert "376.36" in shown
    assert ("mass_flow * exit_velocity" in html.unescape(shown)) or medium == "latex"


def test_equations_fall_back_to_text(reports: dict[str, Report], monkeypatch: pytest.MonkeyPatch) -> None:
    from propkit.view import equations

    monkeypatch.setattr(equations, "svg_of", lambda latex: None)
    shown = render(reports["working"], "html")
    assert "<img" not in shown
    assert "<code>thrust = mass_flow * exit_velocity</code>" in shown


def test_equations_are_images_on_a_plate_of_their_own() -> None:
    pytest.importorskip("ziamath")
    from propkit.view import equations

    drawn = equations.svg_of(r"F = \dot{m} u_{e} + (p_{e} - p_{a}) A_{e}")
    assert drawn is not None
    assert xml.dom.minidom.parseString(drawn).documentElement.tagName == "svg"
    assert len(drawn) < 9000
    assert equations.svg_of(r"\nosuchcommand{") is None


def test_an_unknown_medium_is_refused_by_name(reports: dict[str, Report]) -> None:
    with pytest.raises(InputError, match="'pdf'"):
        render(reports["bare"], "pdf")


def test_the_style_sheet_is_small() -> None:
    from propkit.view.style import STYLE

    assert len(STYLE) < 8000
    assert "prefers-color-scheme:dark" in STYLE
    assert "@media print" in STYLE


@pytest.mark.parametrize("make", [lambda r: r._repr_mimebundle_(), lambda r: r._repr_mimebundle_(include=["text/html"])])
def test_the_bundle_goes_through_the_views(reports: dict[str, Report], make: Callable[[Report], dict[str, str]]) -> None:
    import dataclasses

    report = dataclasses.replace(reports["performance"], render=render)
    assert make(report)["text/html"] == render(report, "html")
    assert str(report) == render(report, "text")
