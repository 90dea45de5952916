"""Every structure of delimited text is read back exactly, from a file with known content."""

from __future__ import annotations

import gzip
from collections.abc import Callable
from dataclasses import dataclass, field

import pytest
from read_back import Read, codes_of, point, values_of

from benchtool.model.capture import UniformTime, Waveform

N = 60
DT = 5e-6
VOLTS = [0.25 if (i // 7) % 2 else 4.75 + 0.01 * (i % 3) for i in range(N)]
OTHER = [round(0.1 * (i % 11) - 0.3, 1) for i in range(N)]


@dataclass(frozen=True)
class Case:
    """A file and what must be read from it."""

    text: str | bytes
    channels: dict[str, list[float]] = field(default_factory=lambda: {"OUT": VOLTS})
    dt: float = DT
    codes: tuple[str, ...] = ()
    points: dict[str, str] = field(default_factory=dict)
    options: dict[str, object] = field(default_factory=dict)


def rows(line: Callable[[int], str], n: int = N, *, end: str = "\n") -> str:
    return "".join(line(i) + end for i in range(n))


def us(i: int) -> str:
    return f"{i * 5e-6:.6f}"


def comma(value: float, places: int) -> str:
    return f"{value:.{places}f}".replace(".", ",")


PLAIN = "time_s,OUT [V]\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}")

CASES = {
    "comma": Case(
        PLAIN, points={"delimiter": ",", "decimal": ".", "time_unit": "s", "header": "1 row"}
    ),
    "semicolon with decimal comma": Case(
        "Zeit (ms);OUT (V)\n" + rows(lambda i: f"{comma(i * 5e-3, 3)};{comma(VOLTS[i], 2)}"),
        points={"delimiter": ";", "decimal": ",", "time_unit": "ms"},
    ),
    "semicolon with decimal point": Case(
        "Time (ms);OUT (V)\n" + rows(lambda i: f"{i * 5e-3:.3f};{VOLTS[i]:.2f}"),
        points={"delimiter": ";", "decimal": "."},
    ),
    "tab": Case(
        "t/ms\tOUT/V\n" + rows(lambda i: f"{i * 5e-3:.3f}\t{VOLTS[i]:.2f}"),
        points={"delimiter": "tab", "time_unit": "ms"},
    ),
    "tab with decimal comma": Case(
        "t/ms\tOUT/V\n" + rows(lambda i: f"{comma(i * 5e-3, 3)}\t{comma(VOLTS[i], 2)}"),
        points={"delimiter": "tab", "decimal": ","},
    ),
    "pipe": Case(
        "| Time (us) | OUT (V) |\n" + rows(lambda i: f"| {5 * i} | {VOLTS[i]:.2f} |"),
        points={"delimiter": "|", "time_unit": "us"},
    ),
    "blanks in fixed width": Case(
        "   Time (us)     OUT (V)\n" + rows(lambda i: f"{5 * i:12d}{VOLTS[i]:12.3f}"),
        points={"delimiter": "space"},
    ),
    "blanks with decimal comma": Case(
        "Time(us) OUT(V)\n" + rows(lambda i: f"{comma(5 * i, 1)} {comma(VOLTS[i], 3)}"),
        points={"delimiter": "space", "decimal": ","},
    ),
    "byte order mark": Case(b"\xef\xbb\xbf" + PLAIN.encode(), points={"encoding": "utf-8"}),
    "crlf": Case(PLAIN.replace("\n", "\r\n")),
    "lone carriage returns": Case(PLAIN.replace("\n", "\r")),
    "utf-16 little endian": Case(PLAIN.encode("utf-16"), points={"encoding": "utf-16-le"}),
    "utf-16 big endian without mark": Case(
        PLAIN.encode("utf-16-be"), points={"encoding": "utf-16-be"}
    ),
    "latin-1 micro sign": Case(
        ("Time (µs),OUT (V)\n" + rows(lambda i: f"{5 * i},{VOLTS[i]:.2f}")).encode("latin-1"),
        points={"encoding": "latin-1", "time_unit": "us"},
    ),
    "utf-8 micro sign": Case(
        "Time (μs),OUT (V)\n" + rows(lambda i: f"{5 * i},{VOLTS[i]:.2f}"),
        points={"encoding": "utf-8", "time_unit": "us"},
    ),
    "metadata before the header": Case(
        "Board,GH-MV-07\nSerial,MV7-000123\nSample Interval,5e-6,s\nCoupling,DC\n\n" + PLAIN,
        points={"interval": "5e-06 s"},
    ),
    "comment lines": Case("# misting controller\n# rate: 200 kS/s\n" + PLAIN),
    "header in a comment line": Case(
        "# board GH-MV-07\n# time_s, OUT (V)\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}")
    ),
    "comments among the rows": Case(
        PLAIN.replace("0.000100", "# valve opened\n0.000100"),
    ),
    "two header rows": Case(
        "Time,OUT\n(ms),(V)\n\n" + rows(lambda i: f"{i * 5e-3:.3f},{VOLTS[i]:.2f}"),
        points={"header": "2 rows", "time_unit": "ms"},
    ),
    "units row without brackets": Case(
        "Time,OUT\nms,V\n" + rows(lambda i: f"{i * 5e-3:.3f},{VOLTS[i]:.2f}"),
        points={"time_unit": "ms"},
    ),
    "axis names and unit words": Case(
        "x-axis,OUT\nsecond,Volt\n" + rows(lambda i: f"{i * 5e-6:.6E},{VOLTS[i]:.5E}"),
        points={"time_unit": "s"},
    ),
    "millivolts": Case("time_us,OUT (mV)\n" + rows(lambda i: f"{5 * i},{1000 * VOLTS[i]:.0f}")),
    "unit suffix in the name": Case(
        "time_us,OUT_mV\n" + rows(lambda i: f"{5 * i},{1000 * VOLTS[i]:.0f}"),
        channels={"OUT_mV": VOLTS},
    ),
    "no header": Case(
        rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}"),
        channels={"column 2": VOLTS},
        codes=("assumed-time-unit", "assumed-volts"),
        points={"header": "none"},
    ),
    "time without a unit": Case(
        "Time,OUT (V)\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}"), codes=("assumed-time-unit",)
    ),
    "time unit by option": Case(
        "Time,OUT (V)\n" + rows(lambda i: f"{5 * i},{VOLTS[i]:.2f}"),
        options={"time_unit": "us"},
    ),
    "time unit in the metadata": Case(
        "Horizontal Units,us\nTime,OUT (V)\n" + rows(lambda i: f"{5 * i},{VOLTS[i]:.2f}"),
        points={"time_unit": "us"},
    ),
    "time unit by the stated interval": Case(
        "Sample Interval: 5 us\nTime,OUT (V)\n" + rows(lambda i: f"{i * 5e-3:.3f},{VOLTS[i]:.2f}"),
        points={"time_unit": "ms"},
    ),
    "value unit in the metadata": Case(
        "Vertical Units,mV\ntime_us,OUT\n" + rows(lambda i: f"{5 * i},{1000 * VOLTS[i]:.0f}"),
    ),
    "interval in the metadata, no time column": Case(
        "Sample Interval,5e-6,s\nOUT (V)\n" + rows(lambda i: f"{VOLTS[i]:.2f}"),
        points={"time": "none", "delimiter": "none"},
    ),
    "rate in the metadata, no time column": Case(
        "Rate: 200 kS/s\nOUT (V),NODE (V)\n" + rows(lambda i: f"{VOLTS[i]:.2f},{OTHER[i]:.1f}"),
        channels={"OUT": VOLTS, "NODE": OTHER},
    ),
    "interval with a unit behind": Case(
        "Interval = 5 us\n\nOUT (V);NODE (V)\n"
        + rows(lambda i: f"{comma(VOLTS[i], 2)};{comma(OTHER[i], 1)}"),
        channels={"OUT": VOLTS, "NODE": OTHER},
    ),
    "rate in hertz in brackets": Case(
        "Sampling Rate [kHz];200\nOUT (V);NODE (V)\n"
        + rows(lambda i: f"{comma(VOLTS[i], 2)};{comma(OTHER[i], 1)}"),
        channels={"OUT": VOLTS, "NODE": OTHER},
    ),
    "interval without a unit": Case(
        "dt=5e-06\nOUT (V)\n" + rows(lambda i: f"{VOLTS[i]:.2f}"), codes=("assumed-time-unit",)
    ),
    "interval by option": Case(
        "OUT (V)\n" + rows(lambda i: f"{VOLTS[i]:.2f}"), options={"interval_s": 5e-6}
    ),
    "single column with decimal comma": Case(
        "Abtastintervall: 5 us\nOUT (V)\n" + rows(lambda i: comma(VOLTS[i], 2)),
        options={"delimiter": "none"},
        points={"decimal": ","},
    ),
    "start and increment columns": Case(
        "X,OUT,Start,Increment\nSequence,Volt,-1.0e-4,5.0e-6\n"
        + rows(lambda i: f"{i},{VOLTS[i]:.2f},,"),
        codes=("assumed-time-unit",),
    ),
    "start and increment beyond the columns of the data": Case(
        "X,OUT,Start,Increment,\nSequence,Volt,-1.0e-4,5.0e-6,\n"
        + rows(lambda i: f"{i},{VOLTS[i]:.2f},"),
        channels={"column 2": VOLTS},
        codes=("assumed-time-unit", "assumed-volts"),
    ),
    "increment repeated in every row": Case(
        "Increment (us);OUT (V)\n" + rows(lambda i: f"5,0;{comma(VOLTS[i], 2)}"),
    ),
    "index column and an interval": Case(
        "Sample interval: 5 us\nIndex,OUT (V)\n" + rows(lambda i: f"{i},{VOLTS[i]:.2f}"),
    ),
    "index column beside time": Case(
        "No.,Time (us),OUT (V)\n" + rows(lambda i: f"{i + 1},{5 * i},{VOLTS[i]:.2f}"),
        points={"time": "Time"},
    ),
    "metadata beside the data": Case(
        "Record Length,60,Points,0.000000,4.75\nSample Interval,5e-6,s,0.000005,4.76\n"
        "Model,bench 1,,0.000010,4.77\n"
        + "".join(f",,,{us(i)},{VOLTS[i]:.2f}\n" for i in range(3, N)),
        channels={"column 5": VOLTS},
        codes=("assumed-volts",),
        points={"time_unit": "s"},
    ),
    "trailing delimiter": Case(
        "time_s,OUT (V),\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},"),
    ),
    "trailing delimiter without one in the header": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},"),
    ),
    "quoted numbers": Case(
        '"time_s","OUT (V)"\n' + rows(lambda i: f'"{us(i)}","{VOLTS[i]:.2f}"'),
    ),
    "quoted decimal commas between commas": Case(
        '"time_s","OUT (V)"\n' + rows(lambda i: f'"{comma(i * 5e-6, 6)}","{comma(VOLTS[i], 2)}"'),
        points={"delimiter": ",", "decimal": ","},
    ),
    "quoted thousands": Case(
        "time_us,OUT (mV)\n" + rows(lambda i: f'{5 * i},"{1000 * VOLTS[i]:,.1f}"'),
    ),
    "decimal comma between commas by options": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{comma(i * 5e-6, 6)},{comma(VOLTS[i], 2)}"),
        options={"delimiter": ",", "decimal": ","},
    ),
    "engineering exponents": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{5.0 * i:.3f}E-06,{1000 * VOLTS[i]:.1f}E-03"),
    ),
    "exponents of another language": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{5.0 * i:.3f}D-06,{1000 * VOLTS[i]:.1f}D-03"),
    ),
    "footer": Case(PLAIN + "\nEnd of data\nChecksum: 1f3a\n", points={"footer": "2 lines"}),
    "blank lines at the end": Case(PLAIN + "\n\n\n"),
    "blank lines between the rows": Case(PLAIN.replace("\n", "\n\n")),
    "no line end at the end": Case(PLAIN.rstrip("\n")),
    "delimiter stated in the first line": Case(
        "sep=;\ntime_s;OUT (V)\n" + rows(lambda i: f"{us(i)};{VOLTS[i]:.2f}"),
    ),
    "iso stamps": Case(
        "Timestamp,OUT (V)\n"
        + rows(lambda i: f"2031-03-02T03:12:00.{100000 + 5 * i:06d},{VOLTS[i]:.2f}"),
    ),
    "iso stamps with a zone and a blank": Case(
        "Timestamp;OUT (V)\n"
        + rows(lambda i: f"2031-03-02 03:12:00,{100000 + 5 * i:06d}Z;{comma(VOLTS[i], 2)}"),
    ),
    "date and time of day apart": Case(
        "Date,Time,OUT (V)\n"
        + rows(lambda i: f"02/03/2031,03:12:00.{100000 + 5 * i:06d},{VOLTS[i]:.2f}"),
    ),
    "time of day past midnight": Case(
        "Time,OUT (V)\n"
        + rows(
            lambda i: (
                f"23:59:59.{1000000 - 100 + 5 * i:06d},{VOLTS[i]:.2f}"
                if i < 20
                else f"00:00:00.{5 * i - 100:06d},{VOLTS[i]:.2f}"
            )
        ),
    ),
    "epoch seconds": Case(
        "epoch_s,OUT (V)\n" + rows(lambda i: f"1930271520.{100000 + 5 * i:06d},{VOLTS[i]:.2f}"),
    ),
    "epoch microseconds by magnitude": Case(
        "timestamp,OUT (V)\n" + rows(lambda i: f"{1930271520100000 + 5 * i},{VOLTS[i]:.2f}"),
        points={"time_unit": "us"},
    ),
    "epoch nanoseconds": Case(
        "timestamp_ns,OUT (V)\n"
        + rows(lambda i: f"{1930271520100000000 + 5000 * i},{VOLTS[i]:.2f}"),
    ),
    "time that begins before zero": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{(i - 20) * 5e-6:.6f},{VOLTS[i]:.2f}"),
    ),
    "two channels": Case(
        "time_s,OUT (V),NODE (V)\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},{OTHER[i]:.1f}"),
        channels={"OUT": VOLTS, "NODE": OTHER},
    ),
    "pairs of columns": Case(
        "Time A (s),OUT (V),Time B (s),NODE (V)\n"
        + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},{us(i)},{OTHER[i]:.1f}"),
        channels={"OUT": VOLTS, "NODE": OTHER},
    ),
    "pairs of columns without a header": Case(
        rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},{us(i)},{OTHER[i]:.1f}"),
        channels={"column 2": VOLTS, "column 4": OTHER},
        codes=("assumed-time-unit", "assumed-volts"),
    ),
    "control characters in a name": Case(
        "time_s,\x1b[31mOUT\x07 (V)\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}"),
        channels={"[31mOUT": VOLTS},
    ),
    "true minus signs": Case(
        "time_s,NODE (V)\n" + rows(lambda i: f"{us(i)},{OTHER[i]:.1f}".replace("-", "\u2212")),
        channels={"NODE": OTHER},
    ),
    "increment under the header": Case(
        "OUT,Start,Increment\nV,0,5e-6\n" + rows(lambda i: f"{VOLTS[i]:.2f},,"),
        codes=("assumed-time-unit",),
    ),
    "group names over equal names": Case(
        "Channel A,,Channel B,\nTime (s),Volt (V),Time (s),Volt (V)\n"
        + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f},{us(i)},{OTHER[i]:.1f}"),
        channels={"Channel A Volt": VOLTS, "Channel B Volt": OTHER},
    ),
    "title between header and rows": Case(
        "time_s,OUT (V)\nSegment 1\n" + rows(lambda i: f"{us(i)},{VOLTS[i]:.2f}")
    ),
    "label column": Case(
        "Label,Time,OUT\nUnits,s,V\n" + rows(lambda i: f",{us(i)},{VOLTS[i]:.2f}")
    ),
    "interval as time a sample": Case(
        "Timebase,5,us/sample\nOUT (V)\n" + rows(lambda i: f"{VOLTS[i]:.2f}")
    ),
    "all metadata in one line": Case(
        "Sample rate: 200000 Hz, Channels: 1, Bits: 12\nOUT (V)\n"
        + rows(lambda i: f"{VOLTS[i]:.2f}")
    ),
    "unnamed counter beside time": Case(
        ",time_s,OUT (V)\n" + rows(lambda i: f"{i},{us(i)},{VOLTS[i]:.2f}")
    ),
    "thousands parted by blanks": Case(
        "t/us;OUT/mV\n"
        + rows(
            lambda i: f"{5 * i};" + f"{1000 * VOLTS[i]:,.1f}".replace(",", " ").replace(".", ",")
        )
    ),
    "thousands parted by points": Case(
        "t/us;OUT/mV\n"
        + rows(
            lambda i: f"{5 * i};" + f"{1000 * VOLTS[i]:_.1f}".replace(".", ",").replace("_", ".")
        )
    ),
    "time in units of samples": Case(
        "Rate: 200 kS/s\nTime (samples),OUT (V)\n" + rows(lambda i: f"{i},{VOLTS[i]:.2f}")
    ),
    "value before time": Case("OUT (V),Time (us)\n" + rows(lambda i: f"{VOLTS[i]:.2f},{5 * i}")),
    "floats in full length": Case(
        "time_s,OUT (V)\n" + rows(lambda i: f"{i * 5e-6!r},{VOLTS[i]!r}")
    ),
    "stamps of the basic format": Case(
        "at,OUT (V)\n" + rows(lambda i: f"20310302T0312{i:02d}Z,{VOLTS[i]:.2f}"), dt=1.0
    ),
    "stamps with an offset": Case(
        "at,OUT (V)\n" + rows(lambda i: f"2031-03-02T03:12:{i:02d}.250+01:00,{VOLTS[i]:.2f}"),
        dt=1.0,
    ),
    "stamps of the afternoon": Case(
        "at,OUT (V)\n" + rows(lambda i: f"3/2/2031 3:12:{i:02d} PM,{VOLTS[i]:.2f}"), dt=1.0
    ),
    "minutes and seconds": Case(
        "time,OUT (V)\n" + rows(lambda i: f"03:{i * 0.05:06.3f},{VOLTS[i]:.2f}"), dt=0.05
    ),
    "minutes": Case(
        "Time (min),OUT (V)\n" + rows(lambda i: f"{i * 0.5:.1f},{VOLTS[i]:.2f}"), dt=30.0
    ),
    "gz": Case(gzip.compress(PLAIN.encode()), points={"compression": "gz"}),
    "gz in two members": Case(
        gzip.compress(PLAIN[:300].encode()) + gzip.compress(PLAIN[300:].encode())
    ),
}


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "in blocks"])
@pytest.mark.parametrize("case", CASES.values(), ids=CASES.keys())
def test_structure_is_read_back_exactly(read: Read, case: Case, limit: int) -> None:
    name = "capture.csv.gz" if case.text[:2] == b"\x1f\x8b" else "capture.csv"
    capture = read(case.text, name, limit=limit, **case.options)
    assert [trace.channel for trace in capture.traces] == list(case.channels)
    for trace, values in zip(capture.traces, case.channels.values(), strict=True):
        assert isinstance(trace, Waveform)
        assert isinstance(trace.time, UniformTime)
        assert values_of(trace) == pytest.approx(values, abs=1e-12)  # arithmetic of the gain
        assert trace.time.dt_s == pytest.approx(case.dt, rel=1e-9)  # of nine digits kept
        assert len(trace.spans) == 1
        assert trace.unit == "V"
    assert codes_of(capture) == list(case.codes)
    for key, value in case.points.items():
        assert point(capture, key) == value
    assert all(p.evidence for p in capture.structure)
