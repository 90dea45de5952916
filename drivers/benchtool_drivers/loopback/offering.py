"""A simulated board offered as an instrument, or as a device that prints edge times."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator

import numpy as np

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import UniformTime, Waveform
from benchtool_drivers.loopback.board import SimulatedBoard
from benchtool_drivers.loopback.edge_printer import DeviceForm, Printer
from benchtool_drivers.loopback.edge_stream import EdgeDevice
from benchtool_drivers.loopback.families import FAMILIES, make_family
from benchtool_drivers.loopback.families.counters import COUNTERS, Beat
from benchtool_drivers.loopback.serving import serve_forever

WAYS = {"tcp": "socket", "hislip": "hislip", "pty": ""}
"""Name of a way to offer a board, and the transport of it; a terminal carries edge lines."""


@frozen_record
class Offer:
    """How a board is offered.

    Attributes:
        way: One of ``WAYS``.
        family: Structure that the instrument speaks, one of ``FAMILIES`` or ``COUNTERS``.
        port: TCP port, 0 for a free one.
        pace: Seconds of the board in a second of time, of edge lines.
        tick_hz: Ticks in a second, of edge lines.
    """

    way: str
    family: str = "positional"
    port: int = 0
    pace: float = 1.0
    tick_hz: int = 1_000_000


def offer_board(board: SimulatedBoard, offer: Offer, announce: Callable[[str], None]) -> None:
    """Offer a board until the user interrupts.

    Args:
        board: The board.
        offer: How.
        announce: Is told how to reach it: a resource string, or the name of a port.

    Raises:
        UsageError: If there is no such family (``no-such-family``), or the board stands still and
            prints no edges (``no-edges-to-send``).
    """
    if offer.way == "pty":
        _offer_edges(board, offer, announce)
        return
    if offer.family in COUNTERS:
        _offer_counter(board, offer, announce)
        return
    if offer.family not in FAMILIES:
        raise UsageError(
            f"no simulated instrument speaks as {offer.family!r}",
            hint=f"One of {', '.join((*FAMILIES, *COUNTERS))}.",
            code="no-such-family",
        )
    start_s = time.monotonic()

    def volts() -> list[FloatArray]:
        capture = board.record(time.monotonic() - start_s)
        return [_volts(trace) for trace in capture.traces if isinstance(trace, Waveform)]

    first = board.record(0.0).traces[0]
    if not isinstance(first, Waveform) or not isinstance(first.time, UniformTime):
        raise UsageError(
            "an instrument shows waveforms", hint="Leave out --kind, or use --serve pty for edges."
        )
    subject = make_family(offer.family, volts=volts, dt_s=first.time.dt_s)
    serve_forever(subject, WAYS[offer.way], announce, port=offer.port)


def _offer_counter(board: SimulatedBoard, offer: Offer, announce: Callable[[str], None]) -> None:
    """Offer a counter that looks at the board; its readings take no time."""
    start_s = time.monotonic()

    def beat() -> Beat:
        found = board.beat(time.monotonic() - start_s)
        if found is None:
            raise UsageError(
                "this board stands still: a counter sees no edge of it",
                hint="Choose a fault with which it runs.",
                code="no-edges-to-send",
            )
        return found

    subject = COUNTERS[offer.family](beat, tick_s=1 / offer.tick_hz)
    serve_forever(subject, WAYS[offer.way], announce, port=offer.port)


def _volts(trace: Waveform) -> FloatArray:
    samples = np.concatenate(list(trace.samples.blocks())).astype(np.float64)
    volts: FloatArray = samples * trace.scale.gain + trace.scale.offset
    return volts


def _offer_edges(board: SimulatedBoard, offer: Offer, announce: Callable[[str], None]) -> None:
    edges = board.edges()
    if next(edges, None) is None:
        raise UsageError(
            "this board stands still and sends no edge",
            hint="Choose a fault with which it runs, or --serve tcp.",
            code="no-edges-to-send",
        )
    printer = Printer(DeviceForm(tick_hz=offer.tick_hz))
    with EdgeDevice(_times(board.edges()), printer, pace=offer.pace) as port:
        announce(port)
        for_ever = threading.Event()
        try:
            while not for_ever.wait(3600.0):
                pass
        except KeyboardInterrupt:
            return


def _times(edges: Iterator[tuple[float, bool]]) -> Iterator[float]:
    return (time_s for time_s, _ in edges)
