"""An instrument that knows TRACe, FORMat, INITiate and STATus as SCPI-1999 has them."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray
from benchtool_drivers.loopback.families.instrument import (
    INF_READING,
    NAN_READING,
    SimulatedInstrument,
)


class Standard(SimulatedInstrument):
    """Volts as REAL numbers, or as text; no scaling of its own.

    References:
        SCPI-1999, volume 2: FORMat, INITiate, SENSe:SWEep, STATus, TRACe.
    """

    commands: ClassVar[dict[str, str]] = {
        "FORMat[:DATA]": "_set_format",
        "FORMat[:DATA]?": "_format_now",
        "FORMat:BORDer": "_set_border",
        "FORMat:BORDer?": "_border_now",
        "TRACe[:DATA]?": "_trace",
        "TRACe:POINts?": "_points",
        "TRACe:CATalog?": "_catalogue",
        "SENSe:SWEep:TINTerval?": "_interval",
        "SENSe:SWEep:OFFSet:TIME?": "_offset",
        "INITiate[:IMMediate]": "arm",
        "INITiate:CONTinuous": "_set_continuous",
        "INITiate:CONTinuous?": "_continuous",
        "ABORt": "stop",
        "STATus:OPERation:CONDition?": "_condition",
        "TRIGger:LEVel?": "_level",
    }
    _format: tuple[str, int] = ("ASC", 9)
    _swapped = False

    def codes(self) -> AnyArray:
        """Return the samples of the whole record as they are sent."""
        volts = self.seen().copy()
        marks = {"nan": NAN_READING, "all_nan": NAN_READING, "inf": INF_READING}
        if self.fault in marks:
            volts[slice(None) if self.fault == "all_nan" else slice(3, 8)] = marks[self.fault]
        order = "<" if self._swapped else ">"
        return volts.astype(f"{order}f{self._format[1] // 8 if self._format[0] == 'REAL' else 8}")

    def volts_of(self, codes: AnyArray) -> AnyArray:
        """Return the volts that its samples stand for."""
        return codes.astype(np.float64)

    def _channel_of(self, parameters: str) -> list[str]:
        name, *rest = (item.strip() for item in parameters.split(","))
        self.choose(name)
        return rest

    def _trace(self, parameters: str) -> bytes:
        window = [int(item) for item in self._channel_of(parameters)]
        offset, count = window or (0, self.n_points)
        samples = self.codes()[offset : offset + count]
        if self._format[0] == "ASC":
            return ",".join(map(self.figure, samples)).encode()
        if self.fault == "wrong_order":
            samples = samples.byteswap()
        return self.block(samples.tobytes())

    def _points(self, parameters: str) -> str:
        self._channel_of(parameters)
        return str(self.n_points // 3 if self.fault == "window_stuck" else self.n_points)

    def _catalogue(self, _parameters: str) -> str:
        return ",".join(f'"CH{n}"' for n in range(1, len(self.record) + 1))

    def _interval(self, _parameters: str) -> str:
        return self.figure(self.dt_s)

    def _offset(self, _parameters: str) -> str:
        return self.figure(0.0)

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
        return self.figure(self.level_v)
