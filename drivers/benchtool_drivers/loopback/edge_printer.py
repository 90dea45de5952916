"""What a device prints for edges, with what can go wrong on the way.

It writes the format by its own code, so that the reader is not tested against itself.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Literal

from benchtool.frozen import frozen_record

FaultKind = Literal["lost", "garbage", "duplicate", "stall", "unplug", "half-line", "restart"]


@frozen_record
class StreamFault:
    """What goes wrong, and when.

    Attributes:
        kind: ``lost`` lines are left out; ``garbage`` stands in place of a line; a ``duplicate``
            is sent twice; ``stall`` sends nothing for a while; ``half-line`` is cut off in its
            middle and runs into the next; ``unplug`` hangs up in the middle of a line;
            ``restart`` begins all counters anew.
        at: Number of the edge, from 1.
        n: How many edges it takes.
        every: Again after so many edges; 0 for once.
        stall_s: How long a stall takes.
    """

    kind: FaultKind
    at: int
    n: int = 1
    every: int = 0
    stall_s: float = 0.3

    def strikes(self, number: int) -> bool:
        """Return whether an edge is struck."""
        since = number - self.at
        if since < 0:
            return False
        return (since % self.every if self.every else since) < self.n


@frozen_record
class DeviceForm:
    """What the device is like.

    Attributes:
        tick_hz: Ticks in a second.
        tick_bits: Width of its counter.
        seq_bits: Width of the sequence number.
        heartbeat_ms: Longest silence.
        channel: Name of the signal.
        xor_sum: Whether it sends check sums.
        first_tick: Reading of its counter at time 0.
        header_every: Edges between two headers.
    """

    tick_hz: int = 1_000_000
    tick_bits: int = 32
    seq_bits: int = 16
    heartbeat_ms: int = 100
    channel: str = "OUT"
    xor_sum: bool = False
    first_tick: int = 0
    header_every: int = 1000


_PLAIN = DeviceForm()


class Printer:
    """Prints lines for edges.

    Args:
        form: What the device is like.
        faults: What goes wrong.
        high: The level before the first edge.
    """

    def __init__(
        self,
        form: DeviceForm = _PLAIN,
        faults: Iterable[StreamFault] = (),
        *,
        high: bool = False,
    ) -> None:
        self.form = form
        self._faults = tuple(faults)
        self._high = high
        self._n = 0
        self._seq_offset = 0

    def header(self) -> bytes:
        """Return the header line, behind an empty one that ends whatever stood before."""
        form = self.form
        text = (
            f"#edge-lines/1 tick-hz={form.tick_hz} tick-bits={form.tick_bits} "
            f"seq-bits={form.seq_bits} heartbeat-ms={form.heartbeat_ms} channel={form.channel}"
        )
        return b"\n" + self._line(text + (" sum=xor" if form.xor_sum else ""))

    def heartbeat(self, time_s: float) -> bytes:
        """Return the line that says that all rests."""
        return self._line(f"{self._seq()},{self._ticks(time_s)},{'H' if self._high else 'L'}")

    def edge(self, time_s: float) -> bytes:
        """Return what is sent for the next edge, faults and all."""
        self._n += 1
        self._high = not self._high
        head = b"" if (self._n - 1) % self.form.header_every else self.header()
        kinds = {fault.kind for fault in self._faults if fault.strikes(self._n)}
        if "restart" in kinds:
            self._seq_offset = self._n - 1
            head = self._line("#start") + self.header()
        line = self._line(f"{self._seq()},{self._ticks(time_s)},{int(self._high)}")
        return head + _spoilt(line, kinds)

    def stall_s(self) -> float:
        """Return how long to be silent before the next edge."""
        number = self._n + 1
        return max(
            (f.stall_s for f in self._faults if f.kind == "stall" and f.strikes(number)), default=0
        )

    def unplugs(self) -> bool:
        """Return whether the line goes dead at the edge printed last."""
        return any(f.kind == "unplug" and f.strikes(self._n) for f in self._faults)

    def _seq(self) -> int:
        return (self._n - self._seq_offset) % (1 << self.form.seq_bits)

    def _ticks(self, time_s: float) -> int:
        ticks = round(time_s * self.form.tick_hz) + self.form.first_tick
        return ticks % (1 << self.form.tick_bits)

    def _line(self, text: str) -> bytes:
        body = text.encode("ascii")
        if not self.form.xor_sum:
            return body + b"\n"
        total = 0
        for byte in body:
            total ^= byte
        return body + f"*{total:02X}\n".encode("ascii")


def _spoilt(line: bytes, kinds: set[FaultKind]) -> bytes:
    if "lost" in kinds:
        return b""
    if "garbage" in kinds:
        return b"\xff\x00" + line[3:6] + b"?,\xfe\n"
    if "half-line" in kinds or "unplug" in kinds:
        return line[: len(line) // 2]
    return line * 2 if "duplicate" in kinds else line


def print_edges(printer: Printer, times_s: Iterable[float]) -> Iterator[bytes]:
    """Yield what is sent for each edge, with heartbeats where nothing happens for longer."""
    beat_s = printer.form.heartbeat_ms / 1000
    last_s: float | None = None
    for time_s in times_s:
        while last_s is not None and time_s - last_s > beat_s:
            last_s += beat_s
            yield printer.heartbeat(last_s)
        yield printer.edge(time_s)
        last_s = time_s
