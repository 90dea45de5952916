"""What can go wrong on the way between an instrument and a program, as data.

A fault turns the answer to a command into a plan: pieces to send, pauses, and how it ends. Each
transport carries plans out in its own way.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Literal

from benchtool.frozen import frozen_record

Kind = Literal[
    "silent",  # no answer at all
    "half-stall",  # half of it, and nothing more
    "half-close",  # half of it, then the connection is closed
    "half-reset",  # half of it, then the connection is reset
    "close-before",  # the connection is closed in place of an answer
    "drop-terminator",  # all but its last byte
    "prefix",  # an old answer first
    "delay",  # late
    "trickle",  # in small pieces
    "echo",  # the command first
    "unplug",  # half of it, and the instrument is gone for good
]
Ending = Literal["", "stall", "close", "reset", "unplug"]


@frozen_record
class TransportFault:
    """One fault.

    Attributes:
        kind: What goes wrong.
        on: A regular expression; commands in which it is found are struck.
        times: How often it strikes, after which all is well; None for always.
        wait_s: How late (delay), and the pause between pieces (trickle).
        prefix: The old answer.
        piece_bytes: How large the pieces of a trickle are.
    """

    kind: Kind
    on: str = ""
    times: int | None = 1
    wait_s: float = 0.02
    prefix: bytes = b"0\n"
    piece_bytes: int = 2000

    def __post_init__(self) -> None:
        if self.kind not in KINDS:
            raise ValueError(f"no fault is called {self.kind!r}")
        re.compile(self.on)


@frozen_record
class Action:
    """Pause, then send a piece; the answer ends with the piece where it says so.

    Attributes:
        wait_s: How long to pause first.
        data: What to send.
        last: Whether the answer is whole with it.
    """

    wait_s: float = 0.0
    data: bytes = b""
    last: bool = False


@frozen_record
class Plan:
    """How an answer is given.

    Attributes:
        actions: What to do, in turn.
        ending: What happens to the connection then.
        n_announced: How long the answer is said to be, where the transport says that.
        stale: Whether it belongs to an earlier command.
    """

    actions: tuple[Action, ...] = ()
    ending: Ending = ""
    n_announced: int = 0
    stale: bool = False


def healthy(answer: bytes) -> Plan:
    """Give an answer as it should be."""
    return Plan(actions=(Action(data=answer, last=True),), n_announced=len(answer))


def struck(fault: TransportFault, command: bytes, answer: bytes) -> tuple[Plan, ...]:
    """Give an answer as a fault makes it."""
    return _STRIKES[fault.kind](fault, command, answer)


def _half(ending: Ending) -> Callable[[TransportFault, bytes, bytes], tuple[Plan, ...]]:
    def give(_fault: TransportFault, _command: bytes, answer: bytes) -> tuple[Plan, ...]:
        half = Action(data=answer[: len(answer) // 2])
        return (Plan(actions=(half,), ending=ending, n_announced=len(answer)),)

    return give


def _late(fault: TransportFault, answer: bytes) -> Plan:
    late = Action(wait_s=fault.wait_s, data=answer, last=True)
    return Plan(actions=(late,), n_announced=len(answer))


def _stale(answer: bytes) -> Plan:
    whole = Action(data=answer, last=True)
    return Plan(actions=(whole,), n_announced=len(answer), stale=True)


def _trickled(fault: TransportFault, answer: bytes) -> Plan:
    step = fault.piece_bytes
    actions = tuple(
        Action(
            wait_s=fault.wait_s if at else 0.0,
            data=answer[at : at + step],
            last=at + step >= len(answer),
        )
        for at in range(0, len(answer), step)
    )
    return Plan(actions=actions, n_announced=len(answer))


_STRIKES: dict[Kind, Callable[[TransportFault, bytes, bytes], tuple[Plan, ...]]] = {
    "silent": lambda _fault, _command, _answer: (),
    "half-stall": _half("stall"),
    "half-close": _half("close"),
    "half-reset": _half("reset"),
    "unplug": _half("unplug"),
    "close-before": lambda _fault, _command, _answer: (Plan(ending="close"),),
    "drop-terminator": lambda _fault, _command, answer: (healthy(answer[:-1]),),
    "prefix": lambda fault, _command, answer: (_stale(fault.prefix), healthy(answer)),
    "echo": lambda _fault, command, answer: (healthy(command + b"\n"), healthy(answer)),
    "delay": lambda fault, _command, answer: (_late(fault, answer),),
    "trickle": lambda fault, _command, answer: (_trickled(fault, answer),),
}
KINDS = tuple(_STRIKES)
