"""From a counter's readings to the result of a stage: there is no trace, and no edge."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from benchtool.errors import UsageError
from benchtool.model.capture import ReadOptions, StructurePoint
from benchtool.model.counted import Counted
from benchtool.model.options import MeasureOptions
from benchtool.model.result import Analysis, Source, StageResult
from benchtool.observation import Settings, settle
from benchtool.provenance import warnings_of
from benchtool.targets import choose_one_stage
from benchtool.timing.counted import timing_of_counted

if TYPE_CHECKING:
    from benchtool.model.design import Design, Stage

_AS_FOUND = ReadOptions()
_WHY = "and a counter's readings are of one"


def observe_counted(
    counted: Counted,
    design: Design | None,
    stage: str | None,
    options: MeasureOptions,
    command: str,
) -> Analysis:
    """Return the figures of a counter's readings, of the one stage that they can be of.

    Args:
        counted: The readings.
        design: The design, where there is one.
        stage: The stage that they are of; needed where the design has several.
        options: What is overruled.
        command: The verb.

    Raises:
        UsageError: If an option is about a record (``counter-readings``), or it is not said which
            of several stages was counted (``choose-stage``).
    """
    _refuse_of_a_record(counted, options)
    settings = settle(options, design)
    result = result_of_counted(counted, choose_one_stage(design, stage, _WHY), settings)
    return Analysis(
        command=command,
        sources=(_source(counted),),
        results=(result,),
        design=design,
        timebase_rel=settings.timebase_rel,
        timebase_from=settings.timebase_from,
        instrument=options.instrument,
        warnings=(*counted.warnings, *warnings_of((), options)),
    )


def result_of_counted(counted: Counted, stage: Stage | None, settings: Settings) -> StageResult:
    """Return the figures of a counter's readings: what a live view shows of them again and again.

    Args:
        counted: The readings.
        stage: The stage they are of, where there is a design.
        settings: As settled for this run.
    """
    low_pulse = stage is not None and stage.topology == "one-shot" and stage.active == "low"
    taken = counted.inverted() if low_pulse else counted  # t_high is the pulse, as of any trace
    timing, jitter = timing_of_counted(taken, settings.timebase_rel, settings.jitter_rel)
    of_jitter = jitter.warnings if jitter else ()
    return StageResult(
        source=0,
        stage=stage.name if stage else None,
        design=stage,
        trace=None,
        timing=timing,
        jitter=jitter,
        counted=taken,
        warnings=tuple(dict.fromkeys((*timing.warnings, *of_jitter))),
    )


def _refuse_of_a_record(counted: Counted, options: MeasureOptions) -> None:
    idle = options.read != _AS_FOUND or options.window is not None or options.level_v is not None
    if idle:
        raise UsageError(
            f"{counted.source} holds a counter's readings: there are no columns, channels, levels "
            "or parts of a record in them to choose",
            hint="Leave out the options that are about a record.",
            code="counter-readings",
        )


def _source(counted: Counted) -> Source:
    return Source(
        role="main",
        name=counted.source,
        sha256=counted.sha256,
        format="readings",
        structure=tuple(_points(counted)),
        start_ns=counted.start_ns,
        instrument=counted.identity,
    )


def _points(counted: Counted) -> Iterator[StructurePoint]:
    """Yield what was counted, and how."""
    rows: list[tuple[str, str, str]] = [
        ("kind", "counter readings", "its first array"),
        ("dialect", counted.dialect, "the run"),
        ("input", counted.channel, "the run"),
        ("resolution", f"{counted.resolution_s:.9g} s", "the dialect or the counter"),
    ]
    for name, item in counted.readings.items():
        gate = f"a gate of {item.gate_s:.6g} s" if item.gate_s else "a gate"
        each = "one interval" if item.per == "interval" else f"an average over {gate}"
        rows.append((name, f"{item.values.size} readings", f"each is {each}"))
    rows += [(query, answer, "asked for before the run") for query, answer in counted.settings]
    for point, value, evidence in rows:
        yield StructurePoint(name=point, value=value, evidence=evidence, sure="stated")
