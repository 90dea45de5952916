"""A third instrument that none of the bundled dialects speaks to, and the page of it.

GRAB takes one record, HALT gives up; STATE? answers ARMED or HELD. CHAN A|B chooses the channel.
INFO? describes it in keys and values with | between them, in engineering notation:
    CHANNEL:A|LENGTH:10 kpts|DT:50us|STEP:5mV|ZERO:548|DELAY:-100ms
SEEK n moves to byte n of the record. BLOCK? answers up to 4096 samples from there as a block; a
sample is 12 bits, left-justified in two bytes with the lower one first. ERR? answers OK, or the
oldest error.
"""

from __future__ import annotations

from collections import deque

import numpy as np

from benchtool.model.arrays import FloatArray, NDArray

STEP_V = 5e-3
ZERO = 548
DT_S = 50e-6
T0_S = -0.1
PAGE = 4096


class Pages:
    """Answers as the page says.

    Args:
        volts: What channel A sees; channel B sees it turned over.
    """

    def __init__(self, volts: FloatArray) -> None:
        self.inputs = {"A": volts, "B": volts[::-1].copy()}
        self.chosen = "A"
        self.place = 0
        self.busy = False
        self.miscount = False
        self.seeks: list[int] = []
        self._errors: deque[str] = deque()
        self._out: deque[bytes] = deque()

    def codes(self, name: str) -> NDArray[np.uint16]:
        """Return the twelve bits of each sample of a channel."""
        return np.rint(self.inputs[name] / STEP_V + ZERO).astype(np.uint16)

    def receive(self, message: bytes) -> None:
        """Take one command."""
        word, _, value = message.decode("ascii").strip().partition(" ")
        answers = {
            "*IDN?": "INVENTED,PAGES,0,1",
            "STATE?": "HELD",
            "ERR?": self._errors.popleft() if word == "ERR?" and self._errors else "OK",
            "INFO?": self._info(),
        }
        if word in answers:
            self._out.append(answers[word].encode("ascii") + b"\n")
        elif word == "BLOCK?":
            self._out.append(self._block())
        elif word == "CHAN":
            self.chosen = value
        elif word == "SEEK":
            self.place = int(value)
            self.seeks.append(self.place)
        elif word == "GRAB" and self.busy:
            self._errors.append('-213,"Init ignored"')
        elif word not in ("GRAB", "HALT"):
            self._errors.append(f'-113,"Undefined header;{word}"')

    def _info(self) -> str:
        length = f"{self.inputs['A'].size / 1000:g} kpts"
        return f"CHANNEL:{self.chosen}|LENGTH:{length}|DT:50us|STEP:5mV|ZERO:{ZERO}|DELAY:-100ms"

    def _block(self) -> bytes:
        first = self.place // 2
        words = self.codes(self.chosen)[first : first + PAGE] << 4
        data = words.astype("<u2").tobytes()
        count = str(len(data) - 2 if self.miscount else len(data))
        return f"#{len(count)}{count}".encode("ascii") + data + b"\n"

    def output(self) -> bytes | None:
        """Return the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Drop what was not fetched."""
        self._out.clear()
