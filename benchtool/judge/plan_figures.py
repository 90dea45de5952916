"""The uncertainty to expect of each timing figure, before there is a capture.

The budget is the one that measuring makes (JCGM 100:2008, 4.2 and 4.3), with the scatter that is
to be expected in place of the one that will be seen.
"""

from __future__ import annotations

import math

from benchtool.frozen import frozen_record
from benchtool.judge.plan_grid import UNSEEN, mean_width_grid, rounded_variance
from benchtool.judge.plan_sampling import Sampling
from benchtool.model.plan import Means
from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import combine, expanded, propagate

_FEW = 6  # intervals below which chance may hide the grid: both are added
_ENOUGH = 30  # from which the grid is taken out of the scatter
_BATCHED = 36  # from which interpolated widths are taken in twelve batches
_BATCH_DOF = 11.0
_EDGES = 2.0  # edges whose variance goes into a cycle's duty: 1, 1 - d and d, and what two share


@frozen_record
class Cycle:
    """The times of a repeating output, seconds; None where it has no such time."""

    t_high: float | None
    t_low: float | None
    period: float | None


@frozen_record
class Counts:
    """How many intervals of each kind a record is sure to hold."""

    t_high: int
    t_low: int
    period: int


@frozen_record
class Setting:
    """What all figures of a planned record share."""

    cycle: Cycle
    sampling: Sampling
    means: Means

    @property
    def sd_rel(self) -> float:
        """Standard deviation of a period to expect, relative."""
        given = self.means.period_sd_rel
        return self.means.jitter_rel / math.sqrt(3) if given is None else given

    @property
    def single_rel(self) -> float:
        """Jitter of one interval alone: as assumed, or as given where that is more."""
        return max(self.means.jitter_rel / math.sqrt(3), self.means.period_sd_rel or 0.0)

    def own_sd(self, length_s: float) -> float:
        """Return the scatter of an interval: variance goes with length (oscillator noise)."""
        return self.sd_rel * math.sqrt(length_s * (self.cycle.period or length_s))


def expect_figures(setting: Setting, counts: Counts) -> dict[str, Measured]:
    """Return the value and uncertainty to expect of each timing figure.

    Args:
        setting: Times, edges and instrument.
        counts: Intervals in the record; a figure with none is left out.

    Returns:
        t_high, t_low, period, frequency and duty as far as there are any.
    """
    cycle = setting.cycle
    found: dict[str, Measured] = {}
    for name, value, n, sign in (
        ("t_high", cycle.t_high, counts.t_high, 1.0),
        ("t_low", cycle.t_low, counts.t_low, -1.0),
    ):
        if value is not None and n:
            found[name] = _width(setting, value, n, sign)
    if cycle.period is not None and counts.period:
        period = _period(setting, cycle.period, counts.period)
        found["period"] = period
        found["frequency"] = propagate(1 / period.value, "Hz", [(-1 / period.value**2, period)])
        if cycle.t_high is not None:
            found["duty"] = _duty(setting, cycle.t_high, cycle.period, counts.period)
    return found


def expect_single(setting: Setting, value: float) -> Measured:
    """Return what to expect of one interval alone, such as a first high or a delay, seconds."""
    return _width(setting, value, 1, 1.0)


def _single(setting: Setting, value: float) -> list[Contribution]:
    return [
        Contribution(source="assumed jitter", u=value * setting.single_rel),
        Contribution(source="edge noise", u=math.sqrt(2) * setting.sampling.edge_u_s),
    ]


def _timebase(setting: Setting, value: float) -> Contribution:
    u = value * setting.means.timebase_rel / math.sqrt(3)
    return Contribution(source="timebase", u=u, common=True)


def _grid(u: float) -> Contribution:
    return Contribution(source="grid", u=u)


def _scatter(u: float, dof: float) -> Contribution:
    return Contribution(source="scatter", u=u, dof=dof)


def _with_grid(u: float, n: int, floor: float, *, resolved: bool) -> list[Contribution]:
    """Return scatter and grid of n > 1: added where few, else the grid as far as it is missed."""
    added = n < _FEW and not resolved
    missed = floor if added else math.sqrt(max(0.0, floor**2 - u**2))
    return [
        _scatter(u, n - 1),
        Contribution(source="grid", u=missed, dof=n - 1 if added else math.inf),
    ]


def _seen_variance(value: float, step_s: float, own_s: float, n: int, mean_s2: float) -> float:
    """Return the variance that n intervals on a grid will show around their own mean, s².

    Rounding errors even out along a record, so that intervals scatter more around their mean than
    the mean does around the truth: E[s²] = n/(n - 1)·(variance of one - variance of the mean).
    """
    one_s2 = rounded_variance(value, step_s, own_s)
    return max(0.0, n / (n - 1) * (one_s2 - mean_s2 - own_s**2 / n))


def _seeming_variance(value: float, step_s: float, own_s: float, wander_s: float, n: int) -> float:
    """Return the variance that many widths on a grid will seem to have of their own, s².

    What rounding adds is taken out of their scatter. It is known to some 1/√n, and what is left of
    it counts as scatter, as far as the edges do not show by lying on one line that there is none.

    Args:
        value: Length of a width.
        step_s: Grid step.
        own_s: True standard deviation of a width.
        wander_s: That of a period.
        n: How many, 30 or more.
    """
    rounding_s2 = rounded_variance(value, step_s, 0.0)
    left_s2 = rounding_s2 * (1 / (n - 1) + 0.57 / math.sqrt(n))
    unseen, wander = UNSEEN / n, wander_s / step_s
    on_line = unseen + _off_line(n, wander)
    about = max(unseen**2, wander**2 * n / 15 + 1 / n)  # n/15: a random walk about its best line
    most_s2 = 2 * step_s**2 * min(on_line**2, about)
    return max(own_s**2, min(left_s2, most_s2))


def _width(setting: Setting, value: float, n: int, sign: float) -> Measured:
    sampling, step_s = setting.sampling, setting.sampling.step_s
    own_s = setting.own_sd(value)
    level = Contribution(source="level", u=sign * sampling.level_u_s, common=True)
    if n == 1:
        own = [*_single(setting, value), _grid(_single_grid(sampling))]
    elif sampling.resolved:
        u = math.sqrt((own_s**2 + 2 * sampling.edge_u_s**2 + sampling.grid_s**2 / 6) / n)
        own = [_scatter(u, n - 1 if n < _BATCHED else _BATCH_DOF)]
    else:
        period_s = setting.cycle.period or value
        floor_s = mean_width_grid(period_s, n, step_s, setting.own_sd(period_s))
        if n < _ENOUGH:
            u = math.sqrt(_seen_variance(value, step_s, own_s, n, floor_s**2) / n)
            own = _with_grid(u, n, floor_s, resolved=False)
        else:
            wander_s = setting.own_sd(period_s)
            u = math.sqrt(_seeming_variance(value, step_s, own_s, wander_s, n) / n)
            own = [_scatter(u, n - 1), _grid(floor_s)]
    return combine(value, "s", [*own, level, _timebase(setting, value)], n=n)


def _single_grid(sampling: Sampling) -> float:
    return (sampling.grid_s if sampling.resolved else sampling.step_s) / math.sqrt(6)


def _period(setting: Setting, value: float, n: int) -> Measured:
    """Return the period; of several ways to say its uncertainty the smallest, as measuring does."""
    sampling, step_s, own_s = setting.sampling, setting.sampling.step_s, setting.own_sd(value)
    floor_s = (sampling.grid_s if sampling.resolved else step_s) / (n * math.sqrt(6))
    timebase = _timebase(setting, value)
    if n == 1:
        return combine(value, "s", [*_single(setting, value), _grid(floor_s), timebase])
    edge_s2 = 2 * sampling.edge_u_s**2 if sampling.resolved else step_s**2 / 6
    if n >= _ENOUGH or sampling.resolved:
        u = math.sqrt(own_s**2 / n + edge_s2 / n ** (2 if n >= _FEW else 1))
        ways = [[_scatter(u, n - 1)]]
    else:
        ends_s2 = rounded_variance(n * value, step_s, 0.0) / n**2
        u = math.sqrt(_seen_variance(value, step_s, own_s, n, ends_s2) / n)
        ways = [_with_grid(u, n, floor_s, resolved=False)]
    if n >= _FEW and not sampling.resolved:
        ways.append(
            [_scatter(_on_a_line(n, own_s / step_s) * step_s / n, math.inf), _grid(floor_s)]
        )
    found = [combine(value, "s", [*terms, timebase], n=n) for terms in ways]
    return min(found, key=expanded)


def _on_a_line(n: int, own: float) -> float:
    """Return what may hide behind edges that lie near one line on the grid, in steps.

    Measuring allows for the more the further edges lie from the line, beyond the one step that the
    grid explains; how far that is follows from simulated records of 10 to 400 periods.
    """
    return math.hypot(2 * (1 + 8 / n) / math.sqrt(n), 3 * _off_line(n, own))


def _off_line(n: int, own: float) -> float:
    """Return how far edges lie from one line beyond the step that the grid explains, in steps."""
    return max(0.0, (math.sqrt(n) - 1) * own - 1.8 / math.sqrt(n))


def _duty(setting: Setting, high_s: float, period_s: float, n: int) -> Measured:
    sampling, step_s, duty = setting.sampling, setting.sampling.step_s, high_s / period_s
    level = Contribution(source="level", u=sampling.level_u_s / period_s, common=True)
    if n == 1:
        jitter = setting.single_rel * duty * (1 - duty) * math.sqrt(2)
        noise = sampling.edge_u_s * math.sqrt(1 + duty**2 + (1 - duty) ** 2) / period_s
        own = [
            Contribution(source="assumed jitter", u=jitter),
            Contribution(source="edge noise", u=noise),
            _grid(_single_grid(sampling) / period_s),
        ]
        return combine(duty, "1", [*own, level], n=n)
    own_s2 = setting.sd_rel**2 * period_s**2 * duty * (1 - duty)
    edge_s2 = sampling.edge_u_s**2 + (
        sampling.grid_s**2 / 12 if sampling.resolved or n >= _ENOUGH else step_s**2 / 12
    )
    floor = mean_width_grid(period_s, n, step_s, setting.own_sd(period_s)) / period_s
    if n >= _ENOUGH and not sampling.resolved:
        own = [_scatter(_seeming_duty(setting, high_s, period_s, n), n - 1), _grid(floor)]
    else:
        u = math.sqrt((own_s2 + _EDGES * edge_s2) / n) / period_s
        dof = n - 1 if n < _BATCHED else _BATCH_DOF
        missed = _with_grid(u, n, floor, resolved=sampling.resolved)[1]
        own = [_scatter(u, dof), missed if not sampling.resolved else _grid(0.0)]
    return combine(duty, "1", [*own, level], n=n)


def _seeming_duty(setting: Setting, high_s: float, period_s: float, n: int) -> float:
    """Return what the scatter of many cycles on a grid will seem to give the duty."""
    step_s, wander_s, duty = setting.sampling.step_s, setting.own_sd(period_s), high_s / period_s
    variances = [
        weight**2 * _seeming_variance(length_s, step_s, setting.own_sd(length_s), wander_s, n)
        for weight, length_s in ((1 - duty, high_s), (duty, period_s - high_s))
    ]
    return math.sqrt(math.fsum(variances) / n) / period_s
