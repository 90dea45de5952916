"""The samples around each edge, cut out of a waveform that is walked once more."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import UniformTime, Waveform
from benchtool.timing.pieces import Index, Stretch, walk_stretches

_MOST = 1 << 19  # samples that are cut out at once

Window = tuple[Index, FloatArray, FloatArray]
"""Which edges, the times of the samples around each against that of its index, and the samples.

Both are of shape (edges, samples); all samples of one place lie side by side in memory.
"""


def cut_windows(waveform: Waveform, index: Index, half: int, *, holed: bool) -> Iterator[Window]:
    """Yield the samples around each edge that has all of them.

    Args:
        waveform: The trace; walked once.
        index: Index of the first sample past the mid level, ascending, shape (n,).
        half: Samples before and after the crossing.
        holed: Whether samples of the trace are missing.
    """
    done = 0
    before: Stretch | None = None
    for here in walk_stretches(waveform, holed=holed):
        if here.begins_run:
            before = None
        stop = here.first + here.values.size
        until = int(np.searchsorted(index, stop - half, side="right"))
        if until > done:
            at = index[done:until]
            first = here.first if before is None else before.first
            which = done + ((at - half >= first) & (at + half <= stop)).nonzero()[0]
            for some in _in_parts(which, half):
                yield _cut(waveform, some, index[some], (before, here), half)
            done = until
        before = _joined(before, here, half) if here.values.size < 2 * half else here


def _joined(before: Stretch | None, here: Stretch, half: int) -> Stretch:
    """Return the end of a stretch and the beginning of the next: what a window may lie in."""
    after = here.part(0, 2 * half)
    if before is None:
        return after
    size = before.values.size
    before = before.part(max(0, size - 2 * half), size)
    stamps = None
    if before.times_s is not None and after.times_s is not None:
        stamps = np.concatenate([before.times_s, after.times_s])
    values = np.concatenate([before.values, after.values])
    return Stretch(values=values, first=before.first, times_s=stamps, begins_run=False)


def _in_parts(which: Index, half: int) -> Iterator[Index]:
    step = max(1, _MOST // (2 * half))
    for start in range(0, which.size, step):
        yield which[start : start + step]


def _cut(
    waveform: Waveform,
    which: Index,
    at: Index,
    sources: tuple[Stretch | None, Stretch],
    half: int,
) -> Window:
    """Cut the windows that begin before a stretch out of its seam with the one before."""
    before, here = sources
    n_seam = int(np.searchsorted(at, here.first + half))
    parts = [(here, slice(n_seam, None))]
    if n_seam:
        parts.insert(0, (_joined(before, here, half), slice(0, n_seam)))
    offsets = np.arange(-half, half)
    values = np.empty((2 * half, which.size))
    stamps: list[FloatArray] = []
    for source, part in parts:
        centre = at[part] - source.first
        for row, offset in zip(values, offsets.tolist(), strict=True):
            row[part] = source.values.take(centre + offset)
        if source.times_s is not None:
            stamps.append(source.times_s[centre[:, None] + offsets] - source.times_s[centre, None])
    if isinstance(waveform.time, UniformTime):
        return which, np.broadcast_to(offsets * waveform.time.dt_s, values.T.shape), values.T
    return which, np.concatenate(stamps), values.T
