"""Edge lines through a pseudo-terminal; prints lines a second and ratios, asserts nothing.

The device is a process of its own that writes prepared lines as fast as they are taken. The ways
are taken in turn, several times, and the fastest of each counts. ``bare`` reads the port and counts
line ends: what the way there costs alone. ``readline`` is the library's own, for a part of the
lines. ``parse`` is from bytes in memory to edges, without a port.

    python tests/benchmarks/streams.py [LINES]
"""

from __future__ import annotations

import multiprocessing
import os
import sys
import time
import tty
from collections.abc import Callable
from itertools import chain, repeat

import numpy as np
import serial

from benchtool_drivers.loopback.edge_printer import DeviceForm, Printer
from benchtool_drivers.streams.intake import Intake
from benchtool_drivers.streams.opening import open_stream
from benchtool_drivers.streams.window import EdgeWindow

N_LINES = 1_000_000
N_RUNS = 3
READLINE_PART = 50
FAULTY_EVERY = 100


def prepared(n: int, *, xor_sum: bool = False) -> bytes:
    """Return ``n`` edge lines with headers between them."""
    printer = Printer(DeviceForm(tick_bits=24, header_every=10_000, xor_sum=xor_sum))
    times_s = np.cumsum(np.where(np.arange(n) % 2, 0.0003, 0.0007)).tolist()
    return b"".join(printer.edge(time_s) for time_s in times_s)


def spoilt(lines: bytes) -> bytes:
    """Return the lines with one of a hundred made unreadable."""
    rows = lines.split(b"\n")
    rows[50::FAULTY_EVERY] = [b"\xff" + row[1:] for row in rows[50::FAULTY_EVERY]]
    return b"\n".join(rows)


def _write_all(fd: int, lines: bytes, ready: int) -> None:
    os.read(ready, 1)
    view = memoryview(lines)
    while view:
        view = view[os.write(fd, view[: 1 << 16]) :]
    time.sleep(60)


def through_terminal(lines: bytes, read: Callable[[str, Callable[[], None]], float]) -> float:
    """Return the seconds that ``read`` takes for the lines of a device of its own."""
    ours, theirs = os.openpty()
    tty.setraw(theirs)
    ready, go = os.pipe()
    device = multiprocessing.get_context("fork").Process(
        target=_write_all, args=(ours, lines, ready), daemon=True
    )
    device.start()
    try:
        return read(os.ttyname(theirs), lambda: os.write(go, b"g") and None)
    finally:
        device.kill()
        device.join()
        for each in (ours, theirs, ready, go):
            os.close(each)


def read_stream(n_edges: int) -> Callable[[str, Callable[[], None]], float]:
    """Return a reader that takes edges as ``acquire`` does."""

    def read(port: str, go: Callable[[], None]) -> float:
        stream = open_stream(port)
        go()
        start = time.perf_counter()
        stream.record(until_periods=n_edges // 2 - 2)
        seconds = time.perf_counter() - start
        stream.close()
        return seconds

    return read


def read_bare(n_bytes: int) -> Callable[[str, Callable[[], None]], float]:
    """Return a reader that takes what waits and counts line ends."""

    def read(name: str, go: Callable[[], None]) -> float:
        with serial.Serial(name, timeout=0.05) as port:
            go()
            start = time.perf_counter()
            left = n_bytes
            while left > 0:
                data = port.read(port.in_waiting or 1)
                data.count(b"\n")
                left -= len(data)
            return time.perf_counter() - start

    return read


def read_lines(n: int) -> Callable[[str, Callable[[], None]], float]:
    """Return a reader that takes ``n`` lines by the library's own ``readline``."""

    def read(name: str, go: Callable[[], None]) -> float:
        with serial.Serial(name, timeout=0.5) as port:
            go()
            start = time.perf_counter()
            for _ in range(n):
                fields = port.readline().split(b",")
                if len(fields) == 3:
                    int(fields[1])
            return time.perf_counter() - start

    return read


def parse(lines: bytes) -> float:
    """Return the seconds from bytes to edges."""
    start = time.perf_counter()
    intake = Intake("memory", None, [EdgeWindow()], joined=False)
    for first in range(0, len(lines), 1 << 16):
        intake.feed(lines[first : first + (1 << 16)])
    return time.perf_counter() - start


def main() -> None:
    """Measure all ways and print the ratios."""
    n = int(sys.argv[1]) if len(sys.argv) > 1 else N_LINES
    plain = prepared(n)
    sums, faulty = prepared(n, xor_sum=True), spoilt(plain)
    few = n // READLINE_PART
    ways: dict[str, tuple[int, Callable[[], float]]] = {
        "parse": (n, lambda: parse(plain)),
        "parse, check sums": (n, lambda: parse(sums)),
        "parse, 1 % garbage": (n, lambda: parse(faulty)),
        "stream": (n, lambda: through_terminal(plain, read_stream(n))),
        "bare": (n, lambda: through_terminal(plain, read_bare(len(plain)))),
        "readline": (few, lambda: through_terminal(plain, read_lines(few))),
    }
    seconds: dict[str, list[float]] = {name: [] for name in ways}
    for name, (_, way) in chain.from_iterable(repeat(list(ways.items()), N_RUNS)):
        seconds[name].append(way())
    rates = {name: count / min(seconds[name]) for name, (count, _) in ways.items()}
    print(f"{n} lines, {len(plain) / n:.1f} bytes each")
    for name, rate in rates.items():
        print(f"{name:20} {rate / 1e6:8.3f} M lines/s")
    print(f"stream / readline {rates['stream'] / rates['readline']:8.1f}")
    print(f"stream / bare     {rates['stream'] / rates['bare']:8.2f}")
    print("targets: stream 1 M lines/s, parse 1.5 M lines/s")


if __name__ == "__main__":
    main()
