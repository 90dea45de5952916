"""A link that answers from a table, and dialects put together from tables."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, cast

import numpy as np

from benchtool.errors import InstrumentTimeoutError, ReplyError, Step
from benchtool.instruments import Order
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, Waveform
from benchtool_drivers.dialect import parse_dialect
from benchtool_drivers.digitiser import Digitiser
from benchtool_drivers.link import Link

HEAD = """schema = 1
name = "scripted"
basis = "invented"
kind = "digitiser"
[channel]
names = ["CH1", "CH2"]
"""

Answer = str | bytes | tuple[str, bytes] | Callable[[], str | bytes]


class ScriptedLink:
    """Answers from a table; remembers what was said.

    Args:
        answers: The answer to each query: a text, the data of a block, or a text and a block.
        queue: What the error queue holds.
    """

    def __init__(self, answers: Mapping[str, Answer], queue: list[str] | None = None) -> None:
        self.answers = answers
        self.queue = queue or []
        self.said: list[str] = []
        self.resource = "SCRIPT::1::INSTR"
        self.identity = "Invented,Script,0,1"
        self.last_good = ""
        self.reopened = False
        self.closed = False
        self.counted: list[int | None] = []
        self.given: dict[str, Any] = {}

    def _answer(self, command: str) -> Any:
        self.said.append(command)
        if command not in self.answers:
            raise InstrumentTimeoutError(
                f"no answer to {command}", hint="", step=Step(command=command, got="nothing")
            )
        found = self.answers[command]
        return found() if callable(found) else found

    def recover(self) -> None:
        """Be in step already."""

    def send(self, command: str) -> None:
        """Note a command."""
        self.said.append(command)

    def ask(self, command: str, *, match: str | None = None, timeout_s: float | None = None) -> str:
        """Answer with a text."""
        assert match is None
        assert timeout_s is None or timeout_s > 0
        found = self._answer(command)
        assert isinstance(found, str), command
        return found

    def ask_block(self, command: str, *, n_bytes: int | None = None, **given: Any) -> bytes:
        """Answer with the data of a block."""
        found = self._answer(command)
        assert isinstance(found, bytes), command
        self.counted.append(n_bytes)
        self.given = given
        if n_bytes is not None and n_bytes != len(found):
            raise ReplyError("another count", hint="", step=Step(command=command))
        if given.get("progress"):
            given["progress"](len(found), len(found))
        return found

    def ask_led_block(self, command: str, **_given: Any) -> tuple[str, bytes]:
        """Answer with a text and a block."""
        found = self._answer(command)
        assert isinstance(found, tuple), command
        return found

    def ask_text_list(self, command: str, **_given: Any) -> bytes:
        """Answer with a text, undecoded."""
        return str(self._answer(command)).encode("latin-1")

    def errors(self) -> tuple[str, ...]:
        """Empty the error queue."""
        found, self.queue = tuple(self.queue), []
        return found

    def close(self) -> None:
        """Note the end."""
        self.closed = True


def digitiser(tables: str, link: ScriptedLink) -> Digitiser:
    """Return an instrument of a dialect whose tables are given."""
    return Digitiser(cast("Link", link), parse_dialect(HEAD + tables))


def record(tables: str, link: ScriptedLink, order: Order | None = None) -> Capture:
    return digitiser(tables, link).acquire(order or Order())


def volts(capture: Capture, n: int = 0) -> FloatArray:
    trace = capture.traces[n]
    assert isinstance(trace, Waveform)
    samples = np.concatenate(list(trace.samples.blocks())).astype(np.float64)
    scaled: FloatArray = samples * trace.scale.gain + trace.scale.offset
    return scaled


def points(capture: Capture) -> dict[str, str]:
    return {point.name: point.value for point in capture.structure}
