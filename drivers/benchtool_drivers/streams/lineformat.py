r"""Edge lines, version 1: a format for microcontrollers that print the times of edges.

It was made for this program, so that twenty lines of C suffice and nothing that goes wrong on the
way is taken for an edge. All is ASCII; a line ends in LF (CR LF is taken too); a line counts only
once its LF has come. Lines are::

    #edge-lines/1 tick-hz=16000000 tick-bits=32 seq-bits=16 heartbeat-ms=200 channel=OUT
    #start
    1,48211,1
    2,91875,0
    2,3291875,L
    3,3512004,1

**Header**, one line: ``#edge-lines/1`` and then ``key=value``, each after one space, in any order.
It is printed when the device starts and again at least every two seconds, between other lines, so
that a reader may join at any moment. A reader gives up the first line it meets, which may be the
rest of one; so an empty line, which means nothing, is best printed before the header.

====================  ==========================================================================
``tick-hz``           ticks in a second; a whole or decimal number. Required.
``tick-bits``         width of the tick counter, 8 to 60: 0 follows on 2^bits - 1. Required.
``seq-bits``          width of the sequence number, 8 to 60. Required.
``heartbeat-ms``      longest silence at rest in milliseconds. Required.
``channel``           name of the signal, no space in it. ``OUT`` where it is left out.
``sum``               ``xor``: every line, this one too, ends in a check sum. None where left out.
====================  ==========================================================================

**Edge**: ``sequence,ticks,level``. The sequence number counts edges and starts again at 0 after
2^seq-bits. The ticks are the counter's reading at the edge. The level is the one that the edge
leads to: ``1`` high, ``0`` low.

**Heartbeat**: the same with ``H`` (rests high) or ``L`` (rests low). Its sequence number is that of
the last edge and its ticks are those of now. It is printed when nothing else was for heartbeat-ms.
So a line at rest is told from a dead one, and an edge lost on the way is noticed even if no other
follows. Two lines that follow each other must lie less than half a turn of the tick counter apart:
heartbeat-ms has to be shorter than that.

**Start**: ``#start``, once, after a reset: what follows does not continue what was before. Any
other line that begins with ``#`` is a comment.

**Check sum**: where the header says ``sum=xor``, each line ends in ``*`` and two hexadecimal
digits in upper case: the exclusive-or of all bytes before the ``*``. Without it a digit that
changes on the way is noticed only if the order of times, levels or numbers suffers.

The whole of a device, for a capture unit whose interrupt notes counter and pin in a small queue
(``now``, ``put``, ``next_edge`` and ``pin`` are the device's own)::

    static uint16_t seq;                       /* as wide as seq-bits says */
    static uint32_t told, headed;              /* when a line, and the header, went out */

    static void line(uint32_t ticks, char state)
    {
        char text[24];
        sprintf(text, "%u,%lu,%c\n", seq, (unsigned long)ticks, state);
        put(text);                             /* waits for room; the queue holds the edges */
        told = now();
    }

    void edge_lines(void)                      /* call it for ever */
    {
        uint32_t ticks;
        bool level;
        if (headed == 0 || now() - headed > 2 * HZ) {
            put("\n#edge-lines/1 tick-hz=16000000 tick-bits=32 seq-bits=16 "
                "heartbeat-ms=200\n");
            headed = now() | 1;
        }
        if (next_edge(&ticks, &level)) {
            seq++;
            line(ticks, level ? '1' : '0');
        } else if (now() - told > HZ / 5) {
            line(now(), pin() ? 'H' : 'L');
        }
    }

An edge for which the queue has no room must still be counted by ``seq``: then the reader knows.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping

from benchtool_drivers.streams.layout import Layout

MAGIC = b"#edge-lines/1"
START = b"#start"
NAME = "edge-lines"
REPEAT_S = 2.0
"""At least so often a device prints its header."""

_KEYS = {"tick-hz", "tick-bits", "seq-bits", "heartbeat-ms", "channel", "sum"}
_NUMBER = re.compile(r"[0-9]{1,15}(\.[0-9]{1,15})?")
_LEVELS = ((b"0", 0), (b"1", 1), (b"L", 2), (b"H", 3))


def parse_header(line: bytes) -> Layout | str:
    """Return the layout that a header line states, or in words what is wrong with the line.

    Args:
        line: The line without its end.
    """
    text = line.decode("ascii", "replace")
    if "sum=xor" in text:
        if not has_sum(line):
            return "its check sum is wrong"
        text = text[:-3]
    pairs = [word.partition("=")[::2] for word in text.split(" ")[1:]]
    given = dict(pairs)
    if len(given) < len(pairs):
        return "a key stands twice"
    if unknown := sorted(given.keys() - _KEYS):
        return f"it has no key {unknown[0]!r}"
    if missing := sorted({"tick-hz", "tick-bits", "seq-bits", "heartbeat-ms"} - given.keys()):
        return f"it lacks {missing[0]}"
    return _layout(given)


def has_sum(line: bytes) -> bool:
    """Return whether a line ends in the right check sum."""
    body, star, digits = line[:-3], line[-3:-2], line[-2:]
    return star == b"*" and digits == b"%02X" % _xor(body)


def _xor(body: bytes) -> int:
    total = 0
    for byte in body:
        total ^= byte
    return total


def _layout(given: Mapping[str, str]) -> Layout | str:
    for key in ("tick-hz", "heartbeat-ms"):
        if not _NUMBER.fullmatch(given[key]) or not float(given[key]) > 0:
            return f"{key} must be a number above 0, not {given[key]!r}"
    for key in ("tick-bits", "seq-bits"):
        if not (given[key].isdigit() and 8 <= int(given[key]) <= 60):
            return f"{key} must be 8 to 60, not {given[key]!r}"
    if given.get("sum", "xor") != "xor":
        return f"sum must be xor, not {given['sum']!r}"
    tick_hz, bits = float(given["tick-hz"]), int(given["tick-bits"])
    heartbeat_s = float(given["heartbeat-ms"]) / 1000
    if heartbeat_s >= math.ldexp(0.5, bits) / tick_hz:
        return "heartbeat-ms is longer than half a turn of its tick counter"
    return Layout(
        name=NAME,
        columns=("seq", "time", "level"),
        levels=_LEVELS,
        tick_hz=tick_hz,
        wrap_bits=bits,
        seq_bits=int(given["seq-bits"]),
        heartbeat_s=heartbeat_s,
        channel=given.get("channel") or "OUT",
        comment=b"#",
        xor_sum="sum" in given,
    )
