"""How a stage repeats, how many intervals a record is sure to hold, and how fast to sample it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from benchtool.circuits import find_topology
from benchtool.errors import DesignError
from benchtool.frozen import frozen_record
from benchtool.judge.plan_figures import Counts, Cycle
from benchtool.model.decision import StageLimit
from benchtool.model.design import Design, Stage
from benchtool.model.plan import Means

ROOM = 4.0
"""Half the distance between the limits over U that is aimed at: four to one, common practice."""

_SAMPLES = 50  # in the shorter interval, so that a picture of it shows what happened
_GRID_SHARE = 0.01  # of the u aimed at
_UNAVOIDABLE = 0.3  # of what jitter and timebase leave
_OF_DUTY = 0.35  # jitter of a duty near one half over that of an interval: √2/4
_PULSES_APART = 2.0  # a trigger every second pulse length
_TOUCH = 1e-9  # relative: a record of exactly n + 1 periods holds n


@frozen_record
class Run:
    """How a stage repeats.

    Attributes:
        unit: Name of what repeats: period, pulse or delay.
        nominal: Quantity to its nominal value.
        cycle: Nominal times of a repeating output.
        unit_s: One repetition of the nominal board, seconds.
        longest_s: The same of the slowest board that may pass.
    """

    unit: str
    nominal: Mapping[str, float]
    cycle: Cycle
    unit_s: float
    longest_s: float


def describe_run(
    stage: Stage,
    design: Design,
    nominal: Mapping[str, float | None],
    limits: Sequence[StageLimit],
) -> Run:
    """Return how a stage repeats.

    Args:
        stage: The stage.
        design: The design, for the message.
        nominal: Its nominal quantities.
        limits: Its limits, for the slowest board that may pass.

    Raises:
        DesignError: If the nominal circuit stands still.
    """
    known = {name: value for name, value in nominal.items() if value is not None}
    run = find_topology(stage.topology).run
    unit = {"t_high": "pulse", "delay": "delay"}.get(run or "", "period")
    of_unit = {"pulse": "t_high", "delay": "delay"}.get(unit, "period")
    if of_unit not in known:
        raise DesignError(
            f"the nominal circuit of stage {stage.name} never switches: there is nothing to plan",
            hint=f"See: benchtool design check {design.source or 'FILE'}",
        )
    cycle = Cycle(
        t_high=known.get("t_high"),
        t_low=known.get("t_low"),
        period=known.get("period"),
    )
    unit_s = known[of_unit]
    longest_s = max(unit_s, _longest(of_unit, limits))
    return Run(unit=unit, nominal=known, cycle=cycle, unit_s=unit_s, longest_s=longest_s)


def _longest(of_unit: str, limits: Sequence[StageLimit]) -> float:
    """Return the longest permitted repetition, 0 where no limit says."""
    uppers = {item.quantity: item.upper for item in limits if item.unit == "s"}
    found = uppers.get(of_unit) or 0.0
    if of_unit == "period" and not found:
        high, low = uppers.get("t_high"), uppers.get("t_low")
        found = high + low if high and low else 0.0
        slowest = next((item.lower for item in limits if item.quantity == "frequency"), None)
        found = max(found, 1 / slowest if slowest else 0.0)
    return found


def span_for(run: Run, n: int) -> float:
    """Return the length of a record that is sure to hold n repetitions, seconds.

    A record that begins anywhere needs one period more than it shall hold whole.
    """
    if run.unit == "period":
        return (n + 1) * run.longest_s
    return n * _PULSES_APART * run.longest_s


def count_intervals(run: Run, span_s: float) -> Counts:
    """Return how many whole intervals a record is sure to hold, wherever it begins.

    Args:
        run: How the stage repeats.
        span_s: Length of the record.
    """
    if run.unit != "period":
        n = int(span_s / (_PULSES_APART * run.longest_s) * (1 + _TOUCH))
        return Counts(t_high=n, t_low=0, period=0)
    stretch = run.longest_s / run.unit_s

    def whole(length_s: float | None) -> int:
        if length_s is None:
            return 0
        return max(0, math.floor((span_s - length_s * stretch) / run.longest_s * (1 + _TOUCH)))

    cycle = run.cycle
    return Counts(t_high=whole(cycle.t_high), t_low=whole(cycle.t_low), period=whole(cycle.period))


def repetitions(run: Run, counts: Counts) -> int:
    """Return how many repetitions the counts stand for."""
    return counts.period if run.unit == "period" else counts.t_high


def recommend_rate(run: Run, limits: Sequence[StageLimit], means: Means) -> float:
    """Return a rate of the 1-2-5 row whose grid stays behind everything else.

    Args:
        run: How the stage repeats.
        limits: What is judged.
        means: Timebase and jitter, which no rate takes away.

    Returns:
        Samples a second: 50 in the shorter interval, and for each limit the grid of a single
        interval at most a third of what jitter and timebase leave anyway, or a hundredth of the U
        that leaves four to one where that is more.
    """
    lengths = [x for x in (run.cycle.t_high, run.cycle.t_low) if x] or [run.unit_s]
    steps = [min(lengths) / _SAMPLES]
    jitter_rel = means.jitter_rel / math.sqrt(3)
    if means.period_sd_rel is not None:
        jitter_rel = means.period_sd_rel
    for limit in limits:
        if limit.lower is None or limit.upper is None or limit.quantity.startswith("tau_"):
            continue
        goal_s = _in_seconds(run, limit, (limit.upper - limit.lower) / 2) / ROOM / 2
        if limit.unit == "1":
            unavoidable_s = _OF_DUTY * jitter_rel * run.unit_s
        else:
            unavoidable_s = math.hypot(jitter_rel, means.timebase_rel / math.sqrt(3)) * run.unit_s
        u_s = max(_GRID_SHARE * goal_s, _UNAVOIDABLE * unavoidable_s)
        steps += [u_s * math.sqrt(6)] if u_s else []
    return round_up(1 / min(steps))


def _in_seconds(run: Run, limit: StageLimit, half: float) -> float:
    if limit.unit == "1":
        return half * run.unit_s
    return half * run.unit_s**2 if limit.unit == "Hz" else half


def round_up(value: float) -> float:
    """Return the next number up of the row 1, 2, 5, 10 and so on.

    Example:
        >>> round_up(11.2), round_up(0.5), round_up(51.0)
        (20.0, 0.5, 100.0)
    """
    decade = math.floor(math.log10(value))
    row = [float(f"{step}e{decade}") for step in (1, 2, 5, 10)]
    return next(step for step in row if step >= value * (1 - _TOUCH))
