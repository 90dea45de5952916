"""Synthetic captures with exact truth: a circuit, a fault and an acquisition."""

from benchtool.simulation.acquisition import NAMES, Acquisition, CaptureKind, Ripple
from benchtool.simulation.simulating import HEALTHY, Injected, simulate, simulate_stage
from benchtool.simulation.truth import Truth, read_truth

__all__ = [
    "HEALTHY",
    "NAMES",
    "Acquisition",
    "CaptureKind",
    "Injected",
    "Ripple",
    "Truth",
    "read_truth",
    "simulate",
    "simulate_stage",
]
