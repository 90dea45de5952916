"""Traces from the values of a transfer: channels apart, gaps masked, time and scale put on."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, BoolArray, FloatArray
from benchtool.model.capture import (
    ArraySamples,
    Scale,
    Span,
    StampedTime,
    StructurePoint,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice
from benchtool_drivers.dialect.records import DataKeys, DigitiserKeys
from benchtool_drivers.digitiser.scaling import find_scale, find_time, printed_u_rel
from benchtool_drivers.digitiser.talk import Talk
from benchtool_drivers.digitiser.transfer import Raw

_NO_READING_V = 9.0e36
"""SCPI-1999, volume 1, 7.2.1: 9.9E37 is infinity and 9.91E37 is not a number; no voltage is."""

_INT32 = 2.0**31
_EVEN = 1e-3
"""Share of a step by which stamps may differ from an even row and still be one."""


@frozen_record(eq=False)
class Made:
    """Traces, with what was found and noticed on the way."""

    traces: tuple[Waveform, ...]
    points: tuple[StructurePoint, ...]
    notices: tuple[Notice, ...]


def make_traces(talk: Talk, raw: Raw, channels: Sequence[str]) -> Made:
    """Return the traces of one transfer.

    Args:
        talk: The instrument.
        raw: The values.
        channels: The channels that they hold, in their order.

    Raises:
        ReplyError: If no sample of a channel is valid, or they are not what the dialect says.
    """
    body: DigitiserKeys = talk.dialect.body
    values = _shifted(_as_codes(raw.values, body), body.data.shift)
    traces: list[Waveform] = []
    notices: list[Notice] = []
    points: list[StructurePoint] = []
    for n, channel in enumerate(channels):
        row = values[n :: len(channels)] if len(channels) > 1 else values
        maker = _Maker(talk, raw, channel)
        traces += maker.waveforms(row)
        notices += maker.notices
        points = points or maker.points
    if not raw.known:
        notices.append(_assumed_length(values.size))
    return Made(traces=tuple(traces), points=tuple(points), notices=tuple(dict.fromkeys(notices)))


def _as_codes(values: AnyArray, body: DigitiserKeys) -> AnyArray:
    """Return printed codes as the whole numbers they are, so that their step is known."""
    printed = body.data.dtype == "ascii" and body.scale.y != "none"
    if not printed or body.data.pairs or not values.size:
        return values
    low, high = float(values.min()), float(values.max())
    whole = low >= -_INT32 and high < _INT32 and bool(np.all(values == np.rint(values)))
    return values.astype(np.int32) if whole else values


def _shifted(values: AnyArray, n_bits: int) -> AnyArray:
    if not n_bits or values.dtype.kind not in "iu":
        return values
    shifted: AnyArray = np.right_shift(values, n_bits)
    return shifted


def _assumed_length(n_values: int) -> Notice:
    return Notice(
        code="assumed-record-length",
        text=f"nothing but the block itself says that the record has {n_values} samples; a query "
        "for the length, as total in [chunk], would check it",
    )


class _Maker:
    """Makes the waveforms of one channel."""

    def __init__(self, talk: Talk, raw: Raw, channel: str) -> None:
        self._talk = talk
        self._raw = raw
        self._channel = channel
        self._body: DigitiserKeys = talk.dialect.body
        self.notices: list[Notice] = []
        self.points: list[StructurePoint] = []

    def waveforms(self, row: AnyArray) -> Iterator[Waveform]:
        """Yield the channel, or the logic channels in the bits of its samples."""
        stamps: FloatArray | None = None
        if self._body.data.pairs:
            stamps, row = row[0::2].astype(np.float64), row[1::2]
        is_codes = row.dtype.kind in "iu"
        samples = self._masked(self._middle(row))
        time = self._time(samples.size, stamps)
        spans = (Span(start=0, stop=int(samples.size), start_s=0.0),)
        bits = self._body.data.bits
        for name, bit in bits.items():
            states = ((samples.astype(np.int64) >> bit) & 1).astype(np.uint8)
            yield Waveform(
                samples=ArraySamples(states), time=time, spans=spans, channel=name, unit="1"
            )
        if not bits:
            scale = self._scale(is_codes=is_codes)
            yield Waveform(
                samples=ArraySamples(samples),
                time=time,
                spans=spans,
                channel=self._channel,
                scale=scale,
            )

    def _scale(self, *, is_codes: bool) -> Scale:
        scale = find_scale(self._talk, self._raw.fields, of_codes=is_codes)
        text = f"{scale.gain:.9g} V a code, {scale.offset:.6g} V at code 0" if is_codes else "volts"
        self._point("scale", text, f"the form {self._body.scale.y!r} of the dialect")
        return scale

    def _time(self, n_points: int, stamps: FloatArray | None) -> UniformTime | StampedTime:
        if stamps is not None:
            return self._stamped(stamps)
        dt_s, start_s = find_time(self._talk, self._raw.fields, n_points)
        self._point("sample interval", f"{dt_s:.9g} s", f"the form {self._body.scale.x!r}")
        self._point("first sample", f"{start_s:.9g} s after the trigger", "the preamble")
        return UniformTime(dt_s=dt_s, u_rel=printed_u_rel(self._talk, self._raw.fields))

    def _stamped(self, stamps: FloatArray) -> UniformTime | StampedTime:
        """Return an even time where the stamps are even, and the stamps otherwise."""
        stamps = stamps - stamps[0]
        if stamps.size < 2 or not bool(np.all(np.diff(stamps) > 0)):
            raise self._talk.wrong(
                "the times beside the samples do not rise",
                hint="Is the time the first value of each pair? Compare pairs in [data].",
                command=self._body.data.query,
                expected="rising times",
                got=", ".join(f"{item:g}" for item in stamps[:4]),
            )
        dt_s = float(stamps[-1]) / (stamps.size - 1)
        off = np.abs(stamps - np.arange(stamps.size) * dt_s).max()
        self._point("sample interval", f"{dt_s:.9g} s", "the times beside the samples")
        if off <= _EVEN * dt_s:
            return UniformTime(dt_s=dt_s)
        return StampedTime(stamps=ArraySamples(stamps))

    def _middle(self, row: AnyArray) -> AnyArray:
        """Return the samples, of an envelope the middle of each pair."""
        data: DataKeys = self._body.data
        form = self._raw.fields.look_up(data.envelope, "envelope")
        if form == "none":
            return row
        if form == "refuse" or row.size % 2:
            raise self._talk.wrong(
                "the instrument delivers an envelope, and not the samples themselves",
                hint="Switch its acquisition from peak detection to plain samples.",
                command=data.query,
                expected="samples",
                got="pairs of least and greatest",
                code="envelope-refused",
            )
        self.notices.append(
            Notice(
                code="envelope",
                text=f"each of {row.size // 2} points of {self._channel} has two samples, the "
                "ends of an envelope: their middle was taken, so an edge is known to one step and "
                "a glitch may be missed",
            )
        )
        return np.add(row[0::2], row[1::2], dtype=np.float64) / 2

    def _masked(self, samples: AnyArray) -> AnyArray:
        """Return samples with those that are none as NaN.

        Raises:
            ReplyError: If none is left (``no-valid-samples``).
        """
        bad = self._invalid(samples)
        n_bad = int(np.count_nonzero(bad)) if bad is not None else 0
        if bad is None or not n_bad:
            return samples
        if n_bad == samples.size:
            raise self._talk.wrong(
                f"none of the {n_bad} samples of {self._channel} is valid",
                hint="Is the channel on and in range? The instrument marks each as not measured.",
                command=self._body.data.query,
                expected="voltages",
                got=str(samples[0]),
                code="no-valid-samples",
            )
        self.notices.append(
            Notice(
                code="invalid-samples",
                text=f"{n_bad} of {samples.size} samples of {self._channel} are marked by the "
                "instrument as not measured: they are a gap",
            )
        )
        kept = samples.astype(np.float64) if samples.dtype.kind in "iu" else samples.copy()
        kept[bad] = np.nan
        return kept

    def _invalid(self, samples: AnyArray) -> BoolArray | None:
        if samples.dtype.kind in "iu":
            codes = self._body.data.missing_codes
            return np.isin(samples, codes) if codes else None
        if self._all_plain(samples):
            return None
        with np.errstate(invalid="ignore"):
            bad: BoolArray = ~np.isfinite(samples) | (np.abs(samples) >= _NO_READING_V)
            for value in self._body.scale.invalid:
                bad |= np.isclose(samples, value, rtol=1e-6, atol=0.0)
        return bad

    def _all_plain(self, samples: AnyArray) -> bool:
        """Say whether no sample can be marked, from the least and the greatest alone."""
        low, high = float(samples.min()), float(samples.max())  # NaN, where one is there
        room = 1e-5 * max(abs(low), abs(high))
        near = any(low - room <= mark <= high + room for mark in self._body.scale.invalid)
        return not near and -_NO_READING_V < low <= high < _NO_READING_V

    def _point(self, name: str, value: str, evidence: str) -> None:
        self.points.append(StructurePoint(name=name, value=value, evidence=evidence, sure="stated"))
        self._talk.tell("note", name, value, evidence)
