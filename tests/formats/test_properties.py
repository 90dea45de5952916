"""What is written in any way is read back the same: random content in random structures."""

from __future__ import annotations

import gzip
import io
import wave
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import times_of, values_of
from vcd import VCDWriter

from benchtool.formats import read_capture
from benchtool.formats.text import walking
from benchtool.model.capture import Capture, LogicTrace

Draw = Callable[..., object]
Folders = pytest.TempPathFactory

CHECKED = settings(max_examples=40, derandomize=True, deadline=None)

UNITS = {"s": 1.0, "ms": 1e-3, "us": 1e-6, "ns": 1e-9}
ENCODINGS = ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-32", "latin-1"]
ENDS = ["\n", "\r\n", "\r"]
ABOVE = ["", "Device: bench\n", "# saved by hand\n", "Board;GH-MV-07\nOperator;none\n\n"]


def read_bytes(folders: Folders, name: str, content: bytes, limit: int = 1 << 20) -> Capture:
    path = folders.mktemp("property") / name
    path.write_bytes(content)
    return read_capture(path, in_memory_bytes=limit)


@st.composite
def spellings(draw: st.DrawFn) -> Callable[[float], str]:
    """Return a way to write a number."""
    places = draw(st.integers(1, 9))
    kind = draw(st.sampled_from("fFeEg"))
    plus = draw(st.sampled_from(["", "+"]))
    form = f"{{:{plus}.{places}{kind if kind != 'F' else 'f'}}}"
    return form.format


volts = st.floats(-60, 60, allow_nan=False).map(lambda v: v if abs(v) > 1e-30 else 0.0)
"""What is below 1e-37 is read as 0."""


@given(data=st.data())
@CHECKED
def test_text_of_any_dialect_is_read_back(tmp_path_factory: Folders, data: st.DataObject) -> None:
    draw = data.draw
    delimiter, decimal = draw(
        st.sampled_from([(",", "."), (";", "."), (";", ","), ("\t", ","), ("\t", ".")])
    )
    unit = draw(st.sampled_from(list(UNITS)))
    spell = draw(spellings())
    step = draw(st.sampled_from([1, 2, 5, 25]))
    n = draw(st.integers(24, 60))
    columns = draw(st.lists(st.lists(volts, min_size=n, max_size=n), min_size=1, max_size=3))
    names = [f"CH{k + 1} (V)" for k in range(len(columns))]
    rows = [delimiter.join([f"Time ({unit})", *names])]
    for i in range(n):
        cells = [f"{i * step / 10:.1f}", *(spell(column[i]) for column in columns)]
        rows.append(delimiter.join(cell.replace(".", decimal) for cell in cells))
    end = draw(st.sampled_from(ENDS))
    text = (draw(st.sampled_from(ABOVE)) + "\n".join(rows) + "\n").replace("\n", end)
    content = text.encode(draw(st.sampled_from(ENCODINGS)))
    if draw(st.booleans()):
        content = gzip.compress(content)
    capture = read_bytes(tmp_path_factory, "a.csv", content, draw(st.sampled_from([0, 1 << 20])))
    assert len(capture.traces) == len(columns)
    for trace, column in zip(capture.traces, columns, strict=True):
        assert values_of(trace).tolist() == [float(spell(v)) for v in column]
        expected_s = np.arange(n) * (step / 10) * UNITS[unit]
        np.testing.assert_allclose(
            times_of(trace), expected_s, rtol=1e-9
        )  # the step is printed to 0.1


@given(
    interval=st.sampled_from([("Sample interval", "s", 2e-3), ("Sample rate", "Hz", 500.0)]),
    column=st.lists(volts, min_size=30, max_size=60),
    delimiter=st.sampled_from([",", ";", "\t"]),
)
@CHECKED
def test_an_interval_above_gives_the_time(
    tmp_path_factory: Folders,
    interval: tuple[str, str, float],
    column: list[float],
    delimiter: str,
) -> None:
    key, unit, value = interval
    text = f"{key} ({unit}){delimiter}{value}\nOUT (V)\n" + "".join(f"{v:.6f}\n" for v in column)
    (trace,) = read_bytes(tmp_path_factory, "a.csv", text.encode()).traces
    assert values_of(trace).tolist() == [float(f"{v:.6f}") for v in column]
    assert times_of(trace)[-1] == pytest.approx((len(column) - 1) * 2e-3, rel=1e-12)


steps = st.lists(st.integers(1, 900), min_size=6, max_size=40)


@st.composite
def transitions(draw: st.DrawFn) -> tuple[np.ndarray, bool]:
    """Return times in counts after the state found at 0, and that state; widths are uneven."""
    widths = draw(steps)
    widths[1] = widths[0] + 1000
    return np.cumsum(widths), draw(st.booleans())


def demand_transitions(
    trace: object, counts: np.ndarray, starts_high: bool, count_s: float
) -> None:
    assert isinstance(trace, LogicTrace)
    (span,) = trace.spans
    assert span.starts_high is starts_high
    np.testing.assert_allclose(span.start_s + trace.times_s, counts * count_s, rtol=1e-12)
    states = [(k % 2 == 0) != starts_high for k in range(counts.size)]
    assert trace.states.tolist() == states


@given(
    wave=transitions(),
    unit=st.sampled_from(["ms", "us"]),
    words=st.sampled_from(["01", ("low", "high")]),
)
@CHECKED
def test_a_list_of_transitions_is_read_back(
    tmp_path_factory: Folders, wave: tuple[np.ndarray, bool], unit: str, words: tuple[str, str]
) -> None:
    counts, high = wave
    rows = [f"0,{words[high]}"]
    rows += [f"{t},{words[(k % 2 == 0) != high]}" for k, t in enumerate(counts)]
    content = f"Time ({unit}),OUT\n" + "\n".join(rows) + "\n"
    (trace,) = read_bytes(tmp_path_factory, "a.csv", content.encode()).traces
    demand_transitions(trace, counts, high, UNITS[unit])


@given(
    wave=transitions(),
    unit=st.sampled_from(["ns", "us", "ms"]),
    multiple=st.sampled_from([1, 10, 100]),
)
@CHECKED
def test_a_dump_by_another_writer_is_read_back(
    tmp_path_factory: Folders, wave: tuple[np.ndarray, bool], unit: str, multiple: int
) -> None:
    counts, high = wave
    shell = io.StringIO()
    with VCDWriter(shell, timescale=f"{multiple} {unit}", date="today") as writer:
        out = writer.register_var("mist", "OUT", "wire", size=1, init=int(high))
        bus = writer.register_var("mist", "bus", "wire", size=4, init=0)
        for k, t in enumerate(counts.tolist()):
            writer.change(out, t, int((k % 2 == 0) != high))
            writer.change(bus, t, k % 16)
    capture = read_bytes(tmp_path_factory, "a.vcd", shell.getvalue().encode())
    trace = next(t for t in capture.traces if t.channel.endswith("OUT"))
    demand_transitions(trace, counts, high, multiple * UNITS[unit])


@given(wave=transitions(), gaps=st.lists(st.sampled_from(["\n", " ", "\r\n", "\t\n"]), min_size=3))
@CHECKED
def test_a_dump_by_hand_is_read_back(
    tmp_path_factory: Folders, wave: tuple[np.ndarray, bool], gaps: list[str]
) -> None:
    counts, high = wave
    words = ["$timescale", "1us", "$end", "$var", "wire", "1", "!!", "OUT", "$end"]
    words += ["$enddefinitions", "$end", "#0", "$dumpvars", f"{int(high)}!!", "$end"]
    for k, t in enumerate(counts.tolist()):
        words += ["$comment", "#5", "1!!", "$end"] * (k % 5 == 4)
        words += [f"#{t}", f"{int((k % 2 == 0) != high)}!!"]
    text = "".join(word + gaps[i % len(gaps)] for i, word in enumerate(words)) + "\n"
    (trace,) = read_bytes(tmp_path_factory, "a.vcd", text.encode()).traces
    demand_transitions(trace, counts, high, 1e-6)


integers = st.sampled_from(["i1", "u1", "<i2", ">i2", "<u2", "<i4", ">i8"])


@given(
    dtype=integers | st.sampled_from(["<f4", ">f8", "<f2"]),
    seed=st.integers(0, 999),
    named=st.booleans(),
)
@CHECKED
def test_arrays_of_any_type_are_read_back(
    tmp_path_factory: Folders, dtype: str, seed: int, named: bool
) -> None:
    values = np.random.default_rng(seed).integers(0, 100, 80).astype(dtype)
    shell = io.BytesIO()
    clock = {"time_ms": np.arange(80) * 0.25} if named else {"interval_us": 250.0}
    np.savez(shell, OUT=values, **clock)
    (trace,) = read_bytes(tmp_path_factory, "a.npz", shell.getvalue()).traces
    assert values_of(trace).tolist() == values.astype(float).tolist()
    np.testing.assert_allclose(times_of(trace), np.arange(80) * 250e-6, rtol=1e-12)


@given(
    bits=st.sampled_from([8, 16, 24, 32]),
    n_channels=st.integers(1, 3),
    rate_hz=st.integers(1, 400_000),
    seed=st.integers(0, 999),
)
@CHECKED
def test_a_sound_of_any_width_is_read_back(
    tmp_path_factory: Folders, bits: int, n_channels: int, rate_hz: int, seed: int
) -> None:
    half = 1 << (bits - 1)
    codes = np.random.default_rng(seed).integers(-half, half, (50, n_channels))
    stored = codes + 128 * (bits == 8)  # 8 bits are stored with an offset
    frames = b"".join(int(c).to_bytes(bits // 8, "little", signed=bits > 8) for c in stored.ravel())
    shell = io.BytesIO()
    with wave.open(shell, "wb") as sound:
        sound.setparams((n_channels, bits // 8, rate_hz, 0, "NONE", ""))
        sound.writeframes(frames)
    capture = read_bytes(tmp_path_factory, "a.wav", shell.getvalue())
    assert len(capture.traces) == n_channels
    for k, trace in enumerate(capture.traces):
        assert values_of(trace).tolist() == (codes[:, k] / half).tolist()
        assert times_of(trace)[-1] == pytest.approx(49 / rate_hz, rel=1e-12)


MIXES = {
    "one width": ["{:.6f}"],
    "few widths": ["{:.3f}", "{:+.3f}", "{:.4f}"],
    "exponents": ["{:.6e}", "{:+.11E}"],
    "exponents of three digits": ["{:.3e}", "{:.16e}"],
    "shortest": ["{!r}"],
    "more digits than a float holds": ["{:.25f}", "{:.19e}"],
    "everything": ["{:.0f}", "{:.17g}", "{!r}", "{:+.5e}", "{:012.4f}", "{:.30f}"],
}


@pytest.mark.parametrize("block", [1 << 20, 3000])
@pytest.mark.parametrize("name", MIXES)
def test_numbers_are_those_of_another_parser_to_the_last_bit(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, name: str, block: int
) -> None:
    monkeypatch.setattr(walking, "BLOCK_BYTES", block)
    rng = np.random.default_rng(len(name))
    spread = 25 if "e" in "".join(MIXES[name]) or "r" in "".join(MIXES[name]) else 6
    numbers = rng.normal(0, 1, (4000, 2)) * 10.0 ** rng.integers(-spread, spread, (4000, 2))
    forms = rng.choice(MIXES[name], (4000, 2))
    cells = [
        [f.format(float(v)) for f, v in zip(*row, strict=True)]
        for row in zip(forms, numbers, strict=True)
    ]
    rows = [f"{i * 5e-6:.6f},{a},{b}" for i, (a, b) in enumerate(cells)]
    path = tmp_path / "a.csv"
    path.write_text("\n".join(["time_s,A (V),B (V)", *rows]) + "\n")
    frame = pd.read_csv(path)  # correctly rounded from pandas 3.1 on
    traces = read_capture(path, in_memory_bytes=0 if block < 1 << 20 else 1 << 24).traces
    for trace, column in zip(traces, ("A (V)", "B (V)"), strict=True):
        ours = values_of(trace) + 0.0  # which makes 0 of -0, the one number of two patterns
        theirs = frame[column].to_numpy(np.float64) + 0.0
        assert ours.view(np.int64).tolist() == theirs.view(np.int64).tolist()
