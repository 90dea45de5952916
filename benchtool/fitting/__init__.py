"""Fitting curves to observations, and the uncertainty that their noise leaves."""

from benchtool.fitting.least_squares import Fit, fit_curve
from benchtool.fitting.noise import Noise, judge_noise

__all__ = ["Fit", "Noise", "fit_curve", "judge_noise"]
