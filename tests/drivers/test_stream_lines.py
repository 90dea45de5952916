"""Lines of the format of our own become edges; whatever is lost becomes a gap."""

from __future__ import annotations

from random import Random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from stream_lines import (
    codes_of,
    interval_set,
    printed,
    read_lines,
    square_wave,
    trace_of,
)

from benchtool.errors import ReplyError
from benchtool_drivers.loopback.edge_printer import DeviceForm, FaultKind, StreamFault
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.lineformat import parse_header

TRUE_INTERVALS = {(700, True), (300, False)}
HEADER = b"#edge-lines/1 tick-hz=1000000 tick-bits=32 seq-bits=16 heartbeat-ms=100 channel=OUT\n"


def test_the_edges_of_a_clean_stream_are_those_that_were_sent() -> None:
    times_s = square_wave(5000)
    trace = trace_of(read_lines(printed(times_s)))
    # both sides are whole microseconds; float64 subtraction leaves 1e-12
    np.testing.assert_allclose(trace.times_s, times_s - times_s[0], rtol=0, atol=1e-12)
    assert trace.states.tolist() == [n % 2 == 0 for n in range(5000)]
    assert len(trace.spans) == 1
    assert not trace.spans[0].starts_high
    assert (trace.channel, trace.tick_s) == ("OUT", 1e-6)


@pytest.mark.parametrize("xor_sum", [False, True])
@pytest.mark.parametrize("bits", [16, 32])
def test_counters_that_start_again_are_unrolled(bits: int, *, xor_sum: bool) -> None:
    near_the_turn = (1 << bits) - 5000
    form = DeviceForm(
        tick_bits=bits, seq_bits=8, heartbeat_ms=20, first_tick=near_the_turn, xor_sum=xor_sum
    )
    times_s = square_wave(3000)
    capture = read_lines(printed(times_s, form))
    trace = trace_of(capture)
    np.testing.assert_allclose(trace.times_s, times_s - times_s[0], rtol=0, atol=1e-12)
    assert len(trace.spans) == 1
    assert not capture.warnings


@pytest.mark.parametrize(
    ("fault", "code", "n_pieces", "n_edges"),
    [
        (StreamFault(kind="lost", at=100, n=3), "stream-lost", 2, 997),
        (StreamFault(kind="lost", at=100, every=300), "stream-lost", 5, 996),
        (StreamFault(kind="garbage", at=100, n=2), "stream-garbage", 2, 998),
        (StreamFault(kind="half-line", at=100), "stream-garbage", 2, 998),
        (StreamFault(kind="duplicate", at=100, n=5), "stream-repeated", 1, 1000),
        (StreamFault(kind="restart", at=100), "stream-restart", 2, 1000),
    ],
)
def test_a_fault_is_counted_and_never_an_interval(
    fault: StreamFault, code: str, n_pieces: int, n_edges: int
) -> None:
    times_s = [*square_wave(1000), 0.7]
    capture = read_lines(printed(times_s, DeviceForm(), fault))
    trace = trace_of(capture)
    assert code in codes_of(capture)
    assert len(trace.spans) == n_pieces
    assert trace.times_s.size == n_edges + 1
    assert {pair for pair in interval_set(capture) if pair[0] < 1000} == TRUE_INTERVALS


def test_a_lost_edge_is_noticed_at_the_next_heartbeat() -> None:
    text = HEADER + b"1,1000,1\n2,2000,0\n4,50000,L\n"
    capture = read_lines(text)
    assert codes_of(capture) == ["stream-lost"]
    assert [span.end_s for span in trace_of(capture).spans] == [0.001, 0.049]
    assert "2 edges were lost" in capture.warnings[0].text


def test_a_heartbeat_lengthens_the_record_without_an_edge() -> None:
    trace = trace_of(read_lines(HEADER + b"1,1000,1\n1,90000,H\n1,180000,H\n"))
    assert trace.times_s.tolist() == [0.0]
    assert trace.spans[0].end_s == pytest.approx(0.179, abs=1e-12)  # arithmetic
    assert trace.end_known


def test_a_heartbeat_at_the_other_level_tells_of_a_missed_edge() -> None:
    capture = read_lines(HEADER + b"1,1000,1\n1,90000,L\n")
    assert codes_of(capture) == ["stream-level"]
    assert len(trace_of(capture).spans) == 2


def test_levels_that_do_not_alternate_part_the_record() -> None:
    capture = read_lines(HEADER + b"1,1000,1\n2,2000,0\n3,3000,0\n4,4000,1\n")
    assert codes_of(capture) == ["stream-level"]
    assert [span.starts_high for span in trace_of(capture).spans] == [False, True]


def test_a_time_that_was_spoilt_upwards_takes_both_doubtful_lines_away() -> None:
    # line 3 reads 90000 instead of 3000: by itself a sound edge, were there none after it
    text = HEADER + b"".join(
        b"%d,%d,%d\n" % (n, 90000 if n == 3 else 1000 * n, n % 2) for n in range(1, 9)
    )
    capture = read_lines(text)
    assert interval_set(capture) == {(1000, True), (1000, False)}
    assert {"stream-time-back", "stream-lost"} <= set(codes_of(capture))


def test_a_number_that_was_spoilt_is_taken_back() -> None:
    lines = [b"%d,%d,%d\n" % (n, 1000 * n, n % 2) for n in range(1, 9)]
    lines[3] = b"904,4000,0\n"
    capture = read_lines(HEADER + b"".join(lines))
    assert interval_set(capture) == {(1000, True), (1000, False)}
    assert len(trace_of(capture).spans) == 2
    assert trace_of(capture).times_s.size == 7


def test_a_device_that_jumps_back_for_good_is_read_on_as_restarted() -> None:
    first = [b"%d,%d,%d\n" % (n, 10**6 + 1000 * n, n % 2) for n in range(1, 50)]
    again = [b"%d,%d,%d\n" % (n, 1000 * n, n % 2) for n in range(1, 50)]
    capture = read_lines(HEADER + b"".join(first + again))
    assert "stream-restart" in codes_of(capture)
    assert interval_set(capture) == {(1000, True), (1000, False)}
    assert trace_of(capture).times_s.size > 90


def test_a_spoilt_digit_is_known_by_its_check_sum() -> None:
    text = printed(square_wave(100), DeviceForm(xor_sum=True))
    lines = text.split(b"\n")
    at = next(i for i, line in enumerate(lines) if line.startswith(b"41,"))
    lines[at] = lines[at].replace(b",20", b",21", 1)
    capture = read_lines(b"\n".join(lines))
    assert codes_of(capture) == ["stream-lost", "stream-garbage"]
    assert interval_set(capture) == TRUE_INTERVALS


def test_lines_before_the_first_header_are_read_once_it_has_come() -> None:
    capture = read_lines(b"1,1000,1\n2,2000,0\n" + HEADER + b"3,3000,1\n", cuts=[5, 20, 40])
    assert trace_of(capture).times_s.size == 3
    assert len(trace_of(capture).spans) == 1


def test_another_header_twice_over_ends_the_reading() -> None:
    other = HEADER.replace(b"1000000", b"2000000")
    once = read_lines(HEADER + b"1,1000,1\n" + other + b"2,2000,0\n" + HEADER)
    assert codes_of(once) == ["stream-header"]
    with pytest.raises(ReplyError) as raised:
        read_lines(HEADER + b"1,1000,1\n" + other + b"2,2000,0\n" + other)
    assert raised.value.code == "stream-header"


def test_lines_of_which_none_can_be_read_are_refused_with_the_first() -> None:
    with pytest.raises(ReplyError) as raised:
        read_lines(HEADER + b"\xfe\x80garbled\n" * 30)
    assert raised.value.code == "stream-unreadable"
    assert "garbled" in raised.value.step.got


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ((b"tick-hz=1000000", b"tick-hz=0"), "tick-hz must be a number above 0"),
        ((b"tick-bits=32", b"tick-bits=99"), "tick-bits must be 8 to 60"),
        ((b" seq-bits=16", b""), "it lacks seq-bits"),
        ((b"channel", b"chanel"), "it has no key 'chanel'"),
        ((b"tick-bits=32", b"tick-bits=16"), "longer than half a turn"),
        ((b"channel=OUT", b"sum=crc"), "sum must be xor"),
        ((b"channel=OUT", b"sum=xor*00"), "its check sum is wrong"),
        ((b"channel=OUT", b"tick-bits=32"), "a key stands twice"),
    ],
)
def test_a_header_with_a_fault_says_what_it_is(change: tuple[bytes, bytes], says: str) -> None:
    found = parse_header(HEADER.strip().replace(*change))
    assert isinstance(found, str)
    assert says in found


def test_a_header_says_all_that_the_lines_mean() -> None:
    found = parse_header(HEADER.strip())
    assert isinstance(found, Layout)
    assert (found.tick_hz, found.wrap_bits, found.seq_bits) == (1e6, 32, 16)
    assert (found.heartbeat_s, found.channel, found.xor_sum) == (0.1, "OUT", False)


SPOILT = printed(
    [*square_wave(300), 0.5],
    DeviceForm(tick_bits=24, seq_bits=8, header_every=50, xor_sum=True),
    StreamFault(kind="garbage", at=20, every=60),
    StreamFault(kind="duplicate", at=30, every=70),
    StreamFault(kind="lost", at=150, n=2),
    StreamFault(kind="restart", at=222),
)
WHOLE = read_lines(SPOILT)


@settings(max_examples=40, deadline=None)
@given(cuts=st.lists(st.integers(0, len(SPOILT)), max_size=60))
def test_however_the_bytes_are_chopped_the_edges_are_the_same(cuts: list[int]) -> None:
    chopped = read_lines(SPOILT, cuts=cuts)
    assert trace_of(chopped).times_s.tolist() == trace_of(WHOLE).times_s.tolist()
    assert trace_of(chopped).states.tolist() == trace_of(WHOLE).states.tolist()
    assert trace_of(chopped).spans == trace_of(WHOLE).spans
    assert chopped.warnings == WHOLE.warnings


def test_a_start_mark_parts_the_record_though_all_counters_go_on() -> None:
    capture = read_lines(HEADER + b"1,1000,1\n2,2000,0\n#start\n3,3000,1\n4,4000,0\n")
    assert codes_of(capture) == ["stream-restart"]
    assert len(trace_of(capture).spans) == 2


def test_a_burst_of_lines_that_come_again_costs_nothing() -> None:
    lines = [b"%d,%d,%d\n" % (n, 1000 * n, n % 2) for n in range(1, 61)]
    capture = read_lines(HEADER + b"".join([*lines[:40], *lines[20:40], *lines[40:]]))
    assert codes_of(capture) == ["stream-repeated"]
    assert "20 lines" in capture.warnings[0].text
    assert trace_of(capture).times_s.size == 60
    assert len(trace_of(capture).spans) == 1


@pytest.mark.parametrize("seed", range(40))
def test_whatever_goes_wrong_no_interval_is_given_that_was_not_sent(seed: int) -> None:
    random = Random(seed)
    kinds: list[FaultKind] = ["lost", "garbage", "duplicate", "half-line", "restart"]
    faults = [
        StreamFault(
            kind=random.choice(kinds),
            at=random.randrange(5, 200),
            n=random.randrange(1, 4),
            every=random.choice([0, 37, 91]),
        )
        for _ in range(3)
    ]
    form = DeviceForm(
        tick_bits=random.choice([16, 32]), seq_bits=random.choice([8, 16]), heartbeat_ms=20
    )
    capture = read_lines(printed(square_wave(400), form, *faults))
    assert interval_set(capture) == TRUE_INTERVALS
    assert trace_of(capture).times_s.size > 250
