"""Value change dumps: written by an independent library and by hand, read back."""

from __future__ import annotations

import io

import numpy as np
import pytest
from read_back import Read, codes_of, point
from vcd import VCDWriter

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError, UsageError
from benchtool.model.capture import Capture, LogicTrace, StampedTime, Waveform
from benchtool.targets import find_channel

HEAD = (
    "$timescale 1 us $end\n$scope module top $end\n$var wire 1 ! OUT $end\n"
    "$upscope $end\n$enddefinitions $end\n"
)


def logic(capture: Capture, place: int = 0) -> LogicTrace:
    trace = capture.traces[place]
    assert isinstance(trace, LogicTrace)
    return trace


@pytest.mark.parametrize("timescale", ["1 s", "100 ms", "10 us", "1 ns", "100 ps", "10 fs"])
def test_dump_of_another_writer_is_read_back(read: Read, timescale: str) -> None:
    rng = np.random.default_rng(1)
    times = np.cumsum(rng.integers(1, 2000, 500))
    file = io.StringIO()
    with VCDWriter(file, timescale=timescale, date="2031") as writer:
        out = writer.register_var("bench", "OUT", "wire", size=1, init=0)
        other = writer.register_var("bench", "count", "integer", size=8, init=0)
        for i, t in enumerate(times):
            writer.change(out, int(t), (i + 1) % 2)
            writer.change(other, int(t), i % 256)
    capture = read(file.getvalue(), "a.vcd")
    trace = logic(capture)
    unit = {"s": 1.0, "ms": 1e-3, "us": 1e-6, "ns": 1e-9, "ps": 1e-12, "fs": 1e-15}
    multiple, name = timescale.split()
    assert trace.channel == "OUT"
    assert trace.times_s == pytest.approx(times * (int(multiple) * unit[name]), rel=1e-14)
    assert trace.states[:4].tolist() == [True, False, True, False]
    assert [t.channel for t in capture.traces[1:]] == [f"count[{i}]" for i in range(7, -1, -1)]
    bit = logic(capture, 8)
    assert np.count_nonzero(bit.states) == 250


def test_tick_is_the_common_spacing_and_not_the_timescale(read: Read) -> None:
    text = (
        HEAD
        + "#0 0!\n"
        + "".join(f"#{20 * t}\n{i % 2}!\n" for i, t in enumerate([3, 7, 12, 18, 25], 1))
    )
    capture = read(text, "a.vcd")
    assert logic(capture).tick_s == pytest.approx(20e-6)
    assert point(capture, "time_unit") == "1 us"


def test_last_time_ends_the_record(read: Read) -> None:
    trace = logic(read(HEAD + "#0\n0!\n#10\n1!\n#50\n", "a.vcd"))
    assert trace.spans[0].end_s == pytest.approx(50e-6)
    assert trace.end_known


def test_record_that_ends_with_its_last_edge(read: Read) -> None:
    assert not logic(read(HEAD + "#0\n0!\n#10\n1!\n", "a.vcd")).end_known


def test_times_count_from_the_first_time(read: Read) -> None:
    trace = logic(read(HEAD + "#1000\n0!\n#1010\n1!\n#1050\n", "a.vcd"))
    assert trace.times_s == pytest.approx([10e-6])
    assert trace.spans[0].start_s == 0


def test_values_before_the_first_time_stand_at_it(read: Read) -> None:
    trace = logic(read(HEAD + "$dumpvars\n1!\n$end\n#100\n#110\n0!\n#150\n", "a.vcd"))
    assert trace.spans[0].starts_high
    assert trace.times_s == pytest.approx([10e-6])


def test_change_at_the_first_time_is_an_edge_of_no_length(read: Read) -> None:
    trace = logic(read(HEAD + "$dumpvars\n1!\n$end\n#100\n0!\n#110\n1!\n#150\n", "a.vcd"))
    assert not trace.spans[0].starts_high
    assert trace.times_s == pytest.approx([10e-6])


@pytest.mark.parametrize("unknown", ["x", "z", "X", "Z"])
def test_unknown_states_are_gaps(read: Read, unknown: str) -> None:
    text = HEAD + f"#0\n0!\n#10\n1!\n#20\n{unknown}!\n#30\n1!\n#40\n0!\n#50\n"
    trace = logic(read(text, "a.vcd"))
    assert [(s.start_s, s.end_s, s.starts_high) for s in trace.spans] == [
        (0.0, pytest.approx(20e-6), False),
        (pytest.approx(30e-6), pytest.approx(50e-6), True),
    ]
    assert trace.times_s == pytest.approx([10e-6, 40e-6])


def test_dump_switched_off_is_a_gap_and_no_edge(read: Read) -> None:
    text = (
        HEAD + "#0\n$dumpvars\n0!\n$end\n#10\n1!\n#20\n$dumpoff\nx!\n$end\n"
        "#90\n$dumpon\n0!\n$end\n#95\n1!\n#99\n"
    )
    trace = logic(read(text, "a.vcd"))
    assert trace.times_s == pytest.approx([10e-6, 95e-6])
    assert [s.starts_high for s in trace.spans] == [False, False]


def test_dump_switched_off_without_values_is_a_gap_too(read: Read) -> None:
    text = HEAD + "#0\n0!\n#10\n1!\n#20\n$dumpoff\n$end\n#90\n$dumpon\n1!\n$end\n#99\n"
    trace = logic(read(text, "a.vcd"))
    assert [s.end_s for s in trace.spans] == pytest.approx([20e-6, 99e-6])


def test_scopes_make_dotted_names(read: Read) -> None:
    text = (
        "$timescale 1us $end $scope module top $end $var wire 1 ! OUT $end\n"
        '$scope module inner $end\n$var reg 1 " OUT $end $upscope $end\n'
        "$var reg 1 # LED $end $upscope $end\n"
        '$enddefinitions $end\n#0 0! 1" 0#\n#10 1! 0" 1#\n#20\n'
    )
    assert [t.channel for t in read(text, "a.vcd").traces] == ["OUT", "inner.OUT", "LED"]


def test_alias_is_one_trace(read: Read) -> None:
    text = HEAD.replace("$upscope", "$var wire 1 ! copy $end\n$upscope") + "#0 0!\n#10 1!\n#20\n"
    capture = read(text, "a.vcd")
    assert [t.channel for t in capture.traces] == ["OUT"]
    assert point(capture, "alias") == "copy"


def test_vectors_give_their_bits(read: Read) -> None:
    text = (
        "$timescale 1us $end\n$var wire 4 # bus [3:0] $end\n$var wire 1 $ flag[2] $end\n"
        "$enddefinitions $end\n#0\nb1 #\n0$\n#10\nb1010 #\n1$\n#20\nbx #\n#30\n"
    )
    capture = read(text, "a.vcd")
    assert [t.channel for t in capture.traces] == [
        "bus[3]",
        "bus[2]",
        "bus[1]",
        "bus[0]",
        "flag[2]",
    ]
    assert logic(capture, 0).times_s == pytest.approx([10e-6])
    assert logic(capture, 3).spans[0].starts_high
    assert logic(capture, 3).spans[0].end_s == pytest.approx(20e-6)


def test_short_vector_values_are_extended_as_the_standard_says() -> None:
    from benchtool.formats.vcd.changes import extended

    # IEEE 1364-2005, table 18-1: 10 -> 0010, X10 -> XX10, ZX0 -> ZZX0, 0X10 -> 0X10
    assert [extended(v, 4) for v in ("10", "X10", "ZX0", "0X10")] == [
        "0010",
        "xx10",
        "zzx0",
        "0x10",
    ]


def test_wide_vectors_and_events_are_left_out_with_notice(read: Read) -> None:
    text = HEAD.replace("$upscope", "$var wire 65 w wide $end\n$var event 1 e hit $end\n$upscope")
    capture = read(text + f"#0 0! b{'1' * 65} w\n#10 1! 1e\n#20\n", "a.vcd")
    assert [t.channel for t in capture.traces] == ["OUT"]
    assert codes_of(capture) == ["signals-skipped"]
    assert "2 variables" in capture.warnings[0].text


def test_real_with_two_values_is_logic(read: Read) -> None:
    text = (
        "$timescale 1us $end $var real 64 ! OUT $end $enddefinitions $end\n#0\n"
        "r0.1 !\n#10\nr4.9 !\n#20\nr0.1 !\n#30\n"
    )
    assert logic(read(text, "a.vcd")).times_s == pytest.approx([10e-6, 20e-6])


def test_real_is_a_staircase(read: Read) -> None:
    text = (
        "$timescale 1us $end $var real 64 ! NODE $end $enddefinitions $end\n"
        "#0\nr0 !\n#10\nr1.5 !\n#20\nr3 !\n"
    )
    trace = read(text, "a.vcd").traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    stamps = np.concatenate(list(trace.time.stamps.blocks()))
    values = np.concatenate(list(trace.samples.blocks()))
    assert stamps == pytest.approx(np.array([0, 9, 10, 19, 20]) * 1e-6)
    assert values.tolist() == [0, 0, 1.5, 1.5, 3]


def test_glitch_of_no_length_is_no_edge(read: Read) -> None:
    trace = logic(read(HEAD + "#0\n0!\n#10\n1!\n0!\n#20\n1!\n#30\n", "a.vcd"))
    assert trace.times_s == pytest.approx([20e-6])


def test_comment_among_the_changes(read: Read) -> None:
    trace = logic(read(HEAD + "#0\n0!\n$comment 1! #5 $end\n#10\n1!\n#30\n", "a.vcd"))
    assert trace.times_s == pytest.approx([10e-6])


def test_carriage_returns_and_sections_over_lines(read: Read) -> None:
    text = (
        "$date\n  today\n$end\n$timescale\n  1us\n$end\n$var wire 1 ! OUT\n"
        "$end\n$enddefinitions\n$end\n#0\n0!\n#10\n1!\n#30\n"
    )
    assert logic(read(text.replace("\n", "\r\n"), "a.vcd")).times_s == pytest.approx([10e-6])


def test_identifier_codes_of_odd_characters(read: Read) -> None:
    text = (
        "$timescale 1us $end\n$var wire 1 #0 A $end\n$var wire 1 $1 B $end\n"
        "$var wire 1 b C $end\n$enddefinitions $end\n#0\n0#0\n0$1\n0b\n#10\n"
        "1#0\n#20\n1$1\n#30\n1b\n#40\n"
    )
    capture = read(text, "a.vcd")
    assert [logic(capture, k).times_s[0] for k in range(3)] == pytest.approx([10e-6, 20e-6, 30e-6])


def test_missing_timescale_is_refused_with_its_option(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError) as caught:
        read(HEAD.replace("$timescale 1 us $end\n", "") + "#0\n0!\n#10\n1!\n", "a.vcd")
    assert "--time-unit" in caught.value.hint


def test_missing_timescale_given_by_option(read: Read) -> None:
    text = HEAD.replace("$timescale 1 us $end\n", "") + "#0\n0!\n#10\n1!\n"
    assert logic(read(text, "a.vcd", time_unit="ms")).times_s == pytest.approx([10e-3])


@pytest.mark.parametrize("end", ["#1", "#3", "b10", "1"])
def test_cut_dump_is_read_to_the_change_before(read: Read, end: str) -> None:
    capture = read(HEAD + "#0\n0!\n#10\n1!\n#20\n0!\n" + end, "a.vcd")
    assert logic(capture).times_s == pytest.approx([10e-6, 20e-6])
    assert codes_of(capture) == ["file-cut"]


@pytest.mark.parametrize(
    ("text", "code"),
    [
        (HEAD[:60], "header-cut"),
        (HEAD, "no-values"),
        (HEAD + "#0\n0!\n#10\n1!\n#5\n0!\n#30\n", "time-disorder"),
        (HEAD + "#0\n0!\n#10\nvalve\n#30\n", "malformed-capture"),
        (HEAD.replace("1 us", "3 us") + "#0\n0!\n", "malformed-capture"),
        (HEAD + "0!\n1!\n", "no-values"),
        (HEAD + "#-5\n0!\n#30\n", "malformed-capture"),
        (HEAD + f"#0\n0!\n#5\n1!\n#{2**63}\n0!\n", "malformed-capture"),
        (HEAD + f"#0\n0!\n#5\n1!\n#{'9' * 5000}\n0!\n", "malformed-capture"),
        (HEAD + "#0\n0!\n#10\n1!\n" + HEAD + "#0\n0!\n#10\n", "malformed-capture"),
        (HEAD + "#0\n0!\n#10\n" + "x" * (5 << 20) + "\n#11\n", "malformed-capture"),
    ],
)
def test_each_damage_has_its_code(read: Read, text: str, code: str) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(text, "a.vcd")
    assert caught.value.code == code


def test_blocks_do_not_cut_words(read: Read, monkeypatch: pytest.MonkeyPatch) -> None:
    from benchtool.formats.vcd import body

    text = HEAD + "#0\n0!\n" + "".join(f"#{10 * i}\n{i % 2}!\n" for i in range(1, 500))
    whole = logic(read(text, "a.vcd"))
    monkeypatch.setattr(body, "_BLOCK", 7)
    assert logic(read(text, "a.vcd")).times_s.tolist() == whole.times_s.tolist()


BUS = (
    "$timescale 1us $end\n$scope module bench $end\n$var wire 4 # bus [3:0] $end\n"
    "$scope module mist $end\n$var wire 1 ! OUT $end\n$var wire 1 ! copy $end\n$upscope $end\n"
    '$scope module vent $end\n$var wire 1 " OUT $end\n$upscope $end\n'
    '$upscope $end\n$enddefinitions $end\n#0\nb0 #\n0!\n0"\n#1\nb11 #\n#2\nb101 #\n1!\n'
    '#3\nbx #\n1"\n#9\n'
)


@pytest.mark.parametrize(
    ("asked", "found"),
    [
        ("mist.OUT", "mist.OUT"),
        ("bench.mist.OUT", "mist.OUT"),
        ("bench.vent.OUT", "vent.OUT"),
        ("copy", "mist.copy"),
        ("bench.mist.copy", "mist.copy"),
        ("bus[2]", "bus[2]"),
        ("bench.bus[2]", "bus[2]"),
        ("bus", "bus"),
        ("bench.bus", "bench.bus"),
    ],
)
def test_signal_is_found_by_path_and_by_short_name(read: Read, asked: str, found: str) -> None:
    capture = read(BUS, "a.vcd", channel=asked)
    assert capture.traces[find_channel(capture, asked)].channel == found


@pytest.mark.parametrize("asked", ["OUT", "vent.copy", "bench.pump.OUT"])
def test_name_that_fits_several_signals_or_none_is_refused(read: Read, asked: str) -> None:
    with pytest.raises(UsageError):
        find_channel(read(BUS, "a.vcd", channel=asked), asked)


def test_vector_that_is_asked_for_is_a_staircase_of_its_value(read: Read) -> None:
    capture = read(BUS, "a.vcd", channel="bus")
    trace = capture.traces[find_channel(capture, "bus")]
    assert isinstance(trace, Waveform)
    values = np.concatenate(list(trace.samples.blocks()))
    assert values.tolist() == pytest.approx([0, 3, 5] + [np.nan] * 3, nan_ok=True)
    assert codes_of(capture) == ["assumed-volts"]


def test_two_signals_of_one_name_are_told_apart(read: Read) -> None:
    text = HEAD.replace("$upscope", '$var wire 1 " OUT $end\n$upscope')
    capture = read(text + '#0\n0!\n0"\n#10\n1!\n#20\n1"\n#30\n', "a.vcd")
    assert [trace.channel for trace in capture.traces] == ["OUT (1)", "OUT (2)"]


def test_ports_of_an_extended_dump_give_their_states(read: Read) -> None:
    # IEEE 1364-2005, 18.4.3: states, strength of 0, strength of 1, code
    text = (
        "$timescale 1 ns $end\n$scope module bench $end\n$var port 1 <0 OUT $end\n"
        "$var port [1:0] <1 D $end\n$upscope $end\n$enddefinitions $end\n#0\n$dumpports\n"
        "pD 6 0 <0\npLU 66 00 <1\n$end\n#5\npU 0 6 <0\npHX 66 00 <1\n#9\npD 6 0 <0\n"
        "$vcdclose #12 $end\n"
    )
    capture = read(text, "a.evcd")
    assert [trace.channel for trace in capture.traces] == ["OUT", "D[1]", "D[0]"]
    assert logic(capture).times_s == pytest.approx([5e-9, 9e-9])
    assert logic(capture).spans[0].end_s == pytest.approx(12e-9)
    assert logic(capture, 1).times_s == pytest.approx([5e-9])
    assert logic(capture, 2).spans[0].end_s == pytest.approx(5e-9)


def test_declarations_without_an_end_are_read_and_said(read: Read) -> None:
    text = HEAD.replace("$enddefinitions $end\n", "") + "#0\n0!\n#10\n1!\n#20\n"
    capture = read(text, "a.vcd")
    assert logic(capture).times_s == pytest.approx([10e-6])
    assert codes_of(capture) == ["declarations-unended"]


@pytest.mark.parametrize("start", [2**53 + 1, 2**62 + 3, 2**70 + 1])
def test_counts_beyond_the_whole_numbers_of_a_float_are_exact(read: Read, start: int) -> None:
    text = HEAD + f"#{start}\n0!\n#{start + 3}\n1!\n#{start + 10}\n0!\n#{start + 20}\n1!\n"
    assert logic(read(text, "a.vcd")).times_s == pytest.approx([3e-6, 10e-6, 20e-6], rel=1e-14)


def test_given_time_unit_overrules_the_timescale(read: Read) -> None:
    trace = logic(read(HEAD + "#0\n0!\n#10\n1!\n#20\n", "a.vcd", time_unit="ns"))
    assert trace.times_s == pytest.approx([10e-9])


def test_zeros_of_a_power_loss_behind_the_changes_are_left_out(read: Read) -> None:
    trace = logic(read(HEAD + "#0\n0!\n#10\n1!\n#20\n0!\n" + "\0" * (6 << 20), "a.vcd"))
    assert trace.times_s == pytest.approx([10e-6, 20e-6])


def test_code_that_may_have_been_meant_to_go_on_is_not_taken(read: Read) -> None:
    text = HEAD.replace("$upscope", "$var wire 1 !! two $end\n$upscope")
    capture = read(text + "#0\n0!\n0!!\n#10\n1!!\n#20\n1!", "a.vcd")
    assert logic(capture).times_s.size == 0
    assert codes_of(capture) == ["file-cut"]


def test_dump_switched_off_is_a_gap_of_a_real(read: Read) -> None:
    text = (
        "$timescale 1us $end $var real 64 ! NODE $end $enddefinitions $end\n#0\nr0 !\n#1\n"
        "r1.5 !\n#3\nr3 !\n#4\n$dumpoff $end\n#9\n$dumpon r2 ! $end\n#12\n"
    )
    trace = read(text, "a.vcd").traces[0]
    assert isinstance(trace, Waveform)
    values = np.concatenate(list(trace.samples.blocks())).tolist()
    assert values == pytest.approx([0, 1.5, 1.5, 3, np.nan, np.nan, 2, 2, 2], nan_ok=True)
