"""Where inside its transition an edge lies: midpoint, interpolation or fit, and how surely."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, middle
from benchtool.model.capture import StampedTime, Waveform
from benchtool.model.timing import Levels
from benchtool.timing.crossings import Crossings
from benchtool.timing.cutouts import Window, cut_windows
from benchtool.timing.fits import Ramped, fit_edges, fit_ramps
from benchtool.timing.levels import dither
from benchtool.timing.pieces import Index
from benchtool.timing.thresholds import Thresholds

_RAMP_FROM = 1.75  # samples of a whole edge from which its straightness is told
_FIT_FROM = 4.0  # samples between the references from which a fit beats two points
_FIT_SHARE = 0.45  # half-width of the fit, of the samples between the references
_ALIKE = 0.3  # relative difference of lengths that few edges leave uncertain
_GRID_SHARE = 0.23  # rms error of two points on an exponential edge: Ts/√12 · 0.23/samples


@frozen_record(eq=False)
class JoinedCrossings:
    """The crossings of all runs in one row; fields as in :class:`Crossings`."""

    index: Index
    rising: BoolArray
    before: FloatArray
    after: FloatArray
    before_s: FloatArray
    after_s: FloatArray


@frozen_record(eq=False)
class Placement:
    """Edge times with what they are worth; fields as in :class:`Edges`."""

    times_s: FloatArray
    u_s: FloatArray
    resolved: bool
    grid_s: float
    level_u_s: float


@frozen_record(eq=False)
class _Direction:
    """The edges of one direction.

    ``per_code_s`` is the time that one sample unit of level error shifts an edge by;
    ``share`` the part of the grid's error that interpolation leaves; ``codes`` how many codes
    average the rounding; ``lag_s`` how late two points place an exponential edge.
    """

    times_s: FloatArray
    u_s: FloatArray
    share: float
    per_code_s: float
    codes: float
    lag_s: float


def join_runs(runs: Sequence[Crossings]) -> JoinedCrossings:
    """Return the crossings of all runs as one."""
    if len(runs) == 1:
        (run,) = runs
        return JoinedCrossings(
            index=run.index,
            rising=run.rising,
            before=run.before,
            after=run.after,
            before_s=run.before_s,
            after_s=run.after_s,
        )
    return JoinedCrossings(
        index=np.concatenate([run.index for run in runs]),
        rising=np.concatenate([run.rising for run in runs]),
        before=np.concatenate([run.before for run in runs]),
        after=np.concatenate([run.after for run in runs]),
        before_s=np.concatenate([run.before_s for run in runs]),
        after_s=np.concatenate([run.after_s for run in runs]),
    )


def place_edges(
    trace: Waveform,
    levels: Levels,
    limits: Thresholds,
    crossings: JoinedCrossings,
    lengths: tuple[float, float],
    step_s: float,
    *,
    holed: bool,
) -> Placement:
    """Place each edge in time.

    Args:
        trace: The waveform.
        levels: Its levels.
        limits: The reference levels in codes.
        crossings: One crossing an edge.
        lengths: Typical samples strictly between the references, rising and falling.
        step_s: Sample interval in seconds.
        holed: Whether samples of the waveform are missing.
    """
    gain = abs(trace.scale.gain)
    setting = _Setting(
        trace=trace,
        holed=holed,
        limits=limits,
        amplitude=(levels.high_v - levels.low_v) / gain,
        noise=max(levels.noise_v, levels.step_v / math.sqrt(12)) / gain,
        code=levels.step_v / gain,
        step_s=step_s,
    )
    times_s, u_s, placed = _place_both(setting, crossings, lengths)
    resolution_s = trace.time.resolution_s if isinstance(trace.time, StampedTime) else 0.0
    share = math.sqrt(sum(part.share**2 for part in placed) / max(1, len(placed)))
    return Placement(
        times_s=_in_order(times_s),
        u_s=np.hypot(u_s, resolution_s / math.sqrt(12)) if resolution_s else u_s,
        resolved=any(part.share < 1 for part in placed),
        grid_s=math.hypot(share * step_s, resolution_s),
        level_u_s=_level_error(levels, gain, placed),
    )


@frozen_record(eq=False)
class _Setting:
    """What all edges of a trace share; amplitude, noise and code step in stored units."""

    trace: Waveform
    holed: bool
    limits: Thresholds
    amplitude: float
    noise: float
    code: float
    step_s: float

    def codes(self, reach: float) -> float:
        """Return over how many codes the rounding error averages."""
        return max(1.0, reach / self.code) if self.code else 1.0

    def windows(self, index: Index, half: int) -> Iterator[Window]:
        """Return the samples around edges."""
        return cut_windows(self.trace, index, half, holed=self.holed)


def _place_both(
    setting: _Setting, crossings: JoinedCrossings, lengths: tuple[float, float]
) -> tuple[FloatArray, FloatArray, list[_Direction]]:
    """Place the edges of both directions; return also what those of each have in common."""
    times_s, u_s = np.zeros(crossings.index.size), np.zeros(crossings.index.size)
    placed: list[_Direction] = []
    for rising, length in zip((True, False), lengths, strict=True):
        chosen = _of_direction(crossings.rising, rising)
        if crossings.rising[chosen].size:
            part = _place(setting, crossings, chosen, length)
            times_s[chosen], u_s[chosen] = part.times_s, part.u_s
            placed.append(part)
    return times_s, u_s, placed


def _of_direction(rising: BoolArray, direction: bool) -> Index | slice:
    """Return which edges go one way: every second, unless a new run breaks the turns."""
    if not rising.size or (rising[1:] == rising[:-1]).any():
        return np.flatnonzero(rising == direction)
    return slice(int(rising[0] != direction), None, 2)


def _place(
    setting: _Setting, crossings: JoinedCrossings, chosen: Index | slice, length: float
) -> _Direction:
    before, after = crossings.before[chosen], crossings.after[chosen]
    before_s, after_s = crossings.before_s[chosen], crossings.after_s[chosen]
    between = _inside(before, setting.limits) | _inside(after, setting.limits)
    if np.mean(between) <= 0.5:
        return _halfway(before_s, after_s)
    part = (setting.limits.mid - before) / (after - before)
    rough_s = before_s + part * (after_s - before_s)
    whole = setting.amplitude / middle(np.abs(after - before))
    if length >= _FIT_FROM:
        whole = length * setting.amplitude / (setting.limits.upper - setting.limits.lower)
    ramps = _on_ramps(setting, crossings.index[chosen], rough_s, after_s, whole)
    if ramps is not None:
        return ramps
    if length >= _FIT_FROM:
        return _fitted(setting, crossings.index[chosen], rough_s, after_s, length)
    slew = middle(np.abs(after - before) / (after_s - before_s))
    return _Direction(
        times_s=rough_s,
        u_s=setting.noise / slew * np.sqrt((1 - part) ** 2 + part**2),
        share=min(1.0, _GRID_SHARE / max(length, 0.2)),
        per_code_s=1 / slew,
        codes=setting.codes(slew * setting.step_s),
        lag_s=0.08 * setting.step_s * min(1.0, 1.4 / max(length, 0.2)),
    )


def _halfway(before_s: FloatArray, after_s: FloatArray) -> _Direction:
    """Place edges that no sample lies on half way between the two samples."""
    return _Direction(
        times_s=(before_s + after_s) / 2,
        u_s=np.zeros(before_s.size),
        share=1.0,
        per_code_s=0.0,
        codes=1.0,
        lag_s=0.0,
    )


def _on_ramps(
    setting: _Setting, index: Index, rough_s: FloatArray, after_s: FloatArray, whole: float
) -> _Direction | None:
    """Place straight edges by all of their ``whole`` samples, None if not shown straight."""
    if whole < _RAMP_FROM:
        return None
    known = Ramped(mid=setting.limits.mid, amplitude=setting.amplitude, noise=setting.noise)
    half = math.ceil(whole / 2) + 1
    fit = fit_ramps(setting.windows(index, half), rough_s - after_s, known)
    if fit is None:
        return None
    times_s, u_s = rough_s.copy(), setting.noise * fit.per_noise_s * np.ones(index.size)
    good = np.isfinite(fit.shift_s)
    times_s[good] = (after_s + fit.shift_s)[good]
    return _Direction(
        times_s=times_s,
        u_s=u_s,
        share=0.0,
        per_code_s=1 / fit.slew,
        codes=setting.codes(setting.amplitude),
        lag_s=0.0,
    )


def _fitted(
    setting: _Setting, index: Index, rough_s: FloatArray, after_s: FloatArray, length: float
) -> _Direction:
    """Place edges by a fit, those without one by the interpolation between two samples."""
    half = max(2, round(_FIT_SHARE * length))
    limits = setting.limits
    windows = setting.windows(index, half)
    fit = fit_edges(windows, index.size, limits.mid, half, setting.noise)
    slew = fit.slew if fit else (limits.upper - limits.lower) / ((length + 1) * setting.step_s)
    times_s, u_s = rough_s.copy(), np.full(index.size, setting.noise / slew)
    if fit:
        good = np.isfinite(fit.shift_s)
        times_s[good] = (after_s + fit.shift_s)[good]
        u_s[good] = setting.noise * fit.per_noise_s
    return _Direction(
        times_s=times_s,
        u_s=u_s,
        share=0.0,
        per_code_s=1 / slew,
        codes=setting.codes(slew * 2 * half * setting.step_s),
        lag_s=0.0,
    )


def _inside(values: FloatArray, limits: Thresholds) -> BoolArray:
    return (values > limits.lower) & (values < limits.upper)


def _level_error(levels: Levels, gain: float, placed: Sequence[_Direction]) -> float:
    """Return the uncertainty that level, code and edge shape give a width, in seconds.

    A level that is too high lets rising edges come late and falling ones early, so its error
    adds over both edges; the lag of two points on a curved edge cancels where both are alike.
    """
    own_level = math.isclose(levels.mid_v, (levels.low_v + levels.high_v) / 2, rel_tol=1e-9)
    u_mid = math.hypot(levels.u_low_v, levels.u_high_v) / 2 / gain if own_level else 0.0
    rounding = levels.step_v / math.sqrt(12) / gain * dither(levels.noise_v, levels.step_v)
    level = u_mid * sum(part.per_code_s for part in placed)
    codes = math.hypot(*(rounding * part.per_code_s / math.sqrt(part.codes) for part in placed))
    return math.sqrt(level**2 + codes**2 + _unlike_lag(placed) ** 2)


def _unlike_lag(placed: Sequence[_Direction]) -> float:
    """Return what is left of the lags where rising and falling edges are of unlike length."""
    lags = [part.lag_s for part in placed]
    if len(lags) < 2 or abs(lags[0] - lags[1]) < _ALIKE * max(lags):
        return 0.0
    return abs(lags[0] - lags[1]) / math.sqrt(3)


def _in_order(times_s: FloatArray) -> FloatArray:
    """Keep the order of edges that fits may have moved past each other."""
    moved = bool((times_s[1:] < times_s[:-1]).any())
    return np.maximum.accumulate(times_s) if moved else times_s
