"""Waveforms from scanned rows."""

from __future__ import annotations

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.grid import code_step, value_step
from benchtool.formats.text import unitwords
from benchtool.formats.text.cells import last_digit
from benchtool.formats.text.column import Column
from benchtool.formats.text.envelope import MiddleSamples, first_rows
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.scanning import Range, Scan
from benchtool.formats.text.timebase import ShiftedStamps, Timebase
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.formats.text.walking import DataRows, TextSamples
from benchtool.frozen import frozen_record
from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
    ArraySamples,
    Samples,
    Scale,
    Span,
    StampedTime,
    UniformTime,
    Waveform,
)

_EMPTY = np.empty(0, np.int64)
_INTEGERS = (np.dtype(np.int8), np.dtype(np.int16), np.dtype(np.int32), np.dtype(np.int64))


@frozen_record(eq=False)
class Sampled:
    """All that waveforms are made of.

    Attributes:
        rows: The data rows.
        scan: Their first walk.
        layout: Their layout.
        timebases: One a clock column.
        units: Unit of each clock column.
        interval_s: Sample interval where no clock gives it.
        value_unit: Unit of the values where no header gives it.
        twins: Whether each time stamp has two samples, the ends of an envelope.
    """

    rows: DataRows
    scan: Scan
    layout: Layout
    timebases: tuple[Timebase, ...]
    units: tuple[TimeUnit, ...]
    interval_s: float | None
    value_unit: str
    twins: bool = False

    def waveform(self, place: int, column: Column, clock: int | None, *, logic: bool) -> Waveform:
        """Return the waveform of channel ``place``."""
        channel = self.scan.ranges[place]
        at = len(self.timebases) + place
        dropped = self.timebases[clock].dropped if clock is not None else _EMPTY
        dtype = np.dtype(np.uint8) if logic else self._dtype(column, channel)
        if channel.n_missing:
            dtype = np.dtype(np.float64)
        time, spans = self._time(clock)
        return Waveform(
            samples=self._taken(at, dropped, dtype, spans[-1].stop),
            scale=Scale() if logic else self._scale(column, at, dtype),
            time=time,
            spans=spans,
            channel=column.title,
            unit="1" if logic else value_unit(column, self.value_unit)[0],
        )

    def _dtype(self, column: Column, channel: Range) -> np.dtype[np.generic]:
        """Return the least integer type for columns printed as integers, else float64."""
        if not (channel.whole and _prints_integers(column, self.layout)):
            return np.dtype(np.float64)
        for dtype in _INTEGERS:
            limits = np.iinfo(dtype)
            if limits.min <= channel.low and channel.high <= limits.max:
                return dtype
        return np.dtype(np.float64)

    def _taken(
        self, at: int, dropped: NDArray[np.int64], dtype: np.dtype[np.generic], size: int
    ) -> Samples:
        """Return the samples of a column, or the middle of the two at each stamp."""
        samples = self._samples(at, dropped, dtype, size)
        if not self.twins:
            return samples
        second = self._samples(at, first_rows(self.scan.n_rows), dtype, size)
        return MiddleSamples(first=samples, second=second)

    def _samples(
        self, at: int, dropped: NDArray[np.int64], dtype: np.dtype[np.generic], size: int
    ) -> Samples:
        if self.scan.table is not None:
            values = np.delete(self.scan.table[:, at], dropped[dropped < self.scan.n_rows])
            array = np.ascontiguousarray(values[:size].astype(dtype))
            array.flags.writeable = False
            return ArraySamples(array)
        return TextSamples(
            source=self.rows.only(at),
            index=self.scan.index,
            dropped=dropped[dropped < self.scan.n_rows],
            n_rows=self.scan.n_rows,
            dtype=dtype,
            spool=self.scan.spool_of(at),
            place=at,
        )

    def _scale(self, column: Column, at: int, dtype: np.dtype[np.generic]) -> Scale:
        factor = value_unit(column, self.value_unit)[1]
        values = self.scan.first[:, at]
        if dtype.kind == "i":
            codes = code_step(values)
            return Scale(gain=factor, step_v=None if codes is None else codes * factor)
        step = value_step(values, _printed_step(column, self.layout))
        return Scale(gain=factor, step_v=None if step is None else step * factor)

    def _time(self, clock: int | None) -> tuple[UniformTime | StampedTime, tuple[Span, ...]]:
        if clock is None:
            assert self.interval_s is not None
            spans = (Span(start=0, stop=self.scan.n_rows, start_s=0.0),)
            return UniformTime(dt_s=self.interval_s), spans
        timebase = self.timebases[clock]
        if timebase.uniform is not None:
            return timebase.uniform, timebase.spans
        stamps = self._stamps(clock, timebase)
        return StampedTime(stamps=stamps, resolution_s=timebase.resolution_s), timebase.spans

    def _stamps(self, clock: int, timebase: Timebase) -> Samples:
        unit, origin = self.units[clock], self.scan.clocks[clock].pieces[0].first_t
        stamps: Samples
        if self.scan.table is not None:
            kept = np.delete(self.scan.table[:, clock], _within(timebase.dropped, self.scan.n_rows))
            stamps = ArraySamples((kept - origin) * unit.times / unit.over)
        else:
            stamps = TextSamples(
                source=self.rows.only(clock),
                index=self.scan.index,
                dropped=_within(timebase.dropped, self.scan.n_rows),
                n_rows=self.scan.n_rows,
                dtype=np.dtype(np.float64),
                origin=origin,
                times=unit.times,
                over=unit.over,
                spool=self.scan.spool_of(clock),
                place=clock,
            )
        if not any(timebase.shifts_s):
            return stamps
        starts = tuple(span.start for span in timebase.spans)
        return ShiftedStamps(stamps=stamps, starts=starts, shifts_s=timebase.shifts_s)


def _within(dropped: NDArray[np.int64], n_rows: int) -> NDArray[np.int64]:
    return dropped[dropped < n_rows]


def value_unit(column: Column, stated: str) -> tuple[str, float, bool]:
    """Return the unit of a channel, its size in that unit, and whether volts were assumed."""
    for text in (column.unit, stated):
        factor = unitwords.volt_factor(text)
        if factor is not None:
            return "V", factor, False
    told = column.unit.strip()
    if told and told.lower() not in unitwords.COUNT_UNITS and told.lower() not in _CODES:
        return told, 1.0, False
    return "V", 1.0, True


_CODES = frozenset({"code", "codes", "lsb", "raw", "1", "bool"})


def _prints_integers(column: Column, layout: Layout) -> bool:
    cells = (row[column.field] for row in layout.rows)
    return all(cell.lstrip("+-").isdigit() for cell in cells if cell)


def _printed_step(column: Column, layout: Layout) -> float | None:
    """Return the size of the last digit, where all values are printed to the same one."""
    digits = [last_digit(row[column.field], layout.decimal) for row in layout.rows]
    told = [d for d in digits if d is not None]
    return 10.0 ** told[0] if told and len(set(told)) == 1 and abs(told[0]) < 300 else None


def is_logic(column: Column, channel: Range, layout: Layout, *, others: bool) -> bool:
    """Say whether a channel is sampled logic: states, or 0 and 1 printed as such, no volts.

    Args:
        column: The column.
        channel: What all its values have in common.
        layout: Layout of the rows.
        others: Whether another channel of the file is logic.
    """
    if column.kind in "WH":
        return True
    if not channel.binary or unitwords.volt_factor(column.unit) is not None:
        return False
    if not _prints_integers(column, layout):
        return False
    return others or channel.low != channel.high


def refuse_empty(ranges: tuple[Range, ...], source: str) -> None:
    """Refuse a file no channel of which holds a single number.

    Raises:
        MalformedCaptureError: With code ``no-values``.
    """
    if not any(channel.n_told for channel in ranges):
        raise MalformedCaptureError(
            f"no value column of {source} holds a number",
            hint="Save the capture again; all its values are missing.",
            path=source,
            code="no-values",
        )
