"""How an instrument talks: terminators, patience, echo, error queue."""

from __future__ import annotations

import re
from typing import Literal

from benchtool.frozen import frozen_record

Clear = Literal["auto", "none"]


@frozen_record
class LinkSettings:
    r"""How to talk to one instrument; the defaults suit most that follow IEEE 488.2.

    Attributes:
        write_termination: Ends each command.
        read_termination: Ends each text answer; a block is read by its count alone.
        timeout_s: The longest silence within an answer, and before a text answer.
        block_timeout_s: The longest silence before the first byte of a block.
        deadline_s: The longest time for a whole block, None for no such limit.
        query_delay_s: Rest between a command and the reading of its answer.
        echo: The instrument repeats each command line before it answers.
        prompt: What it prints when it waits for the next command.
        error_query: Asks for the oldest entry of the error queue; None where it has no queue.
        error_none: What the answer looks like when the queue is empty.
        baud: Rate of a serial line when it is opened; None for 9600.
        device_clear: ``none`` for an instrument that does not stand a device clear.
    """

    write_termination: str = "\n"
    read_termination: str = "\n"
    timeout_s: float = 5.0
    block_timeout_s: float = 30.0
    deadline_s: float | None = None
    query_delay_s: float = 0.0
    echo: bool = False
    prompt: str = ""
    error_query: str | None = "SYST:ERR?"
    error_none: str = r"^\s*\+?0\b"
    baud: int | None = None
    device_clear: Clear = "auto"

    def __post_init__(self) -> None:
        if not self.read_termination or not self.write_termination:
            raise ValueError("a line needs a terminator")
        if min(self.timeout_s, self.block_timeout_s) <= 0 or self.query_delay_s < 0:
            raise ValueError("a time is below zero")
        if self.deadline_s is not None and self.deadline_s <= 0:
            raise ValueError("the deadline is below zero")
        if self.baud is not None and self.baud <= 0:
            raise ValueError("the rate of a serial line is below zero")
        re.compile(self.error_none)
