"""What judging works with: derived limits, the limits of a stage, and concerns about a design."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.design import Derivation, Limit
from benchtool.model.quantity import Notice


@frozen_record
class DerivedLimit:
    """What the tolerances of a design allow one quantity to be.

    Attributes:
        quantity: Timing name.
        nominal: The quantity with every coordinate at its centre; None where the nominal
            circuit is stuck.
        lower, upper: The limits in ``unit``; None where a permitted combination of parts stops
            the circuit, so that no limit bounds the good boards on that side.
        unit: SI unit.
        method: How they were derived.
        warnings: What was met on the way.
    """

    quantity: str
    nominal: float | None
    lower: float | None
    upper: float | None
    unit: str
    method: Derivation
    warnings: tuple[Notice, ...] = ()


@frozen_record
class StageLimit:
    """One limit that a stage is judged by, given or derived.

    Attributes:
        quantity: Timing name.
        nominal: What the typical circuit gives, in ``unit``; None where there is none.
        lower, upper: In ``unit``; None where open.
        unit: SI unit; ``1`` with ``relative`` means a share of the measured mean period.
        source: Where the limit comes from.
        relative: Whether the limit is a share of the measured mean period (jitter only).
        warnings: What deriving it met on the way.
    """

    quantity: str
    nominal: float | None
    lower: float | None
    upper: float | None
    unit: str
    source: str
    relative: bool = False
    warnings: tuple[Notice, ...] = ()


@frozen_record
class LimitComparison:
    """One quantity's limits derived three ways, beside the limit that the design states.

    Attributes:
        quantity: Timing name.
        nominal: What the typical circuit gives, in ``unit``.
        unit: SI unit.
        derived: One limit a method; empty for jitter, which no tolerance determines.
        given: The limit that the design states, if any.
        used: ``given``, a method, or None where the quantity is not judged.
        lower, upper: The limits in use, or those of the design's method where none is in use.
        U: Expanded uncertainty to expect, in ``unit``; None where it was not stated.
        room: (upper - lower) / 2U: how many times the limits' half-width holds U; below 1 no
            result can pass a rule with guard 1. None without U or with an open side.
        warnings: What deriving met on the way, each code once.
    """

    quantity: str
    nominal: float | None
    unit: str
    derived: tuple[DerivedLimit, ...]
    given: Limit | None
    used: Literal["given", "worst-case", "rss", "monte-carlo"] | None
    lower: float | None
    upper: float | None
    U: float | None = None
    room: float | None = None
    warnings: tuple[Notice, ...] = ()


@frozen_record
class Concern:
    """Something in a design that reads well and cannot work well.

    Attributes:
        severity: ``error`` where a good board cannot pass, else ``warning``.
        key: Where it stands in the design file, such as ``stage.spacing.C``.
        text: What is wrong, with its figures, one sentence.
        hint: What to do, one sentence.
    """

    severity: Literal["error", "warning"]
    key: str
    text: str
    hint: str
