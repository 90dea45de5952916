"""The JSON document that every verb prints: a contract, see ``document.schema.json``."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from benchtool.errors import BenchtoolError, DesignError, InstrumentError
from benchtool.model.quantity import Bound, Measured, Notice, Quantity
from benchtool.model.result import (
    Analysis,
    Finding,
    IntervalCounts,
    StageResult,
    TraceFacts,
)
from benchtool.model.timing import Jitter, Levels, StabilityPoint, Timing
from benchtool.report.diagnosis import combination_parts, diagnosis_parts, early_parts
from benchtool.report.sources import instrument_document, source_document
from benchtool.uncertainty import coverage_factor

if TYPE_CHECKING:
    from benchtool.model.judgement import Change, Check, PartEstimate, Solution

SCHEMA = "benchtool/1"

Json = dict[str, Any]

_TIMING = ("t_high", "t_low", "period", "frequency", "duty", "first_high", "delay", "drift")


def analysis_document(
    analysis: Analysis, *, version: str, made_at: str, budget: bool = False
) -> Json:
    """Return the document of an analysis, ready for ``json.dumps``.

    Args:
        analysis: What was found.
        version: Version of benchtool.
        made_at: UTC time in ISO 8601 with a Z.
        budget: Whether to add the budget of every timing quantity.
    """
    parts = (*_PARTS[analysis.command], "budgets") if budget else _PARTS[analysis.command]
    several = len(analysis.sources) > 1
    document: Json = {
        "schema": SCHEMA,
        "command": analysis.command,
        "version": version,
        "made_at": made_at,
        "sources": [source_document(item) for item in analysis.sources],
        "results": [_result(item, parts, several) for item in analysis.results],
    }
    if analysis.verdict is not None:
        document["verdict"] = analysis.verdict
    if analysis.rule is not None:
        rule = analysis.rule
        document["rule"] = {"name": rule.name, "guard": rule.guard, "coverage": rule.coverage}
    if analysis.instrument is not None:
        document["instrument"] = instrument_document(analysis.instrument)
    document["warnings"] = [_notice(item) for item in analysis.warnings]
    return document


def rows_document(command: str, rows: list[Json], *, version: str, made_at: str) -> Json:
    """Return the document of a verb that measures nothing: its rows."""
    return {
        "schema": SCHEMA,
        "command": command,
        "version": version,
        "made_at": made_at,
        "rows": rows,
    }


def error_document(error: BenchtoolError, *, command: str | None) -> Json:
    """Return the document of an error."""
    faults = error.faults if isinstance(error, DesignError) else ()
    step: Json = {"step": asdict(error.step)} if isinstance(error, InstrumentError) else {}
    return {
        "schema": SCHEMA,
        "command": command,
        "error": {
            "code": error.code,
            "message": error.message,
            "hint": error.hint,
            "faults": [
                {
                    "file": fault.file,
                    "line": fault.line,
                    "key": fault.key,
                    "message": fault.message,
                    "near": fault.near,
                }
                for fault in faults
            ],
            **step,
        },
    }


def quantity(item: Quantity | None) -> Json | None:
    """Return a quantity as JSON: value with u and U at 95 %, a bound, or null."""
    if item is None:
        return None
    if isinstance(item, Bound):
        bounds = {"at_least": item.at_least, "at_most": item.at_most}
        known = {name: value for name, value in bounds.items() if value is not None}
        return {"value": None, **known, "unit": item.unit}
    k = coverage_factor(item.dof)
    return {
        "value": item.value,
        "unit": item.unit,
        "u": item.u,
        "dof": _dof(item.dof),
        "k": k,
        "U": k * item.u,
        "n": item.n,
    }


def _notice(item: Notice) -> Json:
    return {"code": item.code, "text": item.text}


def _result(item: StageResult, parts: tuple[str, ...], several: bool) -> Json:
    made: Json = {"source": item.source} if several else {}
    made["stage"] = item.stage
    for name in parts:
        counted = name == "jitter" and item.jitter is not None
        if name in _MAKERS and (item.trace is not None or counted or name not in _OF_TRACE):
            made[name] = _MAKERS[name](item)
    if item.counted is not None:
        from benchtool.report.counting import counted_document

        made["counted"] = counted_document(item.counted)
    if item.changes:
        made["changes"] = [_change(change) for change in item.changes]
    made |= diagnosis_parts(item.diagnosis, quantity) | combination_parts(item.combinations)
    made |= early_parts(item.early, quantity)
    if item.likely is not None:
        made["likely"] = item.likely
    made["findings"] = [_finding(found) for found in item.findings]
    made["warnings"] = [_notice(found) for found in item.warnings]
    return made


def _change(item: Change) -> Json:
    return {
        "quantity": item.quantity,
        "before": quantity(item.before),
        "change": quantity(item.change),
        "significant": item.significant,
    }


def _budgets(item: Timing | None) -> dict[str, list[Json]]:
    figures = {name: getattr(item, name) for name in _TIMING}
    return {
        name: [
            {"source": part.source, "u": part.u, "dof": _dof(part.dof), "note": part.note}
            for part in figure.budget
        ]
        for name, figure in figures.items()
        if isinstance(figure, Measured)
    }


def _dof(dof: float) -> float | None:
    return dof if math.isfinite(dof) else None


def _finding(item: Finding) -> Json:
    return {"code": item.code, "text": item.text, "may_be": list(item.may_be)}


def _trace(item: TraceFacts | None) -> Json | None:
    if item is None:
        return None
    return {
        "channel": item.channel,
        "role": item.role,
        "kind": item.kind,
        "samples": item.samples,
        "sample_interval_s": item.sample_interval_s,
        "tick_s": item.tick_s,
        "start_s": item.start_s,
        "duration_s": item.duration_s,
        "gaps": [{"start_s": gap.start_s, "end_s": gap.end_s} for gap in item.gaps],
    }


def _levels(item: Levels | None) -> Json | None:
    if item is None:
        return None
    low = Measured(value=item.low_v, u=item.u_low_v, unit="V")
    high = Measured(value=item.high_v, u=item.u_high_v, unit="V")
    return {"low": quantity(low), "high": quantity(high), "mid_v": item.mid_v}


def _intervals(item: IntervalCounts | None) -> Json | None:
    if item is None:
        return None
    return {
        "high": item.high,
        "low": item.low,
        "period": item.period,
        "dropped": [{"reason": drop.reason, "count": drop.count} for drop in item.dropped],
    }


def _timing(item: Timing | None) -> Json | None:
    if item is None:
        return None
    return {name: quantity(getattr(item, name)) for name in _TIMING}


def _jitter(item: Jitter | None) -> Json | None:
    if item is None:
        return None
    names = ("period_sd", "period_pp", "cycle_rms", "cycle_peak", "grid_share")
    return {name: quantity(getattr(item, name)) for name in names}


def _stability(points: tuple[StabilityPoint, ...]) -> list[Json]:
    return [
        {
            "tau_s": point.tau_s,
            "adev": point.adev,
            "lower": point.lower,
            "upper": point.upper,
            "n": point.n,
        }
        for point in points
    ]


def _circuit(item: Solution | None) -> Json | None:
    if item is None:
        return None
    return {
        "topology": item.topology,
        "tau_charge": quantity(item.tau_charge),
        "tau_discharge": quantity(item.tau_discharge),
        "tau_RA": quantity(item.tau_RA),
        "tau_ratio": quantity(item.tau_ratio),
        "effective": {
            "charge": quantity(item.effective_charge),
            "discharge": quantity(item.effective_discharge),
        },
        "parts": [_part(part) for part in item.parts],
    }


def _part(item: PartEstimate) -> Json:
    return {
        "ref": item.ref,
        "nominal": item.nominal,
        "estimate": quantity(item.estimate),
        "change": quantity(item.change),
        "assumes": list(item.assumes),
        "within_tolerance": item.within_tolerance,
    }


def _check(item: Check) -> Json:
    return {
        "quantity": item.quantity,
        "measured": quantity(item.measured),
        "lower": item.lower,
        "upper": item.upper,
        "unit": item.unit,
        "accept_lower": item.accept_lower,
        "accept_upper": item.accept_upper,
        "source": item.source,
        "p_conform": item.p_conform,
        "verdict": item.verdict,
        "reason": item.reason,
    }


_MAKERS: dict[str, Callable[[StageResult], Any]] = {
    "trace": lambda item: _trace(item.trace),
    "levels": lambda item: _levels(item.levels),
    "intervals": lambda item: _intervals(item.intervals),
    "timing": lambda item: _timing(item.timing),
    "budgets": lambda item: _budgets(item.timing),
    "jitter": lambda item: _jitter(item.jitter),
    "stability": lambda item: _stability(item.stability),
    "circuit": lambda item: _circuit(item.solution),
    "checks": lambda item: [_check(check) for check in item.checks],
    "verdict": lambda item: item.verdict,
}

_LOOKED = ("trace", "levels", "intervals")
_MEASURED = (*_LOOKED, "timing", "jitter", "stability")
_OF_TRACE = {*_LOOKED, "jitter", "stability"}  # plain figures have none of these
_PARTS: dict[str, tuple[str, ...]] = {
    "look": _LOOKED,
    "measure": _MEASURED,
    "solve": (*_MEASURED, "circuit"),
    "judge": (*_MEASURED, "circuit", "checks", "verdict"),
    "diagnose": _MEASURED,
    "watch": (*_LOOKED, "timing", "jitter", "checks"),
}
