"""Square waves with exact truth: the generator that the timing tests measure against."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.capture import (
    ArraySamples,
    LogicTrace,
    Scale,
    Span,
    TimeSpan,
    UniformTime,
    Waveform,
)

LOW_V, HIGH_V = 0.3, 4.7
FULL_SCALE_V = 6.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Board:
    """What the oscillator does, its long-run means being the truth.

    ``wander`` is the accumulating noise of a period, relative; ``edge_noise`` the noise of an
    edge's own time, relative to the period.
    """

    period_s: float
    duty: float
    wander: float = 0.0
    edge_noise: float = 0.0

    @property
    def truth(self) -> dict[str, float]:
        """The figures that a measurement should find."""
        high_s = self.period_s * self.duty
        return {
            "t_high": high_s,
            "t_low": self.period_s - high_s,
            "period": self.period_s,
            "frequency": 1 / self.period_s,
            "duty": self.duty,
        }


def edge_times(board: Board, n_periods: int, rng: np.random.Generator) -> FloatArray:
    """Return the times of 2·n + 1 edges, the first one rising, from time zero."""
    means = np.array([board.duty, 1 - board.duty]) * board.period_s
    widths = np.tile(means, n_periods)
    sd_s = board.wander * board.period_s / np.sqrt(2)
    widths = widths + rng.normal(0, 1, widths.size) * sd_s
    edges = np.concatenate([[0.0], np.cumsum(widths)])
    noise_s = rng.normal(0, 1, edges.size) * board.edge_noise * board.period_s
    return edges + noise_s


def cut_record(
    edges: FloatArray, n_periods: int, margin_s: float, rng: np.random.Generator
) -> tuple[float, float]:
    """Return start and end of a record with exactly ``n_periods`` from rising to rising edge.

    The outer edges lie ``margin_s`` inside, so that samples on both sides show them.
    """
    rises = edges[::2]
    start_s = rng.uniform(rises[0] + margin_s, rises[1] - margin_s)
    return start_s, rng.uniform(rises[n_periods + 1] + margin_s, rises[n_periods + 2] - margin_s)


def trapezoid(times_s: FloatArray, edges: FloatArray, rise_s: float) -> FloatArray:
    """Return the 0..1 wave with straight edges of full length ``rise_s`` centred on the edges."""
    corners = (edges[:, None] + np.array([-rise_s / 2, rise_s / 2])).ravel()
    levels = np.tile([0.0, 1.0, 1.0, 0.0], edges.size // 2 + 1)[: corners.size]
    return np.interp(times_s, corners, levels)


def exponential(times_s: FloatArray, edges: FloatArray, tau_s: float) -> FloatArray:
    """Return the 0..1 wave behind an RC low-pass that settles between edges."""
    last = np.searchsorted(edges, times_s, side="right") - 1
    since_s = times_s - edges[np.maximum(last, 0)]
    left = np.exp(-since_s / tau_s)
    wave: FloatArray = np.where(last % 2 == 0, 1 - left, left)
    return np.where(last < 0, 0.0, wave)


def as_waveform(
    values: AnyArray, dt_s: float, *, scale: Scale | None = None, unit: str = "V"
) -> Waveform:
    """Return a gap-free waveform of samples."""
    return Waveform(
        samples=ArraySamples(values),
        scale=scale or Scale(),
        time=UniformTime(dt_s=dt_s),
        spans=(Span(start=0, stop=values.size, start_s=0.0),),
        channel="OUT",
        unit=unit,
    )


def digitise(
    wave: FloatArray, dt_s: float, *, bits: int, noise_v: float, rng: np.random.Generator
) -> Waveform:
    """Return a 0..1 wave as the codes of a converter with noise before it."""
    volts = LOW_V + (HIGH_V - LOW_V) * wave
    volts += rng.normal(0, 1, wave.size) * noise_v
    gain = FULL_SCALE_V / 2**bits
    codes = np.clip(np.round(volts / gain), 0, 2**bits - 1) - 2 ** (bits - 1)
    kind = np.int8 if bits <= 8 else np.int16
    scale = Scale(gain=gain, offset=gain * 2 ** (bits - 1), step_v=gain)
    return as_waveform(codes.astype(kind), dt_s, scale=scale)


def sampled_logic(wave: FloatArray, dt_s: float) -> Waveform:
    """Return a 0..1 wave as sampled logic states."""
    return as_waveform((wave > 0.5).astype(np.uint8), dt_s, unit="1")


def transitions(
    edges: FloatArray, start_s: float, end_s: float, tick_s: float, *, stretch: float = 1.0
) -> LogicTrace:
    """Return the record as a logic trace whose times are whole ticks."""
    inside = (edges > start_s) & (edges <= end_s)
    rising = np.arange(edges.size) % 2 == 0
    ticks = np.ceil((edges[inside] - start_s) / tick_s)
    states = rising[inside]
    end_ticks = np.ceil((end_s - start_s) / tick_s)
    return LogicTrace(
        times_s=ticks * tick_s * stretch,
        states=states,
        spans=(
            TimeSpan(
                start_s=0.0, end_s=float(end_ticks * tick_s * stretch), starts_high=not states[0]
            ),
        ),
        tick_s=tick_s * stretch,
        channel="OUT",
    )
