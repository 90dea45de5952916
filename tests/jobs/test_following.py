"""Files that grow: new rows are seen, a half row is not, and nothing is joined that was not one."""

from __future__ import annotations

import os
import threading
from collections.abc import Callable, Iterable, Iterator
from contextlib import ExitStack
from itertools import islice
from pathlib import Path

import numpy as np
import pytest

from benchtool.errors import CaptureError, InputError, MalformedCaptureError, NotConnectedError
from benchtool.jobs.following import WINDOW_BYTES, Growing, open_growing
from benchtool.jobs.growing import GrowingPipe
from benchtool.model.capture import Capture, LogicTrace, Waveform
from benchtool.timing.edges import find_edges
from benchtool.timing.levels import find_levels

STEP_MS = 0.5
Follow = Callable[..., Growing]


def rows(first: int, stop: int) -> str:
    """Return rows of a square wave of 10 ms, on half milliseconds."""
    return "".join(f"{i * STEP_MS:.1f},{5 if i % 20 < 10 else 0}\n" for i in range(first, stop))


def append(path: Path, text: str) -> None:
    with path.open("a") as file:
        file.write(text)


def waveform_of(capture: Capture | None) -> Waveform:
    assert capture is not None
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    return trace


@pytest.fixture
def growing_csv(tmp_path: Path) -> Path:
    path = tmp_path / "grows.csv"
    path.write_text("bench 2\nTime (ms),OUT (V)\n" + rows(0, 100))
    return path


@pytest.fixture
def follow() -> Iterator[Follow]:
    with ExitStack() as opened:

        def follow(path: Path, window_bytes: int = WINDOW_BYTES) -> Growing:
            stream = open_growing(path, window_bytes=window_bytes)
            opened.callback(stream.close)
            return stream

        yield follow


def test_new_rows_are_seen_and_a_half_row_is_not(growing_csv: Path, follow: Follow) -> None:
    stream = follow(growing_csv)
    assert waveform_of(stream.newest(0.1)).samples.size == 100
    assert stream.newest(0.05) is None
    append(growing_csv, rows(100, 150) + "75.0,")
    assert waveform_of(stream.newest(0.1)).samples.size == 150
    append(growing_csv, "5\n")
    assert waveform_of(stream.newest(0.1)).samples.size == 151


def test_rows_that_are_written_while_it_waits_are_seen(growing_csv: Path, follow: Follow) -> None:
    stream = follow(growing_csv)
    stream.newest(0.1)
    writer = threading.Timer(0.1, append, (growing_csv, rows(100, 200)))
    writer.start()
    assert waveform_of(stream.newest(2.0)).samples.size == 200
    writer.join()


def test_a_bounded_window_stays_on_the_axis_of_the_whole_record(
    growing_csv: Path, follow: Follow
) -> None:
    stream = follow(growing_csv, window_bytes=2000)
    stream.newest(0.1)
    for first in range(100, 3000, 100):
        append(growing_csv, rows(first, first + 100))
        capture = stream.newest(0.5)
    trace = waveform_of(capture)
    assert capture is not None
    assert trace.samples.size < 700
    assert capture.window is not None
    end_s = trace.spans[-1].start_s + (trace.samples.size - 1) * STEP_MS / 1000
    # the step is found from the printed stamps of each window; 1e-9 s is its arithmetic over them
    assert end_s == pytest.approx(2999 * STEP_MS / 1000, abs=1e-9)
    edges = find_edges(trace, find_levels(trace))
    assert np.abs(edges.times_s / 5e-3 - np.round(edges.times_s / 5e-3)).max() < 0.06  # half a step


def test_a_long_file_is_followed_from_its_newest_rows(tmp_path: Path, follow: Follow) -> None:
    path = tmp_path / "long.csv"
    path.write_text("Time (ms),OUT (V)\n" + rows(0, 200_000))
    stream = follow(path, window_bytes=20_000)
    size = waveform_of(stream.newest(1.0)).samples.size
    assert 1000 < size < 3000
    append(path, rows(200_000, 200_100))
    assert waveform_of(stream.newest(1.0)).samples.size == size + 100


@pytest.mark.parametrize("way", ["cut short", "replaced"])
def test_a_file_that_begins_anew_is_read_anew_and_says_so(
    growing_csv: Path, follow: Follow, way: str
) -> None:
    stream = follow(growing_csv)
    stream.newest(0.1)
    other = "Time (ms),OUT (V)\n" + rows(0, 40)
    if way == "replaced":
        new = growing_csv.with_name("new.csv")
        new.write_text(other)
        new.replace(growing_csv)
    else:
        growing_csv.write_text(other)
    capture = stream.newest(0.2)
    assert waveform_of(capture).samples.size == 40
    assert capture is not None
    assert [notice.code for notice in capture.warnings] == ["file-begun-anew"]


def follow_on(stream: Growing, path: Path, pieces: Iterable[str]) -> None:
    """Append pieces and look after each."""
    for piece in pieces:
        append(path, piece)
        stream.newest(0.1)


def test_a_structure_that_changes_is_refused(tmp_path: Path, follow: Follow) -> None:
    path = tmp_path / "turns.csv"
    path.write_text("Time (ms),OUT\n" + "".join(f"{i * i},{i % 2}\n" for i in range(100)))
    stream = follow(path, window_bytes=1000)
    stream.newest(0.1)
    samples = (f"{10_000 + i},{i // 7 % 2}\n" for i in range(900))  # no longer transitions
    with pytest.raises(MalformedCaptureError) as raised:
        follow_on(stream, path, ("".join(islice(samples, 200)) for _ in range(4)))
    assert raised.value.code == "structure-changed"
    assert "kind was transitions" in raised.value.message


def test_too_few_rows_to_tell_are_waited_for(tmp_path: Path, follow: Follow) -> None:
    path = tmp_path / "starts.csv"
    path.write_text("Time (ms),OUT (V)\n")
    stream = follow(path)
    assert stream.newest(0.05) is None
    append(path, rows(0, 60))
    assert waveform_of(stream.newest(0.2)).samples.size == 60


def test_a_vcd_that_grows_is_followed_and_bounded(tmp_path: Path, follow: Follow) -> None:
    path = tmp_path / "grows.vcd"
    head = "$timescale 1 us $end\n$var wire 1 ! OUT $end\n$enddefinitions $end\n#0\n0!\n"
    path.write_text(head + "".join(f"#{1000 * n}\n{n % 2}!\n" for n in range(1, 40)))
    stream = follow(path, window_bytes=500)
    stream.newest(0.1)
    for first in range(40, 400, 40):
        append(path, "".join(f"#{1000 * n}\n{n % 2}!\n" for n in range(first, first + 40)))
        capture = stream.newest(0.2)
    assert capture is not None
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.times_s.size < 120
    assert trace.spans[-1].end_s == pytest.approx(0.399, abs=1e-9)  # ticks of 1 µs
    np.testing.assert_allclose(np.diff(trace.times_s), 1e-3, rtol=0, atol=1e-9)


def test_standard_input_is_followed_to_its_end() -> None:
    reading, writing = os.pipe()
    pipe = os.fdopen(reading, "rb", buffering=0)
    stream = Growing(GrowingPipe(pipe))
    os.write(writing, ("Time (ms),OUT (V)\n" + rows(0, 50)).encode())
    assert waveform_of(stream.newest(0.5)).samples.size == 50
    os.write(writing, rows(50, 90).encode())
    os.close(writing)
    assert waveform_of(stream.newest(0.5)).samples.size == 90
    with pytest.raises(NotConnectedError) as raised:
        stream.newest(0.5)
    assert raised.value.code == "stream-ended"
    pipe.close()


def test_a_packed_file_is_not_followed(tmp_path: Path, follow: Follow) -> None:
    path = tmp_path / "capture.npz"
    np.savez(path, a=np.arange(3))
    with pytest.raises(MalformedCaptureError) as raised:
        follow(path).newest(0.1)
    assert raised.value.code == "not-followed"


def test_a_file_that_is_not_there_says_so(tmp_path: Path, follow: Follow) -> None:
    with pytest.raises(InputError) as raised:
        follow(tmp_path / "none.csv")
    assert raised.value.code == "no-such-file"


@pytest.mark.parametrize(
    ("text", "code"), [("nothing to read here\n", "no-rows"), ("a,b\n1,2\n", "no-time")]
)
def test_an_input_that_ends_without_a_reading_says_what_is_wrong_with_it(
    text: str, code: str
) -> None:
    reading, writing = os.pipe()
    os.write(writing, text.encode())
    os.close(writing)
    with os.fdopen(reading, "rb", buffering=0) as pipe:
        stream = Growing(GrowingPipe(pipe))
        assert stream.newest(0.0) is None
        with pytest.raises(CaptureError) as caught:
            stream.newest(0.5)
    assert caught.value.code == code
