"""An instrument whose preamble is ten figures in a fixed order, read by start and stop."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument


class Positional(SimulatedInstrument):
    """Ten-field preamble; volts are (code - reference) * increment + origin."""

    commands: ClassVar[dict[str, str]] = {
        "WAVeform:PREamble?": "_preamble",
        "WAVeform:DATA?": "_data",
        "WAVeform:FORMat": "_set_format",
        "WAVeform:FORMat?": "_format",
        "WAVeform:SOURce": "choose",
        "WAVeform:STARt": "_set_start",
        "WAVeform:STARt?": "_start_now",
        "WAVeform:STOP": "_set_stop",
        "WAVeform:STOP?": "_stop_now",
        "ACQuire:POINts?": "_points",
        "SINGle": "arm",
        "RUN": "run",
        "STOP": "stop",
        "TRIGger:STATus?": "_status",
        "TRIGger:LEVel?": "_level",
        "TIMebase:SCALe?": "_time_scale",
        "CH#:SCALe?": "_volts_scale",
        "CH#:OFFSet?": "_volts_offset",
    }
    _BITS: ClassVar[dict[str, int]] = {"BYTE": 8, "WORD": 16}
    _first = 1
    _last: int | None = None
    _width = "BYTE"

    def _window(self) -> tuple[int, int]:
        last = self.n_points if self._last is None else min(self._last, self.n_points)
        return min(self._first, last + 1), last

    def codes(self) -> AnyArray:
        """Return the codes of the whole record."""
        bits = self._BITS[self._width]
        steps = (self.seen() - self._low_v) / self._increment()
        return np.clip(np.rint(steps), 0, 2**bits - 1).astype(">u2" if bits > 8 else "u1")

    def _increment(self) -> float:
        n_steps = (1 << self._BITS[self._width]) - 1
        return (self._high_v - self._low_v) / n_steps

    def volts_of(self, codes: AnyArray) -> AnyArray:
        """Return the volts that its codes stand for."""
        return self._low_v + codes.astype(np.float64) * self._increment()

    def _preamble(self, _parameters: str) -> str:
        first, last = self._window()
        half = 2 ** (self._BITS[self._width] - 1)
        increment = 9.91e37 if self.fault in ("nan", "all_nan") else self._increment()
        increment = 9.9e37 if self.fault == "inf" else increment
        n_points = self.n_points
        figures = (
            self.dt_s,  # time of a sample
            -n_points / 2 * self.dt_s,  # time of the reference sample
            0.0,  # reference sample
            increment,
            self._low_v + half * self._increment(),  # volts at the reference code
            float(half),
        )
        head = f"{0 if self._width == 'BYTE' else 1},0,{last - first + 1},1"
        return ",".join([head, *map(self.figure, figures)])

    def _data(self, _parameters: str) -> bytes:
        first, last = self._window()
        codes = self.codes()[first - 1 : last]
        return self.block((codes.byteswap() if self.fault == "wrong_order" else codes).tobytes())

    def _set_format(self, parameters: str) -> None:
        self._width = self.agreed(parameters, ("BYTE", "WORD"))

    def _format(self, _parameters: str) -> str:
        return self._width

    def _set_start(self, parameters: str) -> None:
        if self.fault != "window_stuck":
            self._first = int(parameters)

    def _set_stop(self, parameters: str) -> None:
        if self.fault == "window_stuck":
            self._last = self._last or self.n_points // 3
        else:
            self._last = int(parameters)

    def _start_now(self, _parameters: str) -> str:
        return str(self._first)

    def _stop_now(self, _parameters: str) -> str:
        return str(self._window()[1])

    def _points(self, _parameters: str) -> str:
        return str(self.n_points)

    def _status(self, _parameters: str) -> str:
        return {"free": "RUN", "wait": "WAIT", "done": "STOP"}[self.status()]

    def _level(self, _parameters: str) -> str:
        return self.figure(self.level_v)

    def _time_scale(self, _parameters: str) -> str:
        return self.figure(self.n_points * self.dt_s / 10)

    def _volts_scale(self, _number: int, _parameters: str) -> str:
        return self.figure((self._high_v - self._low_v) / 8)

    def _volts_offset(self, _number: int, _parameters: str) -> str:
        return self.figure(self.level_v)
