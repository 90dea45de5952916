"""How files word an interval, a rate and a unit; what contradicts; what is no statement of ours."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of, values_of
from written import MS, TIMES_S, US, VOLTS, N, S, V, comma, is_wave, lines, rows, seconds_of

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError

INDEX = [str(i) for i in range(N)]
STATEMENTS = """\
Sampling Rate [kHz],200
SampleFreq=200k
Fs: 0.2 MS/s
Acquisition Rate: 200 kS/s
Samples per second,200000
Samples/sec: 200000
sample_rate_hz=200000
Sample Rate: 0.2MHz
Sample rate: 200,000 S/s
Sample rate: 200 000 Hz
Record: 240 points at 200 kS/s
Time per sample: 5 us
Sampling Period(uS): 5
tInc = 5E-6 s
1 sample = 5 us
Abtastintervall [µs];5
Abtastrate: 200 kHz
Fréquence d'échantillonnage: 200 kHz
Période d'échantillonnage: 5 µs
Frequenza di campionamento: 200 kHz
Frecuencia de muestreo (Hz): 200000
Periodo de muestreo: 5 us
; Samplerate: 200 kHz
Max sample rate: 1 GS/s\\nSample rate: 200 kS/s
Sample rate: 200 kHz\\nDisplay rate: 10 Hz""".splitlines()


@pytest.mark.parametrize("said", STATEMENTS)
def test_a_rate_or_interval_in_these_words(read: Read, said: str) -> None:
    said = said.replace("\\n", "\n")
    capture = read(f"{said}\nIndex,OUT (V)\n" + rows(INDEX, V))
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)


@pytest.mark.parametrize(
    "said",
    [
        "Timebase: 5 us",
        "Horizontal scale: 5 us",
        "Max sample rate: 1 GS/s",
        "Refresh rate: 60 Hz",
        "Generator sample rate: 1 MHz",
        "Cal interval: 12 months",
        "Update interval: 1 s",
        "Interval: 0 to 3 ms",
        "Duration: 3 ms",
    ],
)
def test_what_is_no_rate_of_the_samples(read: Read, said: str) -> None:
    with pytest.raises(AmbiguousStructureError) as caught:
        read(f"{said}\nIndex,OUT (V)\n" + rows(INDEX, V))
    assert caught.value.code == "no-time"


def test_thousands_or_a_fraction_in_a_rate(read: Read) -> None:
    text = "Abtastrate: 200.000 Hz\nNr;U (V)\n" + rows(INDEX, comma(V), mark=";")
    with pytest.raises(AmbiguousStructureError, match="two sample intervals"):
        read(text)


def test_a_rate_before_samples_were_left_out(read: Read) -> None:
    text = "ADC clock: 2 MHz\nDecimation: 10\nIndex,OUT (V)\n" + rows(INDEX, V)
    with pytest.raises(AmbiguousStructureError, match="left out") as caught:
        read(text)
    assert "--interval" in caught.value.hint


@pytest.mark.parametrize(
    ("said", "differs"),
    [
        ("Sample interval: 10 us", True),
        ("Sample rate: 199000 Hz", True),
        ("Sample rate: 1 GS/s", True),
        ("Sample interval: 5.0 us", False),
        ("Sample rate: 200.2 kHz", False),  # within half of what is told apart
    ],
)
def test_a_stated_interval_that_contradicts_the_column(
    read: Read, said: str, differs: bool
) -> None:
    capture = read(f"{said}\nTime (us),OUT (V)\n" + rows(US, V))
    assert ("interval-differs" in codes_of(capture)) == differs
    assert np.allclose(capture.traces[0].time.dt_s, 5e-6, rtol=1e-3)  # type: ignore[union-attr]


def test_a_stated_interval_is_as_good_as_its_digits(read: Read) -> None:
    stamps = [f"{i * 100 / 3:.4f}" for i in range(N)]
    capture = read("Sample interval: 33.3 us\nTime (us),OUT (V)\n" + rows(stamps, V))
    assert codes_of(capture) == []
    assert capture.traces[0].time.dt_s == pytest.approx(1e-4 / 3, rel=1e-6)  # type: ignore[union-attr]


def test_calendar_stamps_are_held_against_a_stated_rate(read: Read) -> None:
    stamps = [f"2031-03-02T03:{12 + i // 60}:{i % 60:02d}" for i in range(N)]
    capture = read("Sample rate: 100 Hz\nTimestamp,OUT (V)\n" + rows(stamps, V))
    assert codes_of(capture) == ["interval-differs"]
    assert is_wave(capture.traces[0], np.arange(N), VOLTS)


def test_uneven_stamps_are_held_against_a_stated_rate(read: Read) -> None:
    times = np.cumsum(np.random.default_rng(3).uniform(3e-6, 7e-6, N))
    text = "Sample rate: 1 MHz\nTime (s),OUT (V)\n" + rows([f"{t:.7f}" for t in times], V)
    assert "interval-differs" in codes_of(read(text))


def test_a_time_unit_that_contradicts_the_header(read: Read) -> None:
    capture = read("Time unit: ms\nTime (us),OUT (V)\n" + rows(US, V))
    assert codes_of(capture) == ["time-unit-differs"]
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)


HEADERS = """\
TimeMS,CH1|millis,adc|millis(),analogRead(A0)|"Time,ms","CH1,V"|Time:ms,CH1:V|time.ms,out.V
Time[ms]#1,CH1|Relative time [ms],CH1|Temps (millisecondes),Tension (volts)|Čas [ms],Napětí [V]
Время (мс),Напряжение (В)|时间(毫秒),电压(伏)|Zaman (ms),Gerilim (V)|t_ms,OUT_V""".replace(
    "\n", "|"
).split("|")


@pytest.mark.parametrize("head", HEADERS)
def test_milliseconds_in_these_headers(read: Read, head: str) -> None:
    capture = read(f"{head}\n" + rows(MS, V))
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)
    assert "assumed-time-unit" not in codes_of(capture)


@pytest.mark.parametrize("head", ["micros,adc", "TimeUS,adc", "microsec,A0", "t_us,A0"])
def test_microseconds_in_these_headers(read: Read, head: str) -> None:
    assert is_wave(read(f"{head}\n" + rows(US, V)).traces[0], TIMES_S, VOLTS)


STAMPS = {
    "brackets": "[2031-03-02 03:{m:02d}:{s:02d}]",
    "name of the month": "02-Mar-2031 03:{m:02d}:{s:02d}",
    "one number": "20310302" + "03{m:02d}{s:02d}",
    "two numbers": "20310302 03{m:02d}{s:02d}",
    "short hours": "3:{m:02d}:{s:02d}",
}


@pytest.mark.parametrize("form", STAMPS.values(), ids=STAMPS.keys())
def test_calendar_stamps_in_these_forms(read: Read, form: str) -> None:
    stamps = [form.format(m=12 + i // 60, s=i % 60) for i in range(N)]
    capture = read("Timestamp,OUT (V)\n" + rows(stamps, V))
    assert is_wave(capture.traces[0], np.arange(N), VOLTS)
    assert codes_of(capture) == []


def test_milliseconds_behind_a_colon(read: Read) -> None:
    text = "Time,OUT (V)\n" + lines(lambda i: f"03:12:00:{4 * i:03d},{V[i]}")
    assert is_wave(read(text).traces[0], np.arange(N) * 4e-3, VOLTS)


def test_time_before_its_date(read: Read) -> None:
    text = "Time,Date,OUT (V)\n" + lines(
        lambda i: f"03:{12 + i // 60}:{i % 60:02d},02/03/2031,{V[i]}"
    )
    assert is_wave(read(text).traces[0], np.arange(N), VOLTS)


def test_days_as_a_spreadsheet_counts_them(read: Read) -> None:
    text = "Date,OUT (V)\n" + lines(lambda i: f"{47909.125 + i / 86400:.9f},{V[i]}")
    trace = read(text).traces[0]
    assert trace.time.dt_s == pytest.approx(1.0, rel=1e-6)  # type: ignore[union-attr]


def test_stamps_that_lose_a_digit_on_the_way(read: Read) -> None:
    """Six significant digits: microseconds below one second, ten of them above."""
    times = 0.9995 + np.arange(400) * 2.5e-6
    text = "Time (s),OUT (V)\n" + rows([f"{t:.6g}" for t in times], (V * 2)[:400])
    trace = read(text).traces[0]
    assert trace.samples.size == 400  # type: ignore[union-attr]
    span_s = 399 * trace.time.dt_s  # type: ignore[union-attr]
    assert span_s == pytest.approx(399 * 2.5e-6, abs=1e-5)  # the last digit


def test_numbers_that_name_no_unit_of_time(read: Read) -> None:
    with pytest.raises((AmbiguousStructureError, MalformedCaptureError)):
        read("Time (100ns),OUT (V)\n" + rows(INDEX, V))
    assert is_wave(read("Time (s),OUT (V)\n" + rows(S, V)).traces[0], TIMES_S, VOLTS)


def test_a_factor_in_the_header_is_asked_about(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="factor") as caught:
        read("Time x1e-6 s,OUT (V)\n" + rows(US, V))
    assert "--time-unit" in caught.value.hint
    text = "Time x1e-6 s,OUT (V)\n" + rows(US, V)
    assert is_wave(read(text, time_unit="us").traces[0], TIMES_S, VOLTS)


def test_a_fraction_with_a_comma_in_an_interval(read: Read) -> None:
    text = "Abtastintervall: 0,005 ms\nNr;U (V)\n" + rows(INDEX, comma(V), mark=";")
    assert is_wave(read(text).traces[0], TIMES_S, VOLTS)


def test_whole_numbers_without_a_unit_are_asked_about(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="whole numbers and no unit") as caught:
        read("time,OUT (V)\n" + rows(US, V))
    assert "--time-unit" in caught.value.hint


@pytest.mark.parametrize(
    "header",
    [
        "Unit: uS\nTime,OUT (V)\n",
        "Time,OUT\n(us),(V)\n\nSegment 1 of 1\n",
        "Time,OUT\n(us),(V)\n\n",
    ],
)
def test_a_unit_stands_apart_from_the_name(read: Read, header: str) -> None:
    assert is_wave(read(header + rows(US, V)).traces[0], TIMES_S, VOLTS)


def test_a_first_cell_out_of_range_hides_no_units_row(read: Read) -> None:
    capture = read("Time,OUT\n(us),(V)\n\n" + rows(US, ["∞", *V[1:]]))
    assert np.isnan(values_of(capture.traces[0])[0])
    assert seconds_of(capture.traces[0])[-1] == pytest.approx(TIMES_S[-1])
    assert "assumed-time-unit" not in {notice.code for notice in capture.warnings}


def test_nodes_are_named_as_a_circuit_simulation_names_them(read: Read) -> None:
    capture = read("time\tV(out)\tV(cap)\n" + rows(S, V, V, mark="\t"))
    assert [trace.channel for trace in capture.traces] == ["V(out)", "V(cap)"]
