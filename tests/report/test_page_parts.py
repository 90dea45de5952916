"""What pages are made of: the rule's risk, places on number lines, sizes of print, SVG."""

from __future__ import annotations

import re
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from xml.etree import ElementTree as ET

import numpy as np
import page_cases as cases
import pytest

import benchtool
from benchtool.model.design import Rule
from benchtool.model.quantity import Bound
from benchtool.model.result import Analysis
from benchtool.report.page.content import build_page
from benchtool.report.page.geometry import Drawing, place_marks
from benchtool.report.page.pictures import time_scale
from benchtool.report.page.quantities import number_lines
from benchtool.report.page.rules import boundary_risk, rule_text
from benchtool.report.page.sheetfit import print_size_pt
from benchtool.report.page.strips import picture_rows
from benchtool.report.page.svg import INK, fit_svg
from benchtool.report.page.views import Stamp

STAMP = Stamp(version="0.1.0", versions={}, made_at=cases.MADE_AT, command_line=cases.COMMAND)


@pytest.mark.parametrize(
    ("rule", "risk", "digits"),
    [
        # ILAC-G8:09/2019, table of guard bands: w = U under 2.5 %, w = 0 under 50 %,
        # 0.83 U under 5 % (also ISO 14253-1), 1.5 U under 0.16 %. There U = 2u, here 1.96u.
        (Rule(name="guarded", guard=1.0), 0.025, 4),
        (Rule(name="simple"), 0.5, 9),
        (Rule(name="guarded", guard=0.0), 0.5, 9),
        (Rule(name="guarded", guard=0.83), 0.05, 2),
        (Rule(name="nonbinary", guard=1.5), 0.0016, 3),
    ],
)
def test_the_risk_at_the_edge_is_that_of_the_published_guard_bands(
    rule: Rule, risk: float, digits: int
) -> None:
    assert boundary_risk(rule) == pytest.approx(risk, abs=0.6 * 10**-digits)


@pytest.mark.parametrize("name", ["guarded", "simple", "nonbinary"])
def test_every_rule_names_its_sources_and_its_risk(name: str) -> None:
    text = rule_text(Rule(name=name, guard=1.0))  # type: ignore[arg-type]
    assert "JCGM 106:2012" in text
    assert "ILAC-G8:09/2019" in text
    assert re.search(r"at most 2\.5 %|up to 50 %", text)


def drawing(number: int, **changes: object) -> Drawing:
    check = replace(cases.checks()[number], **changes)  # type: ignore[arg-type]
    lines = number_lines(cases.judged(checks=(check,)))
    assert lines is not None
    return place_marks(lines.lines[0])


def test_limits_lie_a_quarter_of_their_distance_from_the_ends() -> None:
    # A margin of 0.25 on both sides: 1/6 and 5/6 of the line, of the 97 % that are drawn on.
    places = [tick.x for tick in drawing(0).ticks]
    assert places == pytest.approx([1.5 + 97 / 6, 1.5 + 97 * 5 / 6], abs=0.01)


def test_guard_bands_fill_what_lies_between_limits_and_accepted() -> None:
    marks = drawing(0, accept_lower=13.0, accept_upper=20.0)
    assert marks.accepted is not None
    left, right = marks.guards
    low, high = (tick.x for tick in marks.ticks)
    assert left.x == pytest.approx(low, abs=0.02)
    assert left.x + left.width == pytest.approx(marks.accepted.x, abs=0.02)
    assert right.x == pytest.approx(marks.accepted.x + marks.accepted.width, abs=0.02)
    assert right.x + right.width == pytest.approx(high, abs=0.02)


def test_where_nothing_is_accepted_all_between_the_limits_is_guard_band() -> None:
    marks = drawing(0, accept_lower=None, accept_upper=None)
    assert marks.accepted is None
    assert [piece.width for piece in marks.guards] == pytest.approx([97 * 4 / 6], abs=0.02)


def test_an_open_side_is_accepted_to_the_end_of_the_line() -> None:
    marks = drawing(4)
    assert marks.accepted is not None
    assert marks.accepted.x == 0
    assert len(marks.ticks) == 1


def test_a_value_far_beyond_is_drawn_at_the_end_without_its_spread() -> None:
    marks = drawing(0, measured=cases.seconds(90.0, 0.1))
    assert (marks.off, marks.value, marks.spread) == ("right", 98.5, None)
    assert drawing(0, measured=cases.seconds(0.1, 0.1)).off == "left"


def test_a_bound_is_drawn_as_all_that_it_allows() -> None:
    marks = drawing(0, measured=Bound(unit="s", at_least=20.0))
    assert marks.value is None
    assert marks.bound is not None
    assert marks.bound.x + marks.bound.width == pytest.approx(100)
    beyond = drawing(0, measured=Bound(unit="s", at_least=300.0))
    assert (beyond.off, beyond.bound) == ("right", None)
    assert drawing(0, measured=Bound(unit="s", at_most=300.0)).off is None


def test_limits_that_coincide_are_one_tick() -> None:
    assert len(drawing(0, lower=14.0, upper=14.0).ticks) == 1


@pytest.mark.parametrize(
    ("reach_s", "unit"),
    [(310.0, "s"), (1.0, "s"), (0.5, "ms"), (2e-6, "µs"), (3e-9, "ns"), (4e-13, "ps")],
)
def test_an_axis_has_the_unit_that_suits_it(reach_s: float, unit: str) -> None:
    assert time_scale(reach_s)[1] == unit


def size_pt(analysis: Analysis) -> float:
    return print_size_pt(build_page(analysis, STAMP))


def test_print_shrinks_with_what_there_is_to_say_and_never_beyond_reading() -> None:
    sizes = [size_pt(make()) for make in (cases.dead, cases.failing, cases.crowded)]
    assert all(larger > smaller for larger, smaller in pairwise(sizes))
    wordy = cases.hostile("words " * 900)
    assert size_pt(wordy) == 6.6


def test_a_picture_without_periods_is_the_trace_alone() -> None:
    empty = np.empty(0)
    bare = replace(
        cases.overview(),
        histogram_s=empty,
        histogram_count=empty,
        periods_at_s=empty,
        periods_s=empty,
    )
    rows = picture_rows(cases.judged(overview=bare))
    assert any("first cycles" in row for row in rows)
    assert not any("Histogram" in row for row in rows)


def test_the_trace_in_characters_has_an_edge_mark_under_each_edge() -> None:
    rows = picture_rows(cases.judged())
    assert sum(row.count("^") for row in rows[1:]) == cases.overview().edges_s.size


def test_the_histogram_in_characters_is_as_high_as_its_count() -> None:
    rows = picture_rows(cases.judged())
    start = rows.index("Histogram of the periods")
    label = rows[start + 1].split()[0]
    assert float(label) == cases.overview().histogram_count.max()


DRAWN = f"""<?xml version="1.0"?>
<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink"
 width="10pt" height="5pt" viewBox="0 0 10 5">
<metadata><x href="http://example.org"/></metadata>
<style>*{{stroke: red}}</style>
<g id="figure_1"><defs><path id="m1" d="M 0.123456 1.987654 L 3 4"/></defs>
<use xlink:href="#m1" style="fill: {INK}"/><path id="p9" clip-path="url(#c1)"/>
<clipPath id="c1"/><text style="font-size: 7px; font-family: 'A', 'B'">1</text></g></svg>"""


def test_a_fitted_svg_keeps_no_namespace_metadata_or_style_sheet() -> None:
    svg = fit_svg(DRAWN, prefix="a-", title="<t>")
    assert "http" not in svg
    assert "metadata" not in svg
    assert "stroke: red" not in svg
    assert svg.startswith("<svg ")
    assert '<title id="a-title">&lt;t&gt;</title>' in svg


def test_a_fitted_svg_has_ids_of_its_own_and_only_those_it_uses() -> None:
    root = ET.fromstring(fit_svg(DRAWN, prefix="a-", title="t"))
    ids = {element.attrib["id"] for element in root.iter() if "id" in element.attrib}
    assert ids == {"a-title", "a-m1", "a-c1"}
    assert root.find(".//use").attrib["href"] == "#a-m1"  # type: ignore[union-attr]
    assert root.find(".//path[@clip-path]").attrib["clip-path"] == "url(#a-c1)"  # type: ignore[union-attr]


def test_a_fitted_svg_takes_the_colours_and_letters_of_the_page() -> None:
    svg = fit_svg(DRAWN, prefix="a-", title="t")
    assert "fill: currentColor" in svg
    assert "font-family: var(--sans, sans-serif)" in svg
    assert "0.12 1.99" in svg


def luminance(colour: str) -> float:
    """Return the relative luminance of an sRGB colour (WCAG 2.2, definition)."""
    digits = "".join(char * 2 for char in colour) if len(colour) == 3 else colour
    channels = [int(digits[i : i + 2], 16) / 255 for i in (0, 2, 4)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return float(np.dot((0.2126, 0.7152, 0.0722), linear))


def palettes() -> list[dict[str, str]]:
    """Return the colours of the style sheet: light, dark, print."""
    sheet = Path(benchtool.__file__).parent / "report" / "page" / "templates" / "page.css"
    blocks = re.findall(r":root \{(.*?)\}", sheet.read_text(encoding="utf-8"), re.DOTALL)
    found = [dict(re.findall(r"--(\w+): #([0-9a-f]{3,6});", block)) for block in blocks]
    light, dark, paper = found
    return [light, {**light, **dark}, {**light, **paper}]


@pytest.mark.parametrize("palette", palettes(), ids=["light", "dark", "print"])
@pytest.mark.parametrize("name", ["ink", "soft", "pass", "near", "fail", "void"])
def test_text_stands_out_from_the_paper(palette: dict[str, str], name: str) -> None:
    # WCAG 2.2, success criterion 1.4.3 (AA): at least 4.5 : 1.
    low, high = sorted((luminance(palette[name]), luminance(palette["paper"])))
    assert (high + 0.05) / (low + 0.05) >= 4.5
