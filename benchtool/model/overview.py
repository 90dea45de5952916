"""Enough of a trace to draw it."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray


@frozen_record(eq=False)
class Overview:
    """Enough of the trace to draw it without its samples.

    Attributes:
        envelope_s: Bin times of the first cycles, shape (n,), n <= 2000.
        envelope_low_v, envelope_high_v: Least and greatest sample of each bin, shape (n,).
        edges_s: Edges inside the envelope's time range, shape (m,).
        histogram_s: Bin limits of the periods, shape (k+1,).
        histogram_count: Periods a bin, shape (k,).
        periods_at_s, periods_s: At most 500 periods over time, shape (p,) each.
    """

    envelope_s: FloatArray
    envelope_low_v: FloatArray
    envelope_high_v: FloatArray
    edges_s: FloatArray
    histogram_s: FloatArray
    histogram_count: FloatArray
    periods_at_s: FloatArray
    periods_s: FloatArray
