"""Before measuring: how to record a stage, what U to expect, what the rule does to boards."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import replace
from typing import Any

from benchtool.circuits import solve
from benchtool.frozen import frozen_record
from benchtool.judge.extremes import draw_boards
from benchtool.judge.limits import stage_limits
from benchtool.judge.observations import JITTER_FIELDS
from benchtool.judge.plan_figures import Counts, Setting, expect_figures, expect_single
from benchtool.judge.plan_probe import shift_by_probe
from benchtool.judge.plan_record import (
    ROOM,
    Run,
    count_intervals,
    describe_run,
    recommend_rate,
    repetitions,
    span_for,
)
from benchtool.judge.plan_remarks import remark
from benchtool.judge.plan_risks import judge_boards, judge_lot
from benchtool.judge.plan_sampling import sample_edges
from benchtool.judge.responses import respond_nominally
from benchtool.judge.rules import guard_band
from benchtool.judge.settling import dominant_source
from benchtool.model.arrays import FloatArray
from benchtool.model.decision import StageLimit
from benchtool.model.design import Design, Stage
from benchtool.model.plan import Means, PlannedQuantity, Repetition, StagePlan
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Timing
from benchtool.uncertainty import combine, coverage_factor

N_BOARDS = 50_000
_MOST = 10_000  # repetitions that are thought of
_NO_LONGER = 1.1  # U against the U of very many: from here it no longer falls
_PLAIN = ("t_high", "t_low", "period", "duty")
_CHEAP_S, _SHOWS_SCATTER, _PLENTY = 1.0, 10, 100
_SURE = 1e-9  # relative u of a time that is as good as known
Expect = Callable[[Counts], dict[str, Measured]]


@frozen_record(eq=False)
class _Case:
    """What all of a plan shares; ``terms`` is the share of u that the IC gives each product."""

    run: Run
    limits: Sequence[StageLimit]
    setting: Setting
    coverage: float
    terms: Mapping[str, tuple[str, float, float]]

    def expect(self, counts: Counts) -> dict[str, Measured]:
        """Return the figures to expect, products of the parts among them."""
        found = expect_figures(self.setting, counts)
        for name in ("first_high", "delay"):
            if name in self.run.nominal:
                found[name] = expect_single(self.setting, self.run.nominal[name])
        for name, (source, value, u_rel) in self.terms.items():
            if source in found:
                found[name] = _product(found[source], value, u_rel)
        return found

    def U(self, item: Measured) -> float:
        """Return the expanded uncertainty by the rule's coverage."""
        return coverage_factor(item.dof, self.coverage) * item.u


def plan_stage(stage: Stage, design: Design, means: Means | None = None) -> StagePlan:
    """Plan the capture of a stage.

    Args:
        stage: A stage of ``design``.
        design: Gives limits, rule, supply, and the instrument as far as ``means`` is None.
        means: What there is to measure with; None takes the design's instrument.

    Returns:
        Rate, span, repetitions and, for each judged quantity, the U to expect, the room it leaves
        and what the guard band does to boards with all parts inside their tolerances.

    Raises:
        DesignError: If the nominal circuit stands still.
    """
    means = means or means_of(design)
    case = _settle(stage, design, means)
    repetition = _repeat(case)
    n_in_time = None
    if means.time_per_board_s is not None:
        n_in_time = repetitions(case.run, count_intervals(case.run, means.time_per_board_s))
    span_s = means.span_s or _span(case, repetition.n, n_in_time, means.time_per_board_s)
    counts = count_intervals(case.run, span_s)
    rows = draw_boards(stage, design, N_BOARDS) if case.limits else {}
    quantities = tuple(_quantities(case, counts, rows, design))
    plan = StagePlan(
        stage=stage.name,
        topology=stage.topology,
        channel=stage.channel,
        instrument=means.instrument,
        rate_hz=1 / case.setting.sampling.step_s,
        rate_given=means.rate_hz is not None,
        span_s=span_s,
        span_given=means.span_s is not None,
        unit_s=case.run.unit_s,
        unit=case.run.unit,
        repetition=repetition,
        n=repetitions(case.run, counts),
        n_in_time=n_in_time,
        time_per_board_s=means.time_per_board_s,
        quantities=quantities,
        board=judge_boards(rows, [item for item in quantities if item.risks or not item.n]),
        n_boards=N_BOARDS,
        probe=shift_by_probe(stage, design, means.probe),
    )
    return replace(plan, warnings=tuple(remark(plan, stage, design, means, case.limits)))


def _settle(stage: Stage, design: Design, means: Means) -> _Case:
    """Return what all of a plan shares."""
    limits = [
        item
        for item in stage_limits(stage, design)
        if item.quantity not in JITTER_FIELDS and (item.lower, item.upper) != (None, None)
    ]
    run = describe_run(stage, design, respond_nominally(stage, design), limits)
    rate_hz = means.rate_hz or recommend_rate(run, limits, means)
    sampling = sample_edges(means, rate_hz, design.supply.nominal)
    return _Case(
        run=run,
        limits=limits,
        setting=Setting(cycle=run.cycle, sampling=sampling, means=means),
        coverage=design.rule.coverage,
        terms=_ic_terms(stage, design, run, limits),
    )


def means_of(design: Design) -> Means:
    """Return the instrument that a design states, the usual one where it states none."""
    plain, stated = Means(), design.instrument
    return replace(
        plain,
        timebase_rel=plain.timebase_rel if stated.timebase_rel is None else stated.timebase_rel,
        jitter_rel=plain.jitter_rel if stated.jitter_rel is None else stated.jitter_rel,
    )


def _span(case: _Case, n: int, n_in_time: int | None, time_s: float | None) -> float:
    """Return the span that is worth its time, or all the time there is where that is less.

    Where many periods cost next to nothing they are taken, so that their scatter is seen.
    """
    cheap = int(_CHEAP_S / case.run.longest_s)
    if case.run.unit == "period" and cheap >= _SHOWS_SCATTER:
        n = max(n, min(cheap, _PLENTY))
    wanted_s = span_for(case.run, n)
    return wanted_s if n_in_time is None or time_s is None else min(wanted_s, time_s)


def _repeat(case: _Case) -> Repetition:
    """Return the fewest repetitions that leave the room, or from which U no longer falls."""
    most = _narrowest(case, 1 if case.run.unit == "delay" else _MOST)
    if most is None:
        return Repetition(n=1, enough=True, dominant=None, quantity=None)
    wanted = ROOM if case.run.unit == "delay" else min(ROOM, most[0] / _NO_LONGER)
    before = 0
    for n in _numbers():
        if _leaves(case, n, wanted) or case.run.unit == "delay":
            break
        before = n
    low, high = before, n
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if _leaves(case, middle, wanted) else (middle, high)
    return _repetition(high, _narrowest(case, high))


def _leaves(case: _Case, n: int, wanted: float) -> bool:
    found = _narrowest(case, n)
    return found is not None and found[0] >= wanted


def _repetition(n: int, found: tuple[float, str, Measured] | None) -> Repetition:
    if found is None:
        return Repetition(n=n, enough=True, dominant=None, quantity=None)
    room, name, figure = found
    return Repetition(n=n, enough=room >= ROOM, dominant=dominant_source(figure), quantity=name)


def _numbers() -> Iterator[int]:
    n = 1
    while n <= _MOST:
        yield n
        n = n + 1 if n < 12 else math.ceil(n * 1.25)


def _narrowest(case: _Case, n: int) -> tuple[float, str, Measured] | None:
    """Return the least room of all limits, its quantity and what to expect of it."""
    found = case.expect(Counts(t_high=n, t_low=n, period=n))
    rooms = [
        (_room(limit, case.U(found[limit.quantity])), limit.quantity, found[limit.quantity])
        for limit in case.limits
        if limit.quantity in found and limit.nominal is not None
    ]
    return min(rooms, key=lambda item: item[0], default=None)


def _room(limit: StageLimit, U: float) -> float:
    if U == 0:
        return math.inf
    if limit.lower is not None and limit.upper is not None:
        return (limit.upper - limit.lower) / 2 / U
    end = limit.lower if limit.lower is not None else limit.upper
    return abs((limit.nominal or 0.0) - (end or 0.0)) / U


def _quantities(
    case: _Case, counts: Counts, rows: Mapping[str, FloatArray], design: Design
) -> Iterator[PlannedQuantity]:
    found = case.expect(counts)
    if not case.limits:
        for name in (name for name in _PLAIN if name in found):
            yield _planned(case, name, None, found.get(name), rows, design)
    for limit in case.limits:
        if limit.nominal is not None:
            item = found.get(limit.quantity)
            yield _planned(case, limit.quantity, limit, item, rows, design)


def _planned(
    case: _Case,
    name: str,
    limit: StageLimit | None,
    expected: Measured | None,
    rows: Mapping[str, FloatArray],
    design: Design,
) -> PlannedQuantity:
    U = None if expected is None else case.U(expected)
    w = None if expected is None else guard_band(expected.u, expected.dof, design.rule)
    risks = None
    if limit is not None and expected is not None and w is not None and name in rows:
        risks = judge_lot(rows[name], expected.u, w, limit.lower, limit.upper)
    return PlannedQuantity(
        quantity=name,
        nominal=case.run.nominal[name],
        unit=limit.unit if limit else ("1" if name == "duty" else "s"),
        lower=limit.lower if limit else None,
        upper=limit.upper if limit else None,
        n=expected.n if expected else 0,
        expected=expected,
        U=U,
        w=w,
        room=None if limit is None or U is None else _room(limit, U),
        risks=risks,
    )


def _ic_terms(
    stage: Stage, design: Design, run: Run, limits: Sequence[StageLimit]
) -> dict[str, tuple[str, float, float]]:
    """Return what the IC leaves open of each judged product: its time, its value, relative u.

    Found by solving the nominal times as if they were known.
    """
    wanted = [item.quantity for item in limits if item.quantity.startswith("tau_")]
    if not wanted:
        return {}
    times = ("t_high", "t_low", "period", "duty", "delay")
    sure: dict[str, Any] = {
        name: Measured(
            value=run.nominal[name],
            u=_SURE * run.nominal[name],
            unit="1" if name == "duty" else "s",
        )
        for name in times
        if name in run.nominal
    }
    solution = solve(Timing(**sure), stage, design)
    single = "delay" if run.unit == "delay" else "t_high"
    sources = {"tau_charge": single, "tau_discharge": "t_low" if "t_low" in sure else single}
    found = {}
    for name in wanted:
        product = getattr(solution, name)
        if product is not None:
            found[name] = (sources[name], product.value, product.u / product.value)
    return found


def _product(figure: Measured, value: float, u_rel: float) -> Measured:
    """Return a product of the parts from its time: errors of the time, and of the IC's terms."""
    scaled = [term.scaled(value / figure.value) for term in figure.budget]
    terms = [*scaled, Contribution(source="thresholds and IC", u=u_rel * value)]
    return combine(value, "s", terms, n=figure.n)
