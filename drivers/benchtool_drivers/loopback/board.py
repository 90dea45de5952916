"""A simulated board to look at: a design, a fault, a trimmer that moves."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import Circuit, apply_fault, circuit_at, find_topology, predict
from benchtool.circuits.circuit import with_fields
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture
from benchtool.model.design import Design, Stage
from benchtool.simulation import Acquisition, Injected, simulate
from benchtool_drivers.loopback.families.counting import Beat


@frozen_record
class Trimmer:
    """A part that somebody turns to and fro, evenly in its value.

    Attributes:
        ref: The part.
        low, high: The values between which it goes, in ohms or farads.
        sweep_s: Seconds from one end to the other.
    """

    ref: str
    low: float
    high: float
    sweep_s: float

    def at(self, elapsed_s: float) -> float:
        """Return its value after so many seconds; it begins at ``low``."""
        turn = elapsed_s / self.sweep_s % 2
        return self.low + (self.high - self.low) * (turn if turn < 1 else 2 - turn)


class SimulatedBoard:
    """A board that runs for ever, recorded as often as asked.

    Args:
        stage: The stage; ``design`` gives supply, temperature and probe.
        design: Its design.
        acquisition: How each record is taken.
        fault: Its fault.
        trimmer: What moves, if anything does.
        seed: Of the random generator: the same seed gives the same records in the same order.

    Raises:
        UsageError: If the fault is unknown here, or the stage has no such part (``no-such-part``).
    """

    def __init__(
        self,
        stage: Stage,
        design: Design,
        acquisition: Acquisition,
        *,
        fault: Injected,
        trimmer: Trimmer | None = None,
        seed: int = 0,
    ) -> None:
        self._circuit = apply_fault(fault.name, circuit_at(stage, design), fault.size)
        self._acquisition = acquisition
        self._trimmer = trimmer
        self._rng = np.random.default_rng(seed)
        parts = find_topology(stage.topology).parts
        if trimmer is not None and trimmer.ref not in parts:
            raise UsageError(
                f"{stage.name} has no part {trimmer.ref}",
                hint=f"Its parts: {', '.join(parts)}.",
                code="no-such-part",
            )

    def circuit(self, elapsed_s: float) -> Circuit:
        """Return the circuit as it stands after so many seconds."""
        if self._trimmer is None:
            return self._circuit
        return with_fields(self._circuit, {self._trimmer.ref: self._trimmer.at(elapsed_s)})

    def record(self, elapsed_s: float) -> Capture:
        """Return a record taken now; each has noise and a phase of its own."""
        capture, _ = simulate(self.circuit(elapsed_s), self._acquisition, self._rng)
        return capture

    def beat(self, elapsed_s: float) -> Beat | None:
        """Return how its output goes high and low by then; None where it stands still."""
        times = predict(replace(self.circuit(elapsed_s), divide=1))
        t_high, t_low = float(times.t_high or math.nan), float(times.t_low or math.nan)
        if not math.isfinite(t_high + t_low):
            return None
        clock = 1 + self._acquisition.timebase_rel
        return Beat(
            t_high=t_high * clock, t_low=t_low * clock, jitter_rel=self._acquisition.jitter_rel
        )

    def edges(self) -> Iterator[tuple[float, bool]]:
        """Yield the output's edges for ever: seconds since the start, and the state after each.

        A board that stands still yields none.
        """
        now_s = 0.0
        while (beat := self.beat(now_s)) is not None:
            own = 1 + beat.jitter_rel * self._rng.standard_normal()
            yield now_s, True
            yield now_s + beat.t_high * own, False
            now_s += (beat.t_high + beat.t_low) * own
