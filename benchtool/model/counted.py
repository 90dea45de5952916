"""What a counter delivers: single readings of durations, frequency or duty."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Literal, get_args

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Notice

CountedName = Literal["t_high", "t_low", "period", "frequency", "duty"]
COUNTED_NAMES: tuple[CountedName, ...] = get_args(CountedName)
"""What a counter can be asked for, by the names that timing has for it."""


@frozen_record(eq=False)
class Readings:
    """The single readings of one quantity.

    Attributes:
        values: Readings in seconds, hertz or as a ratio, in the order they came, shape (n,); those
            that the counter marked as none are left out.
        per: Whether each is one ``interval``, or an average over a ``gate``.
        gate_s: Length of the gate in seconds, None where it is not known.
        n_missing: Readings that the counter marked as none.
        chains: Index ranges (start, stop) of readings that follow each other without a break;
            none where a counter pauses between readings, so that cycles are skipped.
    """

    values: FloatArray
    per: Literal["interval", "gate"] = "interval"
    gate_s: float | None = None
    n_missing: int = 0
    chains: tuple[tuple[int, int], ...] = ()

    def __post_init__(self) -> None:
        if self.values.ndim != 1 or not self.values.size:
            raise ValueError("readings must be 1-D, and at least one")
        if not np.all(np.isfinite(self.values)):
            raise ValueError("readings must be finite: those that are none are left out")
        if self.gate_s is not None and not (math.isfinite(self.gate_s) and self.gate_s > 0):
            raise ValueError(f"a gate must last longer than 0 s, got {self.gate_s}")


@frozen_record(eq=False)
class Counted:
    """The readings of one run of a counter on one of its inputs.

    Attributes:
        source: The connection, or the file they were kept in, as the user named it.
        identity: What the counter answers when asked who it is.
        dialect: Name of the dialect it was spoken to in.
        channel: Its input.
        readings: The readings of each quantity.
        resolution_s: Step in which a single interval can change, in seconds; 0 where none.
        start_ns: When the run began, integer nanoseconds since 1970 (UTC).
        sha256: Of the file, or of all readings as they came.
        settings: What was read of its settings: query and answer.
        warnings: What was noticed on the way.
    """

    source: str
    identity: str
    dialect: str
    channel: str
    readings: Mapping[CountedName, Readings]
    resolution_s: float
    start_ns: int | None = None
    sha256: str = ""
    settings: tuple[tuple[str, str], ...] = ()
    warnings: tuple[Notice, ...] = ()

    def __post_init__(self) -> None:
        if not self.readings:
            raise ValueError("a counter's readings are of at least one quantity")
        unknown = [name for name in self.readings if name not in COUNTED_NAMES]
        if unknown:
            raise ValueError(f"a counter counts {', '.join(COUNTED_NAMES)}, got {unknown[0]!r}")
        if not (math.isfinite(self.resolution_s) and self.resolution_s >= 0):
            raise ValueError(f"a resolution must be finite and >= 0, got {self.resolution_s}")

    def inverted(self) -> Counted:
        """Return the readings with high and low exchanged."""
        names: dict[CountedName, CountedName] = {"t_high": "t_low", "t_low": "t_high"}
        readings = {names.get(name, name): item for name, item in self.readings.items()}
        duty = readings.get("duty")
        if duty is not None:
            readings["duty"] = replace(duty, values=1 - duty.values)
        return replace(self, readings=readings)

    @property
    def n(self) -> int:
        """Readings of all quantities together."""
        return sum(int(item.values.size) for item in self.readings.values())
