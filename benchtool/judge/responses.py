"""Every quantity that limits may name, computed from the circuit for many boards at once."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from benchtool.circuits import Circuit, Value, circuit_at, find_topology, predict
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Stage

UNITS: Mapping[str, str] = {
    "t_high": "s",
    "t_low": "s",
    "period": "s",
    "frequency": "Hz",
    "duty": "1",
    "first_high": "s",
    "delay": "s",
    "tau_charge": "s",
    "tau_discharge": "s",
}
"""Quantities that the parts determine, with their units."""

_PRODUCTS = ("tau_charge", "tau_discharge")


def respond(
    stage: Stage, design: Design, point: Mapping[str, Value], *, size: int = 1
) -> dict[str, FloatArray]:
    """Return every quantity of a stage at one or many points of its tolerances.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        point: Coordinate name to value or row of values; those left out are at their centre.
        size: Number of boards.

    Returns:
        Quantity to a row of shape (size,), in SI units; NaN where a board is stuck.
    """
    circuit = circuit_at(stage, design, point)
    with np.errstate(all="ignore"):
        prediction = predict(circuit)
    found = {name: getattr(prediction, name, None) for name in UNITS} | _products(circuit)
    return {
        name: np.broadcast_to(np.asarray(value, dtype=np.float64), (size,))
        for name, value in found.items()
        if value is not None
    }


def _products(circuit: Circuit) -> dict[str, Value]:
    """Return the products of the parts alone, seconds."""
    sides = find_topology(circuit.topology).resistors
    return {
        name: sum(getattr(circuit, ref) for ref in refs) * circuit.C
        for name, refs in zip(_PRODUCTS, sides, strict=True)
    }


def respond_nominally(stage: Stage, design: Design) -> dict[str, float | None]:
    """Return every quantity of the board with all at its centre; the times None if it is stuck."""
    found = {name: float(row[0]) for name, row in respond(stage, design, {}).items()}
    stuck = any(math.isnan(value) for value in found.values())
    return {
        name: None if stuck and name not in _PRODUCTS else value for name, value in found.items()
    }
