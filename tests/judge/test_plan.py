"""The whole plan of a stage: what to record, how long, what it leaves open, where not to probe."""

import math
from dataclasses import replace

import numpy as np
import pytest
from judged_boards import IDEAL, board, limit, part, single

from benchtool.errors import DesignError
from benchtool.judge.plan import means_of, plan_stage
from benchtool.judge.plan_record import count_intervals, describe_run, round_up, span_for
from benchtool.judge.plan_risks import judge_lot
from benchtool.model.design import Design, Ic, Instrument, Probe, Rule, Stage
from benchtool.model.plan import Means, PlannedQuantity, StagePlan

LN2 = math.log(2)
T_HIGH, T_LOW = 430e3 * 47e-6 * LN2, 330e3 * 47e-6 * LN2
PERIOD = T_HIGH + T_LOW


def mist(*limits: object, ic: Ic = IDEAL, **design: object) -> tuple[Stage, Design]:
    return board(ic=ic, limits=limits or (limit("period", 22.0, 28.0),), design=design)


def codes(plan: StagePlan) -> set[str]:
    return {notice.code for notice in plan.warnings}


def row(plan: StagePlan, name: str) -> PlannedQuantity:
    return next(item for item in plan.quantities if item.quantity == name)


@pytest.mark.parametrize("n", [1, 3, 10])
def test_a_recommended_span_holds_its_periods_wherever_it_begins(n: int) -> None:
    """Edges are laid at every phase; whole periods are counted by their rising edges."""
    run = describe_run(*mist(), {"t_high": T_HIGH, "t_low": T_LOW, "period": PERIOD}, [])
    span_s = span_for(run, n)
    for phase in np.linspace(0, 1, 101):
        rises = (np.arange(-2, n + 4) + phase) * PERIOD
        inside = np.count_nonzero((rises >= 0) & (rises <= span_s))
        assert inside - 1 >= n
    counts = count_intervals(run, span_s)
    assert counts.period == n
    assert counts.t_high >= n
    assert counts.t_low >= n


def test_counts_are_the_fewest_over_every_phase() -> None:
    run = describe_run(*mist(), {"t_high": T_HIGH, "t_low": T_LOW, "period": PERIOD}, [])
    for span_s in (10.0, 27.0, 40.0, 55.0, 90.0):
        seen = []
        for phase in np.linspace(0, 1, 1001):
            rise = (np.arange(-2, 8) + phase) * PERIOD
            fall = rise + T_HIGH
            seen.append(
                (
                    np.count_nonzero((rise >= 0) & (fall <= span_s)),
                    np.count_nonzero((fall[:-1] >= 0) & (rise[1:] <= span_s)),
                    np.count_nonzero((rise[:-1] >= 0) & (rise[1:] <= span_s)),
                )
            )
        fewest = np.min(seen, axis=0)
        counts = count_intervals(run, span_s)
        assert (counts.t_high, counts.t_low, counts.period) == tuple(fewest)


def test_the_slowest_board_that_may_pass_sets_the_span() -> None:
    plan = plan_stage(*mist())
    assert plan.n == plan.repetition.n == 1
    assert plan.span_s == pytest.approx(2 * 28.0)


def test_wide_limits_need_one_period_and_say_that_its_scatter_is_assumed() -> None:
    plan = plan_stage(*mist())
    assert plan.repetition.enough
    assert row(plan, "period").room > 4
    assert {"single-interval", "assumed-jitter"} <= codes(plan)


def test_close_limits_take_the_fewest_periods_that_leave_four_to_one() -> None:
    """One fewer would leave less, by the plan's own figures at that span."""
    stage, design = mist(limit("period", PERIOD - 0.05, PERIOD + 0.05))
    means = Means(period_sd_rel=1e-3)
    plan = plan_stage(stage, design, means)
    n = plan.repetition.n
    assert plan.repetition.enough
    assert n > 3
    assert row(plan, "period").room >= 4
    run_s = PERIOD + 0.05
    fewer = plan_stage(stage, design, replace(means, span_s=n * run_s, rate_hz=plan.rate_hz))
    assert fewer.n == n - 1
    assert row(fewer, "period").room < 4
    by_hand = 1e-3 * PERIOD / math.sqrt(n) * 1.96
    expanded_s = row(plan, "period").U
    assert expanded_s > by_hand  # Student's k is larger, and timebase and grid add


def test_limits_out_of_reach_stop_where_u_no_longer_falls_and_name_what_is_left() -> None:
    """A timebase of 1000 ppm alone gives U = 28 ms: 20 ms of half-width can hold no four of it."""
    stage, design = mist(limit("period", PERIOD - 0.02, PERIOD + 0.02))
    plan = plan_stage(stage, design, Means(timebase_rel=1e-3, period_sd_rel=1e-4))
    assert not plan.repetition.enough
    assert plan.repetition.dominant == "timebase"
    least = 1e-3 / math.sqrt(3) * 1.96 * PERIOD
    assert least < row(plan, "period").U < 1.12 * least
    assert "limits-narrower-than-u" in codes(plan)


def test_room_below_four_that_is_still_room_is_told() -> None:
    stage, design = mist(limit("period", PERIOD - 0.06, PERIOD + 0.06))
    plan = plan_stage(stage, design, Means(timebase_rel=1e-3, period_sd_rel=1e-4))
    assert 1 < row(plan, "period").room < 4
    assert "little-room" in codes(plan)
    assert "limits-narrower-than-u" not in codes(plan)


def test_the_shares_shown_are_those_of_the_boards_and_the_u_shown() -> None:
    stage, design = mist(limit("period", 23.0, 26.0))
    plan = plan_stage(stage, design, Means(timebase_rel=5e-3))
    item = row(plan, "period")
    rng = np.random.default_rng(17)
    true = (rng.uniform(99e3, 101e3, 400_000) + 2 * rng.uniform(326.7e3, 333.3e3, 400_000)) * (
        rng.uniform(42.3e-6, 51.7e-6, 400_000) * LN2
    )
    seen = true + item.expected.u * rng.standard_normal(true.size)
    good = (true >= 23.0) & (true <= 26.0)
    passed = (seen >= 23.0 + item.w) & (seen <= 26.0 - item.w)
    failed = (seen < 23.0 - item.w) | (seen > 26.0 + item.w)
    # 0.012: five standard errors of a share from the plan's 50,000 boards
    assert item.risks.good_not_accepted == pytest.approx(1 - passed[good].mean(), abs=0.012)
    assert item.risks.bad_accepted == pytest.approx(passed[~good].mean(), abs=0.012)
    assert item.risks.undecided == pytest.approx(1 - passed.mean() - failed.mean(), abs=0.012)
    assert plan.board.passing == pytest.approx(passed.mean(), abs=0.012)
    assert 0.005 < item.risks.undecided < 0.5


def test_without_a_guard_band_nothing_is_undecided() -> None:
    stage, design = mist(limit("period", 23.0, 26.0), rule=Rule(name="simple"))
    plan = plan_stage(stage, design, Means(timebase_rel=5e-3))
    assert row(plan, "period").w == 0.0
    assert row(plan, "period").risks.undecided == 0.0
    assert row(plan, "period").risks.bad_accepted > 0


def test_time_that_is_too_short_is_said_and_taken_whole() -> None:
    stage, design = mist()
    short = plan_stage(stage, design, Means(time_per_board_s=20.0))
    assert short.span_s == 20.0
    assert short.n_in_time == 0
    assert {"time-too-short", "no-interval-sure"} <= codes(short)
    assert row(short, "period").expected is None
    assert short.board.undecided == 1.0
    long = plan_stage(stage, design, Means(time_per_board_s=60.0))
    assert "time-too-short" not in codes(long)
    assert long.span_s == pytest.approx(56.0)


def test_a_high_time_may_be_whole_where_no_period_is() -> None:
    """45 s hold a whole high and a whole low time at every phase, and no whole period."""
    stage, design = mist(limit("period", 22.0, 25.0), limit("t_high", 12.0, 16.0))
    plan = plan_stage(stage, design, Means(span_s=45.0))
    assert row(plan, "period").n == 0
    assert row(plan, "t_high").n == 1


def test_many_periods_are_taken_where_they_cost_nothing() -> None:
    parts = {"RA": part("RA", 10e3), "RB": part("RB", 33e3), "C": part("C", 10e-9, 0.05)}
    stage, design = board(parts, limits=(limit("period", 0.4e-3, 0.7e-3),))
    plan = plan_stage(stage, design)
    assert plan.n == 100
    assert "single-interval" not in codes(plan)


def test_the_recommended_rate_keeps_the_grid_behind_everything_else() -> None:
    for limits in ((22.0, 28.0), (PERIOD - 0.03, PERIOD + 0.03)):
        plan = plan_stage(*mist(limit("period", *limits)))
        budget = {term.source: abs(term.u) for term in row(plan, "period").expected.budget}
        assert budget.get("grid", 0.0) < 0.5 * row(plan, "period").expected.u
        assert plan.rate_hz * T_LOW >= 50
        assert plan.rate_hz in {float(f"{a}e{b}") for a in (1, 2, 5) for b in range(7)}


def test_numbers_round_up_to_the_row_1_2_5() -> None:
    for value, up in ((1.0, 1.0), (1.01, 2.0), (4.9e3, 5e3), (0.051, 0.1), (7e6, 1e7)):
        assert round_up(value) == pytest.approx(up)


def test_a_rate_that_measuring_would_refuse_is_told() -> None:
    assert "rate-too-low" in codes(plan_stage(*mist(), Means(rate_hz=0.1)))
    assert "rate-too-low" not in codes(plan_stage(*mist(), Means(rate_hz=1.0)))


def test_noise_and_slow_edges_that_spoil_the_edges_are_told() -> None:
    loud = plan_stage(*mist(), Means(noise_v=2.0, bandwidth_hz=0.1))
    assert {"noise-hides-edges", "slow-edges"} <= codes(loud)
    quiet = plan_stage(*mist(), Means(noise_v=0.2, bandwidth_hz=100.0))
    assert not {"noise-hides-edges", "slow-edges"} & codes(quiet)


@pytest.mark.parametrize(("r_ohm", "stops"), [(10e6, False), (1e6, False), (500e3, True)])
def test_a_probe_at_the_capacitor_shifts_as_a_divider_does(r_ohm: float, stops: bool) -> None:
    """By hand: probe and resistors divide the supply, and their parallel sets the time constant."""
    plan = plan_stage(*mist(), Means(probe=Probe(r_ohm=r_ohm, c_f=0.0)))
    assert plan.probe.stops is stops
    if stops:
        assert r_ohm / (r_ohm + 430e3) < 2 / 3
        return
    settle = r_ohm / (r_ohm + 430e3)
    loaded = 1 / (1 / 430e3 + 1 / r_ohm) * 47e-6 * math.log((settle - 1 / 3) / (settle - 2 / 3))
    assert plan.probe.shifts["t_high"] == pytest.approx(loaded / T_HIGH - 1, rel=1e-9)
    assert plan.probe.shifts["t_low"] == pytest.approx(r_ohm / (r_ohm + 330e3) - 1, rel=1e-9)


def test_the_usual_probe_is_thought_of_where_none_is_stated() -> None:
    plan = plan_stage(*mist())
    assert (plan.probe.probe.r_ohm, plan.probe.probe.c_f) == (10e6, 12e-12)
    # first order in design terms: +1.164·(RA+RB)/Rp and -RB/Rp, good to a tenth here
    assert plan.probe.shifts["t_high"] == pytest.approx(1.164 * 430e3 / 10e6, rel=0.1)
    assert plan.probe.shifts["t_low"] == pytest.approx(-330e3 / 10e6, rel=0.1)


def test_a_one_shot_is_planned_by_pulses_and_a_power_on_by_delays() -> None:
    parts = single(part("R", 68e3, 0.01), part("C", 47e-6, 0.1))
    stage, design = board(parts, topology="one-shot", limits=(limit("t_high", 3.0, 4.2),))
    pulse = plan_stage(stage, design)
    assert pulse.unit == "pulse"
    assert row(pulse, "t_high").n == 1
    stage, design = board(parts, topology="power-on", limits=(limit("delay", 3.0, 4.2),))
    delay = plan_stage(stage, design)
    assert delay.unit == "delay"
    assert row(delay, "delay").n == 1


def test_a_first_high_rests_on_one_interval_however_long_the_record() -> None:
    stage, design = mist(limit("first_high", 20.0, 25.0))
    plan = plan_stage(stage, design, Means(span_s=600.0))
    assert row(plan, "first_high").n == 1


def test_a_product_of_parts_is_as_unsure_as_the_thresholds_make_it() -> None:
    """t_high goes with 2.164 times the upper threshold: 0.6 % of it are 1.3 % of the product."""
    stage, design = mist(limit("tau_charge", 18.0, 23.0), ic=Ic(family="cmos"))
    plan = plan_stage(stage, design, Means(span_s=600.0))
    item = row(plan, "tau_charge")
    assert item.expected.value == pytest.approx(430e3 * 47e-6)
    assert 0.01 < item.expected.u / item.expected.value < 0.025
    assert not plan.repetition.enough or item.room >= 4
    assert plan.repetition.dominant == "thresholds and IC"


def test_a_jitter_above_the_assumed_one_counts_and_is_told() -> None:
    means = Means(jitter_rel=1e-3, period_sd_rel=5e-3, rate_hz=1e3)
    plan = plan_stage(*mist(), means)
    assert row(plan, "period").n == 1
    assert row(plan, "period").expected.u == pytest.approx(5e-3 * PERIOD, rel=1e-3)
    assert "jitter-above-assumed" in codes(plan)
    calm = plan_stage(*mist(), replace(means, period_sd_rel=1e-4))
    assert row(calm, "period").expected.u == pytest.approx(1e-3 / math.sqrt(3) * PERIOD, rel=0.01)
    assert "jitter-above-assumed" not in codes(calm)


def test_limits_on_jitter_are_left_to_a_capture() -> None:
    jitter = limit("jitter_period", None, 0.002, unit="1", relative=True)
    plan = plan_stage(*mist(limit("period", 22.0, 28.0), jitter))
    assert "jitter-not-planned" in codes(plan)
    assert [item.quantity for item in plan.quantities] == ["period"]


def test_without_limits_the_figures_stand_alone() -> None:
    stage, design = board()
    plan = plan_stage(stage, design)
    assert {item.quantity for item in plan.quantities} == {"t_high", "t_low", "period", "duty"}
    assert plan.board is None
    assert all(item.risks is None for item in plan.quantities)


def test_a_divided_output_is_planned_by_its_own_period() -> None:
    stage, design = board(limits=(limit("period", 90.0, 110.0),), divide=4)
    plan = plan_stage(stage, design)
    assert plan.unit_s == pytest.approx(4 * PERIOD)
    assert row(plan, "period").n == 1


def test_a_circuit_that_stands_still_has_nothing_to_plan() -> None:
    stage, design = board(leak_ohm=100e3)
    with pytest.raises(DesignError, match="never switches"):
        plan_stage(stage, design)


def test_what_the_design_says_of_the_instrument_counts_and_the_user_wins() -> None:
    stage, design = mist(instrument=Instrument(timebase_rel=2e-3, jitter_rel=1e-6))
    stated = plan_stage(stage, design)
    timebase = 2e-3 * PERIOD / math.sqrt(3)
    # 6 %: the rate leaves the grid a third of it
    assert row(stated, "period").expected.u == pytest.approx(timebase, rel=0.06)
    better = replace(means_of(design), timebase_rel=1e-6)
    assert row(plan_stage(stage, design, better), "period").U < 0.5 * row(stated, "period").U


def test_a_lot_with_open_limits_is_judged_on_the_side_it_has() -> None:
    true = np.linspace(9.0, 11.0, 2001)
    found = judge_lot(true, 1e-9, 0.0, None, 10.0)
    assert found.passing == pytest.approx(0.5, abs=0.001)
