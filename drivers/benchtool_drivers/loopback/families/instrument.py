"""What all simulated instruments have: error queue, trigger, memory, and things that fail."""

from __future__ import annotations

import re
import time
from collections import deque
from collections.abc import Callable, Mapping, Sequence
from typing import ClassVar

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool_drivers.loopback.families.headers import spellings, split_message

Volts = Sequence[FloatArray] | Callable[[], Sequence[FloatArray]]
"""The volts of each channel, or what gives them at the moment of the trigger."""

CONTENT_FAULTS = (
    *("count_more", "count_less", "garbage_header", "nan", "inf", "all_nan", "comma"),
    *("error_before", "error_setup", "error_during", "busy", "trigger_never", "slow_trigger"),
    *("window_stuck", "wrong_order", "leftovers", "empty"),
)
"""What can be wrong in what an instrument says."""

_SLOW_S = 0.15
_MOST_ERRORS = 20
NAN_READING = 9.91e37
INF_READING = 9.9e37


class SimulatedInstrument:
    """Base of the families; each adds its commands to ``commands``.

    Args:
        volts: What its channels see.
        dt_s: Sample interval.
        channels: Names that the user gives the channels; the instrument calls them CH1, CH2.
        fault: One of ``CONTENT_FAULTS``, or None.
        running: Whether it runs by itself at first.
        identity: What it answers to ``*IDN?``.
    """

    commands: ClassVar[Mapping[str, str]] = {}
    _common: ClassVar[Mapping[str, str]] = {
        "*IDN?": "_identify",
        "*CLS": "_clear_status",
        "*OPC?": "_complete",
        "*ESR?": "_event_status",
        "*TRG": "force",
        "*RST": "_reset",
        "SYSTem:ERRor[:NEXT]?": "_next_error",
        "SYSTem:VERSion?": "_version",
    }

    def __init__(
        self,
        volts: Volts,
        dt_s: float,
        channels: Sequence[str] = ("CH1",),
        *,
        fault: str | None = None,
        running: bool = False,
        identity: str = "Invented,Simulated digitiser,0,1.0",
    ) -> None:
        self._volts = volts
        self.dt_s = dt_s
        self.channels = tuple(channels)
        self.identity = identity
        self.n_resets = 0
        self._answers: deque[bytes] = deque()
        self._backlog: deque[bytes] = deque()
        self._waits_for_end = False
        self._errors: deque[str] = deque()
        self._state = "free" if running else "done"
        self._armed_s = 0.0
        self._channel = 0
        self.record: tuple[FloatArray, ...] = ()
        self._low_v, self._high_v = self._span()
        self._take()
        self._table = {
            word: getattr(self, method)
            for pattern, method in {**self._common, **self.commands}.items()
            for word in spellings(pattern)
        }
        self.fault: str | None = None
        self.set_fault(fault)

    def set_fault(self, fault: str | None) -> None:
        """Let something be wrong from now on; None for nothing."""
        if fault is not None and fault not in CONTENT_FAULTS:
            raise ValueError(f"no fault is called {fault!r}: {', '.join(CONTENT_FAULTS)}")
        self.fault = fault
        if fault == "error_before":
            self.push_error('-113,"Undefined header;OLD:HEADER"')
        if fault == "leftovers":
            for n in range(5):
                self.push_error(f'-222,"Data out of range;old {n}"')

    # What a transport asks for.

    def receive(self, message: bytes) -> None:
        """Take one message; behind an open *OPC? it has to wait."""
        self._settle()
        if self._waits_for_end:
            self._backlog.append(message)
            return
        self._execute(message.decode("latin-1"))

    def output(self) -> bytes | None:
        """Return the next answer that is due."""
        self._settle()
        if self._waits_for_end and self.status() not in ("wait", "measure"):
            self._waits_for_end = False
            self._answers.append(b"1\n")
            while self._backlog and not self._waits_for_end:
                self._execute(self._backlog.popleft().decode("latin-1"))
        return self._answers.popleft() if self._answers else None

    def clear(self) -> None:
        """Forget what is under way, as a device clear does; settings and errors stay."""
        self._answers.clear()
        self._backlog.clear()
        self._waits_for_end = False

    def _execute(self, message: str) -> None:
        replies: list[bytes] = []
        for header, parameters in split_message(message):
            word, numbers = _without_suffix(header)
            method = self._table.get(word)
            if method is None:
                self.push_error(f'-113,"Undefined header;{header}"')
                break
            try:
                reply = method(*numbers, parameters) if numbers else method(parameters)
            except (ValueError, IndexError):
                self.push_error(f'-224,"Illegal parameter value;{header}"')
                break
            if reply is not None:
                replies.append(reply if isinstance(reply, bytes) else reply.encode("ascii"))
        if replies:
            self._answers.append(b";".join(replies) + b"\n")

    # The error queue.

    def push_error(self, entry: str) -> None:
        """Put an error into the queue; when it is full, the last one says so."""
        if len(self._errors) < _MOST_ERRORS:
            self._errors.append(entry)
        else:
            self._errors[-1] = '-350,"Queue overflow"'

    def _next_error(self, _parameters: str) -> str:
        return self._errors.popleft() if self._errors else '0,"No error"'

    def _clear_status(self, _parameters: str) -> None:
        self._errors.clear()

    def _event_status(self, _parameters: str) -> str:
        bits = 0
        for entry in self._errors:
            bits |= {"1": 32, "2": 16, "3": 8, "4": 4}.get(entry[1:2], 8)
        self._errors.clear()
        return str(bits)

    def _identify(self, _parameters: str) -> str:
        return self.identity

    def _version(self, _parameters: str) -> str:
        return "1999.0"

    def _reset(self, _parameters: str) -> None:
        self.n_resets += 1

    def _complete(self, _parameters: str) -> str | None:
        if self.status() in ("wait", "measure"):
            self._waits_for_end = True
            return None
        return "1"

    # The trigger.

    def arm(self, _parameters: str = "") -> None:
        """Wait for a trigger; a second time while waiting is an error."""
        if self.status() in ("wait", "measure") or self.fault == "busy":
            self.push_error('-213,"Init ignored"')
            return
        self._state, self._armed_s = "wait", time.monotonic()

    def stop(self, _parameters: str = "") -> None:
        """Give up waiting, or running; what was recorded stays."""
        if self.status() in ("wait", "free"):
            if self._state == "free":
                self._take()
            self._state = "done"

    def run(self, _parameters: str = "") -> None:
        """Run by itself."""
        self._state = "free"

    def force(self, _parameters: str = "") -> None:
        """Trigger by command."""
        if self.status() == "wait":
            self._finish()
        else:
            self.push_error('-211,"Trigger ignored"')

    def status(self) -> str:
        """Return ``free``, ``wait`` or ``done``."""
        self._settle()
        return self._state

    def _settle(self) -> None:
        """Let the trigger come whose time has come."""
        due_s = {"trigger_never": float("inf"), "slow_trigger": _SLOW_S}.get(self.fault or "", 0.0)
        if self._state == "wait" and time.monotonic() - self._armed_s > due_s:
            self._finish()

    def _finish(self) -> None:
        self._take()
        self._state = "done"

    # The memory.

    def _now(self) -> tuple[FloatArray, ...]:
        rows = self._volts() if callable(self._volts) else self._volts
        return tuple(np.asarray(row, dtype=np.float64) for row in rows)

    def _span(self) -> tuple[float, float]:
        """Return the range of the converter: what the first record holds, with room round it."""
        rows = self._now()
        low, high = min(row.min() for row in rows), max(row.max() for row in rows)
        room = 0.25 * (high - low) or 1.0
        return float(low - room), float(high + room)

    def _take(self) -> None:
        self.record = self._now()

    @property
    def n_points(self) -> int:
        """Samples in the memory."""
        return 0 if self.fault == "empty" else self.record[0].size

    def seen(self) -> FloatArray:
        """Return the volts of the chosen channel."""
        return self.record[self._channel][: self.n_points]

    def choose(self, parameters: str) -> None:
        """Choose the channel that is read."""
        number = int(parameters.strip().upper().removeprefix("CH"))
        if not 1 <= number <= len(self.record):
            raise ValueError(parameters)
        self._channel = number - 1

    @property
    def level_v(self) -> float:
        """The level at which it triggers: the middle of its range."""
        return (self._low_v + self._high_v) / 2

    # How things are written.

    def figure(self, value: float) -> str:
        """Print a figure."""
        text = f"{value:+.9E}"
        return text.replace(".", ",") if self.fault == "comma" else text

    def block(self, payload: bytes) -> bytes:
        """Put the header of a definite-length block before its bytes (IEEE 488.2, 8.7.9)."""
        told = len(payload) + {"count_more": 7, "count_less": -7}.get(self.fault or "", 0)
        if self.fault == "error_during":
            self.push_error('-230,"Data corrupt or stale"')
        digits = str(told)
        header = f"#{len(digits)}{digits}".encode()
        return (b"?!garbage" if self.fault == "garbage_header" else header) + payload

    def agreed(self, word: str, known: Sequence[str]) -> str:
        """Return a parameter that must be one of some words; sometimes none pleases it."""
        if self.fault == "error_setup" or word.upper() not in known:
            raise ValueError(word)
        return word.upper()


def _without_suffix(header: str) -> tuple[str, tuple[int, ...]]:
    """Return ``CH#:SCAL?`` and 1 for ``CH1:SCAL?``."""
    found = re.match(r"CH(\d)(:.*)", header)
    return (f"CH#{found[2]}", (int(found[1]),)) if found else (header, ())
