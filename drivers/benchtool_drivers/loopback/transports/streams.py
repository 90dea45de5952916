"""Serving over a stream of bytes: messages are lines, answers follow one another."""

from __future__ import annotations

import threading
from typing import Protocol

from benchtool_drivers.loopback.faults import Plan
from benchtool_drivers.loopback.responder import Responder

POLL_S = 0.005
"""How often an answer that is not due at once is looked for."""


class Channel(Protocol):
    """A stream of bytes, both ways."""

    def receive(self, timeout_s: float) -> bytes | None:
        """Return what came, nothing at the end of the stream, None if nothing came in time."""
        ...

    def send(self, data: bytes) -> None:
        """Send all of it."""
        ...

    def end(self, ending: str) -> None:
        """End the stream in the way named."""
        ...


def serve_stream(channel: Channel, responder: Responder, stopping: threading.Event) -> None:
    """Answer the lines of a stream until it ends."""
    held = b""
    while not stopping.is_set():
        piece = channel.receive(POLL_S)
        if piece == b"":
            return
        plans = responder.due() if piece is None else []
        if piece:
            *lines, held = (held + piece).split(b"\n")
            for line in lines:
                plans += responder.receive(line.rstrip(b"\r"))
        for plan in plans:
            if not carry_out(plan, channel, stopping):
                return


def carry_out(plan: Plan, channel: Channel, stopping: threading.Event) -> bool:
    """Give one answer; return whether the stream goes on."""
    for action in plan.actions:
        if action.wait_s and stopping.wait(action.wait_s):
            return False
        channel.send(action.data)
    if plan.ending in ("", "stall"):
        return True
    channel.end(plan.ending)
    return False
