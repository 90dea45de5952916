"""A second instrument that none of the bundled dialects speaks to, and the leaflet of it.

Commands and answers end with CR LF; each answer begins with its command. Decimal comma.

FAULT?          none, or the oldest fault.       STATUS?        busy or ready.
START           takes one record.                LENGTH?        samples in the record.
WINDOW a,b      samples a to b, b not included.  POINTS?        samples in the window.
CLOCK?          sample rate, such as 0,25 MHz.   RANGE?         volts of codes 0; 4095.
SAMPLES?        the window as a block, whose count is in samples. Each is two bytes, the lower
                one first, with the twelve bits of the converter at the top.
"""

from __future__ import annotations

from collections import deque

import numpy as np

from benchtool.model.arrays import FloatArray, NDArray

LOW_V, HIGH_V = -10.0, 10.0
RATE_HZ = 250e3


class Box:
    """Answers as the leaflet says.

    Args:
        volts: What its input sees.
    """

    def __init__(self, volts: FloatArray) -> None:
        self.volts = volts
        self.window = (0, 10)
        self.faults: deque[str] = deque()
        self._out: deque[bytes] = deque()

    def codes(self) -> NDArray[np.uint16]:
        """Return the twelve bits of each sample."""
        steps = np.rint((self.volts - LOW_V) / (HIGH_V - LOW_V) * 4095)
        codes: NDArray[np.uint16] = np.clip(steps, 0, 4095).astype(np.uint16)
        return codes

    def receive(self, message: bytes) -> None:
        """Do what a message says."""
        word, _, value = message.decode().strip().partition(" ")
        first, last = self.window
        answers = {
            "*IDN?": "box 7",
            "FAULT?": self.faults[0] if self.faults else "none",
            "STATUS?": "ready",
            "LENGTH?": str(self.volts.size),
            "POINTS?": str(last - first),
            "CLOCK?": "0,25 MHz",
            "RANGE?": "-10,0;+10,0",
        }
        if word == "SAMPLES?":
            data = (self.codes()[first:last] << 4).astype("<u2")
            count = str(data.size).encode()
            block = b"#%d" % len(count) + count + data.tobytes()
            self._out.append(b"SAMPLES " + block + b"\r\n")
        elif word in answers:
            self._out.append(f"{word[:-1]} {answers[word]}\r\n".encode())
            if word == "FAULT?" and self.faults:
                self.faults.popleft()
        elif word == "WINDOW":
            self.window = (int(value.split(",")[0]), int(value.split(",")[1]))
        elif word != "START":
            self.faults.append(f"unknown {word}")

    def output(self) -> bytes | None:
        """Give the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Forget all answers."""
        self._out.clear()
