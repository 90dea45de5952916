"""What kind of trace it is: two states, flat, noise, or a capacitor node."""

from __future__ import annotations

import numpy as np

from benchtool.model.timing import LevelKind, Levels
from benchtool.timing.survey import Survey

_LEAST_SPACING = 0.35  # of the range
_LEAST_SNR = 6.0
_OUTER, _MOST_BETWEEN = 0.2, 0.30
_INNER, _MOST_STEEP = 0.4, 0.05  # a state may wander far, as long as edges between are steep
_MOST_TOGGLING = 0.30  # transitions per sample, where two adjacent codes are all there is
_CLOSE, _LEAST_AT_REST = 0.05, 0.4  # a wave with slow edges still rests in its states
_LEAST_BARE_V = 1.0  # two values this far apart, of unknown step, are no neighbouring codes
LEAST_CODES = 3.5


def is_two_state(survey: Survey, levels: Levels) -> bool:
    """Tell whether two levels exist: well apart, and with few samples between them.

    Args:
        survey: The samples that the levels were found in.
        levels: The candidate levels.
    """
    spacing = levels.high_v - levels.low_v
    if _has_two_values(survey):
        least_v = LEAST_CODES * survey.step_v if survey.step_v else _LEAST_BARE_V
        return spacing > least_v or _is_wave(survey)
    between = _share_between(survey, levels, _OUTER) + _share_beyond(survey, levels)
    steep = _share_between(survey, levels, _INNER) <= _MOST_STEEP
    return bool(
        spacing >= _LEAST_SPACING * (survey.greatest - survey.least)
        and spacing >= _LEAST_SNR * levels.noise_v
        and spacing >= LEAST_CODES * survey.step_v
        and (between <= _MOST_BETWEEN or steep or _share_at_rest(survey, levels) >= _LEAST_AT_REST)
    )


def _has_two_values(survey: Survey) -> bool:
    first, last = survey.ordered[0], survey.ordered[-1]
    until, since = survey.ordered.searchsorted(first, "right"), survey.ordered.searchsorted(last)
    return bool(first != last and until == since)


def _share_at_rest(survey: Survey, levels: Levels) -> float:
    """Return the share of samples that lie close to a state.

    It is a tenth for a capacitor node and 0.29 for a sine.
    """
    spacing = levels.high_v - levels.low_v
    margin = max(_CLOSE * spacing, min(3 * levels.noise_v, 3 * _CLOSE * spacing))
    away = np.minimum(np.abs(survey.values - levels.low_v), np.abs(survey.values - levels.high_v))
    return float(np.mean(away <= margin))


def _share_beyond(survey: Survey, levels: Levels) -> float:
    """Return the share of samples that lie clear outside both states."""
    margin = _OUTER * (levels.high_v - levels.low_v)
    below = survey.ordered.searchsorted(levels.low_v - margin)
    above = survey.ordered.size - survey.ordered.searchsorted(levels.high_v + margin, "right")
    return float(below + above) / survey.ordered.size


def _share_between(survey: Survey, levels: Levels, fraction: float) -> float:
    """Return the share of samples further than a fraction of the amplitude from both states."""
    margin = fraction * (levels.high_v - levels.low_v)
    return survey.share_between(levels.low_v + margin, levels.high_v - margin)


def _is_wave(survey: Survey) -> bool:
    """Tell a wave from a code that toggles: a wave changes rarely."""
    middle = (survey.least + survey.greatest) / 2
    changes = sum(int(np.count_nonzero(np.diff(run > middle))) for run in survey.runs)
    return changes < _MOST_TOGGLING * sum(run.size for run in survey.runs)


def kind_without_states(survey: Survey, noise_v: float) -> LevelKind:
    """Tell a capacitor node from a flat trace and from noise.

    Args:
        survey: The samples.
        noise_v: Noise of neighbouring samples.
    """
    spread = float(np.std(survey.values))
    swing = survey.at_share(0.98) - survey.at_share(0.02)
    smooth = swing >= 3 * _LEAST_SNR * noise_v and swing >= 8 * survey.step_v
    if smooth and not _is_sinusoid(survey):
        return "node"
    level = abs(survey.at_share(0.5))
    steady = spread <= 0.1 * level or spread <= max(0.05, 2 * survey.step_v)
    return "flat" if steady else "noise"


def _is_sinusoid(survey: Survey) -> bool:
    """Tell a sine by its histogram: its ends hold over twice as many samples as its middle.

    An exponential between a third and two thirds of its drive holds 1.125 times as many.
    """
    low, high = survey.at_share(0.005), survey.at_share(0.995)
    edge = np.linspace(low, high, 11)
    until = [*survey.ordered.searchsorted(edge[:-1]), survey.ordered.searchsorted(high, "right")]
    count = np.diff(until)
    middle = max(1.0, float(count[4:6].mean()))
    return bool(min(count[0], count[-1]) > 2.2 * middle)
