"""What the levels are found from: a part of the samples, and the range of all of them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle, quantile, without_repeats
from benchtool.model.capture import Waveform
from benchtool.timing.pieces import Piece, walk_pieces
from benchtool.timing.rows import ROW
from benchtool.timing.sampling import sample_runs
from benchtool.timing.tally import Tally

WHOLE = 1 << 20
"""Samples up to which a record is taken as a whole."""

_SEEN = 0.05  # of the range of a sampled part: what all samples may exceed it by


@frozen_record(eq=False)
class Survey:
    """A part of the samples, and the range of all as far as it is known.

    Attributes:
        runs: Contiguous runs of finite samples in volts.
        values: All of them, shape (n,).
        ordered: The same in order of size.
        least, greatest: Extremes in volts.
        step_v: Code step in volts, 0 where none is known or found.
        code_low_v, code_high_v: Ends of the code range, where the samples are integers.
        is_whole: Whether the extremes are those of all samples.
    """

    runs: tuple[FloatArray, ...]
    values: FloatArray
    ordered: FloatArray
    least: float
    greatest: float
    step_v: float
    code_low_v: float | None
    code_high_v: float | None
    is_whole: bool

    def of_runs(self, runs: tuple[FloatArray, ...]) -> Survey:
        """Return a survey of other runs of the trace, with their own extremes."""
        values = np.concatenate(runs)
        ordered = np.sort(values)
        return replace(
            self,
            runs=runs,
            values=values,
            ordered=ordered,
            least=float(ordered[0]),
            greatest=float(ordered[-1]),
        )

    def share_between(self, low_v: float, high_v: float) -> float:
        """Return the share of samples strictly between two values."""
        ends = (self.ordered.searchsorted(low_v, "right"), self.ordered.searchsorted(high_v))
        return max(0, int(ends[1] - ends[0])) / self.ordered.size

    def at_share(self, share: float) -> float:
        """Return the value below which lies a share of the samples, as ``quantile`` does."""
        place = share * (self.ordered.size - 1)
        low = int(place)
        high = min(low + 1, self.ordered.size - 1)
        step = self.ordered[high] - self.ordered[low]
        return float(self.ordered[low] + (place - low) * step)


def survey_samples(waveform: Waveform) -> Survey:
    """Return all samples of a short record, and of a long one runs spread over it."""
    n = sum(span.stop - span.start for span in waveform.spans)
    runs = _all_runs(waveform) if n <= WHOLE else sample_runs(waveform)
    return _survey(waveform, runs, is_whole=n <= WHOLE)


def exceeds(waveform: Waveform, survey: Survey, tally: Tally) -> bool:
    """Tell whether samples lie clear outside the range that levels were found in."""
    if survey.is_whole or tally.greatest < tally.least:
        return False
    if not survey.values.size:
        return True
    least, greatest = tally.volts(waveform.scale)
    margin = _SEEN * (survey.greatest - survey.least)
    return least < survey.least - margin or greatest > survey.greatest + margin


def widen(waveform: Waveform, survey: Survey, tally: Tally) -> Survey:
    """Return the survey with the range of all samples.

    Where no sampled one lies in one half of it, the waveform is walked for those that do.
    """
    least, greatest = tally.volts(waveform.scale)
    empty = _empty_half(survey, least, greatest)
    if empty is not None:
        survey = _survey(waveform, (*survey.runs, *_inside(waveform, empty)), is_whole=True)
    return replace(survey, least=least, greatest=greatest, is_whole=True)


def _all_runs(waveform: Waveform) -> tuple[FloatArray, ...]:
    gain, offset = waveform.scale.gain, waveform.scale.offset
    runs: list[FloatArray] = []
    for span in waveform.spans:
        blocks = [b.astype(np.float64) for b in waveform.samples.blocks(span.start, span.stop)]
        values = np.concatenate([np.empty(0), *blocks])
        present = values[np.isfinite(values)] * gain + offset
        if present.size:
            runs.append(present)
    return tuple(runs)


def _empty_half(survey: Survey, least: float, greatest: float) -> tuple[float, float] | None:
    """Return the half of a range in which no sample was kept, if there is one."""
    middle_v = (least + greatest) / 2
    if not survey.values.size:
        return least, greatest
    if survey.ordered[-1] <= middle_v:
        return middle_v, greatest
    if survey.ordered[0] >= middle_v:
        return least, middle_v
    return None


def _inside(waveform: Waveform, extent_v: tuple[float, float]) -> tuple[FloatArray, ...]:
    """Return the samples in a range of volts, as many as are taken of a whole record."""
    gain, offset = waveform.scale.gain, waveform.scale.offset
    low, high = sorted((v - offset) / gain for v in extent_v)
    runs: list[FloatArray] = []
    room = WHOLE
    for piece in walk_pieces(waveform):
        volts = _piece_inside(piece, low, high) * gain + offset
        kept = volts[(volts >= extent_v[0]) & (volts <= extent_v[1])][:room]
        if kept.size:
            runs.append(kept)
            room -= kept.size
        if room <= 0:
            break
    return tuple(runs)


def _piece_inside(piece: Piece, low: float, high: float) -> FloatArray:
    """Return the rows of a piece that reach into a range of codes."""
    reaching = (piece.rows.greatest >= low - 1) & (piece.rows.least <= high + 1)
    starts = reaching.nonzero()[0] * ROW
    parts = [piece.values[start : start + ROW].astype(np.float64) for start in starts]
    return np.concatenate([np.empty(0), *parts])


def _survey(waveform: Waveform, runs: tuple[FloatArray, ...], *, is_whole: bool) -> Survey:
    values = np.concatenate([np.empty(0), *runs])
    ordered = np.sort(values)
    step_v, ends = _codes(waveform, ordered)
    return Survey(
        runs=runs,
        values=values,
        ordered=ordered,
        least=float(ordered[0]) if ordered.size else np.inf,
        greatest=float(ordered[-1]) if ordered.size else -np.inf,
        step_v=step_v,
        code_low_v=ends[0] if ends else None,
        code_high_v=ends[1] if ends else None,
        is_whole=is_whole,
    )


def _codes(waveform: Waveform, ordered: FloatArray) -> tuple[float, list[float] | None]:
    """Return the code step, and of integers the ends of their range, in volts."""
    scale, dtype = waveform.scale, waveform.samples.dtype
    step_v = scale.step_v or 0.0
    if dtype.kind in "iu":
        info = np.iinfo(np.dtype(dtype.str))
        ends = sorted(float(x) * scale.gain + scale.offset for x in (info.min, info.max))
        return step_v or abs(scale.gain), ends
    return step_v or find_step(ordered), None


def find_step(ordered: FloatArray) -> float:
    """Return the code step of printed or floating samples, 0 where they lie on no grid.

    Args:
        ordered: Samples in volts in order of size, shape (n,).
    """
    unique = without_repeats(ordered)
    if unique.size < 4 or unique.size > max(16, ordered.size // 4):
        return 0.0
    gaps = np.diff(unique)
    step = middle(gaps[gaps <= 1.5 * quantile(gaps, 0.05)])
    ratio = gaps / step
    off_grid = np.abs(ratio - np.round(ratio)) > 0.25
    return step if float(np.mean(off_grid)) < 0.05 else 0.0
