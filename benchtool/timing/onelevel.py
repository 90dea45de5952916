"""Levels of a waveform that has no two states."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.timing import LevelKind, Levels
from benchtool.timing.survey import Survey


def one_level(kind: LevelKind, survey: Survey, *, noise_v: float) -> Levels:
    """Return the mean as both levels, and of a capacitor node the ends of its range.

    Args:
        kind: What the trace is.
        survey: Its samples.
        noise_v: Noise of neighbouring samples.
    """
    if kind == "node":
        return _node_levels(survey, noise_v)
    mean = float(np.mean(survey.values))
    u = math.hypot(noise_v / math.sqrt(survey.values.size), survey.step_v / math.sqrt(12))
    return Levels(
        kind=kind,
        low_v=mean,
        high_v=mean,
        u_low_v=u,
        u_high_v=u,
        noise_v=float(np.std(survey.values)) if kind == "noise" else noise_v,
        lower_v=mean,
        mid_v=mean,
        upper_v=mean,
        step_v=survey.step_v,
    )


def _node_levels(survey: Survey, noise_v: float) -> Levels:
    low_v, high_v = (survey.at_share(share) for share in (0.005, 0.995))
    swing = high_v - low_v
    u = math.hypot(noise_v, survey.step_v / math.sqrt(12))
    return Levels(
        kind="node",
        low_v=low_v,
        high_v=high_v,
        u_low_v=u,
        u_high_v=u,
        noise_v=noise_v,
        lower_v=low_v + 0.3 * swing,
        mid_v=(low_v + high_v) / 2,
        upper_v=high_v - 0.3 * swing,
        step_v=survey.step_v,
    )
