"""The conditions under which the figures hold."""

from __future__ import annotations

import math
from collections.abc import Iterable

from benchtool.model.design import Band, Part, Probe, Stage
from benchtool.model.kit import KitInstrument
from benchtool.model.result import Analysis, StageResult, TraceFacts
from benchtool.model.timing import Levels
from benchtool.report.counting import TITLE, readings_line
from benchtool.report.page.views import Facts
from benchtool.units import format_value


def condition_facts(analysis: Analysis, result: StageResult) -> Facts:
    """Return trace, circuit, supply, temperature, probe and timebase, as far as they are known.

    Args:
        analysis: The analysis that the result belongs to.
        result: One of its results.
    """
    rows = (*_measured_on(result), *_designed(analysis, result), *timebase_rows(analysis))
    return Facts(rows=rows)


def timebase_rows(analysis: Analysis) -> tuple[tuple[str, str], ...]:
    """Return the timebase and where its figure comes from; empty where nothing was timed.

    Args:
        analysis: The analysis.
    """
    if analysis.timebase_rel is None:
        return ()
    origin = f", {analysis.timebase_from}" if analysis.timebase_from else ""
    timebase = ("timebase", f"± {format_value(analysis.timebase_rel, '1')}{origin}")
    return (*_instrument(analysis.instrument), timebase)


def _instrument(kept: KitInstrument | None) -> tuple[tuple[str, str], ...]:
    """Return the instrument of the user's kit, with the days until which it is calibrated."""
    if kept is None:
        return ()
    words = [kept.name, *([f"probe {kept.probe.name}"] if kept.probe else [])]
    days = (kept.calibration_due, kept.probe.calibration_due if kept.probe else None)
    due = [f"calibration due {min(day for day in days if day)}"] if any(days) else []
    return (("instrument", ", ".join([*words, *due])),)


def _measured_on(result: StageResult) -> Iterable[tuple[str, str]]:
    if result.counted is not None:
        yield "trace", f"none: {TITLE} of input {result.counted.channel}"
        yield "readings", readings_line(result.counted)
        return
    if result.trace is None:
        yield "trace", "none: figures as given"
        return
    yield "trace", f"{result.trace.role} on {result.trace.channel}, {result.trace.kind}"
    yield "record", _record(result.trace)
    if result.levels is not None:
        yield "levels", _levels(result.levels, node=result.trace.role == "capacitor")


def _record(trace: TraceFacts) -> str:
    words = [] if trace.samples is None else [f"{trace.samples} samples"]
    if trace.sample_interval_s is not None:
        words.append(f"{format_value(trace.sample_interval_s, 's')} apart")
    elif trace.tick_s:
        words.append(f"tick {format_value(trace.tick_s, 's')}")
    words.append(f"{format_value(trace.duration_s, 's')} long")
    return ", ".join(words)


def _levels(levels: Levels, *, node: bool) -> str:
    if levels.kind in {"flat", "noise"}:
        return f"{levels.kind} at {format_value(levels.low_v, 'V')}"
    pair = f"{format_value(levels.low_v, 'V')} and {format_value(levels.high_v, 'V')}"
    if levels.kind == "node":
        return f"turns at {pair}"
    return pair if node else f"{pair}, edges at {format_value(levels.mid_v, 'V')}"


def _designed(analysis: Analysis, result: StageResult) -> Iterable[tuple[str, str]]:
    design = analysis.design
    if design is None:
        yield "design", "none given: supply, temperature and probe are not stated"
        return
    if result.design is not None:
        yield "circuit", _circuit(result.design)
    yield "supply", _band(design.supply, "V")
    yield "temperature", _band(design.temperature, "degC")
    yield "probe", _probe(design.probe)


def _circuit(stage: Stage) -> str:
    parts = ", ".join(_part(part) for part in stage.parts.values())
    family = f", {stage.ic.family} IC" if stage.ic.family else ""
    return f"{stage.topology}: {parts}{family}"


def _part(part: Part) -> str:
    unit = "F" if part.ref == "C" else "ohm"
    return f"{part.ref} {format_value(part.value, unit)}{_tolerance(part)}"


def _tolerance(part: Part) -> str:
    if part.lower_rel == part.upper_rel == 0:
        return ""
    if part.upper_rel == -part.lower_rel:
        return f" ± {format_value(part.upper_rel, '1')}"
    return f" {_signed(part.lower_rel)} … {_signed(part.upper_rel)} %"


def _signed(share: float) -> str:
    return f"{100 * share:+g}".replace("-", "−")


def _band(band: Band, unit: str) -> str:
    nominal = format_value(band.nominal, unit)
    if band.lower == band.upper:
        return nominal
    return f"{nominal} ({format_value(band.lower, unit)} … {format_value(band.upper, unit)})"


def _probe(probe: Probe) -> str:
    loads = [format_value(probe.r_ohm, "ohm")] if math.isfinite(probe.r_ohm) else []
    loads += [format_value(probe.c_f, "F")] if probe.c_f else []
    return f"{' ∥ '.join(loads)} at the {probe.at}" if loads else "no load stated"
