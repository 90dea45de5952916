"""What simulated counters have in common: the board they look at, and how it is timed."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray
from benchtool_drivers.loopback.families.instrument import (
    CONTENT_FAULTS,
    NAN_READING,
    SimulatedInstrument,
)


@frozen_record
class Beat:
    """How a board beats at a moment: times in seconds, jitter relative to each cycle."""

    t_high: float
    t_low: float
    jitter_rel: float = 0.0


Board = Callable[[], Beat]
"""Tells how a board beats now."""

COUNTER_FAULTS = (*CONTENT_FAULTS, "missed_edges", "missed_pair", "late_first", "stands_back")
"""What can be wrong: beside the faults of all instruments, edges that were not stamped: one, two,
the first one (its stamp is marked as none), and a stamp that lies before its neighbour."""


class SimulatedCounter(SimulatedInstrument):
    """What the counters have in common; it holds no record of volts.

    Args:
        board: What it looks at.
        tick_s: Step to which it times edges.
        seed: Of its random phase and the board's jitter.
        fault: One of ``COUNTER_FAULTS``, or None.
        running: Whether it runs by itself at first.
    """

    def __init__(
        self,
        board: Board,
        *,
        tick_s: float = 1e-9,
        seed: int = 1,
        fault: str | None = None,
        running: bool = False,
    ) -> None:
        self.board = board
        self.tick_s = tick_s
        self.n_asked = 1
        self._rng = np.random.default_rng(seed)
        self.sent: list[AnyArray] = []
        super().__init__(
            [np.zeros(1)],
            1.0,
            ("1", "2"),
            running=running,
            identity="Invented,Simulated counter,0,1.0",
        )
        self.set_fault(fault)

    def set_fault(self, fault: str | None) -> None:
        """Let something be wrong from now on; None for nothing."""
        if fault is not None and fault not in COUNTER_FAULTS:
            raise ValueError(f"no fault is called {fault!r}: {', '.join(COUNTER_FAULTS)}")
        super().set_fault(fault if fault in CONTENT_FAULTS else None)
        self.fault = fault

    def edges(self, n_cycles: int) -> FloatArray:
        """Return the times of edges from a rising one on, on the grid of the counter's clock."""
        beat = self.board()
        own = 1 + beat.jitter_rel * self._rng.standard_normal((n_cycles, 1))
        widths_s = own * np.array([beat.t_high, beat.t_low])
        times_s = self._rng.random() * self.tick_s + np.concatenate([[0.0], np.cumsum(widths_s)])
        ticks: FloatArray = np.floor(times_s / self.tick_s)
        return ticks

    def count_asked(self, parameters: str) -> None:
        """Take how many readings or stamps are wanted."""
        self.agreed("N", ("N",))
        self.n_asked = int(parameters)
        if self.n_asked < 1:
            raise ValueError(parameters)

    def count_now(self, _parameters: str) -> str:
        """Return how many are wanted."""
        return str(self.n_asked)

    def choose(self, parameters: str) -> None:
        """Choose the input."""
        if parameters.strip() not in self.channels:
            raise ValueError(parameters)
        self._channel = self.channels.index(parameters.strip())

    def numbers(self, values: AnyArray) -> AnyArray:
        """Return numbers as the counter sends them, with what is wrong with them."""
        if self.fault in ("nan", "all_nan") and values.dtype.kind == "f":
            values = values.copy()
            values[slice(None) if self.fault == "all_nan" else slice(2, 5)] = NAN_READING
        if self.fault == "empty":
            values = values[:0]
        self.sent.append(values)
        return values

    def listing(self, values: AnyArray) -> str:
        """Print numbers with commas between them."""
        printed = [self.precise(float(value)) for value in values]
        if self.fault == "count_less":
            printed.pop()
        if self.fault == "count_more":
            printed.append(self.precise(1.0))
        if self.fault == "garbage_header":
            printed[0] = "?!garbage"
        if self.fault == "error_during":
            self.push_error('-230,"Data corrupt or stale"')
        return ",".join(printed)

    def precise(self, value: float) -> str:
        """Print a number with all its digits."""
        text = f"{value:+.16E}"
        return text.replace(".", ",") if self.fault == "comma" else text
