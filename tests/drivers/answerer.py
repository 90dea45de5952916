"""A subject for tests of the link: answers set down beforehand, an error queue, nothing else."""

from __future__ import annotations

from collections import deque

IDENTITY = "loopback,answerer,0,1"
DATA = bytes(range(256)) * 200
"""Holds every byte, line feeds among them; 51,200 bytes are several pieces on each transport."""


def block(data: bytes, *, count: int | None = None, trailer: bytes = b"\n") -> bytes:
    """Wrap data as a definite-length block, counted wrongly on request."""
    digits = str(len(data) if count is None else count).encode()
    return b"#%d" % len(digits) + digits + data + trailer


class Answerer:
    """Answers queries from a table; what is not in it goes to the error queue.

    Args:
        answers: The answer to each query, with its terminator.
    """

    def __init__(self, answers: dict[str, bytes] | None = None) -> None:
        self.answers = {"DATA?": block(DATA), "NAME?": b"spacing\n", **(answers or {})}
        self.heard: list[str] = []
        self.queue: list[bytes] = []
        self.n_clears = 0
        self._out: deque[bytes] = deque()

    def receive(self, message: bytes) -> None:
        """Take a message; its answers become one."""
        self.heard.append(message.decode())
        found = [self._answer(part) for part in message.decode().split(";")]
        answers = [answer for answer in found if answer is not None]
        if answers:
            self._out.append(
                b";".join(answer.removesuffix(b"\n") for answer in answers[:-1])
                + (b";" if answers[1:] else b"")
                + answers[-1]
            )

    def _answer(self, command: str) -> bytes | None:
        command = command.lstrip(":")
        if command == "*IDN?":
            return IDENTITY.encode() + b"\n"
        if command == "SYST:ERR?":
            return (self.queue.pop(0) if self.queue else b'0,"No error"') + b"\n"
        if command in self.answers:
            return self.answers[command]
        if command not in ("*CLS", "SET 1"):
            self.queue.append(b'-113,"Undefined header"')
        return None

    def output(self) -> bytes | None:
        """Return the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Forget answers that were not fetched."""
        self.n_clears += 1
        self._out.clear()
