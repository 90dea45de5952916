"""A counter that is asked for a function and answers with readings of it."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, ClassVar

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool_drivers.loopback.families.counting import Board, SimulatedCounter

_SEEN_LATER = 3  # cycles that pass between two readings
_WORDS = ("FREQ", "PER", "PWID", "NWID", "DCYC")


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
