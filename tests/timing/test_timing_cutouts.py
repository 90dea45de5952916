"""The samples around edges are the same however the record comes in blocks."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import ArraySamples, Span, StampedTime, UniformTime, Waveform
from benchtool.timing import cutouts, pieces
from benchtool.timing.cutouts import cut_windows

N, HALF, DT_S = 300, 3, 1e-3
INDEX = np.array([2, 3, 9, 10, 11, 50, 99, 100, 101, 150, 296, 297, 298])
VALUES = np.random.default_rng(1).integers(-100, 100, N).astype(np.int8)
STAMPS = np.cumsum(np.random.default_rng(2).uniform(0.5e-3, 1.5e-3, N))


def waveform(values: np.ndarray = VALUES, *, stamped: bool = False, cut: int = 0) -> Waveform:
    """Return a record of one span, or of two that meet at ``cut``."""
    ends = [0, cut, N] if cut else [0, N]
    time = StampedTime(stamps=ArraySamples(STAMPS)) if stamped else UniformTime(dt_s=DT_S)
    spans = [Span(start=a, stop=b, start_s=a * DT_S) for a, b in pairwise(ends)]
    samples = ArraySamples(values)
    return Waveform(samples=samples, time=time, spans=tuple(spans), channel="OUT")


def cut(
    trace: Waveform, monkeypatch: pytest.MonkeyPatch, block: int, *, holed: bool = False
) -> tuple[list[int], FloatArray, FloatArray]:
    """Return which edges have a window, its times and its samples, of a record in small blocks."""
    monkeypatch.setattr("benchtool.model.capture.BLOCK", block)
    monkeypatch.setattr("benchtool.model.capture.BLOCK_BYTES", 1)
    monkeypatch.setattr(pieces, "LEAST", 1)
    found = list(cut_windows(trace, INDEX, HALF, holed=holed))
    which, times_s, values = (np.concatenate([part[i] for part in found]) for i in range(3))
    return which.tolist(), times_s, values


def around(values: np.ndarray, which: list[int]) -> np.ndarray:
    return np.array([values[at - HALF : at + HALF] for at in INDEX[which]])


@pytest.mark.parametrize("block", [1, 2, 5, 7, 10, 100, 1000])
@pytest.mark.parametrize("holed", [False, True])
def test_windows_are_what_stands_around_the_edges(
    block: int, holed: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    which, times_s, values = cut(waveform(), monkeypatch, block, holed=holed)
    assert which == [1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11]  # the others meet an end of the record
    assert (values == around(VALUES, which)).all()
    assert (times_s == np.arange(-HALF, HALF) * DT_S).all()


@pytest.mark.parametrize("block", [1, 5, 10, 1000])
def test_stamped_windows_have_the_times_of_their_samples(
    block: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    which, times_s, _ = cut(waveform(stamped=True), monkeypatch, block)
    assert (times_s == around(STAMPS, which) - STAMPS[INDEX[which]][:, None]).all()


@pytest.mark.parametrize("block", [1, 5, 10, 1000])
def test_no_window_reaches_over_the_end_of_a_span(
    block: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    which, _, values = cut(waveform(cut=100), monkeypatch, block)
    assert INDEX[which].tolist() == [3, 9, 10, 11, 50, 150, 296, 297]
    assert (values == around(VALUES, which)).all()


@pytest.mark.parametrize("block", [5, 10, 1000])
def test_no_window_reaches_over_a_hole(block: int, monkeypatch: pytest.MonkeyPatch) -> None:
    values = VALUES.astype(np.float64)
    values[102:110] = np.nan
    which, _, found = cut(waveform(values), monkeypatch, block, holed=True)
    assert INDEX[which].tolist() == [3, 9, 10, 11, 50, 99, 150, 296, 297]
    assert (found == around(values, which)).all()


def test_many_windows_come_in_parts(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cutouts, "_MOST", 4 * 2 * HALF)
    parts = list(cut_windows(waveform(), INDEX, HALF, holed=False))
    assert [part[0].size for part in parts] == [4, 4, 3]
