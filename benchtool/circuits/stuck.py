"""Why a node never reaches its threshold, in words with figures."""

from __future__ import annotations

import math
from typing import Literal

from benchtool.circuits.circuit import Circuit, with_fields
from benchtool.circuits.node import Settling, settle
from benchtool.circuits.topologies import find_topology
from benchtool.frozen import frozen_record


@frozen_record
class Stuck:
    """A circuit that stands still.

    Attributes:
        state: State in which the output stays.
        reason: Which threshold is out of reach, and what holds the node, one sentence.
    """

    state: Literal["high", "low"]
    reason: str


# What may hold the node, with the value at which it would not.
_CULPRITS: tuple[tuple[str, str, float], ...] = (
    ("leak_ohm", "the leak", math.inf),
    ("shunt_ohm", "the shunt across the capacitor", math.inf),
    ("probe_r", "the probe", math.inf),
    ("i_leak", "the capacitor's leakage current", 0.0),
    ("i_discharge_leak", "the leakage of the discharge switch", 0.0),
    ("i_bias", "the bias current", 0.0),
    ("r_on", "the on-resistance of the discharge switch", 0.0),
    ("v_sat", "the saturation voltage of the discharge switch", 0.0),
    ("diode_drop", "the drop of the steering diode", 0.0),
    ("series_diode_drop", "the drop of the series diode", 0.0),
    ("output_high_drop", "the drop of the high output", 0.0),
    ("output_low", "the level of the low output", 0.0),
)


def explain_stuck(
    circuit: Circuit, charge: tuple[Settling, ...], discharge: Settling | None
) -> Stuck:
    """Say why a single board stands still.

    Args:
        circuit: The circuit, all floats.
        charge: Its charging node.
        discharge: Its discharging node; None for a single run.
    """
    topology = find_topology(circuit.topology)
    settled = min(float(state.v) for state in charge)
    if settled <= float(circuit.v_upper) or discharge is None:
        state: Literal["high", "low"] = "low" if topology.run == "delay" else "high"
        return Stuck(state=state, reason=_sentence(circuit, settled, rising=True))
    return Stuck(state="low", reason=_sentence(circuit, float(discharge.v), rising=False))


def _sentence(circuit: Circuit, settled_v: float, *, rising: bool) -> str:
    culprit = _culprit(circuit, rising=rising)
    who = f"{culprit} keeps the node at" if culprit else "the node settles at"
    floor_v = min(0.0, float(circuit.leak_to_v))
    ceiling_v = max(float(circuit.supply), float(circuit.leak_to_v))
    shown_v = min(max(settled_v, floor_v), ceiling_v)
    if rising:
        end = f"below the upper threshold {_volts(float(circuit.v_upper))}"
    else:
        end = f"above the lower threshold {_volts(float(circuit.v_lower))}"
    return f"{who} {_volts(shown_v)}, {end}"


def _volts(value: float) -> str:
    return f"{value:.3g} V"


def _culprit(circuit: Circuit, *, rising: bool) -> str | None:
    """Return the one term without which the threshold would be reached, if there is one."""
    for field, words, neutral in _CULPRITS:
        value = getattr(circuit, field)
        if value is None or value == neutral:
            continue
        if _reaches(with_fields(circuit, {field: neutral}), rising=rising):
            return words
    return None


def _reaches(circuit: Circuit, *, rising: bool) -> bool:
    topology = find_topology(circuit.topology)
    sunk = topology.sunk(circuit)
    if rising:
        drives = topology.charge(circuit)
        return all(settle(circuit, drive, sunk).v > circuit.v_upper for drive in drives)
    if topology.discharge is None:
        return True
    return bool(settle(circuit, topology.discharge(circuit), sunk).v < circuit.v_lower)
