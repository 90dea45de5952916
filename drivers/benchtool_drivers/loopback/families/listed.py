"""An instrument that prints its samples as a list of volts."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray
from benchtool_drivers.loopback.families.instrument import (
    INF_READING,
    NAN_READING,
    SimulatedInstrument,
)


class Listed(SimulatedInstrument):
    """Readings in volts with commas between them."""

    commands: ClassVar[dict[str, str]] = {
        "DATA?": "_data",
        "DATA:POINts?": "_points",
        "DATA:CHANnel": "choose",
        "SAMPle:TIMer?": "_interval",
        "INITiate[:IMMediate]": "arm",
        "ABORt": "stop",
        "STATe?": "_status",
        "VOLTage:RANGe?": "_range",
    }

    def codes(self) -> AnyArray:
        """Return the readings of the whole record, with the digits that are printed."""
        volts = self.seen().copy()
        marks = {"nan": NAN_READING, "all_nan": NAN_READING, "inf": -INF_READING}
        if self.fault in marks:
            volts[slice(None) if self.fault == "all_nan" else slice(3, 8)] = marks[self.fault]
        return np.array([float(f"{value:+.9E}") for value in volts])

    def volts_of(self, codes: AnyArray) -> AnyArray:
        """Return the volts that its readings stand for."""
        return codes.astype(np.float64)

    def _data(self, _parameters: str) -> str:
        readings = [self.figure(value) for value in self.codes()]
        if self.fault == "count_less":
            readings.pop()
        if self.fault == "count_more":
            readings.append(self.figure(0.0))
        if self.fault == "garbage_header":
            readings[0] = "?!garbage"
        if self.fault == "error_during":
            self.push_error('-230,"Data corrupt or stale"')
        return ",".join(readings)

    def _points(self, _parameters: str) -> str:
        return str(self.n_points // 3 if self.fault == "window_stuck" else self.n_points)

    def _interval(self, _parameters: str) -> str:
        return self.figure(self.dt_s)

    def _status(self, _parameters: str) -> str:
        return {"free": "RUN", "wait": "WAIT", "done": "DONE"}[self.status()]

    def _range(self, _parameters: str) -> str:
        return self.figure(self._high_v)
