"""Blocks of counted bytes: header, count, data, terminator, each of them checked.

The forms, with the clauses of IEEE 488.2-1992:

- ``definite`` (8.7.9): ``#``, one digit N, N digits of count, the data.
- ``indefinite`` (8.7.10): ``#0``, the data, a line feed that comes with the end of the message.
- ``counted-checksum`` (common practice of instruments older than that standard): ``%``, two bytes
  of count with the higher first, the data, one byte of checksum. The count holds the checksum too;
  the bytes of count, data and checksum sum to a multiple of 256.
"""

from __future__ import annotations

from io import BytesIO
from typing import Literal

from benchtool.errors import ReplyError
from benchtool.frozen import frozen_record
from benchtool.instruments import Progress
from benchtool_drivers.link.intake import Intake
from benchtool_drivers.link.text import printable
from benchtool_drivers.link.wire import Patience

Wrap = Literal["definite", "indefinite", "counted-checksum"]
SHOWN_BYTES = 24
LONGEST_LEAD_BYTES = 1 << 16


@frozen_record
class BlockForm:
    """How a block is wrapped.

    Attributes:
        wrap: One of the forms above.
        trailer: What follows the data.
        n_bytes: How many bytes of data are to come, where that is known.
        length_unit_bytes: What one of the header's count stands for.
    """

    wrap: Wrap = "definite"
    trailer: bytes = b"\n"
    n_bytes: int | None = None
    length_unit_bytes: int = 1


def read_lead(intake: Intake, form: BlockForm, patience: Patience) -> str:
    """Return the text before a block, up to its first sign, which stays to be read."""
    sign = b"%" if form.wrap == "counted-checksum" else b"#"
    lead = intake.line(sign, patience, longest=LONGEST_LEAD_BYTES)
    intake.held[:0] = sign
    return lead.decode("latin-1")


def read_block(
    intake: Intake, form: BlockForm, patience: Patience, progress: Progress | None = None
) -> bytes:
    """Return the data of a block.

    Args:
        intake: Where it comes from; nothing may be left in it.
        form: How it is wrapped.
        patience: How long to wait.
        progress: Is told bytes behind and in all.

    Raises:
        ReplyError: If header, count, checksum or trailer is not as it must be.
        TimeoutError: If it does not come whole in time.
    """
    if form.wrap == "counted-checksum":
        return _checksummed(intake, form, patience, progress)
    n_bytes = _count(intake, form, patience)
    if n_bytes is None:
        return _indefinite(intake, form, patience, progress)
    _hold_against(form, n_bytes)
    return counted(intake, n_bytes, form.trailer, patience, progress)


def _hold_against(form: BlockForm, n_bytes: int) -> None:
    if form.n_bytes is not None and n_bytes != form.n_bytes:
        raise ReplyError(
            f"The block's header counts {n_bytes} bytes where {form.n_bytes} are to come.",
            hint="Compare the record length the instrument reports with what the dialect takes.",
        )


def _count(intake: Intake, form: BlockForm, patience: Patience) -> int | None:
    """Read the header; None for a block that tells no count."""
    start = intake.take(2, patience)
    if start[:1] != b"#" or not start[1:].isdigit():
        raise _no_header(start + bytes(intake.held[: SHOWN_BYTES - 2]), form.wrap)
    n_digits = int(start[1:])
    if (n_digits == 0) != (form.wrap == "indefinite"):
        raise _no_header(start + bytes(intake.held[: SHOWN_BYTES - 2]), form.wrap)
    if not n_digits:
        return None
    digits = intake.take(n_digits, patience)
    if not digits.isdigit():
        raise _no_header(start + digits, form.wrap)
    return int(digits) * form.length_unit_bytes


def _no_header(got: bytes, wrap: Wrap) -> ReplyError:
    return ReplyError(
        f"The answer begins with {printable(got)} where the header of a block of the form "
        f"{wrap!r} is to come.",
        hint="An answer to an earlier command may have come late: try again. If it stays so, the "
        "dialect has the wrong form of block.",
    )


def counted(
    intake: Intake,
    n_bytes: int,
    trailer: bytes,
    patience: Patience,
    progress: Progress | None = None,
) -> bytes:
    """Return so many bytes, after which the trailer and nothing else must come.

    They are read to where they stay: cutting the end off this buffer and taking its value copies
    nothing, which is a third of the time of a large block.
    """
    spare = 1 if intake.wire.has_end else 0  # one more than is to come, to be told of the end
    store = BytesIO(bytes(n_bytes + len(trailer) + spare))
    with store.getbuffer() as buffer:
        n_got = _pour(intake, buffer, patience, progress, n_bytes)
        _check_end(intake, n_got, n_bytes, bytes(buffer[n_bytes:n_got]), trailer)
    store.truncate(n_bytes)
    return store.getvalue()


def _pour(
    intake: Intake,
    view: memoryview,
    patience: Patience,
    progress: Progress | None,
    n_shown: int,
) -> int:
    """Fill the buffer until it is full or the answer ends; return how many bytes came."""
    n_got = min(len(intake.held), len(view))
    view[:n_got] = intake.held[:n_got]
    del intake.held[:n_got]
    if progress is not None:
        progress(min(n_got, n_shown), n_shown)
    while n_got < len(view) and not intake.ended:
        try:
            n_read, intake.ended = intake.wire.read_into(view[n_got:], patience.timeout_s())
        except TimeoutError as silence:
            if n_got >= n_shown:
                break  # all but what follows the data, which is told by who looks at that
            limit = ", the time for the whole having run out" if patience.expired else ""
            raise TimeoutError(f"{n_got} of {n_shown} bytes{limit}") from silence
        patience.heard()
        intake.note(view[n_got : n_got + n_read])
        n_got += n_read
        if progress is not None:
            progress(min(n_got, n_shown), n_shown)
    return n_got


def _check_end(intake: Intake, n_got: int, n_bytes: int, after: bytes, trailer: bytes) -> None:
    if n_got < n_bytes:
        raise ReplyError(
            f"The answer ended after {n_got} of the {n_bytes} bytes that its header counts.",
            hint="Try again; if it stays so, the instrument counts otherwise than the dialect.",
        )
    if after != trailer or (intake.wire.has_end and not intake.ended):
        wanted = printable(trailer) if trailer else "nothing"
        raise ReplyError(
            f"After the {n_bytes} bytes of the block comes {printable(after) or 'nothing'} where "
            f"{wanted} is to come.",
            hint="The count in the header or the terminator is not what the dialect says.",
        )


def _indefinite(
    intake: Intake, form: BlockForm, patience: Patience, progress: Progress | None
) -> bytes:
    if form.n_bytes is not None:
        return counted(intake, form.n_bytes, form.trailer, patience, progress)
    if not intake.wire.has_end:
        raise ReplyError(
            "A block without a count came over a connection that does not mark its end.",
            hint="Use a connection that does (HiSLIP, VXI-11, USBTMC), or a block with a count.",
        )
    while not intake.ended:
        intake.fill(patience)
        if progress is not None:
            progress(len(intake.held), 0)
    if not intake.held.endswith(form.trailer):
        raise ReplyError(
            f"The block ends with {printable(bytes(intake.held[-4:]))} and not with "
            f"{printable(form.trailer)}.",
            hint="The terminator is not what the dialect says, or the answer was cut.",
        )
    return bytes(memoryview(intake.held)[: len(intake.held) - len(form.trailer)])


def _checksummed(
    intake: Intake, form: BlockForm, patience: Patience, progress: Progress | None
) -> bytes:
    start = intake.take(3, patience)
    if start[:1] != b"%":
        raise _no_header(start + bytes(intake.held[: SHOWN_BYTES - 3]), form.wrap)
    n_counted = int.from_bytes(start[1:], "big") * form.length_unit_bytes
    if not n_counted:
        raise _no_header(start, form.wrap)
    _hold_against(form, n_counted - 1)
    data = counted(intake, n_counted, form.trailer, patience, progress)
    if (sum(start[1:]) + sum(data)) % 256:
        raise ReplyError(
            "The checksum of the block does not fit its data.",
            hint="Bytes were lost or changed on the way: try again.",
        )
    return data[:-1]
