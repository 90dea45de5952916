"""What a diagnosis sees beside the figures it weighs: order, first pulse, a node at rest."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence

from benchtool.circuits import circuit_at, settle_states
from benchtool.diagnose import find_findings
from benchtool.errors import SolveError
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Reading
from benchtool.model.node import FirstPulse
from benchtool.model.quantity import Measured, Notice
from benchtool.model.result import Finding, StageResult
from benchtool.model.timing import Timing
from benchtool.node import judge_first_pulse, read_resting_node, solve_schmitt
from benchtool.timing.regularity import find_regularity
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

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
    more = [*_schmitt(first, timing, stage, design)]
    if not is_healthy:  # else the scatter of healthy thresholds explains it
        more += _first_pulse(first, timing, stage, design)
    state = result.flat.state if result.flat else None
    if state is not None:
        more += _resting(state, readings, stage, design)
    return (*findings, *more), warnings


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
