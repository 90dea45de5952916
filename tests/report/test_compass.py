"""The compass of a diagnosis."""

from __future__ import annotations

import math

import pytest

from benchtool.model.diagnosis import Direction
from benchtool.report.compass import BOARD, draw_compass, place_directions

BOARD_MOVED = Direction(fault=BOARD, dln_high=-0.2, dln_low=-0.2)
FAULTS = (
    BOARD_MOVED,
    Direction(fault="C-low", dln_high=-0.1, dln_low=-0.1),
    Direction(fault="R-all-low", dln_high=-0.3, dln_low=-0.3),
    Direction(fault="RA-high", dln_high=0.1, dln_low=0.0),
)


def test_only_directions_count_and_faults_that_lead_the_same_way_share_a_letter() -> None:
    board, *faults = place_directions(FAULTS, ["C-low", "RA-high", "R-all-low", "healthy"])
    assert (board.x, board.y) == pytest.approx((-0.5 / math.sqrt(2),) * 2)
    assert [(point.letter, point.name) for point in faults] == [
        ("a", "C-low, R-all-low"),
        ("b", "RA-high"),
    ]
    assert (faults[1].x, faults[1].y) == pytest.approx((1, 0))


def test_a_board_that_has_not_moved_has_no_compass() -> None:
    still = Direction(fault=BOARD, dln_high=0.0, dln_low=0.0)
    assert place_directions((still, *FAULTS[1:]), ["C-low"]) == ()
    assert place_directions(FAULTS[1:], ["C-low"]) == ()


def test_right_is_a_longer_high_time_and_up_a_longer_low_time() -> None:
    directions = (
        Direction(fault=BOARD, dln_high=0.1, dln_low=0.0),
        Direction(fault="up", dln_high=0.0, dln_low=0.2),
    )
    rows = draw_compass(place_directions(directions, ["up"]), width=9, height=5)
    assert rows == ("    a", "    |", "----+-o--", "    |", "    |")
