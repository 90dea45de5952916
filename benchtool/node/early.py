"""An early answer for slow circuits: the time constant from a part of one slope."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.fitting import Fit, fit_curve, judge_noise
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Waveform
from benchtool.model.node import EarlyTau
from benchtool.model.quantity import Contribution, Measured, Notice
from benchtool.node.slopes import Points, take_points
from benchtool.node.terms import TIMEBASE_REL
from benchtool.uncertainty import combine, expanded

_BLOCKS = 64  # of the record, in which the longest way in one direction is sought
_BACK = 0.15  # of the range: a way back so long is a turn
_BINS = 32
_LEAST = 24  # samples on it
_WORST = 0.2  # relative uncertainty from which there is no answer


@frozen_record(eq=False)
class _Part:
    """The part of a slope that is used, in bins.

    Attributes:
        times_s: After its first sample, shape (m,).
        volts: Shape (m,).
        begin_s: When that sample was taken.
        sign: 1 where it rises.
    """

    times_s: FloatArray
    volts: FloatArray
    begin_s: float
    sign: float


def find_early_tau(
    trace: Waveform,
    end: Measured | None,
    *,
    begin: Measured | None = None,
    target: Measured | None = None,
    timebase_rel: float = TIMEBASE_REL,
) -> EarlyTau:
    """Return the time constant from the longest way in one direction, its asymptote known.

    Args:
        trace: The node, of which the record may hold a part of one slope alone.
        end: Voltage to which that slope would settle: the supply of a node that charges, 0 V of
            one that discharges. None is refused: a part of a slope does not tell it.
        begin: Threshold at which the slope began, for ``length``.
        target: Threshold at which it will end, for ``arrives`` and ``length``.
        timebase_rel: Half-width of the timebase error, relative.

    Raises:
        MeasurementError: ``asymptote-unknown`` without ``end``; ``asymptote-passed`` where the node
            is beyond it; ``slope-too-short`` where what is left uncertain is over a fifth.

    References:
        tau = t/ln[(V - v0)/(V - v1)]: a part of x time constants leaves of an error of V about
        u(V)/(V - v), divided by about x/2 less, so that it must be known the better the shorter.
    """
    if end is None:
        raise MeasurementError(
            "a part of one slope does not tell to what voltage it would settle",
            code="asymptote-unknown",
            hint="Give that voltage (the supply for a rise, 0 V for a fall), or record a whole "
            "cycle.",
        )
    part = _longest_way(take_points(trace, 0.0))
    if np.any(part.sign * (end.value - part.volts) <= 0):
        way = "rises" if part.sign > 0 else "falls"
        raise MeasurementError(
            f"the slope {way}, away from {end.value:.4g} V or beyond it, where it was to settle",
            code="asymptote-passed",
            hint="Give the supply for a rise, 0 V for a fall; check them and the probe's offset.",
        )
    answer = _Answer(part, end)
    tau = answer.measured("s", lambda _, log_tau, __: math.exp(log_tau), timebase_rel)
    if not tau.u < _WORST * tau.value:
        raise MeasurementError(
            f"this part of a slope leaves the time constant uncertain by "
            f"{100 * tau.u / tau.value:.0f} %",
            code="slope-too-short",
            hint="Record longer, or state the voltage to which it settles more closely.",
        )
    return EarlyTau(
        tau=tau,
        end=end,
        rises=part.sign > 0,
        covered=float(part.times_s[-1] - part.times_s[0]) / tau.value,
        arrives=_arrives(answer, part, end, target, timebase_rel),
        length=_length(answer, end, begin, target, timebase_rel),
        warnings=_notices(part, answer, end),
    )


def _longest_way(points: Points) -> _Part:
    """Return the longest part of a record that goes one way, in bins."""
    n_blocks = max(2, min(_BLOCKS, points.volts.size // 4))
    blocks = np.array_split(np.arange(points.volts.size), n_blocks)
    means = np.array([points.volts[rows].mean() for rows in blocks])
    turns = [0, *_turns(means), means.size - 1]
    longest = int(np.argmax(np.diff(turns)))
    # The blocks at a turn hold some of both slopes.
    begin = turns[longest] + (longest > 0)
    stop = turns[longest + 1] - (longest + 2 < len(turns))
    rows = np.arange(blocks[begin][0], blocks[max(begin, stop)][-1] + 1)
    rises = means[stop] > means[begin]
    if rows.size < _LEAST:
        raise MeasurementError(
            "the node goes one way for too few samples",
            code="slope-too-short",
            hint="Record at a higher rate, or longer.",
        )
    bins = np.array_split(rows, min(_BINS, rows.size // 4))
    begin_s = float(points.times_s[rows[0]])
    return _Part(
        times_s=np.array([points.times_s[b].mean() for b in bins]) - begin_s,
        volts=np.array([points.volts[b].mean() for b in bins]),
        begin_s=begin_s,
        sign=1.0 if rises else -1.0,
    )


def _turns(means: FloatArray) -> list[int]:
    """Return where a course turns by more than noise: back by a part of its range."""
    back_v = _BACK * float(np.ptp(means))
    found: list[int] = []
    top = bottom = 0
    way = 0
    for index, mean in enumerate(means):
        if mean > means[top]:
            top = index
        if mean < means[bottom]:
            bottom = index
        if way >= 0 and means[top] - mean > back_v:
            found += [top] if way else []
            way, bottom = -1, index
            top = index
        elif way <= 0 and mean - means[bottom] > back_v:
            found += [bottom] if way else []
            way, top = 1, index
            bottom = index
    return found


Figure = Callable[[float, float, float], float]
"""Asymptote, ln tau and amplitude to a figure."""


class _Answer:
    """The fit at the stated asymptote, and how its parameters move with that."""

    def __init__(self, part: _Part, end: Measured) -> None:
        self.part, self.end = part, end
        self.fit = self._fit(end.value)
        self.noise = judge_noise(
            self.fit,
            np.arange(part.volts.size, dtype=np.float64),
            np.zeros(part.volts.size, np.int64),
        )
        self.u_end = max(end.u, 1e-9 * abs(end.value - float(part.volts[-1])))
        room = float(np.min(part.sign * (end.value - part.volts)))
        self.small = part.sign * min(self.u_end, 0.3 * room)
        self.moved = self._fit(end.value + self.small).values

    def _fit(self, end_v: float) -> Fit:
        part = self.part
        away = part.sign * (end_v - part.volts)
        slope, level = np.polyfit(part.times_s, np.log(away), 1)
        log_tau = -math.log(max(-slope, 1e-6 / float(np.ptp(part.times_s))))

        def decay(values: FloatArray) -> FloatArray:
            kept: FloatArray = np.exp(-part.times_s * math.exp(-values[0]))
            return kept

        def curve(values: FloatArray) -> FloatArray:
            shown: FloatArray = end_v - part.sign * values[1] * decay(values)
            return shown

        def slopes(values: FloatArray) -> FloatArray:
            kept = decay(values)
            to_tau = -part.sign * values[1] * kept * part.times_s * math.exp(-values[0])
            return np.column_stack([to_tau, -part.sign * kept])

        start = np.array([log_tau, math.exp(level)])
        return fit_curve(curve, part.volts, start, slopes=slopes)

    def measured(
        self, unit: str, figure: Figure, timebase_rel: float, extra: tuple[Contribution, ...] = ()
    ) -> Measured:
        """Return a figure with what noise, asymptote and timebase leave of its certainty."""
        values = [float(x) for x in self.fit.values]
        value = figure(self.end.value, *values)
        gradient = []
        for index in (0, 1):
            small = 1e-6 * (abs(values[index]) or 1.0)
            ahead = [x + small * (i == index) for i, x in enumerate(values)]
            gradient.append((figure(self.end.value, *ahead) - value) / small)
        u_noise = math.sqrt(float(np.array(gradient) @ self.noise.covariance @ gradient))
        with_end = figure(self.end.value + self.small, *(float(x) for x in self.moved))
        u_end = (with_end - value) / self.small * self.end.u
        lines = [
            Contribution(source="noise", u=u_noise, dof=float(self.noise.dof[0])),
            Contribution(source="asymptote", u=u_end, dof=self.end.dof),
            Contribution(source="timebase", u=value * timebase_rel / math.sqrt(3), common=True),
            *extra,
        ]
        return combine(value, unit, lines, n=self.part.volts.size)


def _arrives(
    answer: _Answer, part: _Part, end: Measured, target: Measured | None, timebase_rel: float
) -> Measured | None:
    """Return when the node will be at its threshold."""
    if target is None or part.sign * (end.value - target.value) <= 0:
        return None

    def figure(end_v: float, log_tau: float, amplitude: float) -> float:
        left_v = part.sign * (end_v - target.value)
        return part.begin_s + math.exp(log_tau) * math.log(amplitude / left_v)

    tau_s = math.exp(float(answer.fit.values[0]))
    u = target.u * tau_s / abs(end.value - target.value)
    lines = (Contribution(source="threshold", u=u, dof=target.dof),)
    arrives = answer.measured("s", figure, timebase_rel, lines)
    return arrives if arrives.value > part.begin_s else None


def _length(
    answer: _Answer,
    end: Measured,
    begin: Measured | None,
    target: Measured | None,
    timebase_rel: float,
) -> Measured | None:
    """Return how long the slope takes from threshold to threshold."""
    if begin is None or target is None:
        return None
    if (end.value - begin.value) / (end.value - target.value) <= 1:
        return None

    def figure(end_v: float, log_tau: float, _: float) -> float:
        return math.exp(log_tau) * math.log((end_v - begin.value) / (end_v - target.value))

    tau_s = math.exp(float(answer.fit.values[0]))
    lines = tuple(
        Contribution(source=name, u=level.u * tau_s / abs(end.value - level.value), dof=level.dof)
        for name, level in (("begin", begin), ("target", target))
    )
    return answer.measured("s", figure, timebase_rel, lines)


def _notices(part: _Part, answer: _Answer, end: Measured) -> tuple[Notice, ...]:
    """Say where the bending of the part speaks against the stated asymptote."""
    m = part.volts.size
    start = np.array([end.value, *answer.fit.values])

    def curve(values: FloatArray) -> FloatArray:
        decay = np.exp(-part.times_s * math.exp(-min(max(values[1], -99.0), 99.0)))
        shown: FloatArray = values[0] - part.sign * values[2] * decay
        return shown

    try:
        free = fit_curve(curve, part.volts, start)
    except MeasurementError:
        return ()
    noise = judge_noise(free, np.arange(m, dtype=np.float64), np.zeros(m, np.int64))
    seen = combine(
        float(free.values[0]) - end.value,
        "V",
        [
            Contribution(source="noise", u=math.sqrt(noise.covariance[0, 0]), dof=noise.dof[0]),
            Contribution(source="asymptote", u=end.u, dof=end.dof),
        ],
    )
    if abs(seen.value) <= 1.5 * expanded(seen):
        return ()
    text = (
        f"the slope bends as if it would settle at {free.values[0]:.4g} V, "
        f"not at the {end.value:.4g} V that were stated"
    )
    return (Notice(code="asymptote-disagrees", text=text),)
