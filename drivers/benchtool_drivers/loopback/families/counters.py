"""The simulated counters by name."""

from __future__ import annotations

from benchtool_drivers.loopback.families.counting import (
    COUNTER_FAULTS,
    Beat,
    Board,
    SimulatedCounter,
)
from benchtool_drivers.loopback.families.function_counter import FunctionCounter
from benchtool_drivers.loopback.families.stamp_counter import StampCounter

__all__ = [
    "COUNTERS",
    "COUNTER_FAULTS",
    "Beat",
    "Board",
    "FunctionCounter",
    "SimulatedCounter",
    "StampCounter",
]

COUNTERS: dict[str, type[SimulatedCounter]] = {
    "functions": FunctionCounter,
    "stamps": StampCounter,
}
"""Name of a structure, and the counter that has it."""
