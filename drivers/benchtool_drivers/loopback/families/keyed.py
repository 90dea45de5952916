"""An instrument whose preamble is keys and values, read by offset and count."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument


class Keyed(SimulatedInstrument):
    """Key/value preamble, headers on at first; volts are code * gain - offset."""

    commands: ClassVar[dict[str, str]] = {
        "HEADer": "_set_header",
        "HEADer?": "_header",
        "DATA:PREamble?": "_preamble",
        "DATA:VALues?": "_values",
        "DATA:TYPE": "_set_type",
        "DATA:TYPE?": "_type_now",
        "DATA:WIDth": "_set_width",
        "DATA:WIDth?": "_width_now",
        "DATA:SOURce": "choose",
        "DATA:OFFSet": "_set_offset",
        "DATA:COUNt": "_set_count",
        "HORizontal:LENGth?": "_length",
        "HORizontal:RATE?": "_rate",
        "INITiate[:IMMediate]": "arm",
        "INITiate:CONTinuous": "_set_continuous",
        "INITiate:CONTinuous?": "_continuous",
        "ABORt": "stop",
        "TRIGger:FORCe": "force",
        "TRIGger:LEVel?": "_level",
        "STATus:OPERation:CONDition?": "_condition",
    }
    _headers = True
    _signed = True
    _width = 2
    _offset = 0
    _count: int | None = None
    _little = False

    def _gain(self) -> float:
        return (self._high_v - self._low_v) / ((1 << 8 * self._width) - 1)

    def codes(self) -> AnyArray:
        """Return the codes of the whole record."""
        steps = np.rint((self.seen() - self._low_v) / self._gain())
        kind = f"{'<' if self._little else '>'}{'i' if self._signed else 'u'}{self._width}"
        lowest = 256**self._width // 2 if self._signed else 0
        return (np.clip(steps, 0, 256**self._width - 1) - lowest).astype(kind)

    def _zero(self) -> float:
        """Return what is taken off the scaled codes."""
        lowest = 256**self._width // 2 if self._signed else 0
        return -self._low_v - lowest * self._gain()

    def volts_of(self, codes: AnyArray) -> AnyArray:
        """Return the volts that its codes stand for."""
        lowest = 256**self._width // 2 if self._signed else 0
        return self._low_v + (codes.astype(np.float64) + lowest) * self._gain()

    def _titled(self, title: str, text: str) -> str:
        return f":{title} {text}" if self._headers else text

    def _n_window(self) -> int:
        room = max(self.n_points - self._offset, 0)
        return room if self._count is None else min(self._count, room)

    def _preamble(self, _parameters: str) -> str:
        gain = {"nan": 9.91e37, "all_nan": 9.91e37, "inf": 9.9e37}.get(
            self.fault or "", self._gain()
        )
        pairs = [
            f"NPT {self._n_window()}",
            f"BYT {self._width}",
            f"SIGN {'INT' if self._signed else 'UINT'}",
            f"ORD {'LSB' if self._little else 'MSB'}",
            f"TINT {self.figure(self.dt_s)}",
            f"TOFF {self.figure(0.0)}",
            f"GAIN {self.figure(gain)}",
            f"OFFS {self.figure(self._zero())}",
            'UNIT "V"',
            'TEXT "a note; with NPT 7 in it"',
        ]
        return self._titled("DATA:PREAMBLE", ";".join(pairs))

    def _values(self, _parameters: str) -> bytes:
        codes = self.codes()[self._offset : self._offset + self._n_window()]
        payload = (codes.byteswap() if self.fault == "wrong_order" else codes).tobytes()
        return self._titled("DATA:VALUES", "").encode() + self.block(payload)

    def _set_header(self, parameters: str) -> None:
        self._headers = parameters.upper() in ("ON", "1")

    def _header(self, _parameters: str) -> str:
        return self._titled("HEADER", str(int(self._headers)))

    def _set_type(self, parameters: str) -> None:
        word = self.agreed(parameters, ("INT,BIG", "UINT,BIG", "INT,LITT", "UINT,LITT"))
        self._signed, self._little = word.startswith("INT"), word.endswith("LITT")

    def _type_now(self, _parameters: str) -> str:
        kind = "INT" if self._signed else "UINT"
        return self._titled("DATA:TYPE", f"{kind},{'LITT' if self._little else 'BIG'}")

    def _set_width(self, parameters: str) -> None:
        self._width = int(self.agreed(parameters, ("1", "2")))

    def _width_now(self, _parameters: str) -> str:
        return self._titled("DATA:WIDTH", str(self._width))

    def _set_offset(self, parameters: str) -> None:
        self._offset = int(parameters)

    def _set_count(self, parameters: str) -> None:
        stuck = self.fault == "window_stuck"
        self._count = self.n_points // 3 if stuck else int(parameters)

    def _length(self, _parameters: str) -> str:
        return self._titled("HORIZONTAL:LENGTH", str(self.n_points))

    def _rate(self, _parameters: str) -> str:
        return self._titled("HORIZONTAL:RATE", self.figure(1 / self.dt_s))

    def _set_continuous(self, parameters: str) -> None:
        if parameters.upper() in ("ON", "1"):
            self.run()
        elif self.status() == "free":
            self.stop()

    def _continuous(self, _parameters: str) -> str:
        return self._titled("INITIATE:CONTINUOUS", str(int(self.status() == "free")))

    def _level(self, _parameters: str) -> str:
        return self._titled("TRIGGER:LEVEL", self.figure(self.level_v))

    def _condition(self, _parameters: str) -> str:
        bits = {"free": 16, "wait": 32, "done": 0}[self.status()]
        return self._titled("STATUS:OPERATION:CONDITION", str(bits))
