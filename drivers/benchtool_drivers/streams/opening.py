"""From the name of a connection to a stream of edges."""

from __future__ import annotations

import sys
from pathlib import Path

from benchtool.errors import InputError, UsageError
from benchtool_drivers.streams.description import load_description
from benchtool_drivers.streams.feed import Feed, Tap
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.pipe import GrowingTap, PipeTap
from benchtool_drivers.streams.port import open_port
from benchtool_drivers.streams.stream import MOST_PERIODS, WINDOW_PERIODS, EdgeStream

BAUD = 115_200
"""Speed where none is given; devices on USB that are no adapters take any."""


def open_stream(
    name: str,
    *,
    description: str | Path | Layout | None = None,
    baud: int | None = None,
    window_periods: int = WINDOW_PERIODS,
    window_s: float | None = None,
) -> EdgeStream:
    """Open a stream of edges.

    Args:
        name: A serial port (``/dev/ttyACM0``, ``COM3``), a URL of pyserial (``socket://host:port``),
            ``-`` for standard input, or a file to which lines are appended.
        description: A description file, or a layout; None for lines of our own format.
        baud: Bits a second of a port.
        window_periods: Periods that ``newest`` gives at most.
        window_s: Seconds that it gives at most, though never less than two periods.

    Raises:
        UsageError: If the window is none, or the port's speed or name cannot be.
        InputError: If the description or a file cannot be read.
        DesignError: ``stream-description``: if the description has faults.
        NotConnectedError: If the port cannot be opened.
        DriverMissingError: If pyserial is not installed.
    """
    _check_window(window_periods, window_s)
    layout = description
    if layout is not None and not isinstance(layout, Layout):
        layout = load_description(layout)
    tap, joined = _open_tap(name, baud or BAUD)
    return EdgeStream(
        Feed(tap, name),
        name,
        layout,
        window_periods=window_periods,
        window_s=window_s,
        joined=joined,
    )


def _check_window(window_periods: int, window_s: float | None) -> None:
    if not 2 <= window_periods <= MOST_PERIODS:
        raise UsageError(
            f"a window of {window_periods} periods is not possible",
            hint=f"give 2 to {MOST_PERIODS} periods",
        )
    if window_s is not None and not window_s > 0:
        raise UsageError(
            f"a window of {window_s:g} s is not possible", hint="give a length above 0"
        )


def _open_tap(name: str, baud: int) -> tuple[Tap, bool]:
    """Return where bytes come from, and whether the stream had begun before."""
    if name == "-":
        return PipeTap(sys.stdin.buffer, "standard input"), False
    path = Path(name)
    if "://" not in name and path.is_file():
        try:
            return GrowingTap(path.open("rb", buffering=0), name), False
        except OSError as error:
            raise InputError(
                f"{name!r} cannot be read: {error.strerror or error}",
                hint="ask for permission to read it, or copy it",
                code="unreadable",
            ) from None
    return open_port(name, baud), True
