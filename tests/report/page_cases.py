"""Analyses made by hand for the page: the misting controller, invented."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.model.capture import StructurePoint
from benchtool.model.design import Band, Design, Instrument, Part, Probe, Rule, Stage
from benchtool.model.judgement import Check, PartEstimate, Solution
from benchtool.model.overview import Overview
from benchtool.model.quantity import Bound, Contribution, Measured, Notice
from benchtool.model.result import (
    Analysis,
    Finding,
    Gap,
    IntervalCounts,
    Source,
    StageResult,
    TraceFacts,
)
from benchtool.model.timing import Dropped, Jitter, Levels, Timing

MADE_AT = "2031-03-02T03:12:00Z"
VERSIONS = {"python": "3.12.1", "numpy": "2.1.0"}
COMMAND = "benchtool judge mist-0412.csv --design mist.toml --report mist-0412.html"
STAMP = {"version": "0.1.0", "versions": VERSIONS, "made_at": MADE_AT, "command_line": COMMAND}


def seconds(value: float, u: float, n: int = 12) -> Measured:
    budget = (Contribution(source="scatter", u=u),)
    return Measured(value=value, u=u, unit="s", dof=11, n=n, budget=budget)


def stage() -> Stage:
    parts = (
        Part(ref="RA", value=100e3, lower_rel=-0.01, upper_rel=0.01),
        Part(ref="RB", value=330e3, lower_rel=-0.01, upper_rel=0.01),
        Part(ref="C", value=47e-6, lower_rel=-0.2, upper_rel=0.5, kind="electrolytic"),
    )
    return Stage(name="spacing", topology="astable", parts={part.ref: part for part in parts})


def design() -> Design:
    return Design(
        name="Mist valve timer",
        assembly="GH-MV-07",
        revision="C",
        supply=Band(nominal=12, lower=11.4, upper=12.6),
        temperature=Band(nominal=25, lower=10, upper=40),
        stages=(stage(),),
        rule=Rule(),
        instrument=Instrument(timebase_rel=50e-6),
        probe=Probe(r_ohm=10e6, c_f=12e-12),
        source="mist.toml",
        sha256="7d" * 32,
    )


def source(name: str = "mist-0412.csv") -> Source:
    return Source(
        role="main",
        name=name,
        sha256="3f9a" * 16,
        format="text",
        structure=(
            StructurePoint(name="delimiter", value=",", evidence="in every line"),
            StructurePoint(name="time_unit", value="s", evidence="header 'Time (s)'"),
        ),
        start_ns=1_930_187_520_250_000_000,
    )


def levels() -> Levels:
    return Levels(
        kind="two-state",
        low_v=0.021,
        high_v=11.97,
        u_low_v=0.002,
        u_high_v=0.002,
        noise_v=0.012,
        lower_v=4.8,
        mid_v=6.0,
        upper_v=7.2,
    )


def timing() -> Timing:
    return Timing(
        t_high=seconds(14.0102, 0.0014),
        t_low=seconds(10.7531, 0.0011),
        period=seconds(24.7633, 0.0021),
        frequency=Measured(value=0.0403823, u=3.4e-6, unit="Hz", dof=11, n=12),
        duty=Measured(value=0.56577, u=3.1e-5, unit="1", dof=11, n=12),
        first_high=Measured(value=22.2031, u=0.0128, unit="s"),
    )


def jitter() -> Jitter:
    return Jitter(
        period_sd=Measured(value=0.0071, u=0.0015, unit="s", dof=11, n=12),
        period_pp=Measured(value=0.0241, u=0.0040, unit="s", dof=11, n=12),
        grid_share=Bound(unit="s", at_most=2.0e-3),
    )


def check(name: str, measured: Measured, limits: tuple[float, float], **given: object) -> Check:
    w = 2.2 * measured.u
    values: dict[str, object] = {
        "quantity": name,
        "measured": measured,
        "lower": limits[0],
        "upper": limits[1],
        "unit": measured.unit,
        "accept_lower": limits[0] + w,
        "accept_upper": limits[1] - w,
        "source": "derived: worst case",
        "p_conform": 0.99999,
        "verdict": "pass",
        "reason": f"The {name} is inside its limits.",
    }
    return Check(**{**values, **given})  # type: ignore[arg-type]


LOW_REASON = (
    "The low time, 10.7531 s ± 0.0024 s, is above its upper limit of 10.7 s by 0.496 % of the "
    "limit, 22 times its U."
)


def checks() -> tuple[Check, ...]:
    times = timing()
    assert isinstance(times.t_high, Measured)
    assert isinstance(times.t_low, Measured)
    assert isinstance(times.period, Measured)
    assert isinstance(times.duty, Measured)
    spread = jitter().period_sd
    assert isinstance(spread, Measured)
    return (
        check("t_high", times.t_high, (11.1, 22.9)),
        check(
            "t_low",
            times.t_low,
            (8.5, 10.7),
            verdict="fail",
            p_conform=1e-9,
            reason=LOW_REASON,
        ),
        check("period", times.period, (22.0, 28.0), source="drawing GH-MV-07 sheet 4"),
        check("duty", times.duty, (0.552, 0.578)),
        check(
            "jitter_period",
            spread,
            (0.0, 0.0495),
            lower=None,
            accept_lower=None,
            source="0.2 % of the measured mean period",
        ),
    )


def solution() -> Solution:
    return Solution(
        topology="astable",
        tau_charge=seconds(20.21, 0.13),
        tau_discharge=seconds(15.51, 0.10),
        tau_RA=seconds(4.70, 0.09),
        tau_ratio=Measured(value=1.303, u=0.008, unit="1"),
        parts=(
            PartEstimate(
                ref="C",
                nominal=47e-6,
                estimate=Measured(value=47.0e-6, u=0.4e-6, unit="F"),
                change=Measured(value=0.0002, u=0.008, unit="1"),
                assumes=("RA as marked", "RB as marked"),
                within_tolerance=True,
            ),
            PartEstimate(
                ref="RB",
                nominal=330e3,
                estimate=Measured(value=339.1e3, u=2.4e3, unit="ohm"),
                change=Measured(value=0.0276, u=0.007, unit="1"),
                assumes=("C as marked",),
                within_tolerance=False,
            ),
        ),
    )


def overview(n_periods: int = 12) -> Overview:
    envelope_s = np.linspace(0, 60, 1800)
    phase_s = np.mod(envelope_s + 3, 24.76)
    wave_v = np.where(phase_s < 14.01, 11.97, 0.02)
    noise_v = 0.03 * np.abs(np.sin(np.arange(envelope_s.size) * 2.4))
    starts_s = np.arange(n_periods) * 24.76
    periods_s = 24.7633 + 0.007 * np.sin(np.arange(n_periods) * 2.4)
    count, limits_s = np.histogram(periods_s, bins=min(9, n_periods))
    return Overview(
        envelope_s=envelope_s,
        envelope_low_v=wave_v - noise_v,
        envelope_high_v=wave_v + noise_v,
        edges_s=np.array([11.01, 21.76, 35.77, 46.52]),
        histogram_s=limits_s,
        histogram_count=count.astype(np.float64),
        periods_at_s=starts_s,
        periods_s=periods_s,
    )


def trace(channel: str = "OUT") -> TraceFacts:
    return TraceFacts(
        channel=channel,
        role="output",
        kind="waveform",
        samples=62_000,
        sample_interval_s=0.005,
        tick_s=None,
        start_s=0.0,
        duration_s=310.0,
    )


def judged(**given: object) -> StageResult:
    values: dict[str, object] = {
        "source": 0,
        "stage": "spacing",
        "trace": trace(),
        "levels": levels(),
        "intervals": IntervalCounts(
            high=12, low=12, period=12, dropped=(Dropped(reason="cut at start", count=1),)
        ),
        "timing": timing(),
        "jitter": jitter(),
        "solution": solution(),
        "checks": checks(),
        "verdict": "fail",
        "likely": "The likeliest part is RB: 2.8 % high would explain both times.",
        "warnings": (
            Notice(code="assumed-channel", text="the design names none; OUT was measured"),
        ),
        "overview": overview(),
        "design": stage(),
    }
    return StageResult(**{**values, **given})  # type: ignore[arg-type]


def failing(**given: object) -> Analysis:
    """A board with one stage, whose low time is too long."""
    values: dict[str, object] = {
        "command": "judge",
        "sources": (source(),),
        "results": (judged(),),
        "verdict": "fail",
        "rule": Rule(),
        "design": design(),
        "timebase_rel": 50e-6,
        "timebase_from": "the design",
    }
    return Analysis(**{**values, **given})  # type: ignore[arg-type]


def measured_only() -> Analysis:
    """A capture without a design."""
    result = judged(
        stage=None, solution=None, checks=(), verdict=None, likely=None, warnings=(), design=None
    )
    return failing(command="measure", results=(result,), verdict=None, rule=None, design=None)


def looked_at() -> Analysis:
    """A capture of which only the structure and the traces are known."""
    names = ("OUT", "NODE")
    results = tuple(
        StageResult(source=0, stage=None, trace=trace(name), levels=levels()) for name in names
    )
    return failing(command="look", results=results, verdict=None, rule=None, design=None)


def given_figures() -> Analysis:
    """Times typed in, with no capture behind them."""
    result = StageResult(
        source=0, stage=None, trace=None, timing=Timing(t_high=timing().t_high), solution=solution()
    )
    return failing(
        command="solve",
        sources=(),
        results=(result,),
        verdict=None,
        rule=None,
        design=None,
        timebase_rel=None,
    )


def dead() -> Analysis:
    """A board whose output stands still: bounds in place of values."""
    bound = Bound(unit="s", at_least=310.0)
    reason = "The output stood still for 310 s, longer than the limits allow."
    failed = replace(checks()[2], measured=bound, verdict="fail", reason=reason, p_conform=None)
    finding = Finding(
        code="stuck-high", text="The output stands at 11.97 V.", may_be=("C-short", "RB-open")
    )
    result = judged(
        timing=None, jitter=None, solution=None, likely=None, checks=(failed,),
        findings=(finding,), levels=replace(levels(), kind="flat"), overview=None,
    )  # fmt: skip
    return failing(results=(result,))


def two_stages() -> Analysis:
    """A board of which one stage passes."""
    good = judged(
        stage="heartbeat",
        verdict="pass",
        checks=tuple(replace(item, verdict="pass") for item in checks()[:3]),
        likely=None,
    )
    return failing(results=(judged(), good))


def crowded() -> Analysis:
    """As much as one stage can reasonably say: every limit, many warnings, long names."""
    times = timing()
    by_name = {
        name: getattr(times, name)
        for name in ("t_high", "t_low", "period", "frequency", "duty", "first_high")
    }
    by_name["delay"] = seconds(3.2, 0.01)
    by_name["tau_charge"] = seconds(20.21, 0.13)
    by_name["tau_discharge"] = seconds(15.51, 0.10)
    by_name["jitter_period"] = seconds(0.0071, 0.0015)
    by_name["jitter_cycle"] = seconds(0.0093, 0.0018)
    every = tuple(
        check(name, item, (item.value * 0.9, item.value * 1.1), source="drawing GH-MV-07 sheet 4")
        for name, item in by_name.items()
    )
    notices = tuple(
        Notice(
            code=f"invented-{i}",
            text=f"warning number {i} says what was seen in this trace, at 12.5 s and later",
        )
        for i in range(8)
    )
    result = judged(
        checks=every, verdict="pass", warnings=notices,
        trace=replace(trace("CH1 spacing output, long name of a channel"), gaps=(
            Gap(start_s=12.0, end_s=13.5), Gap(start_s=50, end_s=51), Gap(start_s=70, end_s=71),
        )),
        overview=overview(500),
    )  # fmt: skip
    name = "soak-test/rack-3/board-000412/2031-03-02T03-12-00Z-mist-valve-timer-spacing-output.csv"
    return failing(results=(result,), verdict="pass", sources=(source(name),))


def hostile(text: str) -> Analysis:
    """A board on which every name that comes from outside is ``text``."""
    result = judged(
        stage=text, trace=trace(text), likely=text, design=None,
        checks=(replace(checks()[0], source=text, reason=text, verdict="fail"),),
        findings=(Finding(code="drifting", text=text, may_be=(text,)),),
        warnings=(Notice(code="assumed-channel", text=text),),
    )  # fmt: skip
    point = StructurePoint(name=text, value=text, evidence=text)
    outside = replace(source(text), structure=(point,), instrument=text, sha256=text)
    board = replace(design(), name=text, assembly=text, revision=text, source=text, sha256=text)
    return failing(results=(result,), sources=(outside,), design=board, timebase_from=text)
