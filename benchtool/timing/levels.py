"""State levels of a waveform and the reference levels between them (IEEE 181)."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.model.arrays import quantile
from benchtool.model.capture import Waveform
from benchtool.model.quantity import Notice
from benchtool.model.timing import Levels
from benchtool.timing.kinds import LEAST_CODES, is_two_state, kind_without_states
from benchtool.timing.onelevel import one_level
from benchtool.timing.pieces import walk_pieces
from benchtool.timing.plateaus import (
    Plateau,
    Stretches,
    curved_noise,
    find_plateau,
    local_noise,
    values_beyond,
    whole_runs,
)
from benchtool.timing.survey import Survey, exceeds, survey_samples, widen
from benchtool.timing.tally import Tally

_BINS = 256
_REFERENCE = 0.2  # lower reference at 20 %, upper at 80 % of the amplitude
_INDEPENDENT = 0.7  # of the samples of a state: the same noise chose where its stretches end
_REMAINING = 2.0  # of an exponential seen to settle over a seventh of a state, still to come
_MOST_SPIKES = 0.03  # of the samples
_SPIKE_SAMPLES = 3  # that a spike lasts, in the mean
_LEAST_WAVE = 0.1  # of the range with the spikes
_INWARDS = 0.4  # as far as a wandering state may push a reference level


def find_levels(waveform: Waveform, *, level_v: float | None = None) -> Levels:
    """Find the state levels of a waveform; of a long one all samples are walked once.

    Args:
        waveform: The trace; missing samples are left out.
        level_v: Mid reference level in volts where the user sets it; else half way.

    Returns:
        Levels of kind two-state, flat, noise or node; a node's levels are the ends of its range.

    Raises:
        MeasurementError: If no sample is present (``no-samples``), or if ``level_v`` lies
            outside the two states (``level-outside``).

    References:
        IEEE 181-2011, state levels by the modes of the two halves of the histogram, reference
        levels in percent of the amplitude (clause 5.2, number from memory).
    """
    survey = survey_samples(waveform)
    n_missing = _length(waveform) - survey.values.size
    if not survey.is_whole:
        tally = Tally()
        for _ in walk_pieces(waveform, tally):
            pass
        n_missing = tally.n_missing
        if exceeds(waveform, survey, tally):
            survey = widen(waveform, survey, tally)
    levels = tell_missing(waveform, levels_of(waveform, survey), n_missing)
    return levels if level_v is None else _at_level(levels, level_v)


def levels_of(waveform: Waveform, survey: Survey) -> Levels:
    """Return the levels of a surveyed waveform.

    Raises:
        MeasurementError: If no sample is present (``no-samples``).
    """
    if not survey.runs:
        raise MeasurementError(
            f"{waveform.channel} holds no sample: all values are missing",
            hint="Choose another trace with --channel; `benchtool look FILE` lists them.",
            code="no-samples",
        )
    return _decide(waveform, survey)


def tell_missing(waveform: Waveform, levels: Levels, n_missing: int) -> Levels:
    """Return the levels with a warning where samples are missing."""
    if not n_missing:
        return levels
    text = f"{n_missing} of {_length(waveform)} samples are missing and were left out"
    notice = Notice(code="missing-samples", text=text)
    return replace(levels, warnings=(*levels.warnings, notice))


def _length(waveform: Waveform) -> int:
    return sum(span.stop - span.start for span in waveform.spans)


def _decide(waveform: Waveform, survey: Survey) -> Levels:
    if survey.greatest == survey.least:
        return one_level("flat", survey, noise_v=0.0)
    if waveform.is_logic:
        return _logic_levels()
    levels = _two_levels(survey)
    if is_two_state(survey, levels):
        return _behind_spikes(survey, levels) or levels
    runs = whole_runs(survey.runs)
    noise_v = min(local_noise(runs), curved_noise(runs))
    return one_level(kind_without_states(survey, noise_v), survey, noise_v=noise_v)


def _behind_spikes(survey: Survey, levels: Levels) -> Levels | None:
    """Return the levels of a wave whose spikes were taken for a state, None where none were.

    Spikes are few and short, and without them a wave is left; behind the narrow pulses of a real
    state there is only the noise of the other.
    """
    beyond = [run > levels.mid_v for run in survey.runs]
    if 2 * sum(int(run.sum()) for run in beyond) > survey.values.size:
        beyond = [~run for run in beyond]
    n = sum(int(run.sum()) for run in beyond)
    n_visits = sum(int(run[0]) + int(np.count_nonzero(run[1:] > run[:-1])) for run in beyond)
    if n > _MOST_SPIKES * survey.values.size or n > _SPIKE_SAMPLES * n_visits:
        return None
    kept = tuple(run[~far] for run, far in zip(survey.runs, beyond, strict=True) if not far.all())
    rest = survey.of_runs(kept)
    if rest.greatest - rest.least < _LEAST_WAVE * (survey.greatest - survey.least):
        return None
    within = _two_levels(rest)
    return (_behind_spikes(rest, within) or within) if is_two_state(rest, within) else None


def _two_levels(survey: Survey) -> Levels:
    modes = _modes(survey)
    spacing = modes[1] - modes[0]
    runs = whole_runs(survey.runs)
    resting = [find_plateau(runs, mode, spacing * _REFERENCE) for mode in modes]
    noise_v = local_noise(*(plateau.stretches for plateau in resting))
    states = [
        _state(plateau, mode, noise_v, survey.step_v, spacing / _BINS)
        for plateau, mode in zip(resting, modes, strict=True)
    ]
    (low_v, u_low_v), (high_v, u_high_v) = states
    lower, upper = _references(runs, low_v, high_v, noise_v)
    clipped = _is_clipped(survey)
    return Levels(
        kind="two-state",
        low_v=low_v,
        high_v=high_v,
        u_low_v=u_low_v,
        u_high_v=u_high_v,
        noise_v=noise_v,
        lower_v=lower,
        mid_v=(low_v + high_v) / 2,
        upper_v=upper,
        step_v=survey.step_v,
        clipped=clipped,
        warnings=_clipping(survey) if clipped else (),
    )


def _state(
    plateau: Plateau, mode_v: float, noise_v: float, step_v: float, bin_v: float
) -> tuple[float, float]:
    """Return a state level and its standard uncertainty.

    The samples around the mode are averaged, since bins and codes resolve too little. Noise
    dithers the codes: the error of the mean of rounded samples falls with exp(-2π²σ²/LSB²),
    the first harmonic of the rounding error. A state that still settles has more of that to go.
    """
    values, level = plateau.settled, mode_v
    reach = max(4 * noise_v, 1.01 * step_v, bin_v)
    near = values
    for _ in range(3):
        near = values[np.abs(values - level) <= reach]
        if near.size == 0:
            break
        level = float(np.mean(near))
    rounding = step_v / math.sqrt(12) * dither(noise_v, step_v)
    settling = _REMAINING * plateau.settling_v
    noise = noise_v / math.sqrt(max(1.0, _INDEPENDENT * near.size))
    return level, math.sqrt(noise**2 + rounding**2 + settling**2)


def dither(noise_v: float, step_v: float) -> float:
    """Return how much of the rounding error of a mean is left under noise, between 0 and 1."""
    if not step_v:
        return 0.0
    own = max(0.0, (noise_v / step_v) ** 2 - 1 / 12)
    return math.exp(-2 * math.pi**2 * own)


def _modes(survey: Survey) -> tuple[float, float]:
    """Return the mode of each half of the histogram between the extremes."""
    span = survey.greatest - survey.least
    bins = _BINS
    if survey.step_v:
        bins = int(min(bins, max(2, round(span / survey.step_v) + 1)))
    margin = span / (bins - 1) / 2 if survey.step_v and bins < _BINS else 0.0
    edge = np.linspace(survey.least - margin, survey.greatest + margin, bins + 1)
    count = np.diff(survey.ordered.searchsorted(edge[:-1]), append=survey.ordered.size)
    centre = (edge[1:] + edge[:-1]) / 2
    half = bins // 2
    low = centre[int(np.argmax(count[:half]))]
    return float(low), float(centre[half + int(np.argmax(count[half:]))])


def _references(
    runs: Stretches, low_v: float, high_v: float, noise_v: float
) -> tuple[float, float]:
    """Return the reference levels, drawn inwards where a state wanders away from its mode.

    Eight standard deviations of noise stay between them, so that no edge counts twice.
    """
    amplitude = high_v - low_v
    most = float(np.clip(0.5 - 4 * noise_v / amplitude, _REFERENCE, _INWARDS))
    middle = (low_v + high_v) / 2
    below, above = (values_beyond(runs, middle, above=side) for side in (False, True))
    wander_low = quantile(below, 0.9) if below.size else low_v
    wander_high = quantile(above, 0.1) if above.size else high_v
    lower = low_v + amplitude * float(
        np.clip((wander_low - low_v) / amplitude + 0.05, _REFERENCE, most)
    )
    upper = high_v - amplitude * float(
        np.clip((high_v - wander_high) / amplitude + 0.05, _REFERENCE, most)
    )
    return lower, upper


def _logic_levels() -> Levels:
    return Levels(
        kind="two-state",
        low_v=0.0,
        high_v=1.0,
        u_low_v=0.0,
        u_high_v=0.0,
        noise_v=0.0,
        lower_v=0.4,
        mid_v=0.5,
        upper_v=0.6,
        step_v=1.0,
    )


def _is_clipped(survey: Survey) -> bool:
    """Tell whether samples sit at an end of the code range; a plain 0/1 trace is not clipped."""
    if survey.code_low_v is None or survey.code_high_v is None:
        return False
    many_codes = survey.greatest - survey.least > LEAST_CODES * survey.step_v
    return many_codes and (
        survey.least <= survey.code_low_v or survey.greatest >= survey.code_high_v
    )


def _clipping(survey: Survey) -> tuple[Notice, ...]:
    text = (
        f"samples sit at the end of the code range ({survey.least:.4g} V to "
        f"{survey.greatest:.4g} V): levels may lie beyond"
    )
    return (Notice(code="clipped", text=text),)


def _at_level(levels: Levels, level_v: float) -> Levels:
    """Move the mid level, and the references in proportion."""
    if levels.kind != "two-state":
        return levels
    if not levels.low_v < level_v < levels.high_v:
        raise MeasurementError(
            f"the level {level_v:g} V does not lie between the states {levels.low_v:.4g} V "
            f"and {levels.high_v:.4g} V",
            hint="Leave --level out, or give one between the two states.",
            code="level-outside",
        )
    below = (levels.lower_v - levels.low_v) / (levels.mid_v - levels.low_v)
    above = (levels.high_v - levels.upper_v) / (levels.high_v - levels.mid_v)
    return replace(
        levels,
        lower_v=levels.low_v + below * (level_v - levels.low_v),
        mid_v=level_v,
        upper_v=levels.high_v - above * (levels.high_v - level_v),
    )
