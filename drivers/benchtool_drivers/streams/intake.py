"""From bytes to edges: lines, their layout once it is known, rows, order."""

from __future__ import annotations

from collections import deque

from benchtool.errors import ReplyError, Step
from benchtool_drivers.streams.decoding import decode
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.lineformat import MAGIC, REPEAT_S, parse_header
from benchtool_drivers.streams.mishaps import Kind, Mishap
from benchtool_drivers.streams.rows import Rows
from benchtool_drivers.streams.sequence import Sequencer, Sink
from benchtool_drivers.streams.splitting import LineSplitter

BLOCK_BYTES = 1 << 18
"""Lines are decoded in pieces of about this size, which stay in the cache."""

_HELD_BYTES = 1 << 20
_GARBAGE_LINES = 20
_SHOWN = 40


class Intake:
    """Takes bytes as they come and hands edges to its sinks.

    Args:
        source: Name of the stream, for errors.
        layout: What lines look like; None where a header line will say.
        sinks: Who takes the edges.
        joined: Whether the stream had begun before.

    Attributes:
        layout: What lines look like, once known.
        n_bytes: Bytes taken.
        n_lines: Lines decoded.
        n_garbage: Lines that could not be read.
        decimals: Most decimals that a time was printed with.
    """

    def __init__(
        self, source: str, layout: Layout | None, sinks: list[Sink], *, joined: bool
    ) -> None:
        self.layout = layout
        self.n_bytes = 0
        self.n_lines = 0
        self.n_garbage = 0
        self.decimals = 0
        self._source = source
        self._sinks = sinks
        self._own = layout is None
        header_lines = layout.header_lines if layout else 0
        self._splitter = LineSplitter(joined=joined, header_lines=header_lines)
        self._held: deque[bytes] = deque()
        self._n_held = 0
        self._sequencer = self._sequencer_of(layout)
        self._changed_header = b""
        self._header_fault = ""
        self._first_garbage = b""

    def _sequencer_of(self, layout: Layout | None) -> Sequencer | None:
        return Sequencer(layout, self._source, self._sinks) if layout else None

    @property
    def n_rows(self) -> int:
        """Edges and heartbeats taken."""
        return self._sequencer.n_rows if self._sequencer else 0

    def feed(self, data: bytes, silent_s: float = 0.0, *, overrun: bool = False) -> None:
        """Take bytes.

        Args:
            data: The bytes.
            silent_s: Seconds for which nothing had come right before them.
            overrun: Whether something was lost right before them.

        Raises:
            ReplyError: If lines come but none can be read, or the header has changed.
        """
        self.n_bytes += len(data)
        n_before, n_overlong = self._splitter.n_lines, self._splitter.n_overlong
        lines = self._splitter.split(data)
        self.n_lines += self._splitter.n_lines - n_before
        if (overrun or self._splitter.n_overlong > n_overlong) and self._sequencer:
            self._lose("overrun")
        if self._sequencer is None:
            self._hold(lines)
            return
        for block in _blocks(lines):
            self._take(block, silent_s)
            silent_s = 0.0

    def _lose(self, kind: Kind) -> None:
        if self.layout and self._sequencer and not self.layout.has_seq:
            self._sequencer.interrupt(kind)

    def _hold(self, lines: bytes) -> None:
        """Keep lines until a header says what they mean; then take them all."""
        if not lines:
            return
        self._held.append(lines)
        self._n_held += len(lines)
        while self._n_held > _HELD_BYTES and len(self._held) > 1:
            gone = self._held.popleft()
            self._n_held -= len(gone)
            self.n_lines += gone.count(b"\n")
        self._find_header(lines)
        if self._sequencer is None:
            return
        held = b"".join(self._held)
        self._held.clear()
        for block in _blocks(held):
            self._take(block, 0.0)

    def _find_header(self, lines: bytes) -> None:
        for line in lines.split(b"\n")[:-1]:
            if not line.startswith(MAGIC):
                continue
            found = parse_header(line.removesuffix(b"\r"))
            if isinstance(found, Layout):
                self.layout = found
                self._sequencer = self._sequencer_of(found)
                return
            self._header_fault = found

    def _take(self, block: bytes, silent_s: float) -> None:
        if self.layout is None or self._sequencer is None:
            return
        rows = decode(block, self.layout, self.n_lines + 1)
        self.n_lines += rows.n_lines
        self.decimals = max(self.decimals, rows.decimals)
        self._sequencer.feed(rows, silent_s)
        self._count_garbage(rows)
        if self._own:
            self._check_headers(rows)

    def _count_garbage(self, rows: Rows) -> None:
        if not rows.garbage:
            return
        number, line = rows.garbage[0]
        self._first_garbage = self._first_garbage or line
        self.n_garbage += len(rows.garbage)
        self._note("garbage", len(rows.garbage), number, line)
        if self.n_garbage >= _GARBAGE_LINES and self.n_rows == 0:
            self._refuse()

    def _note(self, kind: Kind, n: int, number: int, line: bytes) -> None:
        tick = self._sequencer.last_tick if self._sequencer else 0
        mishap = Mishap(kind=kind, tick=tick, n=n, line=number, text=_shown(line))
        for sink in self._sinks:
            sink.note(mishap)

    def _check_headers(self, rows: Rows) -> None:
        """See that the device still says what it said at first."""
        for number, line in rows.comments:
            if not line.startswith(MAGIC):
                continue
            found = parse_header(line)
            if found == self.layout:
                self._changed_header = b""
                continue
            if isinstance(found, Layout) and line == self._changed_header:
                raise self._changed(line)
            self._changed_header = line
            self._note("header", 1, number, line)

    def _refuse(self) -> None:
        raise ReplyError(
            f"{self._source} sends lines, but not one of the first {self.n_garbage} can be read",
            hint="see whether the speed (baud) and the description fit what the device prints",
            step=self._step(_shown(self._first_garbage)),
            code="stream-unreadable",
        )

    def check_header(self, waited_s: float) -> None:
        """See that a header came in the time in which it must.

        Raises:
            ReplyError: ``stream-no-header``: if other lines came instead.
        """
        if self._sequencer is not None or waited_s < 1.5 * REPEAT_S or not self._held:
            return
        first = self._held[0].split(b"\n", 1)[0]
        raise ReplyError(
            f"{self._source} sends lines, but {self._header_trouble()}",
            hint="let the device print its header every two seconds, or describe its lines in a "
            "description file",
            step=self._step(_shown(first)),
            code="stream-no-header",
        )

    def _header_trouble(self) -> str:
        if self._header_fault:
            return f"its header line cannot be used: {self._header_fault}"
        return f"no header line {MAGIC.decode()} among them"

    def _changed(self, line: bytes) -> ReplyError:
        return ReplyError(
            f"the device at {self._source} now states another tick rate or layout than before",
            hint="connect anew, so that no time is measured with the wrong rate",
            step=self._step(_shown(line)),
            code="stream-header",
        )

    def _step(self, got: str) -> Step:
        expected = self.layout.name if self.layout else MAGIC.decode()
        return Step(
            resource=self._source,
            expected=f"lines of {expected}",
            got=got,
            last_good=f"{self.n_rows} lines taken",
        )


def _blocks(lines: bytes) -> list[bytes]:
    """Return whole lines in pieces."""
    if len(lines) <= BLOCK_BYTES:
        return [lines] if lines else []
    blocks, start = [], 0
    while start < len(lines):
        stop = lines.find(b"\n", min(start + BLOCK_BYTES, len(lines) - 1)) + 1
        blocks.append(lines[start:stop])
        start = stop
    return blocks


def _shown(line: bytes) -> str:
    """Return the beginning of a line, made printable."""
    text = line[:_SHOWN].decode("ascii", "backslashreplace")
    printable = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text)
    return printable + ("..." if len(line) > _SHOWN else "")
