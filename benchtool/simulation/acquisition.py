"""How a simulated capture is taken: rate, span, range, noise, bandwidth and their like."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import field
from types import MappingProxyType
from typing import Literal

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Role

CaptureKind = Literal["waveform", "sampled-logic", "logic"]

NAMES: Mapping[Role, str] = MappingProxyType(
    {"output": "OUT", "capacitor": "NODE", "supply": "VCC", "trigger": "TRIG"}
)
"""What the traces are called unless the acquisition says otherwise."""


@frozen_record
class Ripple:
    """A sine on the supply: V(t) = V·(1 + depth_rel·sin(2π·frequency_hz·t + phase)).

    Both thresholds and the high output follow the supply at once, as a divider's do; the timing
    node sees the ripple through its own time constant. The phase is drawn at random.

    Attributes:
        depth_rel: Amplitude as a share of the supply, 0 to below 1.
        frequency_hz: Frequency, greater than 0.
    """

    depth_rel: float
    frequency_hz: float

    def __post_init__(self) -> None:
        if not 0 <= self.depth_rel < 1:
            raise UsageError(
                f"a ripple of {self.depth_rel} of the supply cannot be",
                hint="Give the amplitude as a share of the supply from 0 to below 1.",
            )
        if not (math.isfinite(self.frequency_hz) and self.frequency_hz > 0):
            raise UsageError(
                f"a ripple needs a frequency above 0, got {self.frequency_hz}",
                hint="Give its frequency in hertz.",
            )


@frozen_record
class Acquisition:
    """How a simulated capture is taken.

    Attributes:
        rate_hz: Samples a second; for ``logic`` ticks a second.
        duration_s: Length of the record by the instrument's clock; or
        periods: the same in nominal periods (repetitions of the trigger, delays) of the circuit.
        kind: Samples in volts or codes, samples of 0 and 1, or transitions alone.
        bits: Resolution of the converter; None gives volts without steps.
        full_scale_v: Lowest and highest volts of the converter; None leaves an eighth of the
            supply of room on either side.
        noise_v: Standard deviation of the noise on each sample, volts.
        bandwidth_hz: One-pole bandwidth of output, supply and trigger; None for square edges.
        timebase_rel: Relative error of the instrument's clock: it shows
            (1 + timebase_rel) seconds for each true second.
        offset_v: Added to every trace, volts.
        start_up: Whether the supply is switched on inside the record.
        power_up_s: When it is; None puts it after a twentieth of the record.
        record: Which traces to record, by role.
        names: Channel names by role where they differ from ``NAMES``.
        jitter_rel: Standard deviation of a period, relative; independent from cycle to cycle, so
            that the variance of an edge's time grows with its number.
        ripple: Ripple on the supply.
        trigger_every_s: Repetition of the trigger of a one-shot; None takes twice its pulse.
        trigger_width_s: Length of the low trigger pulse; None takes a twentieth of the pulse.
    """

    rate_hz: float
    duration_s: float | None = None
    periods: float | None = None
    kind: CaptureKind = "waveform"
    bits: int | None = None
    full_scale_v: tuple[float, float] | None = None
    noise_v: float = 0.0
    bandwidth_hz: float | None = None
    timebase_rel: float = 0.0
    offset_v: float = 0.0
    start_up: bool = False
    power_up_s: float | None = None
    record: tuple[Role, ...] = ("output",)
    names: Mapping[Role, str] = field(default_factory=lambda: NAMES)
    jitter_rel: float = 0.0
    ripple: Ripple | None = None
    trigger_every_s: float | None = None
    trigger_width_s: float | None = None

    def __post_init__(self) -> None:
        self._refuse_no_length()
        for name in ("rate_hz", "duration_s", "periods", "bandwidth_hz", "trigger_every_s"):
            _refuse_not_above_zero(name, getattr(self, name))
        for name in ("noise_v", "jitter_rel", "power_up_s", "trigger_width_s"):
            _refuse_below_zero(name, getattr(self, name))
        if self.bits is not None and not 2 <= self.bits <= 24:
            raise UsageError(
                f"a converter of {self.bits} bits cannot be simulated", hint="Give 2 to 24 bits."
            )
        if not self.timebase_rel > -1:
            raise UsageError(
                f"a clock cannot be wrong by {self.timebase_rel}",
                hint="Give the relative error of the timebase, such as 50e-6.",
            )
        if not self.record or not set(self.record) <= set(NAMES):
            raise UsageError(
                f"cannot record {', '.join(self.record) or 'nothing'}",
                hint=f"Choose from {', '.join(NAMES)}.",
            )

    def _refuse_no_length(self) -> None:
        if (self.duration_s is None) == (self.periods is None):
            raise UsageError(
                "an acquisition needs either a duration or a number of periods",
                hint="Give one of the two.",
            )

    def channel(self, role: Role) -> str:
        """Return the name of the trace of ``role``."""
        return self.names.get(role, NAMES[role])


def _refuse_not_above_zero(name: str, value: float | None) -> None:
    if value is not None and not (math.isfinite(value) and value > 0):
        raise UsageError(f"{name} must be above 0, got {value}", hint="Give a positive number.")


def _refuse_below_zero(name: str, value: float | None) -> None:
    if value is not None and not (math.isfinite(value) and value >= 0):
        raise UsageError(f"{name} must not be below 0, got {value}", hint="Give 0 or more.")
