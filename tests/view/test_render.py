"""Every medium shows the same numbers, escapes what a user typed, and stays the same from one rendering to the next."""

from __future__ import annotations

import re
from html.parser import HTMLParser

import pytest

import propkit as pk
from propkit.report import Report, Row
from propkit.view import MEDIA, numbers, render, svg
from propkit.view.symbols import html_species, html_symbol, latex_species, text_species, text_symbol

NASTY = "<script>alert(1)</script> & $\\&_{x}% #1 \"q\" 'q' `c` |"


@pytest.fixture(scope="module")
def objects(case, chamber, nozzle, perf):
    gas = pk.Chamber.from_gas(pressure="7 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    return [
        case, chamber, nozzle, perf, gas,
        perf.replace({"chamber.contraction_ratio": 3, "nozzle.flow": "frozen", "ambient": "12 km"}),
        pk.Performance(pk.Nozzle(gas, area_ratio=20, throat_diameter="0.1 m"), ambient="vacuum"),
    ]  # fmt: skip


def canonical(text: str) -> str:
    """Return a rendering with numbers in one spelling."""
    text = re.sub(r"<[^>]*>|\\,|[\u202f\u2007\u2008]", "", text.replace("\u2212", "-"))
    text = re.sub(
        r"\s*(?:×|\\times)\s*10(?:\^\{(-?\d+)\}|([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+))",
        lambda m: "e" + (m[1] or m[2].translate(str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789"))),
        text,
    )
    return text.replace("\\-", "-").replace("\\_", "_")


def shown_numbers(report: Report):
    for row in report.rows():
        if isinstance(row.value, int | float):
            yield numbers.rounded(row.value, row.digits)
    for section in report.sections:
        for column in section.table.columns if section.table else ():
            yield from (
                numbers.rounded(value, column.digits) for value in column.values if isinstance(value, int | float)
            )


@pytest.mark.parametrize("units", ["SI", "US"])
@pytest.mark.parametrize("medium", MEDIA)
def test_every_medium_holds_every_number(objects, medium, units):
    for one in objects:
        report = one.report(units)
        body = canonical(render(report, medium))
        missing = [text for text in shown_numbers(report) if text not in body]
        assert not missing, (one.kind, missing[:5])


@pytest.mark.parametrize("medium", MEDIA)
def test_the_same_object_gives_the_same_bytes(objects, medium):
    for one in objects:
        assert render(one.report(), medium) == render(one.report(), medium)


class Strict(HTMLParser):
    VOID = ("br", "img", "meta", "hr")

    def __init__(self):
        super().__init__()
        self.open, self.tags, self.attributes = [], [], []

    def handle_starttag(self, tag, attrs):
        self.tags.append(tag)
        self.attributes += attrs
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag, tag


def test_html_is_well_formed_and_safe(objects):
    for one in [*objects, *(o.working("mass_flow") for o in objects if o.kind == "performance")]:
        page = (one if isinstance(one, Report) else one.report())._repr_mimebundle_()["text/html"]
        parser = Strict()
        parser.feed(page)
        assert parser.open == []
        assert not {"script", "h1", "h2", "h3", "h4", "iframe", "link", "svg", "math"} & set(parser.tags)
        for name, value in parser.attributes:
            assert not name.startswith("on")
            assert name != "id"
            assert not re.search(r"https?:|//", value or "") or (value or "").startswith("data:"), value
        images = [dict(parser_attrs) for parser_attrs in [parser.attributes]]
        assert images
        assert all(alt for name, alt in parser.attributes if name == "alt")


def test_what_a_user_typed_is_escaped_everywhere(case):
    named = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4, name=NASTY[:60])
    html = render(named.report(), "html")
    assert "<script" not in html
    assert "&lt;script&gt;" in html
    assert "<script" not in render(named.report(), "markdown")
    assert r"\textbackslash{}" in render(Report("x", NASTY, "", "SI"), "latex")
    assert not re.search(r"(?<!\\)[&%#$]", re.sub(r"\\text\w+\{\}", "", render(Report("x", NASTY, "", "SI"), "latex")))
    assert "<script" not in svg.draw(
        pk.Nozzle(pk.Chamber(named, pressure=7e6), area_ratio=9, throat_diameter=0.1).figures()[0]
    )


def test_given_default_and_computed_are_told_apart_without_colour(nozzle):
    text = render(nozzle.report(), "text")
    assert re.search(r"● throat diameter", text)
    assert re.search(r"○ flow model", text)
    assert re.search(r"= throat area", text)


def test_doubts_stand_beside_the_number(perf):
    text = render(perf.report(), "text").splitlines()
    at = next(k for k, line in enumerate(text) if "thrust " in line)
    assert "Separation is likely" in text[at + 1]


def test_a_displayed_performance_carries_its_record(perf, nozzle):
    bundle = perf._repr_mimebundle_()
    assert set(bundle) == {
        "text/plain",
        "text/html",
        "text/markdown",
        "text/latex",
        "application/vnd.propkit.record+json",
    }
    assert "application/vnd.propkit.record+json" not in nozzle._repr_mimebundle_()


def test_us_units_are_the_customary_ones(perf):
    text = render(perf.report("US"), "text")
    for unit in ("lbf", "lbm/s", "psia", "°R", "ft/s"):
        assert unit in text, unit
    assert "in" in render(perf.nozzle.report("US"), "text")


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (3594.578, 6, "3594.58"),
        (0.0, 4, "0"),
        (868588.0, 5, "868588"),
        (1.23e-7, 3, "1.23e-7"),
        (-405.619, 6, "-405.619"),
        (1e9, 3, "1.00e9"),
        (0.9999996, 4, "1.0000"),
    ],
)
def test_rounding(value, digits, shown):
    assert numbers.rounded(value, digits) == shown


def test_pretty_numbers():
    assert numbers.pretty(868588.0, 5) == "868\u202f588"
    assert numbers.pretty(9999.5, 5) == "9999.5"
    assert numbers.pretty(-1.5e-7, 2) == "\u22121.5\u202f×\u202f10⁻⁷"
    assert numbers.aligned(["1.25", "10", "0.5"]) == ["1.25", "10\u2008\u2007\u2007", "0.5\u2007"]


def test_symbols_and_species():
    assert text_symbol(r"\dot{m}_{ox}") == "ṁₒₓ"
    assert text_symbol(r"c^{*}") == "c*" or text_symbol(r"c^{*}") == "c^*"
    assert html_symbol(r"\gamma_{f}") == "<i>γ</i><sub><i>f</i></sub>"
    assert html_species("C2H2 (acetylene)") == "C<sub>2</sub>H<sub>2</sub> (acetylene)"
    assert text_species("Al2O3 (liquid)") == "Al₂O₃ (liquid)"
    assert latex_species("H2O") == r"\mathrm{H_{2}O}"


def test_an_unknown_medium_is_refused(perf):
    with pytest.raises(pk.InputError, match="can be shown as"):
        render(perf.report(), "pdf")


def test_drawings_are_small_and_readable_without_sight(objects):
    for one in objects:
        for figure in one.figures():
            drawn = svg.draw(figure)
            assert len(drawn) < 9000
            assert f"<title>{figure.alt.split('&')[0][:20]}" in drawn
            assert "nan" not in drawn


def test_an_unavailable_value_is_said(case):
    row = Row("x", "thing", "x", None, "", 3, "computed", doubts=("because of a reason",))
    for medium in MEDIA:
        text = render(Report("kind", "title", "", "SI", results=(row,)), medium)
        assert "not available" in text
        assert "because of a reason" in text
