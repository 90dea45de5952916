"""Numbers are bit-exact, whatever way they are decoded, and blocks hold one block at a time."""

from __future__ import annotations

import tracemalloc
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import Read, codes_of, values_of

from benchtool.formats import read_capture, spool
from benchtool.formats.text import walking
from benchtool.formats.text.walking import TextSamples
from benchtool.model.capture import ArraySamples, Waveform

FORMS = ["{:.3f}", "{:.6f}", "{:+.4e}", "{:.9E}", "{:.16e}", "{!r}", "{:g}", "{:.0f}", "{:012.5f}"]


def table(texts: list[str], delimiter: str = ",") -> str:
    rows = "".join(f"{i * 5e-6:.6f}{delimiter}{t}\n" for i, t in enumerate(texts))
    return f"time_s{delimiter}OUT (V)\n" + rows


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("delimiter", [",", ";", "\t", " "])
def test_numbers_are_those_of_float(read: Read, form: str, delimiter: str) -> None:
    rng = np.random.default_rng(len(form))
    scales = 10.0 ** rng.integers(-12, 12, 2000)
    texts = [form.format(float(v)) for v in rng.normal(0, 1, 2000) * scales]
    values = values_of(read(table(texts, delimiter)).traces[0])
    assert values.tolist() == [float(t) for t in texts]


def test_numbers_are_those_of_pandas(tmp_path: Path) -> None:
    volts = big_table(tmp_path / "a.csv", 5000)
    frame = pd.read_csv(tmp_path / "a.csv")
    values = values_of(read_capture(tmp_path / "a.csv").traces[0])
    assert values.tolist() == frame["OUT (V)"].tolist() == volts.tolist()


def test_decimal_commas_are_bit_exact(read: Read) -> None:
    rng = np.random.default_rng(1)
    texts = [f"{v:.7f}" for v in rng.normal(0, 3, 2000)]
    text = table(texts, ";").replace(".", ",")
    assert values_of(read(text).traces[0]).tolist() == [float(t) for t in texts]


@pytest.mark.parametrize("n_bad", [1, 7, 150])
def test_damaged_rows_cost_only_themselves(read: Read, n_bad: int) -> None:
    rng = np.random.default_rng(n_bad)
    texts = [f"{v:.4f}" for v in rng.normal(0, 1, 3000)]
    expected = np.array([float(t) for t in texts])
    bad = rng.choice(3000, n_bad, replace=False)
    for i in bad:
        texts[i] = str(rng.choice(["abc", "1.2.3", "1-2", "--", "0x10", "1 2", "1_000", "", "e5"]))
    expected[bad] = np.nan
    capture = read(table(texts))
    np.testing.assert_array_equal(values_of(capture.traces[0]), expected)
    assert codes_of(capture) == ["values-missing"]
    assert f"{n_bad} cells" in capture.warnings[0].text
    assert f"line {min(bad) + 2}" in capture.warnings[0].text


def test_cells_that_compensate_are_not_shifted(read: Read) -> None:
    rows = [f"{i * 0.005:.3f},{i % 7}.5,{i % 5}.25" for i in range(200)]
    rows[50], rows[51] = "0.250,1 2,", "0.255,,3 4"
    capture = read("time_s,A (V),B (V)\n" + "\n".join(rows) + "\n")
    a, b = (values_of(trace) for trace in capture.traces)
    assert np.isnan(a[50:52]).all()
    assert np.isnan(b[50:52]).all()
    assert (a[52], b[52]) == (3.5, 2.25)


@given(
    data=st.data(),
    delimiter=st.sampled_from([",", ";", "\t"]),
    quoted=st.booleans(),
    crlf=st.booleans(),
    trailing=st.booleans(),
    n_channels=st.integers(1, 3),
)
@settings(max_examples=40, derandomize=True, deadline=None)
def test_any_structure_is_read_back(
    tmp_path_factory: pytest.TempPathFactory,
    data: st.DataObject,
    delimiter: str,
    quoted: bool,
    crlf: bool,
    trailing: bool,
    n_channels: int,
) -> None:
    decimal = data.draw(st.sampled_from([".", ","])) if delimiter != "," or quoted else "."
    unit, places = data.draw(st.sampled_from([("s", 6), ("ms", 3), ("us", 0)]))
    spread = st.floats(-50, 50, allow_nan=False).map(lambda v: round(v, 4))
    columns = [data.draw(st.lists(spread, min_size=30, max_size=30)) for _ in range(n_channels)]
    scale = {"s": 1e-6, "ms": 1e-3, "us": 1.0}[unit]
    mark = '"' if quoted else ""

    def line(cells: list[str]) -> str:
        end = delimiter if trailing else ""
        return delimiter.join(f"{mark}{c}{mark}" for c in cells) + end + ("\r\n" if crlf else "\n")

    text = line([f"Time ({unit})", *(f"CH{k} (V)" for k in range(n_channels))])
    for i in range(30):
        cells = [f"{5 * i * scale:.{places}f}", *(f"{c[i]:.4f}" for c in columns)]
        text += line([cell.replace(".", decimal) for cell in cells])
    path = tmp_path_factory.mktemp("any") / "a.csv"
    path.write_bytes(text.encode())
    capture = read_capture(path)
    assert [values_of(t).tolist() for t in capture.traces if isinstance(t, Waveform)] == columns


def big_table(path: Path, n: int) -> np.ndarray:
    volts = np.round(np.random.default_rng(1).normal(0, 1, n), 4)
    text = "time_s,OUT (V)\n" + "".join(f"{i * 5e-6:.6f},{v:.4f}\n" for i, v in enumerate(volts))
    path.write_text(text)
    return volts


def test_blocks_are_the_same_as_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(walking, "BLOCK_BYTES", 1000)
    volts = big_table(tmp_path / "a.csv", 5000)
    trace = read_capture(tmp_path / "a.csv", in_memory_bytes=0).traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.samples, TextSamples)
    for start, stop in [(0, None), (0, 1), (4999, None), (1234, 4321), (77, 78), (300, 300)]:
        pieces = list(trace.samples.blocks(start, stop))
        joined = np.concatenate(pieces) if pieces else np.empty(0)
        assert joined.tolist() == volts[start:stop].tolist()


def test_walking_a_file_holds_one_block_at_a_time(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    block = 1 << 13
    monkeypatch.setattr(walking, "BLOCK_BYTES", block)
    volts = big_table(tmp_path / "a.csv", 60_000)
    size = (tmp_path / "a.csv").stat().st_size
    trace = read_capture(tmp_path / "a.csv", in_memory_bytes=0).traces[0]
    assert isinstance(trace, Waveform)
    tracemalloc.start()
    total = sum(float(piece.sum()) for piece in trace.samples.blocks())
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert total == pytest.approx(volts.sum())
    assert peak < 40 * block  # copies of the block, and an eight-byte index of each byte
    assert size > 100 * block


def test_reading_a_file_in_blocks_holds_no_table(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(walking, "BLOCK_BYTES", 1 << 14)
    monkeypatch.setattr(spool, "COLUMNS_IN_MEMORY_BYTES", 1 << 16)
    big_table(tmp_path / "a.csv", 60_000)
    read_capture(tmp_path / "a.csv", in_memory_bytes=0)  # imports are not counted
    tracemalloc.start()
    read_capture(tmp_path / "a.csv", in_memory_bytes=0)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 60_000 * 16  # two columns of float64 would be that
    assert isinstance(read_capture(tmp_path / "a.csv").traces[0].samples, ArraySamples)  # type: ignore[union-attr]


def test_samples_in_memory_cannot_be_changed(read: Read) -> None:
    trace = read(table(["1.5"] * 50)).traces[0]
    assert isinstance(trace, Waveform)
    block = next(trace.samples.blocks())
    with pytest.raises(ValueError, match="read-only"):
        block[0] = 1.0
