"""The edges of a stretch as a capture."""

from __future__ import annotations

import hashlib

import numpy as np

from benchtool.model.capture import Capture, LogicTrace, Origin, StructurePoint, TimeSpan
from benchtool.model.quantity import Notice
from benchtool.model.window import Window
from benchtool_drivers.streams.layout import PS_HZ, Layout
from benchtool_drivers.streams.mishaps import notices
from benchtool_drivers.streams.window import EdgeWindow


def capture_stretch(
    edges: EdgeWindow,
    layout: Layout,
    source: str,
    *,
    decimals: int = 0,
    whole: bool = False,
    extra: tuple[Notice, ...] = (),
) -> Capture:
    """Return the edges held as a capture of one logic trace.

    Args:
        edges: The edges; at least one row has come.
        layout: What the lines look like.
        source: The connection, as the user named it.
        decimals: Most decimals that a time was printed with.
        whole: Whether it is all of a record; otherwise it is a window of an endless one, and says
            where in it.
        extra: Notices to add.
    """
    seconds = _Seconds(edges.first_tick, layout.tick_hz)
    spans = _spans(edges, seconds)
    times_s = seconds.of(edges.ticks)
    digest = hashlib.sha256(edges.ticks.tobytes())
    digest.update(edges.levels.tobytes())
    trace = LogicTrace(
        times_s=times_s,
        states=edges.levels.copy(),
        spans=spans,
        tick_s=tick_seconds(layout, decimals),
        channel=layout.channel,
        end_known=bool(not times_s.size or spans[-1].end_s > times_s[-1]),
    )
    return Capture(
        origin=Origin(source=source, format=layout.name, sha256=digest.hexdigest()),
        traces=(trace,),
        structure=_structure(layout, edges.ticks.size, decimals),
        warnings=(*notices(edges.mishaps), *_assumed(layout), *extra),
        window=None if whole else _window(spans),
    )


def tick_seconds(layout: Layout, decimals: int) -> float:
    """Return the resolution of the times in seconds: a tick, or the last digit printed."""
    if layout.unit_ticks == 1:
        return 1 / layout.tick_hz
    return max(1.0, layout.unit_ticks / 10.0**decimals) / layout.tick_hz


class _Seconds:
    """Seconds after the first row."""

    def __init__(self, first_tick: int, tick_hz: float) -> None:
        self._first_tick = first_tick
        self._tick_hz = tick_hz

    def of(self, ticks: np.ndarray) -> np.ndarray:
        return (ticks - self._first_tick) / self._tick_hz

    def one(self, tick: int) -> float:
        return (tick - self._first_tick) / self._tick_hz


def _spans(edges: EdgeWindow, seconds: _Seconds) -> tuple[TimeSpan, ...]:
    """Return the pieces; one whose beginning has left begins at its first edge that is held."""
    spans = []
    for i, piece in enumerate(edges.pieces):
        start, high = piece.start, piece.starts_high
        if i == 0 and piece.first < edges.n_gone and edges.ticks.size:
            start, high = int(edges.ticks[0]), not edges.levels[0]
        start_s, end_s = seconds.one(start), seconds.one(piece.end)
        spans.append(TimeSpan(start_s=start_s, end_s=end_s, starts_high=bool(high)))
    return tuple(spans)


def _window(spans: tuple[TimeSpan, ...]) -> Window | None:
    """Return where in the endless record the stretch lies."""
    from_s, to_s = spans[0].start_s, spans[-1].end_s
    return Window(from_s=from_s, to_s=to_s) if to_s > from_s else None


def _structure(layout: Layout, n_edges: int, decimals: int) -> tuple[StructurePoint, ...]:
    own = layout.heartbeat_s is not None
    said = "its header line" if own else "its description"
    points = [
        ("kind", "transitions", "one line an edge"),
        ("columns", ", ".join(layout.columns), said),
        ("tick", f"{tick_seconds(layout, decimals):.9g} s", said),
        ("channels", layout.channel, said),
        ("edges", str(n_edges), "lines read"),
    ]
    if layout.wrap_bits:
        points.insert(3, ("tick_bits", str(layout.wrap_bits), said))
    if layout.tick_hz == PS_HZ:
        points[2] = (*points[2][:2], "last digit printed")
    return tuple(
        StructurePoint(name=name, value=value, evidence=evidence, sure="stated")
        for name, value, evidence in points
    )


def _assumed(layout: Layout) -> tuple[Notice, ...]:
    if layout.first_level is None:
        return ()
    edge = "a rising" if layout.first_level else "a falling"
    return (
        Notice(
            code="assumed-first-level",
            text=f"the lines give no level; the first that came was taken as {edge} edge, as the "
            "description says",
        ),
    )
