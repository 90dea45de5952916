"""What is kept beside an acquired capture: a JSON file that says how it was taken.

========================= =====================================================================
``schema``                ``benchtool-acquisition/1``; within /1 keys are only added
``file``, ``sha256``      the capture it belongs to
``made_at``               UTC time in ISO 8601
``source``                resource, port or file, as the user named it
``identity``              what the instrument answers when asked who it is; null for a stream
``dialect``               the dialect it was spoken to in; null for a stream
``settings``              what was read of its settings: query and answer
``changed``               commands that the user had sent first; empty where none
``power_up``              whether it was armed before the supply came on
``instrument``            what the user's kit says of it; null where it is not of the kit
``number``, ``periods``   number of the capture in its run from 1, complete periods in it
``traces``                channel, samples or transitions, sample interval or tick of each
``counted``               of a counter's readings: input, resolution, and how many of what; null
                          for a capture
``warnings``              code and text of each
========================= =====================================================================
"""

from __future__ import annotations

from typing import Any

from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, Trace, UniformTime, Waveform
from benchtool.model.counted import Counted
from benchtool.model.kit import KitInstrument
from benchtool.report.counting import counted_document
from benchtool.report.sources import instrument_document

SCHEMA = "benchtool-acquisition/1"
Json = dict[str, Any]


@frozen_record
class Taken:
    """How captures are taken in one run.

    Attributes:
        source: Resource, port or file, as the user named it.
        identity: What the instrument answers when asked who it is.
        dialect: Name of its dialect.
        settings: What was read of its settings.
        changed: Commands that the user had sent first.
        power_up: Whether it was armed before the supply came on.
        kept: What the user's kit says of it.
    """

    source: str
    identity: str | None = None
    dialect: str | None = None
    settings: tuple[tuple[str, str], ...] = ()
    changed: tuple[str, ...] = ()
    power_up: bool = False
    kept: KitInstrument | None = None


@frozen_record(eq=False)
class Saved:
    """One capture that was written.

    Attributes:
        file: Name of the file.
        sha256: Of its bytes.
        number: Its number in the run, from 1.
        periods: Complete periods in it.
        capture: The capture, or a counter's readings.
        made_at: UTC time in ISO 8601.
    """

    file: str
    sha256: str
    number: int
    periods: int
    capture: Capture | Counted
    made_at: str


def acquisition_document(taken: Taken, saved: Saved) -> Json:
    """Return what is kept beside a capture, ready for ``json.dumps``."""
    return {
        "schema": SCHEMA,
        "file": saved.file,
        "sha256": saved.sha256,
        "made_at": saved.made_at,
        "source": taken.source,
        "identity": taken.identity,
        "dialect": taken.dialect,
        "settings": [{"query": query, "answer": answer} for query, answer in taken.settings],
        "changed": list(taken.changed),
        "power_up": taken.power_up,
        "instrument": instrument_document(taken.kept) if taken.kept else None,
        "number": saved.number,
        "periods": saved.periods,
        "traces": [_trace(trace) for trace in getattr(saved.capture, "traces", ())],
        "counted": counted_document(saved.capture) if isinstance(saved.capture, Counted) else None,
        "warnings": [{"code": item.code, "text": item.text} for item in saved.capture.warnings],
    }


def _trace(trace: Trace) -> Json:
    if isinstance(trace, Waveform):
        return {
            "channel": trace.channel,
            "samples": trace.samples.size,
            "sample_interval_s": trace.time.dt_s if isinstance(trace.time, UniformTime) else None,
        }
    return {
        "channel": trace.channel,
        "transitions": int(trace.times_s.size),
        "tick_s": trace.tick_s or None,
    }
