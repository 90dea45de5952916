"""Boards that stand still: which faults hold the output in its state."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import circuit_at, faults_of, find_topology, predict, settle_states
from benchtool.circuits.circuit import Circuit
from benchtool.circuits.fault_entry import Fault
from benchtool.diagnose.hypotheses import HEALTHY, UNEXPLAINED
from benchtool.diagnose.priors import Priors
from benchtool.diagnose.scatter import tolerance_notices
from benchtool.diagnose.words import ACTIONS, join, name_fault, percent
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import (
    Diagnosis,
    Evidence,
    Group,
    NextReading,
    Reading,
    State,
    Suspect,
)

_POINTS = 400
_BEYOND = 1e3  # how far past its usual range a fault is followed, as a factor: assumed
_MOST_SHARE, _LEAST_LEFT = 30.0, 0.03  # a wrong part, against the marked one: assumed
_SLOW = 1e3  # times the healthy time: nobody waits for that
_UNKNOWN_SHARE = 0.1  # of the boards that stand still: no supply, a dead IC, a held reset; assumed
_U_LEVEL = 0.02  # of the supply: how well the model knows where a dead node rests, assumed
_CERTAIN = 0.95
_LEAST_RATIO = 1 / 20
_MOST_NAMED = 4


@frozen_record
class _Standstill:
    """How a fault holds a board still.

    Attributes:
        fault: The fault.
        share: Of its sizes that hold it in the state that was seen.
        density: Of the level of the node that was read, over its range; 1 where none was.
    """

    fault: Fault
    share: float
    density: float


def diagnose_stuck(
    evidence: Evidence, stage: Stage, design: Design, *, priors: Priors
) -> Diagnosis:
    """Rank what may hold a board still.

    Args:
        evidence: Its state, and the level of its node where that was read.
        stage: The circuit as designed.
        design: Its supply.
        priors: What is held of the faults beforehand; their order matters, not their sizes.
    """
    state = evidence.state
    if state is None:
        raise ValueError("a board that runs is no standstill")
    level = next((item for item in evidence.readings if item.kind == "node-level"), None)
    circuit = circuit_at(stage, design)
    found = [
        (priors.weight(fault, stage) * still.share * still.density, still)
        for fault in faults_of(stage.topology)
        if fault.name != HEALTHY and (still := _stand(fault, circuit, state, level)).share > 0
    ]
    suspects = _ranked(found)
    group = _first_group(suspects)
    return Diagnosis(
        suspects=tuple(_grouped(suspects, group)),
        groups=(group,) if group else (),
        next=tuple(_next(level, suspects[0])),
        is_certain=suspects[0].probability >= _CERTAIN and suspects[0].fault != UNEXPLAINED,
        stuck=state,
        stop="" if level is None else "Look at the suspects in this order, power off.",
        sentence=_sentence(state, suspects, group),
        used=("the output's state", *(("the node's level",) if level else ())),
        warnings=tuple(tolerance_notices(stage)),
    )


def _ranked(found: list[tuple[float, _Standstill]]) -> tuple[Suspect, ...]:
    total = sum(weight for weight, _ in found)
    usual = sum(weight / still.density for weight, still in found if still.density > 0) or 1.0
    unknown = usual * _UNKNOWN_SHARE / (1 - _UNKNOWN_SHARE)
    best = max((still.share * still.density for _, still in found), default=1.0)
    suspects = [
        Suspect(
            fault=still.fault.name,
            part=still.fault.part,
            probability=weight / (total + unknown),
            likelihood_ratio=still.share * still.density / best if best > 0 else 0.0,
            why=still.fault.seen,
        )
        for weight, still in found
    ]
    suspects.append(
        Suspect(
            fault=UNEXPLAINED,
            probability=unknown / (total + unknown),
            why="A missing supply, a dead IC or a held reset stands still too: check the supply at "
            "the IC's own pins first.",
        )
    )
    suspects.append(
        Suspect(fault=HEALTHY, probability=0.0, why="A healthy board does not stand still.")
    )
    return tuple(sorted(suspects, key=lambda item: -item.probability))


def _stand(fault: Fault, circuit: Circuit, state: State, level: Reading | None) -> _Standstill:
    sizes = _sizes(fault, circuit)
    faulty = fault.move.act(circuit, sizes)
    high, low = _stands(faulty, circuit, sizes.shape)
    held = high if state == "high" else low
    share = float(np.mean(held))
    if not held.any() or level is None:
        return _Standstill(fault=fault, share=share, density=1.0)
    density = _density(faulty, held, state, level, float(np.max(circuit.supply)))
    return _Standstill(fault=fault, share=share, density=density)


def _sizes(fault: Fault, circuit: Circuit) -> FloatArray:
    """Return sizes from usual ones up to the extreme, evenly in their logarithm."""
    lower, upper = fault.sizes
    if not fault.unit:
        return np.zeros(1)
    if fault.unit == "1":
        grids = []
        if lower < 0:
            grids.append(np.geomspace(1 + lower, _LEAST_LEFT, _POINTS) - 1)
        if upper > 0:
            grids.append(np.geomspace(1 + upper, _MOST_SHARE, _POINTS) - 1)
        return np.concatenate(grids)
    reference = float(fault.reference(circuit))
    ends = lower * reference, upper * reference
    if fault.sizes[0] >= 1e9 or fault.unit == "F" or fault.name.endswith("-short"):
        return np.geomspace(*ends, _POINTS)
    if fault.unit == "ohm" and fault.move.fields[0] in ("shunt_ohm", "leak_ohm", "probe_r"):
        return np.geomspace(ends[0] / _BEYOND, ends[1], _POINTS)
    return np.geomspace(ends[0], ends[1] * _BEYOND, _POINTS)


def _stands(
    faulty: Circuit, circuit: Circuit, shape: tuple[int, ...]
) -> tuple[BoolArray, BoolArray]:
    """Return where the output stays high, and where low."""
    topology = find_topology(circuit.topology)
    after, before = predict(faulty), predict(circuit)
    shown = "delay" if topology.run == "delay" else "t_high"
    first = _never(getattr(after, shown), getattr(before, shown), shape)
    if topology.discharge is None:
        nothing = np.zeros(shape, dtype=bool)
        return (nothing, first) if topology.run == "delay" else (first, nothing)
    return first, ~first & _never(after.t_low, before.t_low, shape)


def _never(after: object, before: object, shape: tuple[int, ...]) -> BoolArray:
    values = np.broadcast_to(np.asarray(after, dtype=float), shape)
    usual = float(np.asarray(before, dtype=float))
    never: BoolArray = ~(values < _SLOW * usual)
    return never


def _density(
    faulty: Circuit, held: BoolArray, state: State, level: Reading, supply_v: float
) -> float:
    """Return the density of the level that was read, against one evenly over the supply.

    A node that nothing charges any more has not moved from 0 V since power came on.
    """
    states = settle_states(faulty)
    settling = (
        states.charge[-1] if state == "high" or states.discharge is None else states.discharge
    )
    ends = np.clip(np.broadcast_to(settling.v, held.shape), 0.0, supply_v)
    taus = np.broadcast_to(settling.tau, held.shape)
    usual_tau = np.median(taus[np.isfinite(taus)]) if np.isfinite(taus).any() else 0.0
    still = np.broadcast_to(np.asarray(faulty.v_upper, dtype=float), held.shape)
    rests = np.where((ends > still) & (usual_tau > 0) & (state == "high"), 0.0, ends)[held]
    u = math.hypot(level.u / supply_v, _U_LEVEL)
    apart = (level.value - rests) / supply_v / u
    densities = np.exp(-(apart**2) / 2) / (u * math.sqrt(2 * math.pi))
    return float(np.mean(densities)) + 1e-6


def _first_group(suspects: tuple[Suspect, ...]) -> Group | None:
    named = [item for item in suspects if item.fault not in (UNEXPLAINED, HEALTHY)]
    members = [item for item in named if item.likelihood_ratio > _LEAST_RATIO]
    if not members:
        return None
    return Group(
        number=1,
        members=tuple(item.fault for item in members),
        probability=sum(item.probability for item in members),
        why="" if len(members) == 1 else "Each of them holds the output in this state.",
    )


def _grouped(suspects: tuple[Suspect, ...], group: Group | None) -> Iterator[Suspect]:
    for item in suspects:
        inside = group is not None and item.fault in group.members
        yield replace(item, group=1) if inside else item


def _next(level: Reading | None, best: Suspect) -> Iterator[NextReading]:
    if level is not None or best.probability >= _CERTAIN:
        return
    yield NextReading(
        reading="node-level",
        why="Read the capacitor's voltage with a voltmeter of 10 MΩ or more: 0 V, the supply and "
        "what lies between tell an open part, a short and a leak apart.",
        gain_bits=1.0,
        minutes=0.5,
        caution="The board is powered: an earth-referenced clip on a mains-fed board is a short "
        "circuit. The meter itself loads the node.",
    )


def _sentence(state: State, suspects: tuple[Suspect, ...], group: Group | None) -> str:
    best = suspects[0]
    head = f"The output stays {state}."
    if best.probability >= _CERTAIN and best.fault in ACTIONS:
        return f"{head} {ACTIONS[best.fault]} ({percent(best.probability)} sure)."
    if group is None or best.fault == UNEXPLAINED:
        first = "check the supply, the reset pin, then the IC"
        return f"{head} No fault of the list holds it there: {first}."
    more = len(group.members) - _MOST_NAMED
    named = [name_fault(fault) for fault in group.members[:_MOST_NAMED]]
    shown = f"{join(named)} (or {more} more)" if more > 0 else join(named)
    return f"{head} Most likely {shown}. Check the supply at the IC's pins first."
