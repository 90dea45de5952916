"""Damaged text: what is whole is read right, what is not is counted, and nothing is guessed."""

from __future__ import annotations

import gzip
import random
from pathlib import Path

import pytest
from damage import DT_S, HEAD, ROWS, WHOLE, N, at_row, measured, row, table, volts

from benchtool.formats import read_capture
from benchtool.formats.text import walking
from benchtool.model.capture import Waveform
from benchtool.timing import roles

Capsys = pytest.CaptureFixture[str]

FIRST, SECOND = ROWS[:300], ROWS[300:]
MIXED_ENDS = b"".join(
    line + (b"\n", b"\r\n", b"\r", b"\r\r\n")[i % 4]
    for i, line in enumerate(WHOLE.split(b"\n")[:-1])
)
LATE_ENDS = table(FIRST, end="\r\n") + "".join(f"{line}\r" for line in SECOND).encode()
TAIL = "".join(f"{line}\n" for line in SECOND).encode()


def european(rows: list[str]) -> list[str]:
    return [line.replace(",", ";").replace(".", ",") for line in rows]


def semicolons(rows: list[str]) -> list[str]:
    return [line.replace(",", ";") for line in rows]


READ: dict[str, tuple[bytes, int, list[str]]] = {
    "undamaged": (WHOLE, N, []),
    "NUL tail": (WHOLE + bytes(4096), N, ["file-cut: the file ends in 4096 zero bytes"]),
    "NUL tail of megabytes": (WHOLE + bytes(5 << 20), N, ["5242880 zero bytes"]),
    "NUL tail in mid-line": (
        WHOLE[:-4] + bytes(99),
        599,
        ["99 zero bytes", "file-cut: the file ends inside"],
    ),
    "NULs between": (
        table(FIRST) + bytes(512) + TAIL,
        599,
        ["rows-skipped: 1 row(s)", "line 302", "gaps"],
    ),
    "two exports": (table(FIRST) + table(FIRST), 600, ["gaps: the record has 1 gaps"]),
    "two exports, no header": (
        "".join(f"{r}\n" for r in FIRST).encode() * 2,
        600,
        ["gaps: the record has 1 gaps"],
    ),
    "two exports, other time unit": (
        table(FIRST) + table(FIRST, "Time (ms),OUT (V)"),
        300,
        ["other-table: from line 302"],
    ),
    "two exports, other volts": (
        table(FIRST)
        + table([f"{k * DT_S},{volts(k) * 1e3}" for k in range(300)], "Time (s),OUT (mV)"),
        300,
        ["other-table: from line 302"],
    ),
    "two exports, other order": (
        table(FIRST) + table([f"{volts(k)},{k * DT_S}" for k in range(300)], "OUT (V),Time (s)"),
        300,
        ["other-table: from line 302"],
    ),
    "two exports, one more column": (
        table(FIRST) + table([f"{r},1.0" for r in FIRST], "Time (s),OUT (V),NODE (V)"),
        300,
        ["other-table: from line 302"],
    ),
    "columns come and go": (
        table([r + ",7" * (i % 40 == 39) for i, r in enumerate(ROWS)]),
        585,
        ["rows-skipped: 15 row(s)", "line 41"],
    ),
    "mixed line ends": (MIXED_ENDS, N, []),
    "line ends change after the head": (LATE_ENDS, N, []),
    "CR alone": (table(ROWS, end="\r"), N, []),
    "CR CR LF": (table(ROWS, end="\r\r\n"), N, []),
    "LF CR": (table(ROWS, end="\n\r"), N, []),
    "decimal mark changes at the end": (
        table([*semicolons(ROWS[:590]), *european(ROWS[590:])], HEAD.replace(",", ";")),
        590,
        ["rows-skipped: 10 row(s)", "line 592"],
    ),
    "line of a million letters": (
        table(FIRST) + b"x" * 1_000_000 + b"\n" + TAIL,
        N,
        ["rows-skipped: 1 row(s)", "line 302"],
    ),
    "line of a million digits": (
        table(FIRST) + b"1" * 1_000_000 + b"x\n" + TAIL,
        N,
        ["rows-skipped: 1 row(s)", "line 302"],
    ),
    "line of a million delimiters": (
        table(FIRST) + b"," * 1_000_000 + b"\n" + TAIL,
        N,
        ["rows-skipped: 1 row(s)", "line 302"],
    ),
    "line of a million quotes": (
        table(FIRST) + b'"' * 1_000_001 + b"\n" + TAIL,
        N,
        ["rows-skipped: 1 row(s)", "line 302"],
    ),
    "first line of a million letters": (b"x" * 1_000_000 + b"\n" + WHOLE, N, []),
    "first line of a million delimiters": (b"," * 1_000_000 + b"\n" + WHOLE, N, []),
    "gz of two members": (gzip.compress(table(FIRST)) + gzip.compress(TAIL), N, []),
    "one huge value": (
        table(at_row(100, "50.0,1e308")),
        N,
        ["values-missing: 1 cells", "line 102"],
    ),
    "one overflow mark": (
        table(at_row(100, "50.0,9.9E37")),
        N,
        ["values-missing: 1 cells", "line 102"],
    ),
    "one value of 400 digits": (
        table(at_row(100, "50.0," + "9" * 400)),
        N,
        ["values-missing: 1 cells", "line 102"],
    ),
    "one time of 400 digits": (
        table(at_row(100, "9" * 400 + ",12.0")),
        599,
        ["gaps: 1 samples", "line 102"],
    ),
    "one huge time": (table(at_row(100, "1e308,12.0")), 599, ["gaps: 1 samples", "line 102"]),
    "one infinite value": (
        table(at_row(100, "50.0,inf")),
        N,
        ["values-missing: 1 cells", "line 102"],
    ),
    "one infinite time": (table(at_row(100, "inf,12.0")), 599, ["gaps: 1 samples", "line 102"]),
    "one NaN time": (table(at_row(100, "nan,12.0")), 599, ["gaps: 1 samples", "line 102"]),
    "subnormal lows": (table([r.replace(",0.00", ",5e-324") for r in ROWS]), N, []),
    "some NaN and words": (
        table(
            [
                r.split(",")[0] + (",NaN", ",bad")[i % 2] if i % 60 == 5 else r
                for i, r in enumerate(ROWS)
            ]
        ),
        N,
        ["values-missing: 10 cells", "line 7", "missing-samples: 10 of 600"],
    ),
    "UTF-16 with its mark": (WHOLE.decode().encode("utf-16"), N, []),
    "UTF-16 LE without": (WHOLE.decode().encode("utf-16-le"), N, []),
    "UTF-16 BE without": (WHOLE.decode().encode("utf-16-be"), N, []),
    "UTF-16 of an odd length": (WHOLE.decode().encode("utf-16") + b"\n", N, []),
    "UTF-32": (WHOLE.decode().encode("utf-32"), N, []),
    "Latin-1": (table(ROWS, "Zeit (s),Über\u00b5 (V)").decode().encode("latin-1"), N, []),
    "overlong UTF-8 in the header": (WHOLE.replace(b"OUT", b"O\xc0\x80UT"), N, []),
    "overlong UTF-8 in a number": (
        WHOLE.replace(b"\n50.0", b"\n\xc0\xb5\xc0\xb00.0"),
        599,
        ["line 102", "gaps"],
    ),
    "mark of UTF-8 between": (table(FIRST) + b"\xef\xbb\xbf" + TAIL, 599, ["line 302", "gaps"]),
    "two marked exports": (b"\xef\xbb\xbf" + table(FIRST) + b"\xef\xbb\xbf" + table(SECOND), N, []),
    "each time twice for lack of digits": (
        table([f"{k // 2},{volts(k)}" for k in range(N)]),
        N,
        ["repeated-stamps: 300 rows", "even grid"],
    ),
    "each row twice": (
        table([f"{k // 2}.0,{volts(2 * (k // 2))}" for k in range(N)]),
        300,
        ["envelope: each of 300 time stamps has two samples"],
    ),
    "one step backwards": (table([*FIRST, ROWS[100], *SECOND]), N, ["time-backwards: 1 rows"]),
    "ragged rows": (
        table([r.split(",")[0] if i % 150 == 149 else r for i, r in enumerate(ROWS)]),
        596,
        ["gaps: 3 samples", "rows-skipped: 4 row(s)", "line 151"],
    ),
    "cut in a number": (WHOLE[:-4], 599, ["file-cut: the file ends inside a row ('299.5,12')"]),
    "cut in a time": (WHOLE[:-9], 599, ["file-cut"]),
    "cut behind a delimiter": (WHOLE[:-6], 599, ["file-cut"]),
    "a quote never closed": (table(at_row(100, '50.0,"12.00')), N, []),
}


@pytest.mark.parametrize("name", READ)
def test_what_is_whole_is_measured_right_and_the_rest_is_counted(
    capsys: Capsys, tmp_path: Path, name: str
) -> None:
    content, n_samples, says = READ[name]
    path = tmp_path / ("capture.csv.gz" if name.startswith("gz") else "capture.csv")
    path.write_bytes(content)
    end = measured(capsys, path)
    assert end.code == 0, end.document
    assert end.n_samples == n_samples
    for words in says:
        assert words in end.said
    end.demand_truth()
    quiet = {"jitter-below-grid", "assumed-volts", "assumed-time-unit", "rows-skipped"}
    if not says:
        assert {line.partition(":")[0] for line in end.said.splitlines()} <= quiet


REFUSED: dict[str, tuple[bytes, int, str]] = {
    "empty": (b"", 4, "empty-file"),
    "NULs alone": (bytes(5000), 2, "unknown-structure"),
    "header alone": (table([]), 4, "no-rows"),
    "one row": (table(ROWS[:1]), 4, "one-row"),
    "flat": (table([f"{k * DT_S},12.0" for k in range(N)]), 4, "flat-trace"),
    "one edge": (table([f"{k * DT_S},{12.0 * (k > 300)}" for k in range(N)]), 4, "no-interval"),
    "all NaN": (table([f"{k * DT_S},NaN" for k in range(N)]), 4, "no-values"),
    "all infinite": (table([f"{k * DT_S},inf" for k in range(N)]), 4, "no-values"),
    "all huge": (table([f"{k * DT_S},{(volts(k) - 6) / 6}e308" for k in range(N)]), 4, "no-values"),
    "all times subnormal": (table([f"{k}e-310,{volts(k)}" for k in range(N)]), 4, "time-disorder"),
    "all times huge": (table([f"{k}e305,{volts(k)}" for k in range(N)]), 4, "one-row"),
    "one time for all": (table([f"5.0,{volts(k)}" for k in range(N)]), 4, "time-disorder"),
    "time backwards": (table(ROWS[::-1]), 4, "time-disorder"),
    "blocks out of order": (
        table([*ROWS[:200], *ROWS[300:400], *ROWS[200:300], *ROWS[400:]]),
        4,
        "time-disorder",
    ),
    "a block twice": (table([*ROWS[:200], *ROWS[100:]]), 4, "time-disorder"),
    "a column more from the middle on": (
        table([*FIRST, *(f"{i},{r}" for i, r in enumerate(SECOND))]),
        4,
        "rows-unreadable",
    ),
    "decimal marks by turns": (
        table(
            [european([r])[0] if i % 7 == 3 else r.replace(",", ";") for i, r in enumerate(ROWS)],
            "Time (s);OUT (V)",
        ),
        2,
        "ambiguous-structure",
    ),
    "decimal mark changes halfway": (
        table([*semicolons(FIRST), *european(SECOND)], HEAD.replace(",", ";")),
        4,
        "rows-unreadable",
    ),
    "noise": (random.Random(1).randbytes(20_000), 2, "unknown-structure"),
    "gz in gz": (gzip.compress(gzip.compress(WHOLE)), 2, "unknown-structure"),
    "a line of a million letters alone": (b"x" * 1_000_000, 4, "no-rows"),
    "ten thousand columns": (
        "".join(f"{k}" + ",1.0" * 9_999 + "\n" for k in range(30)).encode(),
        4,
        "too-many-columns",
    ),
    "a row of a million columns": (b"1.0," * 999_999 + b"1.0\n", 4, "too-many-columns"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_cannot_be_measured_is_one_clear_error(
    capsys: Capsys, tmp_path: Path, name: str
) -> None:
    content, code, error = REFUSED[name]
    path = tmp_path / "capture.csv"
    path.write_bytes(content)
    end = measured(capsys, path)
    assert (end.code, end.error) == (code, error), end.document


def test_a_gz_cut_short_is_read_to_the_cut(capsys: Capsys, tmp_path: Path) -> None:
    rows = [f"{k * DT_S:.1f},{volts(k) + k % 7 * 0.011:.3f}" for k in range(N)]
    whole = gzip.compress(table(rows), mtime=0)
    (tmp_path / "capture.csv.gz").write_bytes(whole[: len(whole) * 2 // 3])
    end = measured(capsys, tmp_path / "capture.csv.gz")
    assert end.code == 0
    assert 300 < end.n_samples < N
    assert "file-cut: " in end.said
    assert "ends inside its gz shell" in end.said
    end.demand_truth()


@pytest.mark.parametrize("name", ["mixed line ends", "line ends change after the head"])
@pytest.mark.parametrize("block", [7, 64, 1000])
def test_line_ends_are_found_across_blocks(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str, block: int
) -> None:
    monkeypatch.setattr(walking, "BLOCK_BYTES", block)
    (tmp_path / "capture.csv").write_bytes(READ[name][0])
    (trace,) = read_capture(tmp_path / "capture.csv", in_memory_bytes=0).traces
    assert isinstance(trace, Waveform)
    read = [float(v) for piece in trace.samples.blocks() for v in piece]
    assert read == [volts(k) for k in range(N)]


def test_each_trace_is_looked_at_once_and_not_once_a_pair(
    capsys: Capsys, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Roles are found between traces: of 300 alike there are 90,000 pairs."""
    looked: list[object] = []
    real = roles._pulses
    monkeypatch.setattr(roles, "_pulses", lambda shape: looked.append(shape) or real(shape))
    names = ",".join(f"c{i} (V)" for i in range(12))
    path = tmp_path / "capture.csv"
    path.write_bytes(table([row(k) + f",{volts(k)}" * 11 for k in range(60)], f"Time (s),{names}"))
    end = measured(capsys, path)
    assert (end.code, end.error) == (2, "choose-channel")
    assert len(looked) == 2 * 12  # for the document and for the screen
