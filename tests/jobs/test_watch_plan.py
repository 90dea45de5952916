"""What a watch is about: quantity, goal, limits."""

from __future__ import annotations

import pytest
from moving_boards import DESIGN, period_s, quick_design

from benchtool.designs import parse_design
from benchtool.errors import UsageError
from benchtool.jobs.watch_plan import plan_watch
from benchtool.model.options import MeasureOptions
from benchtool.observation import settle

SETTINGS = settle(MeasureOptions(), None)
STAGE = DESIGN[DESIGN.index("[stage.spacing]") :]


def test_a_design_gives_goal_and_limits() -> None:
    plan = plan_watch(SETTINGS, quick_design())
    assert plan.quantity == "period"
    assert plan.goal is not None
    assert plan.goal.value == pytest.approx(period_s())
    assert (plan.limits[0].lower, plan.limits[0].upper) == (0.024, 0.0255)


def test_the_goal_that_is_given_wins() -> None:
    plan = plan_watch(SETTINGS, quick_design(), goal=(0.0251, "s"))
    assert plan.goal is not None
    assert (plan.goal.value, plan.goal.source) == (0.0251, "--goal")
    assert plan.limits


@pytest.mark.parametrize(
    ("unit", "quantity"), [("s", "period"), ("Hz", "frequency"), ("1", "duty")]
)
def test_the_unit_of_the_goal_says_what_is_watched(unit: str, quantity: str) -> None:
    assert plan_watch(SETTINGS, None, goal=(0.5, unit)).quantity == quantity


def test_without_goal_and_design_the_period_is_watched() -> None:
    plan = plan_watch(SETTINGS, None)
    assert (plan.quantity, plan.goal, plan.limits) == ("period", None, ())


def test_a_goal_of_another_unit_is_refused() -> None:
    with pytest.raises(UsageError, match="hertz") as caught:
        plan_watch(SETTINGS, None, goal=(40.0, "Hz"), quantity="t_high")
    assert caught.value.code == "goal-unit"


def test_one_trimmer_is_watched_at_a_time() -> None:
    second = STAGE.replace("stage.spacing", "stage.other").replace('"OUT"', '"OUT2"')
    design = parse_design(DESIGN + second, source="two.toml")
    with pytest.raises(UsageError) as caught:
        plan_watch(SETTINGS, design)
    assert caught.value.code == "choose-stage"
    assert "spacing, other" in caught.value.hint
    plan = plan_watch(SETTINGS, design, stage="other")
    assert plan.stage is not None
    assert plan.stage.name == "other"


def test_a_one_shot_is_watched_by_its_pulse() -> None:
    text = DESIGN.replace('"astable"', '"one-shot"').replace('RA = "100k 1%"\n', "")
    text = text.replace("RB =", "R =").replace("period =", "t_high =")
    assert plan_watch(SETTINGS, parse_design(text, source="one.toml")).quantity == "t_high"
    plan = plan_watch(SETTINGS, parse_design(text, source="one.toml"), goal=(0.02, "s"))
    assert plan.quantity == "t_high"
