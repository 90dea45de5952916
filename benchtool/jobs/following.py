"""A capture file that grows, or standard input: its newest stretch, again and again.

What was appended is read once; rows count when their line has ended. The newest rows are kept with
the lines that stand before the first row, and are read together as a file of their own, so that any
text or VCD that can be read can be followed. Its structure is found once, and must stay.
"""

from __future__ import annotations

import hashlib
import time
from dataclasses import replace
from pathlib import Path

from benchtool.errors import CaptureError, MalformedCaptureError, NotConnectedError
from benchtool.formats.content import Content
from benchtool.formats.reading import read_content
from benchtool.jobs.growing import GrowingFile, GrowingPipe, Growth
from benchtool.jobs.placing import end_of, placed
from benchtool.model.capture import Capture, ReadOptions
from benchtool.model.quantity import Notice

WINDOW_BYTES = 1 << 20
"""Of rows; once there are twice as many, the older half is let go."""

_FIRST_BYTES = 1 << 16
_SURE_ROWS = 16  # from so many on a structure is taken as found
_BETWEEN_LOOKS_S = 0.02
_DECLARED = b"$enddefinitions"
_WHOLE = (b"PK\x03\x04", b"\x93NUMPY", b"RIFF", b"\x1f\x8b", b"\xff\xfe", b"\xfe\xff")
_KEPT = ("delimiter", "decimal", "time", "time_unit", "kind", "channels")
_NO_OPTIONS = ReadOptions()


def open_growing(
    source: str | Path, *, options: ReadOptions = _NO_OPTIONS, window_bytes: int = WINDOW_BYTES
) -> Growing:
    """Open a file that grows, or ``-`` for standard input, as a stream of captures.

    Args:
        source: The file.
        options: What the user overrules about its structure.
        window_bytes: Bytes of the newest rows that a capture holds at least, once they are there,
            and at most twice as many.

    Raises:
        InputError: If the file cannot be opened.
        MalformedCaptureError: ``not-followed``: if it is of a kind to which nothing is appended.
    """
    growth = GrowingPipe() if str(source) == "-" else GrowingFile(source)
    return Growing(growth, options=options, window_bytes=window_bytes)


class Growing:
    """A ``Stream`` of what grows.

    Args:
        growth: What grows.
        options: What the user overrules about its structure.
        window_bytes: As ``open_growing`` has it.
    """

    def __init__(
        self,
        growth: Growth,
        *,
        options: ReadOptions = _NO_OPTIONS,
        window_bytes: int = WINDOW_BYTES,
    ) -> None:
        self._growth = growth
        self._options = options
        self._window_bytes = window_bytes
        self._n_begun = 0
        self._given = False
        self._begin()

    def _begin(self) -> None:
        self._head = b""
        self._rows = b""
        self._unended = b""
        self._settled: dict[str, str] | None = None
        self._offset_s = 0.0
        self._joining = False

    @property
    def source(self) -> str:
        """The file, as the user named it."""
        return self._growth.source

    def newest(self, timeout_s: float) -> Capture | None:
        """Return the newest stretch, None where no whole row came within the time.

        Its times are seconds after the first row that was read; its ``window`` says where in them
        it lies once older rows were let go. A file that was replaced or cut short begins anew, and
        the warning ``file-begun-anew`` says so.

        Raises:
            NotConnectedError: ``stream-ended``: if standard input has ended.
            CaptureError: If what is there cannot be read, or its structure has changed.
        """
        until = time.monotonic() + timeout_s
        while True:
            capture = self._read() if self._grow() else None
            self._given = self._given or capture is not None
            if capture is not None or time.monotonic() >= until:
                return capture
            time.sleep(_BETWEEN_LOOKS_S)

    def close(self) -> None:
        """End it."""
        self._growth.close()

    def _grow(self) -> bool:
        """Take what has come; return whether there are new whole rows."""
        n_new = 0
        while data := self._more(after=n_new):
            if self._growth.begun_anew:
                self._growth.begun_anew = False
                self._begin()
                self._n_begun += 1
            n_new += self._take(data)
            if len(self._rows) > (2 * self._window_bytes if self._settled else _FIRST_BYTES):
                break
        return n_new > 0

    def _more(self, *, after: int) -> bytes:
        """Return what has come; an end is told only once all that came before it was given."""
        try:
            return self._growth.more()
        except NotConnectedError:
            if after:
                return b""
            if not self._given and (self._rows or self._unended):
                self._capture_of(self._rows + self._unended)  # says what is wrong with all of it
            raise

    def _take(self, data: bytes) -> int:
        """Append what are whole rows now; return how many bytes they have."""
        if not (self._head or self._rows) and data.startswith(_WHOLE):
            raise MalformedCaptureError(
                f"{self.source} is of a kind to which no rows are appended",
                hint="follow delimited text or a VCD; read this file with `benchtool measure`",
                path=self.source,
                code="not-followed",
            )
        text = self._unended + data
        end = text.rfind(b"\n") + 1
        self._unended, whole = text[end:], text[:end]
        if self._joining and whole:
            place = whole.find(self._row_mark())
            self._joining = place < 0
            whole = whole[place + 1 :] if place >= 0 else b""
        self._rows += whole
        return len(whole)

    def _read(self) -> Capture | None:
        """Return what is held as a capture; None as long as there are too few rows."""
        try:
            capture = self._capture_of(self._head + self._rows)
        except CaptureError:
            if self._settled is None and self._rows.count(b"\n") < _SURE_ROWS:
                return None
            raise
        new = self._settled is None and self._settle(capture)
        if new and self._growth.skip_to_last(self._window_bytes):
            self._rows, self._unended, self._joining = b"", b"", True
            return None  # the file is long already: its newest rows come next
        self._check(capture)
        if len(self._rows) > 2 * self._window_bytes:
            capture = self._let_go(capture)
        return self._said(placed(capture, self._offset_s))

    def _settle(self, capture: Capture) -> bool:
        """Keep the structure and the lines before the first row, once there are rows enough."""
        if self._rows.count(b"\n") < _SURE_ROWS:
            return False
        points = {point.name: point for point in capture.structure}
        if capture.origin.format == "vcd":
            at = self._rows.index(b"\n", self._rows.find(_DECLARED)) + 1
        else:
            first_line = int(points["rows"].evidence.rsplit(" ", 1)[1])
            at = _start_of_line(self._rows, first_line)
        self._head, self._rows = self._rows[:at], self._rows[at:]
        self._settled = {name: points[name].value for name in _KEPT if name in points}
        return True

    def _check(self, capture: Capture) -> None:
        """See that the structure is the one found at first."""
        points = {point.name: point.value for point in capture.structure}
        for name, value in (self._settled or {}).items():
            if points.get(name, value) != value:
                raise MalformedCaptureError(
                    f"{self.source} has changed while it was followed: {name} was {value}, and is "
                    f"{points[name]} now",
                    hint="start anew; name what is right with options such as --time-unit",
                    path=self.source,
                    code="structure-changed",
                )

    def _let_go(self, capture: Capture) -> Capture:
        """Drop the older half of the rows; both readings end at the same row, which places them."""
        self._rows = self._from_row(len(self._rows) - self._window_bytes)
        shorter = self._capture_of(self._head + self._rows)
        self._offset_s += end_of(capture) - end_of(shorter)
        return shorter

    def _from_row(self, place: int) -> bytes:
        """Return the rows from the first that begins at or behind a place."""
        at = self._rows.find(self._row_mark(), max(0, place - 1), -1)
        return self._rows[at + 1 :] if at >= 0 else self._rows

    def _row_mark(self) -> bytes:
        """Return what stands where a row begins that can be the first of a stretch."""
        return b"\n#" if _DECLARED in self._head else b"\n"

    def _capture_of(self, data: bytes) -> Capture:
        suffix = ".vcd" if _DECLARED in data[:_FIRST_BYTES] else Path(self.source).suffix.lower()
        content = Content(
            source=self.source,
            suffix=suffix,
            sha256=hashlib.sha256(data).hexdigest(),
            size=len(data),
            data=data,
        )
        return read_content(content, self._options)

    def _said(self, capture: Capture) -> Capture:
        if not self._n_begun:
            return capture
        times = "once" if self._n_begun == 1 else f"{self._n_begun} times"
        text = f"{self.source} was replaced or cut short {times} while it was followed"
        notice = Notice(code="file-begun-anew", text=text)
        return replace(capture, warnings=(*capture.warnings, notice))


def _start_of_line(text: bytes, number: int) -> int:
    """Return where a line, counted from 1, begins."""
    place = 0
    for _ in range(number - 1):
        place = text.index(b"\n", place) + 1
    return place
