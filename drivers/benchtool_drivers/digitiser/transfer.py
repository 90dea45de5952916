"""The transfer of one record: the window, the figures, the samples in their pieces."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.instruments import Progress
from benchtool.model.arrays import AnyArray
from benchtool_drivers.dialect.records import ChunkKeys, DataKeys, DigitiserKeys
from benchtool_drivers.digitiser.decoding import Layout, check_codes, decode
from benchtool_drivers.digitiser.dif import printed_values
from benchtool_drivers.digitiser.fetching import Fetch
from benchtool_drivers.digitiser.fields import Fields
from benchtool_drivers.digitiser.preamble import complete, leading, read_preamble
from benchtool_drivers.digitiser.talk import Talk
from benchtool_drivers.digitiser.windows import Window, plan_windows

_MOST_PIECES = 100_000


@frozen_record(eq=False)
class Raw:
    """A record as it came.

    Attributes:
        fields: The figures that describe it.
        values: Codes or volts in their order, all channels of the transfer in turn.
        known: Whether anything but the samples said how many there are.
    """

    fields: Fields
    values: AnyArray
    known: bool


@frozen_record(eq=False)
class Piece:
    """One transfer: what came, and what led it."""

    values: AnyArray
    fields: Fields


class Transfer:
    """Reads one record.

    Args:
        talk: The instrument.
        channel: The channel to read.
        n_rows: How many channels one transfer holds.
        digest: Is given all bytes that came.
        progress: Is told bytes behind and in all.
    """

    def __init__(
        self,
        talk: Talk,
        channel: str,
        n_rows: int,
        digest: Callable[[bytes], None],
        progress: Progress | None,
    ) -> None:
        self._talk = talk
        self._body: DigitiserKeys = talk.dialect.body
        self._channel = channel
        self._per_point = n_rows * (2 if self._body.data.pairs else 1)
        self._digest = digest
        self._fetch = Fetch(talk, channel, self._per_point, progress)

    def read(self) -> Raw:
        """Return the whole record.

        Raises:
            InstrumentError: If not all of it came, or it contradicts what describes it.
        """
        talk, chunk = self._talk, self._body.chunk
        talk.send(talk.dialect.channel.select, "choose the channel", channel=self._channel)
        total = self._total()
        if total and chunk.set and chunk.whole:
            self._fetch.choose(Window(offset=0, count=total, n=0))
        fields = read_preamble(talk, self._channel)
        n_points = self._agreed(fields, total)
        pieces = list(self._pieces(fields, n_points))
        if not pieces or not sum(piece.values.size for piece in pieces):
            raise self._empty()
        first = pieces[0].fields
        n_points = self._agreed(first, total)
        values = np.concatenate([piece.values for piece in pieces])
        values = values.astype(values.dtype.newbyteorder("="), copy=False)
        self._check_number(values, n_points)
        check_codes(talk, values)
        return Raw(fields=first, values=values, known=n_points is not None)

    def _total(self) -> int | None:
        query = self._body.chunk.total
        if not query:
            return None
        answer = self._talk.ask(query, "samples in the record", channel=self._channel)
        value = self._talk.number(answer, "the record length", query)
        if not 0 <= value < 1 << 40 or value != int(value):
            raise self._talk.wrong(
                f"the record length is {answer!r}, which is no whole number",
                hint="Compare total in [chunk] with the manual.",
                command=query,
                expected="a whole number",
                got=answer,
                code="bad-preamble",
            )
        return int(value)

    def _agreed(self, fields: Fields | None, total: int | None) -> int | None:
        """Return the number of points that everything agrees on, None where nothing tells.

        An instrument may keep the window of an earlier transfer; its preamble then speaks of a
        part of the record. So the length is asked for apart, and both must say the same.
        """
        told = None if fields is None else self._told(fields)
        if told is not None and total is not None and told != total:
            raise self._talk.wrong(
                f"the preamble tells {told} samples, the record has {total}",
                hint="The instrument kept a window of an earlier transfer, or total in [chunk] is "
                "another figure: compare with the manual.",
                command=self._body.preamble.query or self._body.data.query,
                expected=f"{total} samples",
                got=f"{told} samples",
                code="window-kept",
            )
        n_points = total if told is None else told
        if n_points == 0:
            raise self._empty()
        return n_points

    def _told(self, fields: Fields) -> int | None:
        """Return how many points the figures tell of; as bytes, where they count those."""
        if "points" in fields:
            return fields.count("points")
        layout = self._layout(fields, 0)
        if "bytes" not in fields or layout.is_text:
            return None
        return fields.count("bytes") // (layout.numpy_dtype.itemsize * self._per_point)

    def _empty(self) -> Exception:
        return self._talk.wrong(
            "the record holds no samples",
            hint="Let the instrument take a record first, or arm it.",
            command=self._body.data.query,
            expected="samples",
            got="none",
            code="empty-record",
        )

    def _pieces(self, fields: Fields | None, n_points: int | None) -> Iterator[Piece]:
        chunk: ChunkKeys = self._body.chunk
        if chunk.by == "next":
            yield from self._until_empty(fields)
        elif chunk.by == "none" or n_points is None:
            whole = Window(offset=0, count=n_points or 0, n=0)
            yield self._piece(whole, fields, n_points, n_points)
        else:
            for window in plan_windows(n_points, self._most(fields)):
                piece = self._piece(window, fields, window.count, n_points)
                fields = fields or piece.fields
                yield piece

    def _most(self, fields: Fields | None) -> int | None:
        most = self._body.chunk.max_points
        if most is None or isinstance(most, int):
            return most
        return int(fields.look_up(most, "max_points")) if fields is not None else None

    def _until_empty(self, fields: Fields | None) -> Iterator[Piece]:
        for n in range(_MOST_PIECES):
            piece = self._piece(Window(offset=0, count=0, n=n), fields, None, None)
            if not piece.values.size:
                return
            fields = fields or piece.fields
            yield piece

    def _piece(
        self, window: Window, fields: Fields | None, count: int | None, n_points: int | None
    ) -> Piece:
        """Read one window; where the figures come with the samples, they are read from it."""
        talk, data = self._talk, self._body.data
        known = self._layout(fields, 0) if fields is not None else None
        n_values = None if count is None else count * self._per_point
        lead, content = self._fetch.piece(window, known, n_values, n_points)
        self._digest(content)
        size = 0
        if self._body.preamble.in_block and content:
            texts, size = leading(talk, lead, content)
            fields = fields or complete(talk, texts, self._channel)
            if n_values is None:
                n_values = self._told_values(fields)
        if fields is None:
            raise self._empty()
        layout = known if known is not None and not size else self._layout(fields, size)
        if self._body.preamble.kind == "dif" and data.wrap == "ascii":
            content = printed_values(talk, lead)
        values = decode(talk, content, layout, n_values)
        if values.size and window.n == 0:
            shown = ", ".join(str(item) for item in values[:6].tolist())
            form = "text" if layout.is_text else f"{layout.dtype}, {layout.order} byte order"
            talk.tell("note", "first samples", shown, form)
        return Piece(values=values, fields=fields)

    def _told_values(self, fields: Fields) -> int | None:
        told = self._told(fields) if self._body.chunk.by == "none" else None
        return told * self._per_point if told is not None else None

    def _layout(self, fields: Fields, size: int) -> Layout:
        data: DataKeys = self._body.data
        skip = data.skip if isinstance(data.skip, int) else fields.count(data.skip)
        return Layout(
            dtype=fields.look_up(data.dtype, "dtype"),
            order=fields.look_up(data.order, "order"),
            skip=skip + size,
        )

    def _check_number(self, values: AnyArray, n_points: int | None) -> None:
        if n_points is not None and values.size != n_points * self._per_point:
            raise self._talk.wrong(
                f"{values.size} values came where {n_points * self._per_point} are to come",
                hint="Compare points in [preamble] with the manual.",
                command=self._body.data.query,
                expected=f"{n_points * self._per_point} values",
                got=f"{values.size} values",
                code="wrong-count",
            )
