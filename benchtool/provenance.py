"""Where the figures of an analysis come from, and what has to be said of that."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

from benchtool.model.capture import Capture, ReadOptions
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Notice
from benchtool.model.result import Source

_AS_FOUND = ReadOptions()


def source_of(capture: Capture, options: MeasureOptions) -> Source:
    """Return what is said of the file or acquisition that a capture came from."""
    origin = capture.origin
    typed: tuple[str, ...] = ()
    if options.window is not None or options.read != _AS_FOUND:
        from benchtool.formats.overrules import words_of

        typed = words_of(options.read, options.window)
    return Source(
        role="main",
        name=origin.source,
        sha256=origin.sha256,
        format=origin.format,
        structure=capture.structure,
        start_ns=origin.start_ns,
        instrument=origin.instrument,
        window=capture.window,
        options=typed,
    )


def warnings_of(captures: Iterable[Capture], options: MeasureOptions) -> tuple[Notice, ...]:
    """Return what the captures warn of, each once, and what is to be said of the instrument."""
    said = (notice for item in captures for notice in item.warnings)
    return tuple(dict.fromkeys((*said, *_overdue(options))))


def _overdue(options: MeasureOptions) -> Iterator[Notice]:
    kept = options.instrument
    if kept is None or not kept.is_overdue:
        return
    days = [kept.calibration_due, kept.probe.calibration_due if kept.probe else None]
    first = min(day for day in days if day is not None)
    text = (
        f"the calibration of {kept.name} or of its probe was due on {first}: the "
        "stated timebase is not vouched for"
    )
    yield Notice(code="calibration-overdue", text=text)
