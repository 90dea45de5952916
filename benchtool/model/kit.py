"""The user's own instruments and probes, by name."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import field
from types import MappingProxyType

from benchtool.frozen import frozen_record


@frozen_record
class KitProbe:
    """A probe: its load, and the last day on which its calibration holds, ISO 8601."""

    name: str
    r_ohm: float
    c_f: float
    calibration_due: str | None = None


@frozen_record
class KitInstrument:
    """An instrument as its user keeps it.

    Attributes:
        name: The user's name for it.
        resource: How it is reached; None for one whose saved captures alone are read.
        dialect: Name or file of its dialect; None leaves it to probing.
        timebase_rel: Half-width of its timebase error, relative.
        calibration_due: Last day on which its calibration holds, ISO 8601.
        channels: The user's name of a trace to the instrument's name of the channel.
        probe: The probe that hangs on it.
        is_overdue: Whether the calibration of it or of its probe is past its day.
    """

    name: str
    resource: str | None = None
    dialect: str | None = None
    timebase_rel: float | None = None
    calibration_due: str | None = None
    channels: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    probe: KitProbe | None = None
    is_overdue: bool = False


@frozen_record
class Kit:
    """All that the user keeps, by name; ``file`` is where it stands."""

    file: str
    instruments: Mapping[str, KitInstrument]
    probes: Mapping[str, KitProbe]
