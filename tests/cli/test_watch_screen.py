"""What a watch draws: it fits, it is large, it says what is due and which way to go on."""

from __future__ import annotations

import re
import sys
from dataclasses import replace
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "jobs"))
from moving_boards import RB_OHM, quick_design, records, steps
from test_watch_state import readings, silent

from benchtool.cli.watch_audience import ring_interval
from benchtool.jobs.watch_plan import plan_watch
from benchtool.jobs.watch_state import begin
from benchtool.model.judgement import Check
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Measured
from benchtool.model.watch import Goal, Heading, Mark, Point, Reading
from benchtool.observation import settle
from benchtool.report.screen.watch import Frame, Row, watch_rows
from benchtool.report.screen.watch_digits import ROWS, enlarge
from benchtool.report.screen.watch_strip import draw_strip
from benchtool.report.screen.watch_words import (
    HINTS,
    age_text,
    distance_text,
    duration_text,
    reading_text,
)
from benchtool.uncertainty import expanded


@pytest.fixture(scope="module")
def turned() -> Reading:
    """A reading after the trimmer was turned towards the goal."""
    return readings(records(steps((350e3, 4), (340e3, 3)), periods=4.5))[-1]


def text_of(rows: list[Row]) -> list[str]:
    return ["".join(text for text, _ in row) for row in rows]


def drawn(reading: Reading, width: int = 80, height: int = 24, now_s: float = 0.7) -> str:
    frame = Frame(width=width, height=height, keys="q quit")
    return "\n".join(text_of(watch_rows(reading, now_s, frame)))


@pytest.mark.parametrize("height", [1, 2, 3, 6, 12, 14, 20, 24, 40, 80])
@pytest.mark.parametrize("width", [20, 40, 60, 80, 120, 200])
def test_it_fits_every_terminal(turned: Reading, width: int, height: int) -> None:
    marked = replace(turned, marks=(Mark(number=1, value=value_of(turned)),))
    empty = begin(plan_watch(settle(MeasureOptions(), None), None)).reading
    for reading in (marked, empty, readings([silent(0.5)])[0]):
        rows = text_of(watch_rows(reading, 0.7, Frame(width=width, height=height, keys="q quit")))
        assert 1 <= len(rows) <= height
        assert max(map(len, rows)) <= width


def value_of(reading: Reading) -> Measured:
    assert isinstance(reading.value, Measured)
    return reading.value


def test_eighty_columns_hold_all_of_it(turned: Reading) -> None:
    screen = drawn(turned)
    assert screen.count("######") > 3
    for words in (
        *("period", "Mist valve timer, quick", "average of", "since it moved", "nominal of the"),
        *("goal, limits 24 ms … 25.5 ms", "PASS", "it moved towards the goal: keep turning"),
        *("reading 0.1 s old", "q quit", "| limit", "|===="),
    ):
        assert words in screen


def test_the_smallest_terminal_keeps_the_value(turned: Reading) -> None:
    text = reading_text(turned).split()[0]
    assert text[:6] in drawn(turned, 20, 1)
    assert "####" in drawn(turned, 60, ROWS + 3)  # large as long as there is room for it
    assert "####" not in drawn(turned, 60, ROWS + 2)


def test_a_name_from_outside_does_not_act(turned: Reading) -> None:
    assert turned.source is not None
    source = replace(turned.source, name="a\x1b[31m\x07b")
    assert "\x1b" not in drawn(replace(turned, source=source), 120)


def test_no_hint_says_which_way_a_trimmer_turns() -> None:
    said = " ".join(HINTS.values())
    assert [w for w in ("clockwise", "left", "right") if w in said.split()] == []
    assert "keep turning" in HINTS["towards"]
    assert "turn back" in HINTS["past"]
    assert "turn back" in HINTS["away"]
    assert "less than U" in HINTS["unclear"]


@pytest.mark.parametrize("heading", list(HINTS))
def test_each_heading_has_its_hint_on_the_screen(turned: Reading, heading: Heading) -> None:
    assert HINTS[heading][:40] in drawn(replace(turned, heading=heading), 120)


def test_a_slow_timer_says_when_the_next_reading_is_due(turned: Reading) -> None:
    slow = replace(turned, came_at_s=100.0, every_s=25.0)
    assert age_text(slow, 107.0) == ("reading 7.0 s old, the next is due in 18 s", False)
    assert age_text(slow, 126.0)[0].endswith("due in 0.0 s")
    assert age_text(slow, 145.0) == ("reading 45 s old, the next is overdue by 20 s", True)


def test_a_quick_one_only_when_it_stays_out(turned: Reading) -> None:
    quick = replace(turned, came_at_s=100.0, every_s=0.1)
    assert age_text(quick, 100.3) == ("reading 0.3 s old", False)
    assert age_text(quick, 112.0)[1]


@pytest.mark.parametrize(
    ("seconds", "said"),
    [(0.04, "0.0 s"), (9.94, "9.9 s"), (9.96, "10 s"), (65, "1 min 05 s"), (3720, "1 h 02 min")],
)
def test_durations_are_short(seconds: float, said: str) -> None:
    assert duration_text(seconds) == said


def test_the_distance_is_in_percent_and_in_U(turned: Reading) -> None:
    value = Measured(value=1.02, u=0.005, unit="s")
    plan = replace(turned.plan, goal=Goal(value=1.0, source="--goal"))
    reading = replace(turned, plan=plan, value=value, distance=0.02)
    assert distance_text(reading) == f"+2 %   {0.02 / expanded(value):+.1f} U"
    assert distance_text(replace(reading, plan=replace(plan, goal=None))) == ""


def test_without_limits_the_line_shows_the_goal(turned: Reading) -> None:
    plan = replace(turned.plan, goal=Goal(value=0.025, source="--goal"))
    screen = drawn(replace(turned, plan=plan, check=None, verdict=None))
    assert "| goal   o value" in screen
    assert "limits" not in screen


def test_the_guard_band_is_drawn_where_it_is_wide_enough(turned: Reading) -> None:
    check = turned.check
    assert isinstance(check, Check)
    wide = replace(check, accept_lower=0.0243, accept_upper=0.0252)
    assert re.search(r"\|-+\[=+.*o?.*\]-.*\|", drawn(replace(turned, check=wide)))
    assert not re.search(r"\|-*\[", drawn(turned))  # its U is far below a character


def test_large_figures_are_seven_rows_of_plain_characters() -> None:
    rows = enlarge("24.770 s", 76)
    assert len(rows) == ROWS
    assert set("".join(rows)) == {"#", " "}
    assert max(map(len, rows)) <= 76


def test_digits_differ_from_each_other() -> None:
    drawings = {enlarge(digit, 80) for digit in "0123456789"}
    assert len(drawings) == 10


def test_a_wide_figure_loses_its_large_unit_and_then_its_size() -> None:
    assert enlarge("24.7700 ms", 60)[-1].endswith(" ms")
    assert enlarge("24.7700 ms", 30) == ("24.7700 ms",)
    assert len(enlarge("2.0 s", 120, scale=2)) == 2 * ROWS


def points(*values: float, moved: tuple[int, ...] = ()) -> tuple[Point, ...]:
    return tuple(Point(value=v, moved=i in moved) for i, v in enumerate(values))


def test_the_strip_shows_where_it_moved() -> None:
    strip = draw_strip(
        points(1.0, 1.0, 1.2, 1.3, 1.3, moved=(2, 3)), None, "s", least_span=0, width=40, height=4
    )
    column = strip.rows[0].index("|")
    assert [row[column] for row in strip.rows].count("|") == 3  # the reading itself is the fourth
    assert "".join(strip.rows).count("*") == 2
    assert strip.rows[-1].endswith("oo|")
    assert strip.since == column + 1


def test_a_hand_that_turns_slowly_makes_one_movement() -> None:
    """A bar where it begins, and again after a rest of ten readings."""
    values = [1 + 0.01 * i for i in range(20)]
    moved = (3, 5, 8, 19)
    strip = draw_strip(points(*values, moved=moved), None, "s", least_span=0, width=40, height=3)
    assert [i - 12 for i, char in enumerate(strip.rows[1]) if char == "|"] == [3, 19]


def test_the_strip_shows_the_newest_and_a_goal_that_is_near() -> None:
    many = points(*(1 + 0.001 * (i % 7) for i in range(200)))
    strip = draw_strip(many, 1.005, "s", least_span=0, width=60, height=5)
    assert max(map(len, strip.rows)) <= 60
    assert any("." in row[12:] for row in strip.rows)
    far = draw_strip(many, 2.0, "s", least_span=0, width=60, height=5)
    assert not any("." in row[12:] for row in far.rows)


def test_noise_below_U_does_not_fill_the_strip() -> None:
    strip = draw_strip(points(1.0, 1.001, 0.999), None, "s", least_span=0.1, width=40, height=5)
    assert [bool(row[12:].strip()) for row in strip.rows] == [False, False, True, False, False]


def test_the_tone_is_quicker_nearer_the_goal(turned: Reading) -> None:
    def ring(away: float) -> float | None:
        value = Measured(value=1 + away, u=0.0005, unit="s")
        plan = replace(turned.plan, goal=Goal(value=1.0, source="--goal"))
        return ring_interval(replace(turned, plan=plan, value=value, distance=away))

    rings = [ring(away) for away in (0.3, 0.1, 0.01, 0.002, 0.0)]
    assert rings == sorted(rings, key=lambda s: -(s or 0))
    assert (rings[0], rings[-1]) == (2.0, 0.2)
    assert ring_interval(replace(turned, plan=replace(turned.plan, goal=None))) is None


def test_a_still_board_says_nothing_of_a_movement() -> None:
    reading = readings(records([RB_OHM] * 2, periods=4.5))[-1]
    assert "since it moved" not in drawn(reading)
    assert "last move" not in drawn(reading)
    assert reading.plan.design == quick_design()
