"""Every form of scaling, of numbers and of sample types, against figures worked out by hand."""

from __future__ import annotations

import struct

import numpy as np
import pytest
from scripted import ScriptedLink, points, record, volts

from benchtool.errors import ReplyError
from benchtool.model.capture import StampedTime, UniformTime, Waveform
from benchtool_drivers.dialect.vocabulary import X_FORMS, Y_FORMS
from benchtool_drivers.digitiser.numerals import read_number

CODES = bytes([10, 20, 30, 40])

Y_CASES = {
    "ref-inc-origin": ("inc = 0.5, ref = 8, origin = 1", [2.0, 7.0, 12.0, 17.0]),
    "ref-inc-minus-origin": ("inc = 0.5, ref = 8, origin = 1", [0.0, 5.0, 10.0, 15.0]),
    "origin-ref-inc": ("inc = 0.5, ref = 8, origin = 1", [0.5, 5.5, 10.5, 15.5]),
    "gain-plus-offset": ("gain = 0.1, offset = 2", [3.0, 4.0, 5.0, 6.0]),
    "gain-minus-offset": ("gain = 0.1, offset = 2", [-1.0, 0.0, 1.0, 2.0]),
    "offset-gain": ("gain = 0.1, offset = 2", [1.2, 2.2, 3.2, 4.2]),
    "division-plus-offset": (
        "scale = 2, codes_per_division = 10, ref = 10, offset = 1",
        [1.0, 3.0, 5.0, 7.0],
    ),
    "division-minus-offset": (
        "scale = 2, codes_per_division = 10, ref = 10, offset = 1",
        [-1.0, 1.0, 3.0, 5.0],
    ),
    "division-position": (
        "scale = 2, codes_per_division = 10, ref = 10, position = -1.5, offset = 0.5",
        [3.5, 5.5, 7.5, 9.5],
    ),
    "bottom-top": (
        "bottom = -1, top = 1, low_code = 10, high_code = 40",
        [-1.0, -1 / 3, 1 / 3, 1.0],
    ),
}


def tables(constant: str, *, y: str = "none", x: str = "index-dt", more: str = "") -> str:
    return f"""
[preamble]
kind = "constant"
constant = {{ points = 4, {constant} }}
[data]
query = "DATA?"
dtype = "u1"
{more}
[scale]
y = "{y}"
x = "{x}"
"""


@pytest.mark.parametrize("form", [form for form in Y_FORMS if form != "none"])
def test_each_form_of_volts_gives_what_its_formula_says(form: str) -> None:
    constant, expected = Y_CASES[form]
    capture = record(tables(f"dt = 1, {constant}", y=form), ScriptedLink({"DATA?": CODES}))
    # two sums and a product of doubles: 1e-12
    np.testing.assert_allclose(volts(capture), expected, rtol=1e-12, atol=1e-12)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.dtype == np.uint8
    assert trace.scale.step_v == pytest.approx(abs(trace.scale.gain))


X_CASES = {
    "index-dt": ("dt = 0.001, t0 = -0.002", 0.001, -0.002),
    "index-rate": ("rate = 500, t0 = 1", 0.002, 1.0),
    "xref-dt-xorigin": ("dt = 0.001, xref = 2, xorigin = 0.5", 0.001, 0.498),
    "centred": ("dt = 0.001, delay = 0.1", 0.001, 0.098),
    "span": ("span = 0.02, t0 = 0", 0.005, 0.0),
    "divisions": ("time_scale = 0.01, divisions = 10, delay = 0.2", 0.025, 0.15),
}


@pytest.mark.parametrize("form", [form for form in X_FORMS if form != "pairs"])
def test_each_form_of_seconds_gives_interval_and_first_sample(form: str) -> None:
    constant, dt_s, start_s = X_CASES[form]
    capture = record(tables(constant, x=form), ScriptedLink({"DATA?": CODES}))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.time.dt_s == pytest.approx(dt_s, rel=1e-12)
    assert float(points(capture)["first sample"].split()[0]) == pytest.approx(start_s, rel=1e-9)


@pytest.mark.parametrize(("unit", "factor"), [("ns", 1e-9), ("us", 1e-6), ("ms", 1e-3), ("s", 1.0)])
def test_a_field_in_another_unit_comes_out_in_seconds(unit: str, factor: float) -> None:
    text = tables("dt = 4").replace(
        "points = 4, dt = 4 }", f'points = 4, dt = 4 }}\nunits.dt = "{unit}"'
    )
    trace = record(text, ScriptedLink({"DATA?": CODES})).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.time.dt_s == pytest.approx(4 * factor, rel=1e-12)


def test_a_probe_that_the_figures_leave_out_multiplies_volts_and_offset() -> None:
    constant = "dt = 1, gain = 0.1, offset = 2, probe = 10"
    text = tables(constant, y="gain-plus-offset") + 'probe = "apart"\n'
    np.testing.assert_allclose(
        volts(record(text, ScriptedLink({"DATA?": CODES}))), [30, 40, 50, 60]
    )
    text = tables(constant, y="gain-plus-offset")
    np.testing.assert_allclose(volts(record(text, ScriptedLink({"DATA?": CODES}))), [3, 4, 5, 6])


def test_millivolts_come_out_in_volts() -> None:
    text = tables("dt = 1, gain = 2", y="gain-plus-offset") + 'y_unit = "mV"\n'
    capture = record(text, ScriptedLink({"DATA?": CODES}))
    np.testing.assert_allclose(volts(capture), [0.02, 0.04, 0.06, 0.08], rtol=1e-12)


@pytest.mark.parametrize("dtype", ["u1", "i1", "u2", "i2", "u4", "i4", "f4", "f8"])
@pytest.mark.parametrize("order", ["big", "little"])
def test_every_type_of_sample_is_read_in_both_byte_orders(dtype: str, order: str) -> None:
    values = [0, 1, 100, 127] if dtype[0] == "u" else [-100, -1, 0, 127]
    code = {"u1": "B", "i1": "b", "u2": "H", "i2": "h", "u4": "I", "i4": "i", "f4": "f", "f8": "d"}
    data = struct.pack(f"{'>' if order == 'big' else '<'}4{code[dtype]}", *values)
    text = tables("dt = 1", more=f'order = "{order}"').replace('"u1"', f'"{dtype}"')
    capture = record(text, ScriptedLink({"DATA?": data}))
    assert volts(capture).tolist() == values
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.dtype.str[1:] == dtype
    assert trace.samples.dtype.isnative


def test_left_justified_codes_are_shifted_before_scaling() -> None:
    data = struct.pack(">4H", 0x0010, 0x0FF0, 0x7FF0, 0xFFF0)
    text = tables("dt = 1", more='shift = 4\norder = "big"').replace('"u1"', '"u2"')
    assert volts(record(text, ScriptedLink({"DATA?": data}))).tolist() == [1, 255, 2047, 4095]


def test_unused_low_bits_make_the_step_larger() -> None:
    text = tables("dt = 1, gain = 0.001", y="gain-plus-offset", more="code_step = 16")
    trace = record(text, ScriptedLink({"DATA?": CODES})).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.scale.step_v == pytest.approx(0.016)


def test_pairs_of_time_and_volts_are_an_even_time_where_they_are_even() -> None:
    text = tables("", x="pairs", more="pairs = true").replace("points = 4, ", "points = 4")
    text = text.replace('"u1"', '"f8"')
    even = struct.pack(">8d", 0.5, 1, 0.75, 2, 1.0, 3, 1.25, 4)
    trace = record(text, ScriptedLink({"DATA?": even})).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.time == UniformTime(dt_s=0.25)
    uneven = struct.pack(">8d", 0.5, 1, 0.75, 2, 1.1, 3, 1.25, 4)
    trace = record(text, ScriptedLink({"DATA?": uneven})).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    stamps = np.concatenate(list(trace.time.stamps.blocks()))
    np.testing.assert_allclose(stamps, [0, 0.25, 0.6, 0.75], rtol=1e-12)
    falling = struct.pack(">8d", 0.5, 1, 0.4, 2, 1.1, 3, 1.25, 4)
    with pytest.raises(ReplyError, match="do not rise"):
        record(text, ScriptedLink({"DATA?": falling}))


def test_logic_bits_become_traces_of_their_own() -> None:
    text = tables("dt = 1", more="bits = { D0 = 0, D4 = 4 }")
    capture = record(text, ScriptedLink({"DATA?": bytes([0x00, 0x01, 0x10, 0x11])}))
    assert [trace.channel for trace in capture.traces] == ["D0", "D4"]
    assert [volts(capture, n).tolist() for n in (0, 1)] == [[0, 1, 0, 1], [0, 0, 1, 1]]
    assert all(isinstance(trace, Waveform) and trace.is_logic for trace in capture.traces)


def test_channels_in_turn_are_taken_apart() -> None:
    text = "interleaved = true\n" + tables("dt = 1")
    capture = record(text, ScriptedLink({"DATA?": bytes([1, 9, 2, 8, 3, 7, 4, 6])}))
    assert [trace.channel for trace in capture.traces] == ["CH1", "CH2"]
    assert [volts(capture, n).tolist() for n in (0, 1)] == [[1, 2, 3, 4], [9, 8, 7, 6]]


def test_the_ends_of_an_envelope_give_their_middle_and_a_notice() -> None:
    text = tables("dt = 1", more='envelope = "pairs"')
    capture = record(text, ScriptedLink({"DATA?": bytes([10, 20, 30, 41])}))
    assert volts(capture).tolist() == [15.0, 35.5]
    assert [notice.code for notice in capture.warnings] == ["envelope"]


def test_an_envelope_that_a_dialect_refuses_is_refused() -> None:
    more = 'envelope = { from = "type", map = { PEAK = "refuse", NORM = "none" } }'
    text = tables('dt = 1, type = "PEAK"', more=more)
    with pytest.raises(ReplyError) as caught:
        record(text, ScriptedLink({"DATA?": CODES}))
    assert caught.value.code == "envelope-refused"
    text = tables('dt = 1, type = "NORM"', more=more)
    assert volts(record(text, ScriptedLink({"DATA?": CODES}))).tolist() == [10, 20, 30, 40]


def test_codes_that_mean_no_sample_are_a_gap() -> None:
    text = tables("dt = 1", more="missing_codes = [20, 255]")
    capture = record(text, ScriptedLink({"DATA?": CODES}))
    np.testing.assert_array_equal(volts(capture), [10, np.nan, 30, 40])
    assert [notice.code for notice in capture.warnings] == ["invalid-samples"]
    assert "1 of 4" in capture.warnings[0].text


@pytest.mark.parametrize("mark", [9.91e37, 9.9e37, -9.9e37, float("nan"), float("inf")])
def test_marks_for_no_reading_are_a_gap_and_never_volts(mark: float) -> None:
    text = tables("dt = 1").replace('"u1"', '"f4"')
    capture = record(text, ScriptedLink({"DATA?": struct.pack(">4f", 1, mark, 2, 3)}))
    np.testing.assert_array_equal(volts(capture), [1, np.nan, 2, 3])
    with pytest.raises(ReplyError) as caught:
        record(text, ScriptedLink({"DATA?": struct.pack(">4f", *[mark] * 4)}))
    assert caught.value.code == "no-valid-samples"


@pytest.mark.parametrize(
    ("text", "value"),
    [
        *(("12", 12.0), ("+12", 12.0), ("-1.5", -1.5), (".5", 0.5), ("1.", 1.0)),
        *(("1.5E-3", 1.5e-3), ("1.5 E +03", 1500.0), ("#HFF", 255.0), ("#q17", 15.0)),
        *(("#B101", 5.0), ('"1.5"', 1.5), ("500us", 500e-6), ("2.5 mV", 2.5e-3)),
        *(("20 kpts", 2e4), ("20k", 2e4), ("5M", 5e6), ("50\N{MICRO SIGN}s", 50e-6)),
        *(("5MV", 5e-3), ("5MS", 5e-3), ("5mV", 5e-3), ("1 MHZ", 1e6), ("2 V/div", 2.0)),
        *(("1.25 MSa/s", 1.25e6), ("10 Mpts", 1e7)),
        *(("1 GHz", 1e9), ("100kSa/s", 1e5), ("10 V", 10.0), ("9.91E37", 9.91e37)),
    ],
)
def test_numbers_are_read_as_instruments_print_them(text: str, value: float) -> None:
    assert read_number(text) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("text", ["", "x", "1,5", "1.5.2", "#HXY", "1 2", "--1", "5 volts"])
def test_what_is_no_number_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match="is no number"):
        read_number(text)


@pytest.mark.parametrize("text", ["20m", "10 mpts"])
def test_a_prefix_that_could_be_milli_or_mega_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match="milli or mega"):
        read_number(text)


def test_a_unit_is_not_applied_twice() -> None:
    units = tables('dt = "50us"').replace("[data]", 'units = { dt = "ns" }\n[data]')
    with pytest.raises(ReplyError, match="a unit of its own"):
        record(units, ScriptedLink({"DATA?": CODES}))


def test_a_decimal_comma_is_read_where_the_dialect_says_so() -> None:
    assert read_number("1,5E-3", ",") == pytest.approx(1.5e-3)


@pytest.mark.parametrize(
    ("constant", "form"),
    [
        ("dt = 0", "index-dt"),
        ("dt = -1", "index-dt"),
        ("dt = 9.91e37", "index-dt"),
        ('dt = "soon"', "index-dt"),
        ("rate = 0", "index-rate"),
    ],
)
def test_an_interval_that_cannot_be_is_refused(constant: str, form: str) -> None:
    with pytest.raises(ReplyError):
        record(tables(constant, x=form), ScriptedLink({"DATA?": CODES}))


def test_a_gain_of_zero_is_refused() -> None:
    text = tables("dt = 1, gain = 0", y="gain-plus-offset")
    with pytest.raises(ReplyError) as caught:
        record(text, ScriptedLink({"DATA?": CODES}))
    assert caught.value.code == "bad-preamble"


def test_an_interval_that_fills_its_digits_is_uncertain_in_the_last() -> None:
    trace = record(tables('dt = "3.33333E-7"'), ScriptedLink({"DATA?": CODES})).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.time.u_rel == pytest.approx(0.5e-5 / 3.33333 / 3**0.5)
    trace = record(tables('dt = "2.500000000E-7"'), ScriptedLink({"DATA?": CODES})).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    assert trace.time.u_rel == 0.0
