"""From the scanned clock column to the time of a waveform: even or stamped, spans, notices."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.formats.clock import ClockScan
from benchtool.formats.pieces import Piece
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray, NDArray
from benchtool.model.capture import Samples, Span, UniformTime
from benchtool.model.quantity import Notice

_AGREES = 1e-6  # a stated interval this near to the stamps' own is the one meant
_DIFFERS = 1e-3  # beyond this a stated interval contradicts the stamps
_NOMINAL = 0.01  # the same where the stamps are those of another clock, or uneven


@frozen_record(eq=False)
class Timebase:
    """Time of the channels that share a clock.

    Attributes:
        uniform: The even grid, or None where stamps must be kept.
        spans: Gap-free pieces.
        dropped: Rows that take no part.
        size: Samples of a channel.
        resolution_s: Last printed digit in seconds.
        shifts_s: Added to the stamps of each span, where segments restart.
        evidence: What the interval was found from.
        warnings: Holes, repeats, backward steps.
    """

    uniform: UniformTime | None
    spans: tuple[Span, ...]
    dropped: NDArray[np.int64]
    size: int
    resolution_s: float
    shifts_s: tuple[float, ...]
    evidence: str
    warnings: tuple[Notice, ...]


@frozen_record
class StatedInterval:
    """A sample interval that the file or the user states beside the time column.

    Attributes:
        value_s: The interval in seconds.
        rounding: Half its last printed digit, relative to it.
        nominal: Whether it is only the nominal one of a clock that keeps its own time.
    """

    value_s: float
    rounding: float = 0.0
    nominal: bool = False

    def contradicts(self, step_s: float, u_rel: float) -> bool:
        """Say whether it lies further from a step than what is rounded, or drifts, explains."""
        off = abs(step_s / self.value_s - 1)
        allowed = _NOMINAL if self.nominal else _DIFFERS
        return off > max(allowed, self.rounding + 3 * u_rel)


def settle_time(scan: ClockScan, unit: TimeUnit, stated: StatedInterval | None) -> Timebase:
    """Make the timebase of a scanned column.

    Args:
        scan: The finished scan.
        unit: Unit of the column.
        stated: Interval that the metadata or the user state.

    References:
        The step is (last - first)/(n - 1); its relative standard uncertainty from two stamps
        rounded to a digit q is q*sqrt(2/12)/span: rectangular laws, JCGM 100:2008, 4.3.7.
    """
    resolution_s = unit.seconds(scan.steps.resolution)
    size = scan.pieces[-1].stop
    even = scan.is_even()
    step_s = unit.seconds(scan.mean_step)
    uniform, evidence, warnings = _grid(scan, unit, stated) if even else (None, "", [])
    spans, shifts = _spans(scan.pieces, unit, uniform.dt_s if uniform else step_s, even=even)
    if not even:
        if stated is not None and replace(stated, nominal=True).contradicts(step_s, 0.0):
            warnings = [_differs(stated, step_s)]
        evidence = f"{size} stamps, not evenly spaced"
    return Timebase(
        uniform=uniform,
        spans=spans,
        dropped=scan.dropped,
        size=size,
        resolution_s=resolution_s,
        shifts_s=shifts,
        evidence=evidence,
        warnings=(*warnings, *_order_notices(scan, even=even), *_gap_notices(spans, uniform, scan)),
    )


def _grid(
    scan: ClockScan, unit: TimeUnit, stated: StatedInterval | None
) -> tuple[UniformTime, str, list[Notice]]:
    step_s = unit.seconds(scan.mean_step)
    longest = scan.longest
    u_rel = scan.steps.resolution * math.sqrt(2 / 12) / longest if longest > 0 else 0.0
    n_rows = scan.pieces[-1].stop
    notices: list[Notice] = []
    if scan.n_doubtful:
        u_rel = math.hypot(u_rel, (1 - scan.steps.typical / scan.mean_step) / math.sqrt(3))
        notices.append(_doubtful(scan, unit))
    own = UniformTime(dt_s=_clean(step_s), u_rel=u_rel)
    evidence = f"(last - first)/(n - 1) over {n_rows} evenly spaced stamps"
    if stated is None:
        return own, evidence, notices
    off = abs(step_s / stated.value_s - 1)
    if off <= max(3 * u_rel, _AGREES) and not stated.nominal:
        return UniformTime(dt_s=stated.value_s), f"stated, and {n_rows} stamps agree", []
    if stated.contradicts(step_s, u_rel):
        notices.append(_differs(stated, step_s))
    return own, evidence, notices


def _doubtful(scan: ClockScan, unit: TimeUnit) -> Notice:
    step_s, digit_s = unit.seconds(scan.mean_step), unit.seconds(scan.steps.typical)
    return Notice(
        code="assumed-even-stamps",
        text=f"{scan.n_doubtful} step(s) of the stamps are two digits long, all others one: "
        f"either rows {step_s:.6g} s apart, rounded, which is assumed, or a row lost at each and "
        f"{digit_s:.6g} s; U covers both (--time none --interval {digit_s:.6g} counts the rows)",
    )


def _differs(stated: StatedInterval, step_s: float) -> Notice:
    return Notice(
        code="interval-differs",
        text=f"the stated sample interval {stated.value_s:.6g} s contradicts the time column, "
        f"whose stamps are {step_s:.6g} s apart; the time column was taken",
    )


def _clean(step_s: float) -> float:
    """Return a step without the noise of its last binary digits."""
    rounded = float(f"{step_s:.9g}")
    return rounded if abs(rounded - step_s) <= 1e-12 * step_s else step_s


def _spans(
    pieces: list[Piece], unit: TimeUnit, step_s: float, *, even: bool
) -> tuple[tuple[Span, ...], tuple[float, ...]]:
    """Place the pieces in time: holes as stamped, restarted segments end to end."""
    origin, shift, end = pieces[0].first_t, 0.0, 0.0
    spans, shifts = [], []
    for piece in pieces:
        at = unit.seconds(piece.first_t - origin)
        start = end + step_s if piece.restarts else at + shift
        shift = start - at
        if even and abs(start / step_s - round(start / step_s)) < 0.05:
            start = round(start / step_s) * step_s
        spans.append(Span(start=piece.first, stop=piece.stop, start_s=start))
        shifts.append(shift)
        end = start + unit.seconds(piece.last_t - piece.first_t)
    return tuple(spans), tuple(shifts)


def _order_notices(scan: ClockScan, *, even: bool) -> list[Notice]:
    notices = []
    if scan.n_backwards:
        notices.append(
            Notice(
                code="time-backwards",
                text=f"{scan.n_backwards} rows whose time steps backwards were left out",
            )
        )
    if scan.n_repeated:
        kept = even and scan.steps.coarse
        what = (
            "the digits are too few to tell neighbours apart; all rows lie on an even grid to "
            "within the last digit, so that grid is their time"
            if kept
            else "the first row of each was kept"
        )
        notices.append(
            Notice(
                code="repeated-stamps",
                text=f"{scan.n_repeated} rows repeat the time of the row before: {what}",
            )
        )
    return notices


def _gap_notices(
    spans: tuple[Span, ...], uniform: UniformTime | None, scan: ClockScan
) -> list[Notice]:
    holes = [i for i, piece in enumerate(scan.pieces) if i > 0 and not piece.restarts]
    if not holes:
        return []
    lost = 0
    if uniform is not None:
        for i in holes:
            before = spans[i - 1]
            end_s = before.start_s + (before.stop - before.start) * uniform.dt_s
            lost += max(0, round((spans[i].start_s - end_s) / uniform.dt_s))
    first = spans[holes[0]]
    counted = f"{lost} samples are missing in " if lost else ""
    return [
        Notice(
            code="gaps",
            text=f"{counted}{len(holes)} hole(s) of the record, the first before "
            f"{first.start_s:.6g} s; no interval is measured across one",
        )
    ]


@frozen_record(eq=False)
class ShiftedStamps:
    """Stamps whose restarted segments are moved behind one another."""

    stamps: Samples
    starts: tuple[int, ...]
    shifts_s: tuple[float, ...]

    @property
    def size(self) -> int:
        """Number of stamps."""
        return self.stamps.size

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a stamp."""
        return self.stamps.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the stamps ``start`` to ``stop``."""
        at = start
        for block in self.stamps.blocks(start, stop):
            rows = np.arange(at, at + block.size)
            segment = np.searchsorted(np.array(self.starts), rows, side="right") - 1
            shift: FloatArray = np.array(self.shifts_s)[segment]
            yield block.astype(np.float64) + shift
            at += block.size
