"""Figures of a counter's readings, held against the standard library and scipy."""

from __future__ import annotations

import math
import statistics

import numpy as np
import pytest
from scipy import stats

from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.quantity import Bound, Measured
from benchtool.timing.counted import timing_of_counted
from benchtool.uncertainty import expanded

TIMEBASE_REL, JITTER_REL, TICK_S = 20e-6, 1e-3, 1e-9
RNG = np.random.default_rng(7)
T_HIGH_S = 14.01 * (1 + 2e-4 * RNG.standard_normal(25))
T_LOW_S = 10.75 * (1 + 2e-4 * RNG.standard_normal(30))
PERIOD_S = 24.76 * (1 + 2e-4 * RNG.standard_normal(40))


def counted(tick_s: float = TICK_S, **readings: object) -> Counted:
    """Return readings of a counter; an array stands for single intervals."""
    items: dict[CountedName, Readings] = {
        name: item if isinstance(item, Readings) else Readings(values=np.asarray(item, float))
        for name, item in readings.items()
    }  # type: ignore[misc]  # names of keywords are plain texts
    return Counted(
        source="a counter",
        identity="Invented,Counter,0,1",
        dialect="counter-scpi99",
        channel="1",
        readings=items,
        resolution_s=tick_s,
    )


def figures(item: Counted) -> dict[str, Measured]:
    timing, _ = timing_of_counted(item, TIMEBASE_REL, JITTER_REL)
    names = ("t_high", "t_low", "period", "frequency", "duty")
    found = {name: getattr(timing, name) for name in names}
    return {name: value for name, value in found.items() if isinstance(value, Measured)}


def codes(item: Counted) -> list[str]:
    return [notice.code for notice in timing_of_counted(item, TIMEBASE_REL, JITTER_REL)[0].warnings]


def type_a(values: np.ndarray) -> float:
    return statistics.stdev(values.tolist()) / math.sqrt(values.size)


@pytest.mark.parametrize("name", ["t_high", "t_low", "period"])
@pytest.mark.parametrize("tick_s", [0.0, TICK_S, 1e-3])
def test_a_time_has_the_u_of_an_independent_computation(name: str, tick_s: float) -> None:
    values = {"t_high": T_HIGH_S, "t_low": T_LOW_S, "period": PERIOD_S}[name]
    found = figures(counted(tick_s, **{name: values}))[name]
    mean = statistics.fmean(values.tolist())
    parts = [type_a(values), tick_s / math.sqrt(6), mean * TIMEBASE_REL / math.sqrt(3)]
    assert found.value == pytest.approx(mean, rel=1e-15)  # the last digits of a float
    assert found.u == pytest.approx(math.hypot(*parts), rel=1e-12)  # arithmetic
    # Welch-Satterthwaite with one part of limited freedom, JCGM 100 (G.2b)
    assert found.dof == pytest.approx((found.u / parts[0]) ** 4 * (values.size - 1), rel=1e-9)
    k = stats.t.ppf(0.975, math.floor(found.dof))
    assert expanded(found) == pytest.approx(k * found.u, rel=1e-9)
    assert found.n == values.size


def test_a_frequency_has_its_own_readings_and_the_period_follows() -> None:
    values = 1 / PERIOD_S
    gated = Readings(values=values, per="gate", gate_s=100.0)
    found = figures(counted(1e-3, frequency=gated))
    mean = statistics.fmean(values.tolist())
    parts = [
        type_a(values),
        mean * (1e-3 / 100.0) / math.sqrt(6),  # a gate of 100 s is rounded to 1 ms at both ends
        mean * TIMEBASE_REL / math.sqrt(3),
    ]
    assert found["frequency"].u == pytest.approx(math.hypot(*parts), rel=1e-12)
    assert found["period"].value == pytest.approx(1 / mean, rel=1e-15)
    assert found["period"].u == pytest.approx(found["frequency"].u / mean**2, rel=1e-12)
    assert found.keys() == {"period", "frequency"}


def test_a_long_gate_shares_the_step_among_its_periods() -> None:
    gated = Readings(values=np.full(4, 1e-3), per="gate", gate_s=0.1)
    single = figures(counted(1e-6, period=np.full(4, 1e-3)))["period"]
    averaged = figures(counted(1e-6, period=gated))["period"]
    share = {term.source: term.u for term in single.budget}["resolution"]
    shared = {term.source: term.u for term in averaged.budget}["resolution"]
    assert shared == pytest.approx(share / 100, rel=1e-12)


def test_the_duty_comes_from_the_widths_and_the_timebase_cancels() -> None:
    found = figures(counted(0.0, t_high=T_HIGH_S, t_low=T_LOW_S, duty=np.full(5, 0.9)))
    high, low = (statistics.fmean(x.tolist()) for x in (T_HIGH_S, T_LOW_S))
    whole = high + low
    u = math.hypot(low * type_a(T_HIGH_S), high * type_a(T_LOW_S)) / whole**2
    assert found["duty"].value == pytest.approx(high / whole, rel=1e-14)
    assert found["duty"].u == pytest.approx(u, rel=1e-9)
    assert found["period"].value == pytest.approx(whole, rel=1e-14)
    u = math.hypot(type_a(T_HIGH_S), type_a(T_LOW_S), whole * TIMEBASE_REL / math.sqrt(3))
    assert found["period"].u == pytest.approx(u, rel=1e-12)  # the timebase adds, it is common


@pytest.mark.parametrize("name", ["t_high", "t_low"])
def test_a_width_and_the_period_give_the_other_width_and_the_duty(name: str) -> None:
    values = {"t_high": T_HIGH_S, "t_low": T_LOW_S}[name]
    found = figures(counted(period=PERIOD_S, **{name: values}))
    rest = PERIOD_S.mean() - values.mean()
    assert found["t_high"].value + found["t_low"].value == pytest.approx(PERIOD_S.mean())
    assert found["t_low" if name == "t_high" else "t_high"].value == pytest.approx(rest)
    assert found["duty"].value == pytest.approx(found["t_high"].value / PERIOD_S.mean())
    assert not [term for term in found["duty"].budget if term.source == "timebase" and
                abs(term.u) > 1e-15]  # fmt: skip


def test_a_duty_that_was_read_stands_alone() -> None:
    values = np.array([0.56, 0.57, 0.565])
    found = figures(counted(duty=values))
    assert found.keys() == {"duty"}
    assert found["duty"].u == pytest.approx(type_a(values), rel=1e-12)


def test_one_reading_has_an_assumed_jitter_and_says_so() -> None:
    item = counted(0.0, t_high=[14.0])
    found = figures(item)["t_high"]
    parts = [14.0 * JITTER_REL / math.sqrt(3), 14.0 * TIMEBASE_REL / math.sqrt(3)]
    assert found.u == pytest.approx(math.hypot(*parts), rel=1e-12)
    assert codes(item) == ["single-reading"]


def test_single_periods_give_a_jitter_of_the_period_and_none_of_neighbours() -> None:
    item = counted(period=PERIOD_S)
    _, jitter = timing_of_counted(item)
    assert jitter is not None
    assert isinstance(jitter.period_sd, Measured)
    # the tick of 1 ns is far below the scatter of 5 ms
    assert jitter.period_sd.value == pytest.approx(statistics.stdev(PERIOD_S.tolist()), rel=1e-9)
    assert (jitter.cycle_rms, jitter.cycle_peak, jitter.lag1) == (None, None, None)
    assert codes(item) == ["readings-apart"]


def test_periods_that_follow_each_other_have_a_jitter_of_neighbours() -> None:
    item = counted(0.0, period=Readings(values=PERIOD_S, chains=((0, 20), (20, 40))))
    _, jitter = timing_of_counted(item)
    assert jitter is not None
    steps = np.concatenate([np.diff(PERIOD_S[:20]), np.diff(PERIOD_S[20:])])
    assert isinstance(jitter.cycle_rms, Measured)
    assert jitter.cycle_rms.value == pytest.approx(math.sqrt(np.mean(steps**2)), rel=1e-12)
    assert codes(item) == []


def test_averages_over_a_gate_are_never_called_a_jitter() -> None:
    item = counted(period=Readings(values=PERIOD_S, per="gate", gate_s=1000.0))
    timing, jitter = timing_of_counted(item)
    assert jitter is None
    assert [notice.code for notice in timing.warnings] == ["gate-averaged"]
    assert "1000 s" in timing.warnings[0].text
    unknown = counted(period=Readings(values=PERIOD_S, per="gate"))
    assert "unknown length" in timing_of_counted(unknown)[0].warnings[0].text


def test_widths_alone_have_no_jitter() -> None:
    assert timing_of_counted(counted(t_high=T_HIGH_S, t_low=T_LOW_S))[1] is None
    assert timing_of_counted(counted(period=PERIOD_S[:2]))[1] is None


def test_a_scatter_below_the_resolution_is_a_bound() -> None:
    _, jitter = timing_of_counted(counted(1e-3, period=np.array([0.5, 0.501, 0.5, 0.5])))
    assert jitter is not None
    assert isinstance(jitter.period_sd, Bound)
    assert [notice.code for notice in jitter.warnings] == ["jitter-below-grid"]


def test_widths_that_do_not_add_up_to_the_period_are_told_of_beyond_three_u() -> None:
    flat = {"t_high": np.full(4, 14.0), "t_low": np.full(4, 10.0)}
    # each of the three is uncertain by a step over the root of six, 24 s by no timebase in common
    u_s = math.sqrt(3) * 1e-3 / math.sqrt(6)
    assert "counter-disagrees" in codes(counted(1e-3, **flat, period=np.full(4, 24 + 3.01 * u_s)))
    assert "counter-disagrees" not in codes(
        counted(1e-3, **flat, period=np.full(4, 24 + 2.99 * u_s))
    )
    assert "counter-disagrees" not in codes(counted(0.0, **flat, period=np.full(4, 24.0)))
    assert "counter-disagrees" not in codes(counted(t_high=T_HIGH_S, t_low=T_LOW_S))


def test_u_covers_the_truth_as_often_as_it_says() -> None:
    rng, inside = np.random.default_rng(3), 0
    for _ in range(400):
        values = 10.0 + 0.01 * rng.standard_normal(5)
        timing, _ = timing_of_counted(counted(0.0, t_high=values), 0.0)
        assert isinstance(timing.t_high, Measured)
        inside += abs(timing.t_high.value - 10.0) <= expanded(timing.t_high)
    # 95 % of 400 with four of the binomial's own standard deviations, 0.011
    assert abs(inside / 400 - 0.95) < 0.044


@pytest.mark.parametrize(
    "bad",
    [
        {"values": np.empty(0)},
        {"values": np.array([1.0, math.nan])},
        {"values": np.ones((2, 2))},
        {"values": np.ones(2), "gate_s": 0.0},
    ],
)
def test_readings_that_are_none_cannot_be_made(bad: dict[str, object]) -> None:
    with pytest.raises(ValueError, match=r"reading|gate"):
        Readings(**bad)  # type: ignore[arg-type]  # wrong on purpose


def test_a_counter_without_readings_cannot_be() -> None:
    with pytest.raises(ValueError, match="at least one"):
        counted()
    with pytest.raises(ValueError, match="width"):
        counted(width=[1.0])
    with pytest.raises(ValueError, match="resolution"):
        counted(-1.0, period=[1.0])


def test_a_low_pulse_is_counted_as_the_high_one() -> None:
    turned = counted(t_high=[1.0], t_low=[2.0], duty=[0.25], period=[3.0]).inverted()
    found = {name: item.values.tolist() for name, item in turned.readings.items()}
    assert found == {"t_high": [2.0], "t_low": [1.0], "duty": [0.75], "period": [3.0]}
