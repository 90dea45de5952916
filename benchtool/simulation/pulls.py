"""What pulls the timing node in each state, and when it gets where: with a ripple too."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import Circuit, States, find_topology, settle_states
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray
from benchtool.simulation.legs import Leg, Wave

_STEPS_PER_CYCLE = 40
_CHUNK = 4096
_LONGEST_TAU = 30.0


@frozen_record
class Goal:
    """A node voltage to be reached, and the amplitude with which a ripple moves it."""

    v: float
    rising: bool
    swing_v: float = 0.0


@frozen_record
class Pull:
    """One state of the node.

    Attributes:
        settle_v, tau_s, esr_share: See ``Leg``.
        swing_v: Amplitude with which a ripple moves ``settle_v``.
        until: Node voltage at which the next pull takes over; None where none does.
    """

    settle_v: float
    tau_s: float
    esr_share: float = 0.0
    swing_v: float = 0.0
    until: Goal | None = None

    def inside_after(self, begin_v: float, start_s: float, wait_s: float, wave: Wave) -> float:
        """Return the voltage inside the capacitor ``wait_s`` after ``start_s``, volts."""
        omega_tau = wave.omega_per_s * self.tau_s
        swing, lag = self.swing_v / math.hypot(1.0, omega_tau), math.atan(omega_tau)
        then = self.settle_v + swing * wave.value(start_s, lag)
        now = self.settle_v + swing * wave.value(start_s + wait_s, lag)
        return now + (begin_v - then) * math.exp(-wait_s / self.tau_s)

    def seconds_to(self, goal: Goal, begin_v: float, start_s: float, wave: Wave) -> float:
        """Return seconds from ``begin_v`` inside until the node is at ``goal``; inf for never.

        Args:
            goal: What is to be reached.
            begin_v: Voltage inside the capacitor at ``start_s``.
            start_s: Time at which the node begins, for the phase of the ripple.
            wave: The ripple; of no depth where there is none.
        """
        if wave.depth_rel == 0:
            return self._plain_seconds(goal.v, begin_v, goal.rising)
        reach_v = goal.swing_v + abs(self.swing_v)
        nearer_v = goal.v - reach_v if goal.rising else goal.v + reach_v
        first_s = self._plain_seconds(nearer_v, begin_v, goal.rising)
        if not math.isfinite(first_s):
            return math.inf
        return self._first_crossing(goal, begin_v, start_s, wave, first_s)

    def _plain_seconds(self, goal_v: float, begin_v: float, rising: bool) -> float:
        """Return tau·ln[(V - v0)/(V - v1)], 0 where the goal lies behind, inf where beyond V."""
        if goal_v == self.settle_v or (self.settle_v > goal_v) != rising:
            return math.inf
        inside_v = goal_v + (goal_v - self.settle_v) * self.esr_share
        ratio = (self.settle_v - begin_v) / (self.settle_v - inside_v)
        return self.tau_s * math.log(ratio) if ratio > 1 else 0.0

    def _first_crossing(
        self, goal: Goal, begin_v: float, start_s: float, wave: Wave, first_s: float
    ) -> float:
        """Walk from ``first_s`` in fine steps to the first crossing, then halve the step."""
        sign = 1.0 if goal.rising else -1.0

        def is_short(wait_s: FloatArray) -> BoolArray:
            short: BoolArray = sign * self._short_of(goal, begin_v, start_s, wait_s, wave) > 0
            return short

        step_s = 2 * math.pi / wave.omega_per_s / _STEPS_PER_CYCLE
        begin_s = first_s
        while begin_s < first_s + _LONGEST_TAU * self.tau_s:
            waits = begin_s + step_s * np.arange(_CHUNK + 1, dtype=np.float64)
            reached = np.flatnonzero(~is_short(waits))
            if reached.size:
                hit = int(reached[0])
                return _bisect(is_short, float(waits[max(hit - 1, 0)]), float(waits[hit]))
            begin_s = float(waits[-1])
        return math.inf

    def _short_of(
        self, goal: Goal, begin_v: float, start_s: float, wait_s: FloatArray, wave: Wave
    ) -> FloatArray:
        """Return how far the node still is below the goal, volts."""
        omega_tau = wave.omega_per_s * self.tau_s
        swing, lag = self.swing_v / math.hypot(1.0, omega_tau), math.atan(omega_tau)
        times_s = start_s + wait_s
        kept = begin_v - self.settle_v - swing * wave.value(start_s, lag)
        decay = np.exp(-wait_s / self.tau_s)
        inside = self.settle_v + swing * wave.at(times_s, lag) + kept * decay
        pull = self.settle_v + self.swing_v * wave.at(times_s)
        node = (inside + pull * self.esr_share) / (1.0 + self.esr_share)
        short: FloatArray = goal.v + goal.swing_v * wave.at(times_s) - node
        return short


def _bisect(is_short: Callable[[FloatArray], BoolArray], low_s: float, high_s: float) -> float:
    """Return the first time between the two at which the node is no longer short of its goal."""
    for _ in range(60):
        middle_s = 0.5 * (low_s + high_s)
        if is_short(np.array([middle_s]))[0]:
            low_s = middle_s
        else:
            high_s = middle_s
    return high_s


@frozen_record
class Network:
    """A circuit as pulls and goals, ready to be walked.

    Attributes:
        charge: Pulls of the charging node in the order in which they take over.
        discharge: Pull of the discharging node; a one-shot's switch at rest; None at power-on.
        upper, lower: Thresholds.
        delay_upper_s, delay_lower_s: From a threshold's crossing to the turn of the node.
        start_v: Voltage inside the capacitor from which a single run begins.
    """

    charge: tuple[Pull, ...]
    discharge: Pull | None
    upper: Goal
    lower: Goal
    delay_upper_s: float
    delay_lower_s: float
    start_v: float


def build_network(circuit: Circuit, depth_rel: float = 0.0) -> Network:
    """Return the pulls of a circuit, all floats, on a supply that may ripple by ``depth_rel``."""
    topology = find_topology(circuit.topology)
    low, mid, high = (
        settle_states(_on_supply(circuit, 1 + share)) for share in (-depth_rel, 0.0, depth_rel)
    )
    v_upper, v_lower = float(circuit.v_upper), float(circuit.v_lower)
    discharge = _pull(low, mid, high, -1) if mid.discharge is not None else _rest(circuit)
    return Network(
        charge=tuple(_pull(low, mid, high, i) for i in range(len(mid.charge))),
        discharge=discharge,
        upper=Goal(v=v_upper, rising=True, swing_v=v_upper * depth_rel),
        lower=Goal(v=v_lower, rising=False, swing_v=v_lower * depth_rel),
        delay_upper_s=float(circuit.delay_upper),
        delay_lower_s=float(circuit.delay_lower),
        start_v=float(topology.start(circuit)),
    )


def _on_supply(circuit: Circuit, share: float) -> Circuit:
    """Return the circuit with supply and thresholds at ``share`` of themselves."""
    return replace(
        circuit,
        supply=circuit.supply * share,
        v_upper=circuit.v_upper * share,
        v_lower=circuit.v_lower * share,
    )


def _pull(low: States, mid: States, high: States, index: int) -> Pull:
    below, here, above = (
        states.discharge if index < 0 else states.charge[index] for states in (low, mid, high)
    )
    if below is None or here is None or above is None:
        raise ValueError("a single run has no discharge")
    until = None
    if below.until_v is not None and here.until_v is not None and above.until_v is not None:
        swing_v = float(above.until_v - below.until_v) / 2
        until = Goal(v=float(here.until_v), rising=True, swing_v=swing_v)
    return Pull(
        settle_v=float(here.v),
        tau_s=float(here.tau),
        esr_share=float(here.esr_share),
        swing_v=float(above.v - below.v) / 2,
        until=until,
    )


def _rest(circuit: Circuit) -> Pull | None:
    """Return a one-shot's node at rest: the closed switch empties the capacitor."""
    topology = find_topology(circuit.topology)
    if topology.run != "t_high":
        return None
    tau_s = max(float(circuit.r_on), 1e-3) * float(circuit.C)
    return Pull(settle_v=float(topology.start(circuit)), tau_s=tau_s)


def charge_legs(network: Network, begin_v: float, start_s: float, wave: Wave) -> Iterator[Leg]:
    """Yield the legs from ``begin_v`` until the node turns at the upper threshold.

    The last leg is endless where the threshold is out of reach.
    """
    left_s, v, now_s = network.delay_upper_s, begin_v, start_s
    for pull in network.charge:
        crossing_s = pull.seconds_to(network.upper, v, now_s, wave)
        handover_s = math.inf
        if pull.until is not None:
            handover_s = pull.seconds_to(pull.until, v, now_s, wave)
        spent_s = min(crossing_s + left_s, handover_s)
        yield _leg(pull, v, now_s, spent_s, output_high=True)
        if crossing_s + left_s <= handover_s:
            return
        left_s -= max(0.0, handover_s - crossing_s)
        v, now_s = pull.inside_after(v, now_s, spent_s, wave), now_s + spent_s


def discharge_leg(network: Network, begin_v: float, start_s: float, wave: Wave) -> Leg:
    """Return the leg from ``begin_v`` until the node turns at the lower threshold.

    Raises:
        ValueError: If the circuit never discharges.
    """
    pull = network.discharge
    if pull is None:
        raise ValueError("this circuit never discharges")
    spent_s = pull.seconds_to(network.lower, begin_v, start_s, wave) + network.delay_lower_s
    return _leg(pull, begin_v, start_s, spent_s, output_high=False)


def _leg(pull: Pull, begin_v: float, start_s: float, spent_s: float, *, output_high: bool) -> Leg:
    return Leg(
        start_s=start_s,
        duration_s=spent_s,
        settle_v=pull.settle_v,
        tau_s=pull.tau_s,
        begin_v=begin_v,
        esr_share=pull.esr_share,
        output_high=output_high,
        swing_v=pull.swing_v,
    )


def end_of(leg: Leg, wave: Wave) -> float:
    """Return the voltage inside the capacitor at the end of a leg, volts."""
    pull = Pull(
        settle_v=leg.settle_v, tau_s=leg.tau_s, esr_share=leg.esr_share, swing_v=leg.swing_v
    )
    return pull.inside_after(leg.begin_v, leg.start_s, leg.duration_s, wave)
