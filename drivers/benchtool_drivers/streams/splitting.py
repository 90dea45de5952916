"""Bytes as they come, cut into whole lines."""

from __future__ import annotations

LONGEST_LINE = 4096


class LineSplitter:
    """Keeps the unfinished line until its end has come.

    Args:
        joined: Whether the stream had begun before; its first line is then a part of one.
        header_lines: Lines at the start that are passed over.

    Attributes:
        n_lines: Lines handed out or passed over.
        n_overlong: Bytes given up because no line ended.
    """

    def __init__(self, *, joined: bool, header_lines: int = 0) -> None:
        self.n_lines = 0
        self.n_overlong = 0
        self._to_skip = header_lines + joined
        self._kept = b""

    def split(self, data: bytes) -> bytes:
        """Return the whole lines that are there now, each with its LF; maybe none."""
        end = data.rfind(b"\n") + 1
        if not end:
            self._keep(self._kept + data)
            return b""
        lines = self._kept + data[:end]
        self._kept = b""
        self._keep(data[end:])
        return self._without_first(lines) if self._to_skip else lines

    def _keep(self, rest: bytes) -> None:
        if len(rest) > LONGEST_LINE:
            self.n_overlong += len(rest)
            self._to_skip = max(self._to_skip, 1)  # what is left of this line when it ends
            rest = b""
        self._kept = rest

    def _without_first(self, lines: bytes) -> bytes:
        while self._to_skip and lines:
            self._to_skip -= 1
            self.n_lines += 1
            lines = lines[lines.index(b"\n") + 1 :]
        return lines
