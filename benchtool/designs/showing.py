"""A design as plain rows, each with where its value comes from."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING

from benchtool.designs.notation import key_text
from benchtool.designs.values import LIMIT_SOURCE
from benchtool.designs.vocabulary import IC_TERMS
from benchtool.model.design import Band, Design, DesignValue, Limit, Part, Stage, Threshold
from benchtool.units import format_value

if TYPE_CHECKING:
    from benchtool.circuits import Topology

STATED = "stated"
DEFAULT = "default"


def show_rows(design: Design) -> tuple[DesignValue, ...]:
    """Return every value that the design works with, stated or not, in the order of the file."""
    rows = [*_board_rows(design)]
    for stage in design.stages:
        rows += [*_stage_rows(design, stage), *_ic_rows(design, stage), *_limit_rows(design, stage)]
    return (*rows, *_closing_rows(design))


def _row(design: Design, section: str, key: str, value: str, default: str = DEFAULT) -> DesignValue:
    stated = f"{section}.{key}" in design.stated
    return DesignValue(section=section, key=key, value=value, origin=STATED if stated else default)


def _stated(section: str, key: str, value: str) -> DesignValue:
    return DesignValue(section=section, key=key, value=value, origin=STATED)


def _board_rows(design: Design) -> Iterator[DesignValue]:
    yield _stated("board", "name", design.name)
    for key in ("assembly", "revision", "serial_pattern"):
        value = getattr(design, key)
        if value is not None:
            yield _stated("board", key, value)
    yield _stated("board", "supply", _band(design.supply, "V"))
    yield _row(design, "board", "temperature", _band(design.temperature, "degC"))


def _stage_rows(design: Design, stage: Stage) -> Iterator[DesignValue]:
    section = key_text(("stage", stage.name))
    yield _stated(section, "topology", stage.topology)
    for key in ("channel", "capacitor", "trigger"):
        name = getattr(stage, key)
        if name is not None:
            yield _stated(section, key, name)
    yield _row(design, section, "active", stage.active)
    yield _row(design, section, "divide", f"{stage.divide}")
    for ref, part in stage.parts.items():
        yield _stated(section, ref, _part(part))
    extras = (
        ("control", stage.control_v, "V"),
        ("diode_drop", stage.diode_drop_v, "V"),
        ("series_diode_drop", stage.series_diode_drop_v, "V"),
        ("leak", stage.leak_ohm if math.isfinite(stage.leak_ohm) else None, "ohm"),
    )
    for key, value, unit in extras:
        if value is not None:
            yield _stated(section, key, format_value(value, unit))
    if math.isfinite(stage.leak_ohm):
        yield _row(design, section, "leak_to", format_value(stage.leak_to_v, "V"))


def _ic_rows(design: Design, stage: Stage) -> Iterator[DesignValue]:
    """Yield the terms of the IC that act in the stage's topology."""
    from benchtool.circuits import find_topology

    section = key_text(("stage", stage.name, "ic"))
    topology = find_topology(stage.topology)
    if stage.ic.family is not None:
        stated = {section, f"{section}.family"} & design.stated
        origin = STATED if stated else DEFAULT
        yield DesignValue(section=section, key="family", value=stage.ic.family, origin=origin)
    yield from _threshold_rows(section, stage, topology)
    for name in ("u_threshold", "u_split", *topology.ic_terms):
        if name != "u_split" or topology.discharge is not None:
            value, origin = _term(design, stage, name)
            yield DesignValue(section=section, key=name, value=value, origin=origin)


def _threshold_rows(section: str, stage: Stage, topology: Topology) -> Iterator[DesignValue]:
    upper, lower = stage.ic.upper_threshold, stage.ic.lower_threshold
    control_v = stage.control_v
    if control_v is not None:
        forced = f"{format_value(control_v, 'V')}, forced at the control pin"
        yield _stated(section, "upper_threshold", forced)
    elif upper is not None:
        yield _stated(section, "upper_threshold", _level(upper))
    else:
        origin = f"{DEFAULT}: divider of three equal resistors"
        value = "2/3 of the supply"
        yield DesignValue(section=section, key="upper_threshold", value=value, origin=origin)
    if topology.discharge is None:
        return
    if lower is not None:
        yield _stated(section, "lower_threshold", _level(lower))
    else:
        origin = f"{DEFAULT}: divider of three equal resistors"
        value = "half of upper_threshold"
        yield DesignValue(section=section, key="lower_threshold", value=value, origin=origin)


def _term(design: Design, stage: Stage, name: str) -> tuple[str, str]:
    """Return a term of the IC as people read it, and its origin."""
    from benchtool.circuits import find_family

    unit = IC_TERMS[name].unit
    if name in stage.ic.terms:
        return format_value(stage.ic.terms[name], unit), STATED
    if name == "u_split" and stage.topology == "schmitt":
        return "as u_threshold", f"{DEFAULT}: the thresholds come from no divider"
    if stage.ic.family is None:
        return format_value(0.0, unit), f"{DEFAULT}: taken as ideal"
    term = find_family(stage.ic.family).terms[name]
    return format_value(float(term.at(design.supply.nominal)), unit), f"{DEFAULT}: {term.origin}"


def _limit_rows(design: Design, stage: Stage) -> Iterator[DesignValue]:
    section = key_text(("stage", stage.name, "limits"))
    if stage.derive is not None:
        yield _row(design, section, "derive", stage.derive)
        yield _row(design, section, "quantities", ", ".join(stage.quantities))
    for limit in stage.limits:
        source = "" if limit.source == LIMIT_SOURCE else f" ({limit.source})"
        yield _stated(section, limit.quantity, f"{_limit(limit)}{source}")


def _closing_rows(design: Design) -> Iterator[DesignValue]:
    rule, instrument, probe = design.rule, design.instrument, design.probe
    yield _row(design, "decision", "rule", rule.name)
    yield _row(design, "decision", "guard", f"{rule.guard:g}")
    yield _row(design, "decision", "coverage", format_value(rule.coverage, "1"))
    for key, value in (("timebase", instrument.timebase_rel), ("jitter", instrument.jitter_rel)):
        if value is not None:
            yield _stated("instrument", key, format_value(value, "1"))
    r_text = format_value(probe.r_ohm, "ohm") if math.isfinite(probe.r_ohm) else "no load"
    yield _row(design, "probe", "R", r_text)
    yield _row(design, "probe", "C", format_value(probe.c_f, "F"))
    yield _row(design, "probe", "at", probe.at)


def _band(band: Band, unit: str) -> str:
    nominal = format_value(band.nominal, unit)
    if band.lower == band.upper:
        return nominal
    return f"{nominal}, from {format_value(band.lower, unit)} to {format_value(band.upper, unit)}"


def _part(part: Part) -> str:
    unit = "F" if part.ref == "C" else "ohm"
    words = [f"{format_value(part.value, unit)} {_tolerance(part)}"]
    if part.kind:
        words.append(part.kind)
    if part.tempco_per_k:
        words.append(format_value(part.tempco_per_k, "1/K"))
    if part.leakage_a:
        words.append(f"leakage up to {format_value(part.leakage_a, 'A')}")
    if part.esr_ohm:
        words.append(f"ESR {format_value(part.esr_ohm, 'ohm')}")
    return ", ".join(words)


def _tolerance(part: Part) -> str:
    if not (part.lower_rel or part.upper_rel):
        return "(no tolerance stated)"
    if -part.lower_rel == part.upper_rel:
        return f"±{_percent(part.upper_rel)}"
    return f"-{_percent(-part.lower_rel)} +{_percent(part.upper_rel)}"


def _percent(share: float) -> str:
    return f"{share * 100:.4g} %"


def _level(level: Threshold) -> str:
    if level.of_supply:
        return f"{_percent(level.value)} of the supply"
    return format_value(level.value, "V")


def _limit(limit: Limit) -> str:
    ends = [None if end is None else _end(end, limit) for end in (limit.lower, limit.upper)]
    if ends[0] is None:
        return f"at most {ends[1]}"
    return f"at least {ends[0]}" if ends[1] is None else f"{ends[0]} to {ends[1]}"


def _end(value: float, limit: Limit) -> str:
    share = " of the mean period" if limit.relative else ""
    return f"{format_value(value, limit.unit)}{share}"
