"""What is said of a fault."""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.fault_moves import Move, one
from benchtool.frozen import frozen_record

Place = Literal["C", "RA", "RB", "R", "IC", "diode", "board", "probe"]
"""Where a fault sits."""

LOW, HIGH = (-0.4, -0.05), (0.05, 0.4)
"""Usual relative changes of a drifted part: common practice."""

OPEN_OHM, SHORT_OHM = (1e10, 1e12), (0.1, 10.0)
"""What is left of an open resistor, and what a short has."""


@frozen_record
class Fault:
    """One fault that is a change of the circuit's figures.

    Attributes:
        name: As in the list of faults.
        topologies: Where it can happen.
        part: Where it sits; None for the healthy board.
        move: What it does to the circuit.
        unit: Unit of the size; ``1`` for a relative change; empty where it has no size.
        sizes: Usual range of the size, in ``unit`` times ``reference``.
        reference: What the range is a multiple of.
        seen: What a person would see, one sentence.
    """

    name: str
    topologies: tuple[str, ...]
    part: Place | None
    move: Move
    unit: str = "1"
    sizes: tuple[float, float] = (0.0, 0.0)
    reference: Callable[[Circuit], Value] = one
    seen: str
