"""The first half of the way, which all verbs share: from a source to what its traces show."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, TypeAlias

from benchtool.errors import UsageError
from benchtool.formats import read_capture
from benchtool.formats.content import open_content
from benchtool.formats.reading import read_content
from benchtool.model.capture import Capture
from benchtool.model.options import MeasureOptions
from benchtool.model.result import Analysis, StageResult
from benchtool.model.timing import Timing
from benchtool.observation import observe, settle
from benchtool.provenance import source_of, warnings_of
from benchtool.targets import Lineup, choose_stages, choose_targets, line_up

if TYPE_CHECKING:
    from benchtool.model.counted import Counted
    from benchtool.model.design import Design

FilePath = str | Path
CaptureSource: TypeAlias = "FilePath | Capture | Counted"
"""A file, ``-`` for standard input, or a capture or a counter's readings already in memory."""

_ARCHIVE = b"PK\x03\x04"

_DEAD_TOO = ("judge", "diagnose")
"""Verbs to which a board without an interval is a result."""


def times_of(
    source: CaptureSource | Timing,
    design: Design | None,
    stage: str | None,
    options: MeasureOptions,
) -> Analysis:
    """Return the times to solve: measured, or as given."""
    if isinstance(source, Timing):
        return _given(source, design, stage)
    return observe_all(source, design, stage, options, "solve")


def _given(timing: Timing, design: Design | None, stage: str | None) -> Analysis:
    chosen = choose_stages(design, stage)[0] if design else None
    result = StageResult(
        source=0,
        stage=chosen.name if chosen else None,
        design=chosen,
        trace=None,
        timing=timing,
        warnings=timing.warnings,
    )
    return Analysis(command="solve", sources=(), results=(result,), design=design)


def take(source: CaptureSource, options: MeasureOptions) -> Capture:
    """Read a capture, or the part of it that is asked for.

    Raises:
        UsageError: If it is a counter's readings (``counter-readings``).
    """
    if isinstance(source, str | Path):
        return _part(read_capture(source, options.read), options)
    if isinstance(source, Capture):
        return _part(source, options)
    raise UsageError(
        f"{source.source} gave a counter's readings, and a trace is wanted",
        hint="Measure, solve or judge them; a digitising instrument gives a trace.",
        code="counter-readings",
    )


def _found(source: CaptureSource, options: MeasureOptions) -> Capture | Counted:
    """Return what a source holds: a capture, or the readings of a counter."""
    if not isinstance(source, str | Path):
        return source
    content = open_content(source)
    if content.head(len(_ARCHIVE)) == _ARCHIVE:
        from benchtool.formats.counted import is_counted, read_counted

        if is_counted(content):
            return read_counted(content)
    return read_content(content, options.read)


def _part(capture: Capture, options: MeasureOptions) -> Capture:
    if options.window is None:
        return capture
    from benchtool.timing.window import narrow

    return narrow(capture, options.window)


def observe_all(
    source: CaptureSource,
    design: Design | None,
    stage: str | None,
    options: MeasureOptions,
    command: str,
) -> Analysis:
    """Measure every trace that is to be measured.

    Args:
        source: The capture or a counter's readings, or the file of either.
        design: The design, where there is one: a result a stage.
        stage: Measure this stage alone.
        options: What is overruled.
        command: The verb; to some a dead trace is a result, to others an error.

    Raises:
        BenchtoolError: As reading, choosing and observing.
    """
    found = _found(source, options)
    if isinstance(found, Capture):
        lineup = line_up(_part(found, options))
        return observe_lineup(lineup, design, stage, options, command)
    from benchtool.counts import observe_counted

    return observe_counted(found, design, stage, options, command)


def observe_lineup(
    lineup: Lineup,
    design: Design | None,
    stage: str | None,
    options: MeasureOptions,
    command: str,
) -> Analysis:
    """Measure every trace of a capture, already lined up, that is to be measured.

    Args:
        lineup: The capture, its traces and their roles.
        design: As of ``observe_all``.
        stage: As of ``observe_all``.
        options: As of ``observe_all``.
        command: As of ``observe_all``.

    Raises:
        BenchtoolError: As choosing and observing.
    """
    capture, settings = lineup.capture, settle(options, design)
    targets = choose_targets(lineup, channel=options.read.channel, design=design, stage=stage)
    return Analysis(
        command=command,
        sources=(source_of(capture, options),),
        results=tuple(
            observe(target, settings, design, required=command not in _DEAD_TOO)
            for target in targets
        ),
        design=design,
        timebase_rel=settings.timebase_rel,
        timebase_from=settings.timebase_from,
        instrument=options.instrument,
        warnings=warnings_of([capture], options),
    )
