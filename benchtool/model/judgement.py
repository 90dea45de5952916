"""What is concluded from the figures: parts, checks against limits, changes."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Measured, Notice, Quantity

VerdictName = Literal[
    "pass", "conditional-pass", "conditional-fail", "undecided", "fail", "unusable"
]

WORST_FIRST: tuple[VerdictName, ...] = (
    "fail",
    "unusable",
    "undecided",
    "conditional-fail",
    "conditional-pass",
    "pass",
)
"""Verdicts in the order in which one outweighs another."""


@frozen_record
class PartEstimate:
    """A part value under a stated assumption.

    Attributes:
        ref: RA, RB, R or C.
        nominal: Design value in SI units, None where there is no design.
        estimate: The value that the times give, under ``assumes``.
        change: Relative change against nominal, unit 1.
        assumes: What was taken as known, in words.
        within_tolerance: True or False where the interval decides, else None.
    """

    ref: str
    nominal: float | None
    estimate: Measured | None
    change: Measured | None
    assumes: tuple[str, ...]
    within_tolerance: bool | None


@frozen_record
class Solution:
    """What the times say of the circuit: products of the parts alone, and the effective ones.

    ``tau_charge`` is (RA+RB)·C and ``tau_discharge`` RB·C for the astable; RA·C and RB·C with a
    steering diode; R·C both for the topologies with one resistor.
    """

    topology: str
    tau_charge: Measured | None = None
    tau_discharge: Measured | None = None
    tau_RA: Measured | None = None
    tau_ratio: Measured | None = None
    effective_charge: Measured | None = None
    effective_discharge: Measured | None = None
    parts: tuple[PartEstimate, ...] = ()
    warnings: tuple[Notice, ...] = ()


@frozen_record
class Check:
    """One quantity held against its limits.

    ``accept_lower`` and ``accept_upper`` are the limits drawn in by the guard band; both None
    where nothing is left between them. ``reason`` is one sentence; ``warnings`` concern this
    check alone.
    """

    quantity: str
    measured: Quantity | None
    lower: float | None
    upper: float | None
    unit: str
    accept_lower: float | None
    accept_upper: float | None
    source: str
    p_conform: float | None
    verdict: VerdictName
    reason: str
    nominal: float | None = None
    warnings: tuple[Notice, ...] = ()


@frozen_record
class Change:
    """How a quantity changed since the baseline: relative, unit 1, with its uncertainty."""

    quantity: str
    before: Measured
    change: Measured
    significant: bool
