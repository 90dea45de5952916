"""What keys of a digitiser's dialect demand of one another."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool.designs.vocabulary import listed, nearest
from benchtool_drivers.dialect.records import ChannelKeys, DigitiserKeys, Lookup
from benchtool_drivers.dialect.takers import Flaw, placeholders_of
from benchtool_drivers.dialect.vocabulary import FIELDS, X_FORMS, Y_FORMS

_MUST_HOLD = {
    "start-stop": {"start", "stop"},
    "offset-count": {"offset"},
    "query-args": set[str](),
    "pages": {"n"},
}
_OF_A_WINDOW = {"start", "stop", "offset", "count", "n"}


def find_conflicts(body: DigitiserKeys, channel: ChannelKeys) -> Iterator[Flaw]:
    """Yield what is wrong between tables that are each right."""
    yield from _of_channels(channel)
    yield from _of_fields(body)
    yield from _of_scaling(body)
    yield from _of_windows(body)
    yield from _of_wraps(body)
    yield from _of_waiting(body)


def _of_channels(channel: ChannelKeys) -> Iterator[Flaw]:
    for n, name in enumerate(channel.default):
        if name not in channel.names:
            yield Flaw(
                path=("channel", "default", n),
                message=f"{name!r} is none of the names",
                near=nearest(name, channel.names),
            )


def _of_fields(body: DigitiserKeys) -> Iterator[Flaw]:
    """Look-ups and units must speak of fields that the preamble gives."""
    fields = body.preamble.fields
    for key in body.preamble.units:
        if key not in fields:
            yield _no_field(("preamble", "units", key), key, fields)
    looked_up = [
        (("data", "dtype"), body.data.dtype),
        (("data", "order"), body.data.order),
        (("data", "envelope"), body.data.envelope),
        (("chunk", "max_points"), body.chunk.max_points),
    ]
    for path, lookup in looked_up:
        for name in lookup.names if isinstance(lookup, Lookup) else ():
            if name not in fields:
                yield _no_field((*path, "from"), name, fields)
    if isinstance(body.data.skip, str) and body.data.skip not in fields:
        yield _no_field(("data", "skip"), body.data.skip, fields)


def _no_field(path: tuple[str, ...], name: str, fields: frozenset[str]) -> Flaw:
    known = listed(sorted(fields)) if fields else "none"
    return Flaw(
        path=path,
        message=f"the preamble gives no field {name!r}; it gives {known}",
        near=nearest(name, fields),
    )


def _of_scaling(body: DigitiserKeys) -> Iterator[Flaw]:
    fields = body.preamble.fields
    for axis, form, forms in (("y", body.scale.y, Y_FORMS), ("x", body.scale.x, X_FORMS)):
        needed, _, formula = forms[form]
        for name in needed:
            if name not in fields:
                like = nearest(name, fields - FIELDS.keys())
                yield Flaw(
                    path=("scale", axis),
                    message=f"{formula}: needs the field {name} ({FIELDS[name]}), which [preamble] "
                    "does not give; a manual that has it as a fixed figure: constant",
                    near=like,
                )
    if body.scale.probe == "apart" and "probe" not in fields:
        yield _no_field(("scale", "probe"), "probe", fields)
    if (body.scale.x == "pairs") != body.data.pairs:
        yield Flaw(path=("scale", "x"), message="goes with pairs = true in [data], and the reverse")


def _of_windows(body: DigitiserKeys) -> Iterator[Flaw]:
    chunk, data = body.chunk, body.data
    used = set[str]().union(*map(placeholders_of, (*chunk.set, data.query))) & _OF_A_WINDOW
    if chunk.by in ("none", "next"):
        if used:
            yield Flaw(
                path=("data", "query"),
                message=f"{{{min(used)}}} needs a window: give by in [chunk]",
            )
        return
    missing = _MUST_HOLD[chunk.by] - used
    if (
        chunk.by == "query-args"
        and not {"start", "stop"} <= used
        and not {
            "offset",
            "count",
        }
        <= used
    ):
        missing = {"offset", "count"}
    place = ("data", "query") if chunk.by == "query-args" else ("chunk", "by")
    if missing:
        words = listed(f"{{{word}}}" for word in sorted(missing, reverse=True))
        yield Flaw(path=place, message=f"{chunk.by} needs {words} in its commands")
    if chunk.by == "offset-count" and "count" not in used and chunk.max_points is None:
        yield Flaw(
            path=place,
            message="without {count} in its commands max_points says how many samples one "
            "transfer brings",
        )
    if chunk.unit == "bytes" and (isinstance(data.dtype, Lookup) or data.dtype == "ascii"):
        yield Flaw(
            path=("chunk", "unit"),
            message='bytes need one fixed type of a sample: dtype in [data], such as "i2"',
        )
    yield from _of_lengths(body)


def _of_lengths(body: DigitiserKeys) -> Iterator[Flaw]:
    """A record that is read in pieces needs its length before."""
    chunk = body.chunk
    if not chunk.total and "points" not in body.preamble.fields:
        yield Flaw(
            path=("chunk", "by"),
            message="nothing says how long the record is: give total here, or points in [preamble]",
        )
    if not chunk.total and body.preamble.in_block:
        yield Flaw(
            path=("chunk", "by"),
            message="the figures come with the samples: give total, a query for the length",
        )


def _of_wraps(body: DigitiserKeys) -> Iterator[Flaw]:
    data = body.data
    if data.wrap == "ascii" and data.dtype != "ascii":
        yield Flaw(path=("data", "dtype"), message='a text has dtype = "ascii", or none')
    if data.wrap == "hex" and data.dtype == "ascii":
        yield Flaw(path=("data", "dtype"), message='hex needs the type of a sample, such as "u1"')
    yield from _of_leads(body)
    if body.preamble.kind == "block-text" and not (body.preamble.ends or body.preamble.size):
        yield Flaw(path=("preamble", "ends"), message="is missing, or size: where the text ends")
    if data.bits and body.scale.y != "none":
        yield Flaw(path=("data", "bits"), message='logic has no volts: give y = "none" in [scale]')


def _of_leads(body: DigitiserKeys) -> Iterator[Flaw]:
    """A text before the block needs a block with a count; some preambles need that text."""
    data, kind = body.data, body.preamble.kind
    printed = data.wrap in ("ascii", "hex")
    if data.lead and printed and kind != "lead-text":
        yield Flaw(
            path=("data", "lead"),
            message='goes with a block, or with kind = "lead-text" in [preamble]',
        )
    if kind == "lead-text" and printed and not body.preamble.ends:
        yield Flaw(
            path=("preamble", "ends"),
            message="is missing: what stands between the figures and printed samples",
        )
    if kind == "lead-text" and not data.lead:
        yield Flaw(path=("preamble", "kind"), message="needs lead = true in [data]")
    if kind == "dif" and not data.lead and data.wrap != "ascii":
        yield Flaw(
            path=("preamble", "kind"),
            message='needs lead = true in [data], or wrap = "ascii" where values are printed',
        )
    if data.trailer not in ("\n", "\r\n", "") and not data.lead:
        yield Flaw(path=("data", "trailer"), message=r'must be "\n", "\r\n" or ""')


def _of_waiting(body: DigitiserKeys) -> Iterator[Flaw]:
    acquire = body.acquire
    if acquire.resume and acquire.running is None:
        yield Flaw(
            path=("acquire", "resume"),
            message="needs running: the query that tells whether it ran before",
        )
