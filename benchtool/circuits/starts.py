"""Where to begin looking for the products: the times over the logarithms of the thresholds."""

from __future__ import annotations

import math

from benchtool.circuits.coordinates import circuit_at
from benchtool.circuits.observations import Observation
from benchtool.circuits.topologies import Topology, find_topology
from benchtool.model.design import Design, Stage

_LEAST_SHARE = 0.02  # of RA in RA + RB, where the times say less than nothing of RA


def start_logs(
    stage: Stage, design: Design, observations: tuple[Observation, ...]
) -> tuple[float, ...]:
    """Return logarithms of RA·C and RB·C, or of R·C, near the solution.

    Args:
        stage: Gives the thresholds.
        design: Gives the supply.
        observations: At least the times that the products need.
    """
    topology = find_topology(stage.topology)
    factors = _factors(stage, design, topology)
    rough = {
        item.name: item.measured.value / factors[item.name]
        for item in observations
        if item.name in factors
    }
    if not topology.has_two_products:
        return (math.log(next(iter(rough.values()))),)
    charge, discharge = rough["t_high"], rough["t_low"]
    if topology.resistors[0] != ("RA",):
        charge = max(charge - discharge, _LEAST_SHARE * charge)
    return math.log(charge), math.log(discharge)


def _factors(stage: Stage, design: Design, topology: Topology) -> dict[str, float]:
    """Return each time over its time constant for an ideal circuit at the stage's thresholds."""
    circuit = circuit_at(stage, design)
    v, upper, lower = float(circuit.supply), float(circuit.v_upper), float(circuit.v_lower)
    from_zero = _log_ratio(v, v - upper)
    if topology.run is not None:
        return {topology.run: from_zero}
    up, down = _log_ratio(v - lower, v - upper), _log_ratio(upper, lower)
    return {"t_high": up, "t_low": down, "period": (up + down) * stage.divide}


def _log_ratio(above: float, below: float) -> float:
    """Return ln(above/below), 1 where there is none: the solver finds out why."""
    return math.log(above / below) if 0 < below < above else 1.0
