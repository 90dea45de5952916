"""Lists of transitions in their variants, and words of logic."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of, values_of
from written import EDGES_S, HIGH_AFTER, TIMES_S, US, E, X, comma, is_list, lines, rows, seconds_of

from benchtool.errors import AmbiguousStructureError, BenchtoolError

K = EDGES_S.size
EDGE_US = [f"{t * 1e6:.1f}" for t in EDGES_S]
LENGTHS_S = np.diff(np.concatenate([[EDGES_S[0] - 131e-6], EDGES_S]))
LENGTH_US = [f"{length * 1e6:.1f}" for length in LENGTHS_S]
BEFORE = ["0" if high else "1" for high in HIGH_AFTER]
LATER_S = EDGES_S + 37e-6
BOTH = sorted(
    [(t, "0", x) for t, x in zip(EDGES_S, X, strict=True)]
    + [(t, "1", x) for t, x in zip(LATER_S, X, strict=True)]
)


def words(high: str, low: str) -> list[str]:
    return [high if h else low for h in HIGH_AFTER]


LISTS = {
    "time and state": "Time (s),State\n" + rows(E, X),
    "state and time": "State,Time (s)\n" + rows(X, E),
    "states in words": "time_us;level\n" + rows(EDGE_US, words("HIGH", "LOW"), mark=";"),
    "edges in words": "#,Time (s),Edge\n"
    + rows([str(i) for i in range(K)], E, words("rising", "falling")),
    "a channel's name in every row": "us,pin,level\n" + rows(EDGE_US, ["D2"] * K, X),
    "duration beside the time": "Time (s),State,Duration (us)\n" + rows(E, X, LENGTH_US),
    "clock times": "time,level\n" + rows([f"00:00:{t:010.7f}" for t in EDGES_S], X),
}


@pytest.mark.parametrize("text", LISTS.values(), ids=LISTS.keys())
def test_one_channel(read: Read, text: str) -> None:
    capture = read(text)
    assert len(capture.traces) == 1
    assert is_list(capture.traces[0], EDGES_S, HIGH_AFTER)
    assert not set(codes_of(capture)) - {"assumed-time-unit"}


@pytest.mark.parametrize(
    "text",
    [
        "State,Duration (us)\n" + rows(BEFORE, LENGTH_US),
        "Level;Dauer [us]\n"
        + rows(["high" if b == "1" else "low" for b in BEFORE], comma(LENGTH_US), mark=";"),
    ],
)
def test_states_and_how_long_each_lasted(read: Read, text: str) -> None:
    trace = read(text).traces[0]
    assert is_list(trace, EDGES_S[:-1], HIGH_AFTER[:-1])
    assert trace.spans[0].end_s == pytest.approx(LENGTHS_S.sum())  # type: ignore[union-attr]


@pytest.mark.parametrize("head", ["Delta (us),State", "dt_us,level"])
def test_time_since_the_last_edge_is_no_duration(read: Read, head: str) -> None:
    with pytest.raises(BenchtoolError):
        read(f"{head}\n" + rows(LENGTH_US, X))


@pytest.mark.parametrize(
    ("head", "mark"),
    [("Rise (s),Fall (s)", ","), ("t_on_s,t_off_s", ","), ("steigend [s];fallend [s]", ";")],
)
def test_times_of_rising_and_of_falling_edges(read: Read, head: str, mark: str) -> None:
    up, down = E[1:-1:2], E[2::2]
    cells = (up, down) if mark == "," else (comma(up), comma(down))
    trace = read(f"{head}\n" + rows(*cells, mark=mark)).traces[0]
    assert is_list(trace, EDGES_S[1:-1], HIGH_AFTER[1:-1])


def test_start_and_end_of_what_is_asked(read: Read) -> None:
    with pytest.raises(BenchtoolError):
        read("Start (s),End (s)\n" + rows(E[1:-1:2], E[2::2]))


TWO = {
    "channel, time and edge": "Channel,Time (s),Edge\n"
    + "".join(f"{c},{t:.7f},{'rise' if x == '1' else 'fall'}\n" for t, c, x in BOTH),
    "time, name and state": "Time (s);Signal;Value\n"
    + "".join(f"{t:.7f};{'OUT' if c == '0' else 'VALVE'};{x}\n" for t, c, x in BOTH),
    "cells only where something changes": "Time (s),D0,D1\n"
    + "".join(f"{t:.7f},{x if c == '0' else ''},{x if c == '1' else ''}\n" for t, c, x in BOTH),
    "a time for each channel": "Time (s),D0,Time (s),D1\n"
    + "".join(f"{a},{x},{b:.7f},{x}\n" for a, b, x in zip(E, LATER_S, X, strict=True)),
}


@pytest.mark.parametrize("text", TWO.values(), ids=TWO.keys())
def test_two_channels(read: Read, text: str) -> None:
    traces = read(text).traces
    assert len(traces) == 2
    assert sum(is_list(trace, EDGES_S, HIGH_AFTER) for trace in traces) == 2


@pytest.mark.parametrize("form", ["0x{:02X}", "{:08b}", "0b{:04b}", "{:02X}h"])
def test_words_of_logic_are_channels(read: Read, form: str) -> None:
    codes = [(i // 7 % 2) + 2 * (i // 3 % 2) for i in range(len(US))]
    capture = read("Time (us),Port\n" + rows(US, [form.format(code) for code in codes]))
    assert [t.channel for t in capture.traces][:2] == ["Port[0]", "Port[1]"]
    assert values_of(capture.traces[1]) == pytest.approx([code >> 1 for code in codes])
    assert seconds_of(capture.traces[0]) == pytest.approx(TIMES_S)
    assert capture.traces[0].is_logic  # type: ignore[union-attr]


def test_words_of_decoded_data_are_no_channels(read: Read) -> None:
    text = "Time (s),Packet,Address,Data\n" + lines(lambda i: f"{E[i]},{i},0x48,0x{i:02X}", K)
    with pytest.raises(BenchtoolError):
        read(text)


def test_a_sample_for_each_channel_in_turn_is_no_list(read: Read) -> None:
    text = "Time (s),Channel,State\n" + lines(lambda i: f"{i * 1e-3:.3f},{i % 2},{i // 30 % 2}", 90)
    with pytest.raises(AmbiguousStructureError, match="several channels"):
        read(text)
