"""Reading the preamble: the figures that describe the samples, wherever they come from."""

from __future__ import annotations

import struct
from collections.abc import Mapping

from benchtool_drivers.dialect.records import OrderFlag, Place, PreambleKeys
from benchtool_drivers.dialect.vocabulary import FIELDS
from benchtool_drivers.digitiser.dif import read_dif
from benchtool_drivers.digitiser.fields import Fields
from benchtool_drivers.digitiser.talk import Talk, cut

_CODES = {
    "u1": "B",
    "i1": "b",
    "u2": "H",
    "i2": "h",
    "u4": "I",
    "i4": "i",
    "u8": "Q",
    "i8": "q",
    "f4": "f",
    "f8": "d",
}


def read_preamble(talk: Talk, channel: str) -> Fields | None:
    """Ask for the figures; None where they come with the samples."""
    keys: PreambleKeys = talk.dialect.body.preamble
    if keys.in_block:
        return None
    texts: Mapping[str, str] = {}
    if keys.kind in ("csv", "keyvalue"):
        answer = talk.ask(keys.query, "the preamble", channel=channel)
        texts = _positional(talk, answer) if keys.kind == "csv" else _keyed(talk, answer)
    elif keys.kind == "block":
        query = keys.query.format(channel=channel)
        content = talk.link.ask_block(query)
        talk.tell("block", query, f"{len(content)} bytes", "the descriptor")
        texts = unpack(talk, content)
    return complete(talk, texts, channel)


def complete(talk: Talk, texts: Mapping[str, str], channel: str) -> Fields:
    """Add to the figures of a preamble those that have a query of their own, and constants."""
    keys: PreambleKeys = talk.dialect.body.preamble
    asked = {
        name: talk.ask(query, FIELDS.get(name, ""), channel=channel)
        for name, query in keys.ask.items()
    }
    found = {**keys.constant, **texts, **asked}
    for name, text in found.items():
        talk.tell("field", name, text, FIELDS.get(name, "recorded"))
    return Fields(talk, found, keys.query or talk.dialect.body.data.query)


def _positional(talk: Talk, answer: str) -> Mapping[str, str]:
    keys: PreambleKeys = talk.dialect.body.preamble
    values = [item.strip() for item in answer.split(keys.separator)]
    if len(values) != len(keys.names):
        many = len(values) > len(keys.names) and keys.separator == ","
        raise talk.wrong(
            f"the preamble has {len(values)} figures where the dialect names {len(keys.names)}"
            + (": it looks like decimal commas" if many else ""),
            hint="Set the instrument to a decimal point, or compare fields with the manual.",
            command=keys.query or talk.dialect.body.data.query,
            expected=f"{len(keys.names)} figures",
            got=answer,
        )
    return {name: value for name, value in zip(keys.names, values, strict=True) if name != "-"}


def _keyed(talk: Talk, answer: str) -> Mapping[str, str]:
    """Return the values of a text of keys and values, under the dialect's names."""
    keys: PreambleKeys = talk.dialect.body.preamble
    pairs = dict(_pairs(answer, keys))
    found = {
        name: pairs[key.casefold()] for name, key in keys.keys.items() if key.casefold() in pairs
    }
    missing = [key for name, key in keys.keys.items() if name not in found]
    if missing:
        raise talk.wrong(
            f"the preamble has no {', '.join(missing)}",
            hint="Compare fields, separator and assign in [preamble] with what came.",
            command=keys.query or talk.dialect.body.data.query,
            expected=f"the keys {', '.join(keys.keys.values())}",
            got=answer,
        )
    return found


def _pairs(answer: str, keys: PreambleKeys) -> list[tuple[str, str]]:
    found = []
    for item in _split(answer, keys.separator):
        left, joint, right = item.strip().partition(keys.assign or " ")
        if joint:
            key = left.strip().strip('"').rpartition(":")[2].casefold()
            found.append((key, right.strip().strip('"')))
    return found


def _split(text: str, separator: str) -> list[str]:
    """Split at separators outside quotes."""
    parts, quoted = [""], False
    for piece in text.split(separator):
        parts[-1] += (separator if quoted else "") + piece
        if parts[-1].count('"') % 2 == 0:
            parts.append("")
            quoted = False
        else:
            quoted = True
    return [part for part in parts if part]


def leading(talk: Talk, lead: str, content: bytes) -> tuple[Mapping[str, str], int]:
    """Return the figures that come with samples, and how many bytes of the block they take.

    Args:
        talk: The instrument.
        lead: The text before the block; of a printed record, all of it.
        content: The block.
    """
    keys: PreambleKeys = talk.dialect.body.preamble
    if keys.kind == "dif":
        return read_dif(talk, lead), 0
    if keys.kind == "lead-text":
        text = lead.strip().rstrip(keys.separator)
        return (_positional(talk, text) if keys.names else _keyed(talk, text)), 0
    if keys.kind == "block":
        return unpack(talk, content), 0
    size = end = keys.size
    if not size:
        end = content.find(keys.ends.encode("ascii"))
        if end < 0:
            raise talk.wrong(
                f"the block holds no {keys.ends!r} after its text",
                hint="Compare ends in [preamble] with the manual.",
                command=talk.dialect.body.data.query,
                expected=repr(keys.ends),
                got=repr(content[:40]),
            )
        size = end + len(keys.ends)
    return _keyed(talk, content[:end].decode("latin-1").rstrip("\0 \r\n")), size


def unpack(talk: Talk, content: bytes) -> Mapping[str, str]:
    """Return the fields of a binary descriptor.

    Raises:
        ReplyError: If it is too short, or does not begin as it must.
    """
    keys: PreambleKeys = talk.dialect.body.preamble
    magic = keys.magic
    if magic is not None:
        there = content[magic.at : magic.at + len(magic.text)]
        if there != magic.text.encode("latin-1"):
            raise _no_descriptor(talk, f"{there!r} stands where {magic.text!r} must", content)
    flag = keys.order
    little = flag == "little"
    texts = {}
    if isinstance(flag, OrderFlag):
        little = _says_little(talk, content, flag)
        texts["order"] = "little" if little else "big"
    for name, place in keys.places.items():
        texts[name] = _unpacked(talk, content, place, little=little)
    return texts


def _says_little(talk: Talk, content: bytes, flag: OrderFlag) -> bool:
    """Return what the flag of a descriptor says; it is written in the order that it names."""
    place = Place(at=flag.at, type=flag.type)
    return _unpacked(talk, content, place, little=True) == str(flag.little_if)


def _unpacked(talk: Talk, content: bytes, place: Place, *, little: bool) -> str:
    size = int(place.type[1:])
    part = content[place.at : place.at + size]
    if len(part) < size:
        raise _no_descriptor(talk, f"it ends before byte {place.at + size}", content)
    if place.type[0] == "s":
        return part.split(b"\0")[0].decode("latin-1").strip()
    value = struct.unpack(("<" if little else ">") + _CODES[place.type], part)[0]
    return repr(value)


def _no_descriptor(talk: Talk, what: str, content: bytes) -> Exception:
    return talk.wrong(
        f"the block does not lead with the descriptor: {what}",
        hint="Compare places and magic in [preamble] with the manual.",
        command=talk.dialect.body.data.query,
        expected="the descriptor of the dialect",
        got=cut(repr(content[:24])),
    )
