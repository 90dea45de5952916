"""What a diagnosis sees beside the figures it weighs: order, first pulse, a node at rest."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence

from benchtool.circuits import circuit_at, faults_of, settle_states
from benchtool.diagnose import find_findings
from benchtool.diagnose.words import join, percent
from benchtool.errors import SolveError
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Diagnosis, Reading
from benchtool.model.node import FirstPulse
from benchtool.model.quantity import Measured, Notice
from benchtool.model.result import Finding, StageResult
from benchtool.model.timing import Timing
from benchtool.timing.regularity import find_regularity
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

_NOTEWORTHY = {
    "drifting": "the period drifts",
    "ripple-line": "the period follows a ripple",
    "ripple-lock": "the period follows a ripple",
    "missed-edge": "pulses are missing",
    "false-trigger": "there are pulses too many",
    "two-level": "the period jumps between two values",
    "paused": "the board stood still for a while",
    "output-level": "the output's high level is that of the other IC family",
}
"""What no mean time shows and the first sentence must not pass over."""

_DROP_V = (1.1, 1.9)
"""How far below its supply a bipolar timer's output stays: common practice."""

_NO_DROP_V = 0.3

Seen = tuple[tuple[Finding, ...], tuple[Notice, ...]]


def further_findings(
    result: StageResult,
    power_ups: Sequence[StageResult],
    readings: Iterable[Reading],
    design: Design,
    *,
    is_healthy: bool,
) -> Seen:
    """Return all that is seen in the captures of a stage, and what was assumed on the way.

    Args:
        result: What was observed of the stage.
        power_ups: The same of captures that begin before power-up.
        readings: Figures that were brought, a node's level among them.
        design: Its supply.
        is_healthy: Whether nothing points to a fault.
    """
    stage = result.design
    if stage is None:
        return result.findings, ()
    findings, warnings = _ordered(result, stage, design)
    timing = result.timing or Timing()
    first = _first_high((result, *power_ups))
    more = [*_output_level(result, stage, design), *_schmitt(first, timing, stage, design)]
    if not is_healthy:  # else the scatter of healthy thresholds explains it
        more += _first_pulse(first, timing, stage, design)
    state = result.flat.state if result.flat else None
    if state is not None:
        more += _resting(state, readings, stage, design)
    return (*findings, *more), warnings


def sentence_with(found: Diagnosis, findings: Iterable[Finding]) -> str:
    """Return the sentence on top with what was seen beside the mean times.

    Args:
        found: The diagnosis.
        findings: What was seen.
    """
    seen = dict.fromkeys(_NOTEWORTHY[item.code] for item in findings if item.code in _NOTEWORTHY)
    if not seen:
        return found.sentence
    words = join(list(seen), "and")
    if found.best.fault == "healthy":
        sure = percent(found.best.probability)
        return f"The mean times are those of healthy parts ({sure}), but {words}: begin with that."
    return f"{found.sentence} Besides, {words}."


def _output_level(result: StageResult, stage: Stage, design: Design) -> Iterator[Finding]:
    """Yield that the output's high level is the other family's, where it can be no other."""
    levels, supply = result.levels, design.supply
    if levels is None or levels.kind != "two-state" or "wrong-ic-family" not in _faults(stage):
        return
    low, high = (supply.lower - _DROP_V[1], supply.upper - _DROP_V[0])
    if stage.ic.family == "cmos":
        is_other = low <= levels.high_v <= min(high, supply.lower - _NO_DROP_V)
    else:
        is_other = supply.upper - _NO_DROP_V >= levels.high_v >= supply.lower - _NO_DROP_V > high
    if is_other:
        text = (
            f"The output's high level is {format_value(levels.high_v, 'V', 3)} at a supply of "
            f"{format_value(supply.nominal, 'V', 3)}: that of the other IC family, or of a "
            "loaded output."
        )
        may_be = ("wrong-ic-family", "output-high-drop")
        likely = tuple(name for name in may_be if name in _faults(stage))
        yield Finding(code="output-level", text=text, may_be=likely)


def _faults(stage: Stage) -> tuple[str, ...]:
    known = stage.ic.family is not None
    return tuple(item.name for item in faults_of(stage.topology)) if known else ()


def _first_high(results: Iterable[StageResult]) -> Measured | None:
    found = (item.timing.first_high for item in results if item.timing is not None)
    return next((item for item in found if item is not None), None)


def _ordered(result: StageResult, stage: Stage, design: Design) -> Seen:
    """Return the findings with what the order of the edges says among them."""
    edges, intervals = result.edges, result.series
    if edges is None or intervals is None or result.timing is None:
        return result.findings, ()
    regularity = find_regularity(intervals, edges)
    findings = find_findings(
        result.levels,
        edges,
        intervals,
        result.timing,
        supply_v=design.supply.nominal,
        topology=stage.topology,
        regularity=regularity,
    )
    return findings, regularity.warnings


def _first_pulse(
    first: Measured | None, timing: Timing, stage: Stage, design: Design
) -> Iterator[Finding]:
    if first is None or not isinstance(timing.t_high, Measured):
        return
    from benchtool.node import judge_first_pulse

    try:
        found = judge_first_pulse(first, timing.t_high, circuit_at(stage, design))
    except SolveError:
        return
    if found.stands_out:
        yield Finding(code="first-pulse", text=_first_pulse_text(found))


def _first_pulse_text(found: FirstPulse) -> str:
    ratio = found.ratio
    said = f"{ratio.value:.4f} ± {expanded(ratio):.4f}"
    alone = [
        f"{cause.text} ({_size(cause.needed, cause.unit)})"
        for cause in found.causes
        if cause.needed is not None
    ]
    why = f" Alone it would take {'; or '.join(alone)}." if alone else ""
    return f"The first high is {said} times the others, {found.expected:.4f} as designed.{why}"


def _size(value: float, unit: str) -> str:
    return f"{100 * value:+.2g} %" if unit == "1" else format_value(value, unit, 3)


def _schmitt(
    first: Measured | None, timing: Timing, stage: Stage, design: Design
) -> Iterator[Finding]:
    high, low = timing.t_high, timing.t_low
    if stage.topology != "schmitt" or first is None:
        return
    if not (isinstance(high, Measured) and isinstance(low, Measured)):
        return
    from benchtool.node import solve_schmitt

    circuit = circuit_at(stage, design)
    top_v = float(circuit.supply) - float(circuit.output_high_drop)
    try:
        found = solve_schmitt(first, high, low, low_rel=float(circuit.output_low) / top_v)
    except SolveError:
        return
    tau = format_measured(found.tau.value, expanded(found.tau), "s")
    shares = ", ".join(
        f"{name} {100 * share.value:.2f} % ± {100 * expanded(share):.2f} %"
        for name, share in (("upper", found.upper), ("lower", found.lower))
    )
    text = f"From the first pulse and the others R·C is {tau}; thresholds over the high level: "
    yield Finding(code="schmitt-solved", text=f"{text}{shares}.")


def _resting(
    state: str, readings: Iterable[Reading], stage: Stage, design: Design
) -> Iterator[Finding]:
    level = next((item for item in readings if item.kind == "node-level"), None)
    if level is None:
        return
    from benchtool.node import read_resting_node

    circuit = circuit_at(stage, design)
    states = settle_states(circuit)
    found = read_resting_node(
        "high" if state == "high" else "low",
        Measured(value=level.value, u=level.u, unit="V"),
        float(circuit.supply),
        (float(circuit.v_upper), float(circuit.v_lower)),
        topology=stage.topology,
        charge_ohm=float(states.charge[-1].r),
        discharge_ohm=float(states.discharge.r) if states.discharge else None,
    )
    held = found.holding_ohm
    more = f"; {format_value(held, 'ohm', 3)} would hold it there" if held else ""
    text = f"The node rests at {format_value(level.value, 'V', 3)}: {found.why}{more}."
    yield Finding(code="resting-node", text=text, may_be=found.faults)
