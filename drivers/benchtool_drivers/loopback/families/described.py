"""An instrument that sends a binary descriptor and the samples in one block."""

from __future__ import annotations

import struct
from typing import ClassVar

import numpy as np

from benchtool.model.arrays import AnyArray
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument

_HEAD_BYTES = 64


class Described(SimulatedInstrument):
    """Descriptor of 64 bytes, little first; volts are code * gain - offset."""

    commands: ClassVar[dict[str, str]] = {
        "CAPTure:STATus?": "_status",
        "CAPTure:LENGth?": "_length",
        "CAPTure:CHANnel": "choose",
        "CAPTure:ARM": "arm",
        "CAPTure:TRIGger": "force",
        "CAPTure:ABORt": "stop",
        "CAPTure:BLOCk?": "_block",
        "CAPTure:LEVel?": "_level",
    }
    little = True

    def _gain(self) -> float:
        return float(np.float32((self._high_v - self._low_v) / 65535))

    def _zero(self) -> float:
        return float(np.float32(-(self._low_v + self._high_v) / 2))

    def codes(self) -> AnyArray:
        """Return the codes of the whole record."""
        steps = np.rint((self.seen() + self._zero()) / self._gain())
        return np.clip(steps, -32768, 32767).astype("<i2" if self.little else ">i2")

    def volts_of(self, codes: AnyArray) -> AnyArray:
        """Return the volts that its codes stand for."""
        return codes.astype(np.float64) * self._gain() - self._zero()

    def _block(self, _parameters: str) -> bytes:
        codes = self.codes()
        told = {"nan": float("nan"), "all_nan": float("nan"), "inf": float("inf")}
        gain = told.get(self.fault or "", self._gain())
        n_points = codes.size // 3 if self.fault == "window_stuck" else codes.size
        head = struct.pack(
            f"{'<' if self.little else '>'}8sHHIIIddff",
            *(b"WAVEBLOK", int(self.little), 16, _HEAD_BYTES, codes.nbytes, n_points),
            *(self.dt_s, -0.001, gain, self._zero()),
        ).ljust(_HEAD_BYTES, b"\0")
        if self.fault == "wrong_order":
            codes = codes.byteswap()
        return self.block(head + codes.tobytes())

    def _status(self, _parameters: str) -> str:
        return {"free": "IDLE", "wait": "ARMED", "done": "FULL"}[self.status()]

    def _length(self, _parameters: str) -> str:
        return str(self.n_points)

    def _level(self, _parameters: str) -> str:
        return self.figure(self.level_v)
