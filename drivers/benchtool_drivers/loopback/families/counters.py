"""Counters that look at a board: one that reads functions, one that stamps edges."""

from __future__ import annotations

import struct
from collections.abc import Callable, Iterator
from typing import Any, ClassVar

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

_SEEN_LATER = 3  # cycles that pass between two readings
_WORDS = ("FREQ", "PER", "PWID", "NWID", "DCYC")


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


class FunctionCounter(SimulatedCounter):
    """SENSe:FUNCtion chooses, TRIGger:COUNt says how many, FETCh? brings them; READ? brings one.

    References:
        SCPI-1999, volume 2: FETCh, FORMat, INITiate, SENSe:FUNCtion, STATus, TRIGger.
    """

    commands: ClassVar[dict[str, str]] = {
        "SENSe:FUNCtion[:ON]": "_set_function",
        "SENSe:FUNCtion[:ON]?": "_function_now",
        "TRIGger:COUNt": "count_asked",
        "TRIGger:COUNt?": "count_now",
        "FORMat[:DATA]": "_set_format",
        "FORMat[:DATA]?": "_format_now",
        "FORMat:BORDer": "_set_border",
        "FORMat:BORDer?": "_border_now",
        "INITiate[:IMMediate]": "arm",
        "INITiate:CONTinuous": "_set_continuous",
        "INITiate:CONTinuous?": "_continuous",
        "ABORt": "stop",
        "STATus:OPERation:CONDition?": "_condition",
        "FETCh?": "_fetch",
        "FETCh:ARRay?": "_fetch_array",
        "READ?": "_read",
        "SENSe:TINTerval:RESolution?": "_resolution",
        **{f"SENSe:{word}:APERture?": "_aperture" for word in _WORDS},
    }
    function = "FREQ"
    gate_s = 0.1
    duty_unit = 100.0
    _format: tuple[str, int] = ("ASC", 9)
    _swapped = False
    _held: FloatArray = np.zeros(0)

    def __init__(self, board: Board, **given: Any) -> None:
        super().__init__(board, **given)
        inputs = [f"{word}{n}:LEV?" for word in ("INP", "INPUT") for n in self.channels]
        self._table |= dict.fromkeys(inputs, self._level)

    def _take(self) -> None:
        super()._take()
        self._held = np.array(list(self._counted(self.n_asked)))

    def _counted(self, n: int) -> Iterator[float]:
        """Yield readings: each waits for its own edges, cycles pass between them."""
        beat = self.board()
        period_s = beat.t_high + beat.t_low
        n_gated = max(1, int(self.gate_s / period_s)) if self.function in ("FREQ", "PER") else 1
        ticks = self.edges(n * (n_gated + _SEEN_LATER))
        rising, falling = ticks[:-1:2], ticks[1::2]
        for k in range(n):
            at = k * (n_gated + _SEEN_LATER)
            whole = (rising[at + n_gated] if at + n_gated < rising.size else ticks[-1]) - rising[at]
            high = falling[at] - rising[at]
            low = (rising[at + 1] if at + 1 < rising.size else ticks[-1]) - falling[at]
            yield {
                "FREQ": n_gated / (whole * self.tick_s),
                "PER": whole * self.tick_s / n_gated,
                "PWID": high * self.tick_s,
                "NWID": low * self.tick_s,
                "DCYC": self.duty_unit * high / whole,
            }[self.function]

    def _set_function(self, parameters: str) -> None:
        word, _, channel = parameters.strip("\"' ").partition(" ")
        self.function = self.agreed(word[:4], _WORDS)
        self.choose(channel or "1")

    def _function_now(self, _parameters: str) -> str:
        return f'"{self.function} {self._channel + 1}"'

    def _fetch(self, _parameters: str) -> bytes:
        return self._written(self._held)

    def _fetch_array(self, parameters: str) -> bytes:
        self.n_asked = int(parameters)
        self._take()
        return self._written(self._held)

    def _read(self, _parameters: str) -> bytes | None:
        if self.fault == "trigger_never":
            return None
        return self.listing(self.numbers(np.array(list(self._counted(1))))).encode()

    def _written(self, held: FloatArray) -> bytes:
        values = self.numbers(held)
        if self._format[0] == "ASC":
            return self.listing(values).encode()
        order = "<" if self._swapped != (self.fault == "wrong_order") else ">"
        return self.block(values.astype(f"{order}f{self._format[1] // 8}").tobytes())

    def _set_format(self, parameters: str) -> None:
        word, _, size = parameters.upper().replace(" ", "").partition(",")
        self.agreed(f"{word[:4]},{size}", ("REAL,32", "REAL,64", "ASC,", "ASCI,", "ASC,9"))
        self._format = ("REAL", int(size)) if word == "REAL" else ("ASC", 9)

    def _format_now(self, _parameters: str) -> str:
        return f"{self._format[0]},{self._format[1]}"

    def _set_border(self, parameters: str) -> None:
        self._swapped = self.agreed(parameters, ("NORM", "SWAP", "NORMAL", "SWAPPED"))[0] == "S"

    def _border_now(self, _parameters: str) -> str:
        return "SWAP" if self._swapped else "NORM"

    def _set_continuous(self, parameters: str) -> None:
        if parameters.upper() in ("ON", "1"):
            self.run()
        elif self.status() == "free":
            self.stop()

    def _continuous(self, _parameters: str) -> str:
        return str(int(self.status() == "free"))

    def _condition(self, _parameters: str) -> str:
        return {"free": "16", "wait": "32", "done": "0"}[self.status()]

    def _level(self, _parameters: str) -> str:
        return self.figure(2.5)

    def _resolution(self, _parameters: str) -> str:
        return self.precise(self.tick_s)

    def _aperture(self, _parameters: str) -> str:
        return self.precise(self.gate_s)


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

    def held(self) -> AnyArray:
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


COUNTERS: dict[str, type[SimulatedCounter]] = {
    "functions": FunctionCounter,
    "stamps": StampCounter,
}
"""Name of a structure, and the counter that has it."""
