"""Shapes that are more than one even record: stamps, segments, holes, logic, transitions."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of, point, times_of, values_of

from benchtool.model.capture import LogicTrace, StampedTime, UniformTime, Waveform


def volts(i: int) -> float:
    return 4.75 if (i // 7) % 2 else 0.25


def table(stamps: list[str], head: str = "time_s,OUT (V)") -> str:
    return head + "\n" + "".join(f"{t},{volts(i)}\n" for i, t in enumerate(stamps))


def test_uneven_stamps_stay_stamps(read: Read) -> None:
    rng = np.random.default_rng(1)
    times = np.round(np.cumsum(rng.uniform(0.5, 1.5, 50)), 3)
    capture = read(table([f"{t:.3f}" for t in times]))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    stamps = np.concatenate(list(trace.time.stamps.blocks()))
    assert stamps == pytest.approx(times - times[0], abs=1e-12)
    assert trace.time.resolution_s == 1e-3
    assert point(capture, "interval") == "irregular"


def test_uneven_stamps_in_another_unit_from_blocks(read: Read) -> None:
    rng = np.random.default_rng(2)
    times = np.round(np.cumsum(rng.uniform(0.5, 1.5, 50)), 3)
    capture = read(table([f"{t:.3f}" for t in times], "t/ms,OUT (V)"), limit=0)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    stamps = np.concatenate(list(trace.time.stamps.blocks(10, 20)))
    assert stamps == pytest.approx((times - times[0])[10:20] / 1e3, abs=1e-15)


def test_step_uncertainty_comes_from_the_printed_digits(read: Read) -> None:
    trace = read(table([f"{i * 0.3:.1f}" for i in range(101)])).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.time.dt_s == pytest.approx(0.3)
    assert trace.time.u_rel == pytest.approx(0.1 * np.sqrt(2 / 12) / 30.0)


def test_stated_interval_that_agrees_is_exact(read: Read) -> None:
    text = table([f"{i / 3:.2f}" for i in range(100)])
    trace = read("Sample interval: 0.33333333 s\n" + text).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.time == UniformTime(dt_s=0.33333333)


def test_stated_interval_that_contradicts_is_reported(read: Read) -> None:
    text = table([f"{i * 0.3:.1f}" for i in range(100)])
    capture = read("Sample interval: 0.2 s\n" + text)
    assert codes_of(capture) == ["interval-differs"]
    assert capture.traces[0].time.dt_s == pytest.approx(0.3)  # type: ignore[union-attr]


@pytest.mark.parametrize("truncate", [False, True])
@pytest.mark.parametrize("step_us", [0.4, 0.13, 1.2, 2.5])
def test_stamps_with_too_few_digits_get_an_even_grid(
    read: Read, step_us: float, truncate: bool
) -> None:
    shift = 0.5 if truncate else 0.0
    stamps = [f"{int(i * step_us + 0.5 - shift)}" for i in range(2000)]
    capture = read(table(stamps, "time_us,OUT (V)"))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    off_s = abs(trace.time.dt_s - step_us * 1e-6) * 1999
    assert off_s <= 1e-6  # the last digit, over the whole record
    assert trace.samples.size == 2000
    assert ("repeated-stamps" in codes_of(capture)) == (step_us < 1)


def test_repeats_on_no_even_grid_are_dropped(read: Read) -> None:
    rng = np.random.default_rng(6)
    stamps = np.floor(np.cumsum(rng.choice([0.1, 0.9], 400) * np.repeat([1, 3], 200))).astype(int)
    capture = read(table([str(t) for t in stamps], "time_us,OUT (V)"))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    assert trace.samples.size == np.unique(stamps).size
    assert "repeated-stamps" in codes_of(capture)


def test_single_repeated_stamps_are_dropped(read: Read) -> None:
    stamps = [f"{i * 0.005:.6f}" for i in range(60)]
    capture = read(table([*stamps[:20], stamps[19], *stamps[20:]]))
    assert codes_of(capture) == ["repeated-stamps"]
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.samples.size == 60
    assert len(trace.spans) == 1


@pytest.mark.parametrize("limit", [1 << 20, 0])
def test_hole_makes_two_spans(read: Read, limit: int) -> None:
    kept = [i for i in range(100) if not 40 <= i < 57]
    text = "time_s,OUT (V)\n" + "".join(f"{i * 5e-6:.6f},{i}.5\n" for i in kept)
    capture = read(text, limit=limit)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert [(s.start, s.stop) for s in trace.spans] == [(0, 40), (40, 83)]
    assert times_of(trace) == pytest.approx(np.array(kept) * 5e-6, abs=1e-15)
    assert codes_of(capture) == ["gaps"]
    assert "17 samples" in capture.warnings[0].text


@pytest.mark.parametrize("limit", [1 << 20, 0])
@pytest.mark.parametrize("start", [0.0, -0.02])
def test_restarting_segments_become_spans_end_to_end(read: Read, limit: int, start: float) -> None:
    text = "time_s,OUT (V)\n" + "".join(
        f"{start + i * 0.001:.3f},{volts(i)}\n" for _ in range(3) for i in range(50)
    )
    capture = read(text, limit=limit)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert [(s.start, s.stop) for s in trace.spans] == [(0, 50), (50, 100), (100, 150)]
    assert [s.start_s for s in trace.spans] == pytest.approx([0, 0.05, 0.1])
    assert codes_of(capture) == []


def test_segment_number_is_no_channel(read: Read) -> None:
    text = "Segment,time_s,OUT (V)\n" + "".join(
        f"{k},{i * 0.001:.3f},{volts(i)}\n" for k in range(3) for i in range(50)
    )
    assert [t.channel for t in read(text).traces] == ["OUT"]


@pytest.mark.parametrize("limit", [1 << 20, 0])
def test_single_backward_rows_are_dropped(read: Read, limit: int) -> None:
    stamps = [f"{i * 0.005:.3f}" for i in range(100)]
    stamps[30], stamps[70] = "0.020", "9.000"
    capture = read(table(stamps), limit=limit)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert "time-backwards" in codes_of(capture)
    assert "2 rows" in next(n.text for n in capture.warnings if n.code == "time-backwards")
    assert [(s.start, s.stop) for s in trace.spans] == [(0, 30), (30, 69), (69, 98)]


def test_lost_digits_do_not_hide_a_hole(read: Read) -> None:
    stamps = [f"{int(i * 0.4 + 0.5)}" for i in range(500) if not 200 <= i < 230]
    capture = read(table(stamps, "time_us,OUT (V)"))
    assert codes_of(capture) == ["repeated-stamps", "gaps"]
    lost = int(capture.warnings[1].text.split()[0])
    assert abs(lost - 30) <= 1 / 0.4  # samples in the last printed digit


def test_columns_of_zero_and_one_are_logic(read: Read) -> None:
    text = "time_us,D0,D1,NODE (V)\n" + "".join(
        f"{5 * i},{(i // 7) % 2},0,{0.1 * (i % 9):.1f}\n" for i in range(60)
    )
    capture = read(text)
    assert [(t.channel, t.unit) for t in capture.traces] == [  # type: ignore[union-attr]
        ("D0", "1"),
        ("D1", "1"),
        ("NODE", "V"),
    ]
    assert values_of(capture.traces[0]) == pytest.approx([(i // 7) % 2 for i in range(60)])
    assert codes_of(capture) == []


def test_words_for_states_are_logic(read: Read) -> None:
    text = "time_us,OUT\n" + "".join(
        f"{5 * i},{'HIGH' if (i // 7) % 2 else 'LOW'}\n" for i in range(60)
    )
    trace = read(text).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.is_logic
    assert values_of(trace) == pytest.approx([(i // 7) % 2 for i in range(60)])


def test_zero_and_one_with_a_unit_are_volts(read: Read) -> None:
    trace = read(
        "time_us,OUT (V)\n" + "".join(f"{5 * i},{(i // 7) % 2}\n" for i in range(60))
    ).traces[0]
    assert isinstance(trace, Waveform)
    assert not trace.is_logic


def test_flat_zero_alone_is_no_logic(read: Read) -> None:
    trace = read("time_us,OUT\n" + "".join(f"{5 * i},0\n" for i in range(60))).traces[0]
    assert isinstance(trace, Waveform)
    assert not trace.is_logic


def test_integer_codes_stay_codes(read: Read) -> None:
    codes = [17 + 4 * (i % 40) for i in range(80)]
    capture = read("time_us,ADC\n" + "".join(f"{5 * i},{c}\n" for i, c in enumerate(codes)))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.dtype == np.int16
    assert trace.scale.step_v == 4.0
    assert values_of(trace) == pytest.approx(codes)


def test_converter_steps_show_through_printed_volts(read: Read) -> None:
    rng = np.random.default_rng(3)
    lsb = 10 / 255
    text = "time_us,OUT (V)\n" + "".join(
        f"{5 * i},{lsb * code:.3f}\n" for i, code in enumerate(rng.integers(0, 200, 400))
    )
    trace = read(text).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.scale.step_v == pytest.approx(lsb, rel=1e-3)  # 1 mV in 200 steps


def test_printed_digit_is_the_step_where_no_other_shows(read: Read) -> None:
    rng = np.random.default_rng(4)
    text = "time_us,OUT (mV)\n" + "".join(
        f"{5 * i},{v:.1f}\n" for i, v in enumerate(rng.normal(2500, 300, 400))
    )
    trace = read(text).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.scale.step_v == pytest.approx(1e-4)


def test_two_clean_levels_are_no_code_steps(read: Read) -> None:
    trace = read(table([f"{i * 0.3:.1f}" for i in range(100)])).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.scale.step_v == pytest.approx(0.01)


EDGES = [0.0, 1.402, 2.477, 3.882, 4.955, 6.361]


def logic(read: Read, text: str, **options: object) -> LogicTrace:
    trace = read(text, **options).traces[0]
    assert isinstance(trace, LogicTrace)
    return trace


@pytest.mark.parametrize(
    ("high", "low"), [("1", "0"), ("high", "low"), ("TRUE", "FALSE"), ("5.0", "0.0"), ("H", "L")]
)
def test_transition_list(read: Read, high: str, low: str) -> None:
    text = "time_s,OUT\n" + "".join(
        f"{t:.3f},{high if i % 2 else low}\n" for i, t in enumerate(EDGES)
    )
    trace = logic(read, text)
    assert trace.times_s == pytest.approx(EDGES[1:], abs=1e-15)
    assert trace.states.tolist() == [True, False, True, False, True]
    assert (trace.spans[0].start_s, trace.spans[0].end_s) == (0.0, 6.361)
    assert not trace.spans[0].starts_high
    assert trace.tick_s == pytest.approx(1e-3)
    assert not trace.end_known


def test_transition_list_takes_its_tick_from_the_common_spacing(read: Read) -> None:
    text = "time_us,OUT\n" + "".join(f"{20 * k},{i % 2}\n" for i, k in enumerate([0, 3, 7, 12, 18]))
    assert logic(read, text).tick_s == pytest.approx(20e-6)


def test_few_transitions_do_not_share_a_tick_by_chance(read: Read) -> None:
    trace = logic(read, "time_ms,OUT\n0,0\n140,1\n420,0\n")
    assert trace.tick_s == pytest.approx(10e-3)  # 140 would be chance


def test_rising_and_falling_are_edges(read: Read) -> None:
    words = ["rising", "falling"]
    text = "time_s,edge\n" + "".join(f"{t + 0.5:.3f},{words[i % 2]}\n" for i, t in enumerate(EDGES))
    trace = logic(read, text)
    assert trace.times_s == pytest.approx(EDGES)
    assert trace.states[0]
    assert not trace.spans[0].starts_high


def test_first_row_like_the_later_ones_is_an_edge(read: Read) -> None:
    text = "time_s,OUT\n" + "".join(f"{t + 0.5:.3f},{(i + 1) % 2}\n" for i, t in enumerate(EDGES))
    capture = read(text)
    assert capture.traces[0].times_s.size == len(EDGES)  # type: ignore[union-attr]
    assert codes_of(capture) == []


def test_first_row_unlike_the_later_ones_is_the_state_found(read: Read) -> None:
    text = "time_s,OUT\n-0.300,1\n" + "".join(f"{t:.3f},{i % 2}\n" for i, t in enumerate(EDGES))
    trace = logic(read, text)
    assert trace.times_s == pytest.approx(np.array(EDGES) + 0.3)
    assert trace.spans[0].starts_high


def test_lone_first_edge_is_assumed(read: Read) -> None:
    capture = read("time_s,OUT\n0.371,1\n1.402,0\n2.478,1\n")
    assert codes_of(capture) == ["assumed-first-edge"]
    assert capture.traces[0].times_s.size == 3  # type: ignore[union-attr]


def test_repeated_last_state_is_the_end_of_the_record(read: Read) -> None:
    trace = logic(read, "time_s,OUT\n0.000,0\n1.402,1\n2.477,0\n9.999,0\n")
    assert trace.end_known
    assert trace.spans[0].end_s == pytest.approx(9.999)
    assert trace.times_s.size == 2


def test_drawn_edges_with_two_rows_each(read: Read) -> None:
    text = "time_s,OUT\n0.000,0\n1.402,0\n1.402,1\n2.477,1\n2.477,0\n3.882,0\n3.882,1\n"
    assert logic(read, text).times_s == pytest.approx([1.402, 2.477, 3.882])


def test_unknown_states_are_a_gap(read: Read) -> None:
    text = "time_s,OUT\n0.000,0\n1.402,1\n2.477,x\n3.882,0\n4.955,1\n6.361,0\n"
    trace = logic(read, text)
    assert [(s.start_s, s.end_s, s.starts_high) for s in trace.spans] == [
        (0.0, 2.477, False),
        (3.882, 6.361, False),
    ]
    assert trace.times_s == pytest.approx([1.402, 4.955, 6.361])


def test_transitions_of_several_channels(read: Read) -> None:
    text = "time_ms,D0,D1\n0,0,1\n140,1,1\n247,0,1\n301,0,0\n388,1,0\n495,0,0\n650,0,1\n"
    capture = read(text)
    d0, d1 = capture.traces
    assert isinstance(d0, LogicTrace)
    assert isinstance(d1, LogicTrace)
    assert d0.times_s == pytest.approx([0.140, 0.247, 0.388, 0.495])
    assert d1.times_s == pytest.approx([0.301, 0.650])
    assert (d0.end_known, d1.end_known) == (True, False)


def test_iso_transitions(read: Read) -> None:
    text = "at,OUT\n" + "".join(
        f"2031-03-02T03:12:{t:06.3f}Z,{i % 2}\n" for i, t in enumerate(EDGES)
    )
    capture = read(text)
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.times_s == pytest.approx(EDGES[1:], abs=1e-12) or trace.times_s == pytest.approx(
        EDGES
    )
    assert trace.tick_s == pytest.approx(1e-3)
    assert capture.origin.start_ns == 1930187520_000000000


def test_epoch_start_is_kept_to_the_nanosecond(read: Read) -> None:
    text = "epoch_s,OUT (V)\n" + "".join(
        f"1930271520.{100000 + 5 * i:06d},{volts(i)}\n" for i in range(60)
    )
    assert read(text).origin.start_ns == 1930271520_100000000


def test_pairs_of_different_length_and_rate(read: Read) -> None:
    lines = [
        f"{i * 5e-6:.6f},{volts(i)},{i * 1e-5:.5f},{0.1 * (i % 9):.1f}"
        if i < 30
        else f"{i * 5e-6:.6f},{volts(i)},,"
        for i in range(60)
    ]
    capture = read("Time A (s),OUT (V),Time B (s),NODE (V)\n" + "\n".join(lines) + "\n")
    out, node = capture.traces
    assert isinstance(out, Waveform)
    assert isinstance(node, Waveform)
    assert (out.samples.size, out.time.dt_s) == (60, pytest.approx(5e-6))  # type: ignore[union-attr]
    assert (node.samples.size, node.time.dt_s) == (30, pytest.approx(1e-5))  # type: ignore[union-attr]
    assert codes_of(capture) == []


def test_index_column_with_a_hole_keeps_time(read: Read) -> None:
    text = "Interval: 1 ms\nIndex,OUT (V)\n" + "".join(
        f"{i},{volts(i)}\n" for i in range(60) if i not in (20, 21)
    )
    capture = read(text)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert [s.start_s for s in trace.spans] == pytest.approx([0.0, 0.022])
    assert codes_of(capture) == ["gaps"]


def test_instrument_of_the_metadata_is_kept(read: Read) -> None:
    capture = read("Model: bench recorder\n" + table([f"{i * 0.3:.1f}" for i in range(20)]))
    assert capture.origin.instrument == "bench recorder"


def test_hash_is_of_the_stored_bytes(read: Read) -> None:
    import gzip
    import hashlib

    stored = gzip.compress(table([f"{i * 0.3:.1f}" for i in range(20)]).encode())
    assert read(stored, "a.csv.gz").origin.sha256 == hashlib.sha256(stored).hexdigest()
