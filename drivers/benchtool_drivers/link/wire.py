"""What carries the bytes: the seam between the link and a library's connection.

A wire knows no commands. Silence is a ``TimeoutError``, a connection that has gone a
``ConnectionError``; whatever else its library raises is left to ``foreign``.
"""

from __future__ import annotations

import time
from typing import Protocol


class Wire(Protocol):
    """An open connection.

    Attributes:
        has_end: Whether the transport itself marks the end of an answer.
        can_clear: Whether it has a device clear.
        broken: Whether an answer was left half read, so that only a new connection helps.
    """

    has_end: bool
    can_clear: bool
    broken: bool

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of ``data``."""
        ...

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what comes, at least one byte, at most the view.

        Returns:
            How many bytes, and whether the answer ended with them; none at all only at an end.

        Raises:
            TimeoutError: If nothing came within the time.
            ConnectionError: If the other side has gone.
        """
        ...

    def unasked(self) -> bool:
        """Tell, without waiting, whether bytes are there that nobody has read."""
        ...

    def gone(self) -> bool:
        """Tell, without waiting, whether the other side is known to have gone."""
        ...

    def clear(self) -> None:
        """Do a device clear."""
        ...

    def close(self) -> None:
        """End the connection; does not raise."""
        ...


class Patience:
    """How long the next read may take: a limit on each silence, and one on the whole.

    Args:
        first_s: The longest silence before the first byte.
        next_s: The longest silence after it.
        deadline_s: The longest time in all, None for no limit.
    """

    def __init__(self, first_s: float, next_s: float, deadline_s: float | None = None) -> None:
        self._silence_s = first_s
        self._next_s = next_s
        self._end_s = None if deadline_s is None else time.monotonic() + deadline_s
        self._is_last = False

    @property
    def expired(self) -> bool:
        """Whether the time in all has run out, or ends with the read that was given what is left.

        A library rounds that time, so that its silence may be over a moment before the whole is.
        """
        return self._is_last or (self._end_s is not None and time.monotonic() >= self._end_s)

    def heard(self) -> None:
        """Note that something came."""
        self._silence_s = self._next_s

    def timeout_s(self) -> float:
        """Return the time for the next read.

        Raises:
            TimeoutError: If the time in all has run out.
        """
        if self._end_s is None:
            return self._silence_s
        left_s = self._end_s - time.monotonic()
        if left_s <= 0:
            raise TimeoutError("the time for the whole answer has run out")
        self._is_last = left_s <= self._silence_s
        return min(self._silence_s, left_s)
