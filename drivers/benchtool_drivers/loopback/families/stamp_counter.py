"""A counter that stamps the time of edges."""

from __future__ import annotations

import struct
from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray
from benchtool_drivers.loopback.families.counting import SimulatedCounter
from benchtool_drivers.loopback.families.instrument import NAN_READING


class StampCounter(SimulatedCounter):
    """Time stamps as whole ticks, rising and falling in turn."""

    commands: ClassVar[dict[str, str]] = {
        "TSTamp:TICK?": "_tick",
        "TSTamp:FIRSt?": "_first",
        "TSTamp:CHANnel": "choose",
        "TSTamp:COUNt": "count_asked",
        "TSTamp:COUNt?": "count_now",
        "TSTamp:STARt": "arm",
        "TSTamp:STOP": "stop",
        "TSTamp:STATe?": "_state_now",
        "TSTamp:DATA?": "_data",
        "TSTamp:LIST?": "_list",
        "TSTamp:LEVel?": "_level",
    }
    first_rises = True
    slopes = "both"
    _held: FloatArray = np.zeros(0)

    def _take(self) -> None:
        super()._take()
        every = {"both": 1, "levels": 1, "rising": 2, "falling": 2}[self.slopes]
        ticks = self.edges(every * self.n_asked + 4)
        first = int(self.slopes == "falling" or (every == 1 and not self.first_rises))
        self._held = ticks[first::every][: self.n_asked + 2]

    def held(self) -> FloatArray:
        """Return the stamps in ticks; a skipped edge gives its place to the next one."""
        n = self._held.size
        gone = {"missed_edges": [n // 2], "missed_pair": [n // 2, n // 2 + 1]}
        kept = np.delete(self._held, gone.get(self.fault or "", []))[: self.n_asked]
        if self.fault == "stands_back":
            kept[3] = kept[1]
        return kept

    def _levels(self) -> AnyArray:
        whole = (np.arange(self._held.size) % 2 == 0) == self.first_rises
        n = self._held.size
        gone = {"missed_edges": [n // 2], "missed_pair": [n // 2, n // 2 + 1]}
        return np.delete(whole, gone.get(self.fault or "", []))[: self.n_asked]

    def _data(self, _parameters: str) -> bytes:
        ticks = self.numbers(self.held())
        order = "<" if self.fault == "wrong_order" else ">"
        packed = b"".join(struct.pack(f"{order}Q", int(tick)) for tick in ticks)
        return self.block(packed)

    def _list(self, _parameters: str) -> str:
        seconds = self.held() * self.tick_s
        if self.fault == "late_first":
            seconds[0] = NAN_READING
        if self.slopes == "levels":
            seconds = np.column_stack([seconds, self._levels()]).ravel()
        return self.listing(self.numbers(seconds))

    def _tick(self, _parameters: str) -> str:
        return self.precise(self.tick_s)

    def _first(self, _parameters: str) -> str:
        return "POS" if self.first_rises else "NEG"

    def _state_now(self, _parameters: str) -> str:
        return {"free": "RUN", "wait": "WAIT", "done": "DONE"}[self.status()]

    def _level(self, _parameters: str) -> str:
        return self.figure(2.5)
