"""One pass over a waveform: its full range and a representative part of its samples."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray, distinct, middle, quantile
from benchtool.model.capture import Waveform

KEPT = 1 << 20
"""Samples kept for the histogram, as contiguous runs spread over the record."""

_GOLDEN = 0.6180339887498949


@frozen_record(eq=False)
class Survey:
    """What one pass over the samples kept.

    Attributes:
        runs: Contiguous runs of finite samples in volts.
        least, greatest: Extremes of all samples in volts.
        n: Samples in the record.
        n_missing: Samples that the file did not give.
        step_v: Code step in volts, 0 where none is known or found.
        code_low_v, code_high_v: Ends of the code range, where the samples are integers.
    """

    runs: tuple[FloatArray, ...]
    least: float
    greatest: float
    n: int
    n_missing: int
    step_v: float
    code_low_v: float | None
    code_high_v: float | None

    @property
    def values(self) -> FloatArray:
        """All kept samples in volts."""
        return np.concatenate(self.runs) if self.runs else np.empty(0)


def survey_samples(waveform: Waveform) -> Survey:
    """Walk a waveform once.

    Args:
        waveform: The trace; at most ``KEPT`` of its samples are held.
    """
    runs, least, greatest, n_missing = _collect(waveform, None)
    survey = _build(waveform, runs, least, greatest, n_missing)
    empty = _empty_half(survey)
    if empty is None:
        return survey
    more, *_ = _collect(waveform, empty)
    return _build(waveform, [*runs, *more], least, greatest, n_missing)


def _collect(
    waveform: Waveform, inside: tuple[float, float] | None
) -> tuple[list[FloatArray], float, float, int]:
    """Keep runs of samples; with ``inside``, only those in that range of volts."""
    gain, offset = waveform.scale.gain, waveform.scale.offset
    share = 1.0 if inside else min(1.0, KEPT / max(waveform.samples.size, 1))
    runs: list[FloatArray] = []
    least, greatest, n_missing, room, number = np.inf, -np.inf, 0, KEPT, 0
    for span in waveform.spans:
        first_run = len(runs)
        for block in waveform.samples.blocks(span.start, span.stop):
            number += 1
            finite = block
            if block.dtype.kind == "f":
                finite = block[np.isfinite(block)]
                n_missing += block.size - finite.size
            if finite.size == 0:
                continue
            ends = sorted(float(x) * gain + offset for x in (finite.min(), finite.max()))
            least, greatest = min(least, ends[0]), max(greatest, ends[1])
            kept = _part(finite, share, number) * gain + offset
            if inside:
                kept = kept[(kept >= inside[0]) & (kept <= inside[1])]
            if kept.size and room > 0:
                runs.append(kept[:room])
                room -= kept.size
        if share == 1.0 and len(runs) > first_run:
            runs[first_run:] = [np.concatenate(runs[first_run:])]
    return runs, float(least), float(greatest), n_missing


def _part(block: AnyArray, share: float, number: int) -> FloatArray:
    """Return a contiguous part; its place varies so that it cannot beat with the signal."""
    length = min(block.size, max(int(np.ceil(block.size * share)), 1))
    start = int((number * _GOLDEN % 1.0) * (block.size - length))
    return block[start : start + length].astype(np.float64)


def _empty_half(survey: Survey) -> tuple[float, float] | None:
    """Return the half of the range in which no sample was kept, if there is one."""
    values = survey.values
    if values.size in (0, survey.n) or survey.greatest <= survey.least:
        return None
    middle = (survey.least + survey.greatest) / 2
    if not (values > middle).any():
        return middle, survey.greatest
    if not (values < middle).any():
        return survey.least, middle
    return None


def _build(
    waveform: Waveform, runs: list[FloatArray], least: float, greatest: float, n_missing: int
) -> Survey:
    scale, dtype = waveform.scale, waveform.samples.dtype
    step_v = scale.step_v or 0.0
    ends: list[float] | list[None] = [None, None]
    if dtype.kind in "iu":
        info = np.iinfo(np.dtype(dtype.str))
        ends = sorted(float(x) * scale.gain + scale.offset for x in (info.min, info.max))
        step_v = step_v or abs(scale.gain)
    elif not step_v:
        step_v = find_step(np.concatenate(runs)) if runs else 0.0
    n = sum(span.stop - span.start for span in waveform.spans)
    return Survey(
        runs=tuple(runs),
        least=least,
        greatest=greatest,
        n=n,
        n_missing=n_missing,
        step_v=step_v,
        code_low_v=ends[0],
        code_high_v=ends[1],
    )


def find_step(values: FloatArray) -> float:
    """Return the code step of printed or floating samples, 0 where they lie on no grid.

    Args:
        values: Samples in volts, shape (n,).
    """
    unique = distinct(values)
    if unique.size < 4 or unique.size > max(16, values.size // 4):
        return 0.0
    gaps = np.diff(unique)
    step = middle(gaps[gaps <= 1.5 * quantile(gaps, 0.05)])
    ratio = gaps / step
    off_grid = np.abs(ratio - np.round(ratio)) > 0.25
    return step if float(np.mean(off_grid)) < 0.05 else 0.0
