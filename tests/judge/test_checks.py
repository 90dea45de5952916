"""Checks: values, bounds, dead boards, relative limits and what their reasons say."""

import math

import numpy as np
import pytest
from scipy import stats

from benchtool.judge.checks import judge_stage
from benchtool.judge.settling import periods_to_settle
from benchtool.judge.verdict import worst
from benchtool.model.decision import StageLimit
from benchtool.model.design import Part, Rule, Stage
from benchtool.model.judgement import Check, Solution
from benchtool.model.quantity import Bound, Contribution, Measured
from benchtool.model.timing import CutInterval, Intervals, Jitter, Timing


def _stage(topology: str = "astable") -> Stage:
    refs = {"RA": 100e3, "RB": 330e3} if topology.startswith("astable") else {"R": 330e3}
    parts = {ref: Part(ref=ref, value=value) for ref, value in {**refs, "C": 47e-6}.items()}
    return Stage(name="spacing", topology=topology, parts=parts)


def _limit(
    quantity: str = "t_high", lower: float | None = 12.0, upper: float | None = 16.0, **more
):
    given = {"unit": "s", "nominal": 14.0, "source": "drawing GH-MV-07 sheet 4"} | more
    return StageLimit(quantity=quantity, lower=lower, upper=upper, **given)


def _seconds(value: float, u: float = 0.01, **more: object) -> Measured:
    return Measured(value=value, u=u, unit="s", **more)


def _cut(kind: str, at_least_s: float, where: str = "end") -> Intervals:
    none = np.empty(0)
    return Intervals(
        high_s=none,
        low_s=none,
        period_s=none,
        high_starts_s=none,
        low_starts_s=none,
        period_starts_s=none,
        cycle_high_s=none,
        cycle_low_s=none,
        chains=(),
        active="high",
        other_period_s=none,
        cut=(CutInterval(kind=kind, at_least_s=at_least_s, where=where),),
    )


def _judge_one(limit: StageLimit, topology: str = "astable", **seen: object) -> Check:
    (check,) = judge_stage(_stage(topology), [limit], **({"timing": None} | seen))
    return check


def _high(value: float, u: float = 0.01, **more: object) -> Check:
    return _judge_one(_limit(), timing=Timing(t_high=_seconds(value, u, **more)))


def test_a_value_inside_both_accept_limits_passes() -> None:
    check = _high(14.0)
    assert check.verdict == "pass"
    assert check.accept_lower == pytest.approx(12 + 1.959964 * 0.01, abs=1e-7)
    assert check.accept_upper == pytest.approx(16 - 1.959964 * 0.01, abs=1e-7)
    assert check.p_conform == pytest.approx(1.0, abs=1e-12)
    assert (check.source, check.nominal) == ("drawing GH-MV-07 sheet 4", 14.0)


def test_a_fail_names_its_limit_the_distance_in_percent_and_in_u() -> None:
    check = _high(16.8)
    assert check.verdict == "fail"
    assert "high time, 16.800 s ± 0.020 s, is above its upper limit of 16 s" in check.reason
    assert "5 % of the limit" in check.reason
    assert "40.8 times its U" in check.reason


def test_undecided_says_how_many_more_periods_would_settle_it() -> None:
    scatter = Contribution(source="scatter", u=0.03, dof=24)
    timebase = Contribution(source="timebase", u=0.001, common=True)
    u = math.hypot(0.03, 0.001)
    check = _high(15.97, u, dof=24, n=25, budget=(scatter, timebase))
    assert check.verdict == "undecided"
    more = periods_to_settle(check.measured, 0.03, Rule())
    assert f"about {more} more periods would settle it" in check.reason


def test_undecided_says_when_no_number_of_periods_would_settle_it() -> None:
    timebase = Contribution(source="timebase", u=0.03, common=True)
    scatter = Contribution(source="scatter", u=0.001, dof=24)
    check = _high(15.97, math.hypot(0.03, 0.001), n=25, budget=(timebase, scatter))
    assert check.verdict == "undecided"
    assert "more periods would not settle it" in check.reason
    assert "the largest part of the uncertainty is: timebase" in check.reason


def test_what_happens_once_a_power_up_is_settled_by_more_of_them() -> None:
    jitter = Contribution(source="assumed jitter", u=0.02)
    first = _seconds(15.98, 0.02, budget=(jitter,))
    check = _judge_one(_limit("first_high"), timing=Timing(first_high=first))
    assert "about 3 more power-ups would settle it" in check.reason


def test_a_large_u_alone_is_undecided_and_warns() -> None:
    check = _high(14.0, 5.0)
    assert check.verdict == "undecided"
    assert (check.accept_lower, check.accept_upper) == (None, None)
    assert [notice.code for notice in check.warnings] == ["limits-narrower-than-u"]
    assert "No high time could pass" in check.reason


def test_the_simple_rule_states_the_shared_risk() -> None:
    (check,) = judge_stage(
        _stage(),
        [_limit()],
        timing=Timing(t_high=_seconds(15.995)),
        rule=Rule(name="simple"),
    )
    assert check.verdict == "pass"
    assert (check.accept_lower, check.accept_upper) == (12.0, 16.0)
    assert "the chance that the true value lies inside is 69.1 %" in check.reason


@pytest.mark.parametrize(
    ("value", "verdict"), [(15.99, "conditional-pass"), (16.01, "conditional-fail")]
)
def test_the_nonbinary_rule_has_conditional_verdicts(value: float, verdict: str) -> None:
    (check,) = judge_stage(
        _stage(),
        [_limit()],
        timing=Timing(t_high=_seconds(value)),
        rule=Rule(name="nonbinary"),
    )
    assert check.verdict == verdict


def test_no_uncertainty_is_judged_on_the_value_alone() -> None:
    assert _high(16.0, 0.0).verdict == "pass"
    outside = _high(16.001, 0.0)
    assert outside.verdict == "fail"
    assert "times its U" not in outside.reason


def test_a_limit_of_zero_has_no_percent() -> None:
    check = _judge_one(
        _limit("tau_charge", 0.0, None),
        timing=None,
        solution=Solution(topology="astable", tau_charge=_seconds(-1.0)),
    )
    assert check.verdict == "fail"
    assert "%" not in check.reason


@pytest.mark.parametrize(
    ("at_least", "verdict"), [(15.9, "undecided"), (16.0004, "undecided"), (16.002, "fail")]
)
def test_a_lower_bound_fails_beyond_the_limit_and_its_guard_band(
    at_least: float, verdict: str
) -> None:
    """The timebase's U of 57 ppm is 0.0009 s here."""
    bound = Bound(unit="s", at_least=at_least)
    check = _judge_one(_limit(), timing=Timing(t_high=bound))
    assert check.verdict == verdict
    assert check.measured == bound
    assert check.p_conform is None


def test_an_undecided_bound_says_what_record_would_settle_it() -> None:
    check = _judge_one(_limit(), timing=Timing(t_high=Bound(unit="s", at_least=3.0)))
    assert "at least 3 s; a record longer than 16 s would settle it" in check.reason


def test_a_lower_bound_passes_a_limit_without_an_upper_side() -> None:
    limit = _limit(upper=None)
    assert _judge_one(limit, timing=Timing(t_high=Bound(unit="s", at_least=12.5))).verdict == "pass"


def test_the_frequency_of_a_dead_board_fails_on_its_upper_bound() -> None:
    limit = _limit("frequency", 0.038, 0.042, unit="Hz")
    dead = Timing(frequency=Bound(unit="Hz", at_most=0.02))
    assert _judge_one(limit, timing=dead).verdict == "fail"
    slow = Timing(frequency=Bound(unit="Hz", at_most=0.04))
    assert _judge_one(limit, timing=slow).verdict == "undecided"


def test_cut_intervals_stand_in_where_timing_has_nothing() -> None:
    limits = [_limit(), _limit("t_low"), _limit("frequency", 0.038, 0.042, unit="Hz")]
    checks = judge_stage(_stage(), limits, timing=None, intervals=_cut("high", 40.0, "both"))
    assert [check.verdict for check in checks] == ["fail", "unusable", "fail"]
    assert checks[0].measured == Bound(unit="s", at_least=40.0)
    assert checks[2].measured == Bound(unit="Hz", at_most=1 / 40.0)
    assert worst(check.verdict for check in checks) == "fail"


def test_an_oscillator_that_stops_at_the_end_fails_though_its_mean_is_good() -> None:
    check = _judge_one(_limit(), timing=Timing(t_high=_seconds(14.0)), intervals=_cut("high", 60.0))
    assert check.verdict == "fail"
    assert "stood still for 60 s at the end of the record" in check.reason
    assert check.measured == _seconds(14.0)


@pytest.mark.parametrize(("length", "verdict"), [(16.0005, "pass"), (16.002, "fail")])
def test_standing_still_counts_beyond_the_limit_and_the_timebase(
    length: float, verdict: str
) -> None:
    seen = Timing(t_high=_seconds(14.0))
    assert _judge_one(_limit(), timing=seen, intervals=_cut("high", length)).verdict == verdict


@pytest.mark.parametrize(("length", "where"), [(15.0, "end"), (60.0, "start")])
def test_a_cut_interval_that_may_be_healthy_changes_nothing(length: float, where: str) -> None:
    """The first high after power-up is 1.585 times as long and may be cut by the start."""
    check = _judge_one(
        _limit(), timing=Timing(t_high=_seconds(14.0)), intervals=_cut("high", length, where)
    )
    assert check.verdict == "pass"


def test_a_one_shot_may_rest_low_for_ever() -> None:
    check = _judge_one(
        _limit(), "one-shot", timing=Timing(t_high=_seconds(14.0)), intervals=_cut("low", 600.0)
    )
    assert check.verdict == "pass"


HIGH_LOW_PERIOD = (_limit(), _limit("t_low", 9.0, 12.0), _limit("period", 22.0, 28.0))


def _flat(length: float, state: str | None, limits=HIGH_LOW_PERIOD, topology="astable"):
    checks = judge_stage(
        _stage(topology), limits, timing=None, longest_flat_s=length, flat_state=state
    )
    return [check.verdict for check in checks]


def test_a_flat_record_longer_than_the_limits_is_a_fail() -> None:
    assert _flat(30.0, "high") == ["fail", "fail", "fail"]
    assert _flat(30.0, "low") == ["fail", "fail", "fail"]


def test_a_flat_high_record_of_a_good_length_fails_nothing() -> None:
    """13 s high is longer than a low time may be, and says nothing of the low time."""
    assert _flat(13.0, "high") == ["undecided", "unusable", "undecided"]


def test_a_record_flat_between_the_states_is_unusable_however_long() -> None:
    assert _flat(300.0, None) == ["unusable", "unusable", "unusable"]
    (check,) = judge_stage(
        _stage(),
        [_limit()],
        timing=Timing(t_high=Bound(unit="s", at_least=300.0)),
        intervals=_cut("high", 300.0, "both"),
        longest_flat_s=300.0,
    )
    assert check.verdict == "unusable"
    assert "neither of the two states" in check.reason


def test_a_flat_low_record_fails_the_high_time_once_it_outlasts_the_low_time() -> None:
    assert _flat(13.0, "low") == ["fail", "fail", "undecided"]


def test_without_a_limit_on_the_state_seen_the_period_decides() -> None:
    assert _flat(30.0, "low", (_limit(), _limit("period", 22.0, 28.0))) == ["fail", "fail"]
    assert _flat(30.0, "low", (_limit(),)) == ["unusable"]


def test_a_flat_one_shot_fails_only_where_it_is_stuck_active() -> None:
    assert _flat(600.0, "low", (_limit(),), "one-shot") == ["unusable"]
    assert _flat(600.0, "high", (_limit(),), "one-shot") == ["fail"]


def test_nothing_at_all_is_unusable() -> None:
    check = _judge_one(_limit("duty", 0.5, 0.6, unit="1"))
    assert check.verdict == "unusable"
    assert check.measured is None
    assert check.reason == "The record holds nothing about the duty."


def test_a_quantity_that_a_sound_record_does_not_show_says_what_would() -> None:
    steady = Timing(t_high=_seconds(14.0), t_low=_seconds(10.6))
    check = _judge_one(_limit("first_high"), timing=steady)
    assert check.verdict == "unusable"
    assert "a longer one, or one that shows it, would settle it" in check.reason


def _jitter(value: float, dof: float = 24) -> Jitter:
    return Jitter(period_sd=_seconds(value, value / math.sqrt(2 * dof), dof=dof, n=25))


def test_a_jitter_limit_in_percent_is_of_the_measured_mean_period() -> None:
    limit = _limit("jitter_period", None, 0.002, unit="1", relative=True, nominal=None)
    timing = Timing(period=_seconds(25.0))
    check = _judge_one(limit, timing=timing, jitter=_jitter(0.01))
    assert (check.upper, check.unit) == (pytest.approx(0.05), "s")
    assert check.verdict == "pass"
    assert "0.2 % of the measured mean period" in check.source
    assert _judge_one(limit, timing=timing, jitter=_jitter(0.1)).verdict == "fail"


def test_a_jitter_share_without_a_period_is_unusable() -> None:
    limit = _limit("jitter_period", None, 0.002, unit="1", relative=True)
    one_high = Timing(t_high=_seconds(14.0), period=Bound(unit="s", at_least=20.0))
    check = _judge_one(limit, timing=one_high, jitter=_jitter(0.01))
    assert check.verdict == "unusable"
    assert check.measured is None


def test_jitter_conforms_by_chi_square() -> None:
    check = _judge_one(_limit("jitter_period", None, 0.012), jitter=_jitter(0.01))
    expected = stats.chi2.sf(24 * (0.01 / 0.012) ** 2, 24)
    assert check.p_conform == pytest.approx(expected, abs=1e-12)


def test_jitter_below_the_grid_is_judged_on_its_bound() -> None:
    below = Jitter(cycle_rms=Bound(unit="s", at_most=1e-4))
    assert _judge_one(_limit("jitter_cycle", None, 2e-4), jitter=below).verdict == "pass"
    assert _judge_one(_limit("jitter_cycle", None, 0.5e-4), jitter=below).verdict == "undecided"
    assert _judge_one(_limit("jitter_cycle", 3e-4, None), jitter=below).verdict == "fail"


def test_products_come_from_the_solution() -> None:
    limits = [_limit("tau_charge", 18.0, 22.0), _limit("tau_discharge", 14.0, 17.0)]
    solution = Solution(topology="astable", tau_charge=_seconds(20.2), tau_discharge=_seconds(18.0))
    checks = judge_stage(_stage(), limits, timing=None, solution=solution)
    assert [check.verdict for check in checks] == ["pass", "fail"]


def test_a_quantity_without_any_limit_is_undecided() -> None:
    check = _judge_one(_limit(lower=None, upper=None), timing=Timing(t_high=_seconds(14.0)))
    assert check.verdict == "undecided"
    assert check.measured == _seconds(14.0)


def _halted(*, at_end: float) -> Intervals:
    empty = np.empty(0)
    high, low = np.full(5, 14.0), np.full(5, 10.7)
    return Intervals(
        high_s=high,
        low_s=low,
        period_s=high + low,
        high_starts_s=empty,
        low_starts_s=empty,
        period_starts_s=empty,
        cycle_high_s=high,
        cycle_low_s=low,
        chains=((0, 5),),
        active="high",
        other_period_s=empty,
        cut=(CutInterval(kind="high", at_least_s=at_end, where="end"),),
    )


@pytest.mark.parametrize(("at_end", "verdict"), [(60.0, "fail"), (22.2, "pass")])
def test_an_output_that_stops_fails_whatever_is_limited(at_end: float, verdict: str) -> None:
    limit = _limit("duty", 0.5, 0.6, unit="1")
    timing = Timing(duty=Measured(value=0.566, u=1e-4, unit="1"))
    check = _judge_one(limit, timing=timing, intervals=_halted(at_end=at_end))
    assert check.verdict == verdict
    if verdict == "fail":
        assert "far longer than any part of its cycle" in check.reason


def test_a_dead_output_never_passes_a_lower_limit() -> None:
    limit = _limit("period", 22.0, None, nominal=24.7)
    (check,) = judge_stage(_stage(), [limit], timing=None, longest_flat_s=100.0, flat_state="high")
    assert check.verdict == "fail"
