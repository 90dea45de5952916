"""The line of a self-test."""

from __future__ import annotations

from benchtool.frozen import frozen_record


@frozen_record
class SelfCheck:
    """One thing that benchtool found out about itself on this machine.

    Attributes:
        name: What was tried.
        found: The figure found, unit 1.
        limit: The figure it is held against, unit 1.
        ok: Whether it holds.
        text: What was done and what came out, one sentence.
    """

    name: str
    found: float
    limit: float
    ok: bool
    text: str
