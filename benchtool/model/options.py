"""What the user overrules about a measurement."""

from __future__ import annotations

from dataclasses import field
from typing import TYPE_CHECKING, Literal

from benchtool.frozen import frozen_record
from benchtool.model.capture import ReadOptions

if TYPE_CHECKING:
    from benchtool.model.design import Probe
    from benchtool.model.kit import KitInstrument
    from benchtool.model.window import Window

TIMEBASE_REL = 50e-6
"""Half-width of a timebase of which nothing is known: common practice for crystals."""

JITTER_REL = 1e-3
"""Half-width of the jitter assumed where one interval is all there is and nothing is stated."""


@frozen_record
class MeasureOptions:
    """What the user overrules about a measurement; None leaves it to the design or the default.

    Attributes:
        active: ``high`` or ``low``: which state starts a cycle.
        level_v: Mid reference level in volts.
        timebase_rel: Half-width of the timebase error, relative (50 ppm is 50e-6).
        jitter_rel: Assumed jitter of one interval, relative half-width.
        temperature_c: Temperature of the board in degrees Celsius.
        probe: The probe's load.
        read: What is overruled about the file's structure.
        window: The part of the record to measure.
        instrument: The instrument of the user's kit that recorded it.
    """

    active: Literal["high", "low"] | None = None
    level_v: float | None = None
    timebase_rel: float | None = None
    jitter_rel: float | None = None
    temperature_c: float | None = None
    probe: Probe | None = None
    read: ReadOptions = field(default_factory=ReadOptions)
    window: Window | None = None
    instrument: KitInstrument | None = None
