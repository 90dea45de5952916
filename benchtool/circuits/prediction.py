"""Forward: from a circuit to its times."""

from __future__ import annotations

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.node import Settling, settle
from benchtool.circuits.stuck import Stuck, explain_stuck
from benchtool.circuits.topologies import Topology, find_topology
from benchtool.frozen import frozen_record


@frozen_record(eq=False)
class Prediction:
    """The times of a circuit in seconds, hertz and shares; None where it has no such time.

    A time that does not exist because the node never reaches its threshold is NaN.

    Attributes:
        t_high: High time of the output, or the pulse of a one-shot, seconds.
        t_low: Low time of the output, seconds.
        period: Sum of both, seconds.
        frequency: Its inverse, hertz.
        duty: High time over period.
        first_high: First high time after a step of the supply, node at 0 V, seconds.
        delay: Delay after power-up, seconds.
        stuck: Why a single board stands still; None where it runs, and for arrays.
    """

    t_high: Value | None = None
    t_low: Value | None = None
    period: Value | None = None
    frequency: Value | None = None
    duty: Value | None = None
    first_high: Value | None = None
    delay: Value | None = None
    stuck: Stuck | None = None


@frozen_record(eq=False)
class States:
    """The loaded node in both states.

    Attributes:
        charge: Settlings of the charging node in the order in which they take over.
        discharge: Settling of the discharging node; None for a single run.
    """

    charge: tuple[Settling, ...]
    discharge: Settling | None

    @property
    def effective_charge(self) -> Settling:
        """The settling in which the node leaves its lower turning point."""
        return self.charge[0]


def settle_states(circuit: Circuit) -> States:
    """Return how the node of a circuit settles in both states."""
    topology = find_topology(circuit.topology)
    sunk = topology.sunk(circuit)
    charge = tuple(settle(circuit, drive, sunk) for drive in topology.charge(circuit))
    if topology.discharge is None:
        return States(charge=charge, discharge=None)
    return States(charge=charge, discharge=settle(circuit, topology.discharge(circuit), sunk))


def predict(circuit: Circuit) -> Prediction:
    """Compute the times of a circuit.

    Args:
        circuit: Floats for one board, arrays for many.

    Returns:
        Floats, or arrays of the broadcast shape. Where the output counts cycles
        (``divide`` > 1) only period and frequency are given.

    References:
        With V_s the settling voltage and tau_s the time constant of state s:
        t_high = td_U + tau_c·ln[(V_c - VL')/(V_c - VU)],
        t_low = td_L + tau_d·ln[(VU' - V_d)/(VL - V_d)], where VU' and VL' are the turning points
        after the delays. Integrating Kirchhoff's current law at the node gives the same.
    """
    topology = find_topology(circuit.topology)
    states = settle_states(circuit)
    times = _cycle_times(circuit, topology, states)
    if topology.run is None:
        times = _with_period(times, circuit.divide)
    return _finished(circuit, states, times)


def _cycle_times(circuit: Circuit, topology: Topology, states: States) -> dict[str, Value]:
    start = _charge_time(circuit, states.charge, topology.start(circuit))
    if topology.run is not None or states.discharge is None:
        return {topology.run or "t_high": start}
    discharge = states.discharge
    low_turn = discharge.after(discharge.inside(circuit.v_lower), circuit.delay_lower)
    high_turn = _overshoot(circuit, states.charge)
    fall = discharge.fall_time(high_turn, circuit.v_lower)
    return {
        "first_high": start,
        "t_high": _charge_time(circuit, states.charge, low_turn),
        "t_low": fall + circuit.delay_lower,
    }


def _charge_time(circuit: Circuit, charge: tuple[Settling, ...], start_v: Value) -> Value:
    """Return seconds from ``start_v`` inside the capacitor to the turn at the upper threshold."""
    last = charge[-1]
    if len(charge) == 1:
        return last.rise_time(start_v, circuit.v_upper) + circuit.delay_upper
    first, handover = charge[0], _handover(charge)
    two_parts = handover < circuit.v_upper
    time_first = first.rise_time(start_v, np.minimum(handover, circuit.v_upper))
    resumed = np.maximum(start_v, first.inside(handover))
    time_last = np.where(two_parts, last.rise_time(resumed, circuit.v_upper), 0.0)
    return time_first + time_last + circuit.delay_upper


def _overshoot(circuit: Circuit, charge: tuple[Settling, ...]) -> Value:
    """Return the voltage inside the capacitor when the node turns to discharge, volts."""
    last = charge[-1]
    from_last = last.after(last.inside(circuit.v_upper), circuit.delay_upper)
    if len(charge) == 1:
        return from_last
    first, handover = charge[0], _handover(charge)
    at_upper = first.inside(circuit.v_upper)
    before = np.fmin(first.rise_time(at_upper, handover), circuit.delay_upper)
    from_first = last.after(first.after(at_upper, before), circuit.delay_upper - before)
    return np.where(handover < circuit.v_upper, from_last, from_first)


def _handover(charge: tuple[Settling, ...]) -> Value:
    until = charge[0].until_v
    if until is None:
        raise ValueError("a drive that is followed by another must say until when it holds")
    return until


def _with_period(times: dict[str, Value], divide: int) -> dict[str, Value]:
    period = (times["t_high"] + times["t_low"]) * divide
    with np.errstate(all="ignore"):  # a circuit without delays may turn at once
        frequency, duty = np.divide(1.0, period), np.divide(times["t_high"], period)
    if divide > 1:
        return {"period": period, "frequency": frequency}
    return {**times, "period": period, "frequency": frequency, "duty": duty}


def _finished(circuit: Circuit, states: States, times: dict[str, Value]) -> Prediction:
    if any(np.ndim(value) for value in times.values()):
        return _named(times, None)
    plain: dict[str, Value] = {name: float(value) for name, value in times.items()}
    if not any(np.isnan(value) for value in plain.values()):
        return _named(plain, None)
    return _named(plain, explain_stuck(circuit, states.charge, states.discharge))


def _named(times: dict[str, Value], stuck: Stuck | None) -> Prediction:
    return Prediction(
        t_high=times.get("t_high"),
        t_low=times.get("t_low"),
        period=times.get("period"),
        frequency=times.get("frequency"),
        duty=times.get("duty"),
        first_high=times.get("first_high"),
        delay=times.get("delay"),
        stuck=stuck,
    )
