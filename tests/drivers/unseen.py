"""An instrument that none of the bundled dialects speaks to, and the one-page manual of it.

The dialect in ``unseen.toml`` was written from this page alone:

    PROGRAMMING THE RECORDER                                                            page 7-1

    Commands end with CR LF, answers with CR LF. The recorder has two inputs, A and B.

    ERR?             number of the last error, E00 when there was none; reading clears it.
    MODE?            answers HOLD, LOOK (awaits the trigger) or ROLL (runs by itself).
    GO               takes one record. ROLL runs by itself. HALT ends both.
    PUSH             triggers by hand.
    INPUT A | B      chooses the input that is read.
    SIZE?            length of the record in samples.
    SCALE?           answers  "<sensitivity in mV a division>/<position in divisions>".
    RATE?            answers the sample rate in kHz.
    READ? <n>        answers page n of the record, counted from 0, as a block: the sign %, two
                     bytes of count with the higher first, the samples, one byte that makes the
                     sum of count, samples and itself a multiple of 256. A page has 1000 samples;
                     the last one may have fewer. The count includes the sum byte.
    A sample is one byte, 0 to 255; the middle of the screen is 128 and a division has 25 steps.
    Volts are ((sample - 128) / 25 - position) times the sensitivity. The recorder does not know of
    the 10:1 probe it is sold with.
"""

from __future__ import annotations

from collections import deque

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray

PAGE = 1000
MV_PER_DIVISION = 100.0
POSITION = -2.5
RATE_KHZ = 200.0
PROBE = 10.0


class Recorder:
    """Answers as the page says.

    Args:
        volts: What input A sees at the probe's tip; input B sees it turned over.
        rolling: Whether it runs by itself.
    """

    def __init__(self, volts: FloatArray, *, rolling: bool = False) -> None:
        self.inputs = {"A": volts, "B": volts[::-1].copy()}
        self.chosen = "A"
        self.mode = "ROLL" if rolling else "HOLD"
        self.error = 0
        self.spoil_sum = False
        self.deaf = False
        self._out: deque[bytes] = deque()

    def samples(self, name: str) -> AnyArray:
        """Return the samples of an input, as its page says."""
        divisions = self.inputs[name] / PROBE * 1000 / MV_PER_DIVISION + POSITION
        codes: AnyArray = np.clip(np.rint(divisions * 25 + 128), 0, 255).astype(np.uint8)
        return codes

    def receive(self, message: bytes) -> None:
        """Do what a message says."""
        word, _, value = message.decode().strip().partition(" ")
        if word == "READ?":
            self._out.append(self._page(int(value)) + b"\r\n")
            return
        answers = {
            "*IDN?": "Invented recorder 2",
            "ERR?": f"E{self.error:02}",
            "MODE?": self.mode,
            "SIZE?": str(self.inputs["A"].size),
            "SCALE?": f"{MV_PER_DIVISION:.1f}/{POSITION:.2f}",
            "RATE?": f"{RATE_KHZ:.3f}",
        }
        if word in answers:
            if word == "ERR?":
                self.error = 0
            self._out.append(answers[word].encode() + b"\r\n")
        elif word == "INPUT" and value in self.inputs:
            self.chosen = value
        elif word == "GO":
            self.mode = "LOOK" if self.deaf else "HOLD"
        elif word in ("HALT", "PUSH"):
            self.mode = "HOLD"
        elif word == "ROLL":
            self.mode = "ROLL"
        else:
            self.error = 11

    def _page(self, n: int) -> bytes:
        data = self.samples(self.chosen)[n * PAGE : (n + 1) * PAGE].tobytes()
        count = (len(data) + 1).to_bytes(2, "big")
        rest = -(sum(count) + sum(data)) % 256
        return b"%" + count + data + bytes([(rest + self.spoil_sum) % 256])

    def output(self) -> bytes | None:
        """Give the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Forget all answers."""
        self._out.clear()
