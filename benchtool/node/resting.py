"""A board that stands still: what the level of its node says."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from types import MappingProxyType

from benchtool.circuits import FAULTS
from benchtool.frozen import frozen_record
from benchtool.model.design import TopologyName
from benchtool.model.diagnosis import State
from benchtool.model.node import NodeZone, Resting
from benchtool.model.quantity import Measured

_AT_AN_END = 0.03  # of the supply: nearer to 0 V or to the rail is there
_NEAR = 3.0  # standard uncertainties from a border within which both sides count


@frozen_record
class _Row:
    """What a node at rest in one zone means while the output is in one state."""

    why: str
    faults: tuple[str, ...]


_ROWS: Mapping[tuple[State, NodeZone], _Row] = MappingProxyType(
    {
        ("high", "zero"): _Row(
            why="nothing charges the capacitor, or it is shorted",
            faults=("C-short", "RA-open", "RB-open", "R-open"),
        ),
        ("high", "low"): _Row(
            why="the capacitor charges against something that draws as much as it gets",
            faults=("C-leaky", "discharge-leak", "probe-load", "C-short", "output-high-drop"),
        ),
        ("high", "between"): _Row(
            why="the capacitor charges against something that draws as much as it gets",
            faults=("C-leaky", "discharge-leak", "probe-load", "output-high-drop"),
        ),
        ("high", "high"): _Row(
            why="the node is above the upper threshold and the IC does not turn",
            faults=("upper-threshold", "control-high"),
        ),
        ("high", "rail"): _Row(
            why="the node is at the supply and the IC does not turn",
            faults=("upper-threshold", "control-high"),
        ),
        ("low", "zero"): _Row(
            why="the node is below the lower threshold and the IC does not turn; look whether "
            "reset is held low",
            faults=("lower-threshold", "control-low"),
        ),
        ("low", "low"): _Row(
            why="the node is below the lower threshold and the IC does not turn; look whether "
            "reset is held low",
            faults=("lower-threshold", "control-low"),
        ),
        ("low", "between"): _Row(
            why="the capacitor discharges against something that feeds it as much",
            faults=("node-leak-to-supply", "discharge-weak", "output-low-rise", "RB-open"),
        ),
        ("low", "high"): _Row(
            why="the capacitor is not discharged, or fed as much as it is",
            faults=("discharge-weak", "node-leak-to-supply", "RB-open", "R-open"),
        ),
        ("low", "rail"): _Row(
            why="the capacitor is not discharged at all",
            faults=("discharge-weak", "RB-open", "R-open", "node-leak-to-supply"),
        ),
    }
)


def read_resting_node(
    state: State,
    level: Measured,
    supply_v: float,
    thresholds_v: tuple[float, float],
    *,
    topology: TopologyName | None = None,
    charge_ohm: float | None = None,
    discharge_ohm: float | None = None,
) -> Resting:
    """Return what can hold a board whose output does not turn, from the level of its node.

    Args:
        state: Where the output stays.
        level: The node, volts.
        supply_v: Supply, volts.
        thresholds_v: Upper and lower threshold as designed, volts.
        topology: The circuit, where known: faults that it cannot have are left out.
        charge_ohm: Resistance through which it charges, for the leak that would hold it there.
        discharge_ohm: The same for the discharge.

    Returns:
        Where the node rests, the faults that can hold it there, likeliest first, and the
        resistance that would.
    """
    upper_v, lower_v = thresholds_v
    zone = _zone(level.value, supply_v, upper_v, lower_v)
    near = {
        _zone(level.value + side * _NEAR * level.u, supply_v, upper_v, lower_v)
        for side in (-1, 0, 1)
    }
    row = _ROWS[state, zone]
    others = (fault for other in sorted(near - {zone}) for fault in _ROWS[state, other].faults)
    return Resting(
        state=state,
        zone=zone,
        zones=tuple(sorted(near)),
        level=level,
        why=row.why,
        faults=_possible(dict.fromkeys((*row.faults, *others)), topology),
        holding_ohm=_holding(state, level.value, supply_v, charge_ohm, discharge_ohm),
    )


def _zone(level_v: float, supply_v: float, upper_v: float, lower_v: float) -> NodeZone:
    if level_v < _AT_AN_END * supply_v:
        return "zero"
    if level_v < lower_v:
        return "low"
    if level_v <= upper_v:
        return "between"
    return "rail" if level_v > (1 - _AT_AN_END) * supply_v else "high"


def _possible(faults: Iterable[str], topology: TopologyName | None) -> tuple[str, ...]:
    return tuple(name for name in faults if topology is None or topology in FAULTS[name].topologies)


def _holding(
    state: State,
    level_v: float,
    supply_v: float,
    charge_ohm: float | None,
    discharge_ohm: float | None,
) -> float | None:
    """Return the resistance to the other rail that would hold the node where it is."""
    if state == "high" and charge_ohm is not None and 0 < level_v < supply_v:
        return charge_ohm * level_v / (supply_v - level_v)
    if state == "low" and discharge_ohm is not None and 0 < level_v < supply_v:
        return discharge_ohm * (supply_v - level_v) / level_v
    return None
