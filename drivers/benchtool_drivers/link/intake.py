"""Reading answers off a wire: lines, messages, and bytes counted out."""

from __future__ import annotations

from collections.abc import Callable

from benchtool.errors import ReplyError
from benchtool_drivers.link.wire import Patience, Wire

FILL_BYTES = 1 << 16
FIRST_BYTES = 64
"""So much of each answer is kept for errors and for the log."""


class Intake:
    """What has been read of one answer.

    Args:
        wire: Where it comes from.
        whole: Keep all of what came, not only its first bytes.

    Attributes:
        held: Bytes that were read and not yet taken.
        ended: Whether the transport has ended the answer.
        n_bytes: How many bytes came in all.
    """

    def __init__(self, wire: Wire, *, whole: bool = False) -> None:
        self.wire = wire
        self.held = bytearray()
        self.ended = False
        self.n_bytes = 0
        self._whole = whole
        self._kept = bytearray()

    @property
    def kept(self) -> bytes:
        """The first bytes of what came, or all of it."""
        return bytes(self._kept)

    def note(self, piece: bytes | bytearray | memoryview) -> None:
        """Count a piece that came, and keep its beginning."""
        self.n_bytes += len(piece)
        if self._whole:
            self._kept += piece
        elif len(self._kept) < FIRST_BYTES:
            self._kept += piece[: FIRST_BYTES - len(self._kept)]

    def fill(self, patience: Patience, limit: int = FILL_BYTES) -> None:
        """Read a piece into ``held``.

        Raises:
            ReplyError: If the answer has ended already.
        """
        if self.ended:
            raise ReplyError(
                f"The answer ended after {self.n_bytes} bytes.",
                hint="Try again; if it stays so, the instrument answers otherwise than expected.",
            )
        piece = bytearray(limit)
        n_bytes, self.ended = self.wire.read_into(memoryview(piece), patience.timeout_s())
        patience.heard()
        del piece[n_bytes:]
        self.note(piece)
        self.held += piece

    def take(self, n_bytes: int, patience: Patience) -> bytes:
        """Return the next few bytes."""
        while len(self.held) < n_bytes:
            self.fill(patience)
        taken = bytes(self.held[:n_bytes])
        del self.held[:n_bytes]
        return taken

    def line(
        self,
        terminator: bytes,
        patience: Patience,
        *,
        longest: int | None = None,
        told: Callable[[int], None] | None = None,
    ) -> bytes:
        """Return what comes up to the terminator, without it.

        Args:
            terminator: What ends the line.
            patience: How long to wait.
            longest: So many bytes without a terminator are no line.
            told: Is told how many bytes have come.

        Raises:
            ReplyError: If it is longer than ``longest``.
        """
        searched = 0
        while (at := self.held.find(terminator, searched)) < 0:
            searched = max(0, len(self.held) - len(terminator) + 1)
            if longest is not None and len(self.held) > longest:
                raise ReplyError(
                    f"{len(self.held)} bytes came without the end of a line.",
                    hint="The terminator is not what the dialect says, or this is no text.",
                )
            self.fill(patience)
            if told is not None:
                told(self.n_bytes)
        taken = bytes(self.held[:at])
        del self.held[: at + len(terminator)]
        return taken

    def message(
        self, terminator: bytes, patience: Patience, told: Callable[[int], None] | None = None
    ) -> bytes:
        """Return all that comes up to the end of the answer, without the terminator."""
        while not self.ended:
            self.fill(patience)
            if told is not None:
                told(self.n_bytes)
        return self._all().removesuffix(terminator)

    def _all(self) -> bytes:
        taken = bytes(self.held)
        self.held.clear()
        return taken
