"""Fetching the pieces of a record: the window, the query, and the bytes that answer it."""

from __future__ import annotations

from typing import Any

from benchtool.instruments import Progress
from benchtool_drivers.dialect.records import ChunkKeys, DigitiserKeys
from benchtool_drivers.digitiser.decoding import Layout
from benchtool_drivers.digitiser.talk import Talk
from benchtool_drivers.digitiser.windows import Window, placeholders

_LONGEST_HEADER = 200


class Fetch:
    """Fetches pieces.

    Args:
        talk: The instrument.
        channel: The channel to read.
        per_point: Values in each point of the record.
        progress: Is told bytes behind and in all.
    """

    def __init__(self, talk: Talk, channel: str, per_point: int, progress: Progress | None) -> None:
        self._talk = talk
        self._body: DigitiserKeys = talk.dialect.body
        self._channel = channel
        self._per_point = per_point
        self._progress = progress
        self._n_behind = 0

    def piece(
        self, window: Window, layout: Layout | None, n_values: int | None, n_points: int | None
    ) -> tuple[str, bytes]:
        """Return what leads the samples, and what holds them."""
        talk = self._talk
        command = self._query(window)
        progress = self._shown(n_points, layout)
        n_bytes = self._n_bytes(layout, n_values)
        with talk.told_if_failing(command, "samples"):
            lead, content = self._asked(command, n_bytes, self._unit_bytes(layout), progress)
        self._n_behind += len(content)
        talk.tell("block", command, f"{len(content)} bytes", "samples")
        return lead, content

    def _asked(
        self, command: str, n_bytes: int | None, unit_bytes: int, progress: Progress | None
    ) -> tuple[str, bytes]:
        data, link = self._body.data, self._talk.link
        if data.wrap in ("ascii", "hex"):
            content = self._plain(link.ask_text_list(command, progress=progress))
            return self._parted(command, content)
        given: Any = {"wrap": data.wrap, "trailer": data.trailer, "length_unit_bytes": unit_bytes}
        if data.lead:
            return link.ask_led_block(command, n_bytes=n_bytes, progress=progress, **given)
        return "", link.ask_block(command, n_bytes=n_bytes, progress=progress, **given)

    def _parted(self, command: str, content: bytes) -> tuple[str, bytes]:
        """Return the figures that lead a printed record, and its samples."""
        preamble = self._body.preamble
        if preamble.kind == "dif":
            return content.decode("latin-1"), content
        if preamble.kind != "lead-text":
            return "", content
        lead, mark, samples = content.partition(preamble.ends.encode("ascii"))
        if not mark:
            raise self._talk.wrong(
                f"the answer holds no {preamble.ends!r} after its figures",
                hint="Compare ends in [preamble] with the manual.",
                command=command,
                expected=repr(preamble.ends),
                got=repr(content[:24]),
            )
        return lead.decode("latin-1"), samples

    def _plain(self, content: bytes) -> bytes:
        """Take the header off a long text."""
        head = content[:_LONGEST_HEADER].decode("latin-1")
        plain = self._talk.dialect.link.plain(head, self._body.data.query)
        return content[len(head) - len(plain) :]

    def _n_bytes(self, layout: Layout | None, n_values: int | None) -> int | None:
        if layout is None or n_values is None or layout.is_text or self._body.preamble.in_block:
            return None
        size = layout.numpy_dtype.itemsize
        return layout.skip + n_values * size + self._body.data.padding

    def _unit_bytes(self, layout: Layout | None) -> int:
        if self._body.data.length_unit == "bytes" or layout is None or layout.is_text:
            return 1
        return layout.numpy_dtype.itemsize

    def _shown(self, n_points: int | None, layout: Layout | None) -> Progress | None:
        """Return the progress over all pieces."""
        told, behind = self._progress, self._n_behind
        if told is None:
            return None
        size = 0 if layout is None or layout.is_text else layout.numpy_dtype.itemsize
        total = (n_points or 0) * self._per_point * size
        return lambda done, of: told(behind + done, max(total, behind + of) if total else 0)

    def _query(self, window: Window) -> str:
        """Return the query of a window, after choosing it; one message where they are joined."""
        chunk: ChunkKeys = self._body.chunk
        values = {"channel": self._channel, **self._placeholders(window)}
        query = self._body.data.query.format(**values)
        if not chunk.set:
            return query
        commands = [command.format(**values) for command in chunk.set]
        joined = _joined([*commands, query])
        if chunk.join and len(joined) <= self._talk.dialect.link.max_message:
            return joined
        self.choose(window)
        return query

    def choose(self, window: Window) -> None:
        """Choose a window by commands."""
        chunk: ChunkKeys = self._body.chunk
        values = self._placeholders(window)
        self._talk.send(chunk.set, "choose the window", channel=self._channel, **values)

    def _placeholders(self, window: Window) -> dict[str, int]:
        dtype = self._body.data.dtype
        sized = isinstance(dtype, str) and dtype != "ascii"
        point_bytes = self._per_point * (int(str(dtype)[1:]) if sized else 1)
        return placeholders(window, self._body.chunk, point_bytes)


def _joined(commands: list[str]) -> str:
    """Join commands into one message; each header begins at the root (IEEE 488.2, 7.1.1)."""
    rooted = (item if item[:1] in "*:" else f":{item}" for item in commands[1:])
    return ";".join([commands[0], *rooted])
