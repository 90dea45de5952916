"""Measure the link against a plain socket: throughput of blocks, and time to be in step again.

The instrument runs in a process of its own and has its answer ready, so that what is measured is
the way of the bytes. Ratios are to reading the same block from such a server into one buffer by
``recv_into``, turn by turn in the same run; figures vary, so they are printed beside their targets
and never asserted.

    python tests/benchmarks/links.py [samples]
"""

from __future__ import annotations

import multiprocessing
import re
import socket
import statistics
import sys
import time
from collections import deque
from collections.abc import Callable, Sequence
from multiprocessing.connection import Connection

from benchtool.errors import InstrumentError
from benchtool_drivers.link import Link, LinkSettings
from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.serving import TRANSPORTS, serve

N_SAMPLES = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000_000
N_TURNS = 15
NETWORK = ("socket", "hislip", "vxi11")
TARGET = 0.5
TARGET_S = 0.5
IDENTITY = b"loopback,benchmark,0,1\n"


class Ready:
    """A subject with one large block ready.

    Args:
        n_bytes: How large.
    """

    def __init__(self, n_bytes: int) -> None:
        data = bytes(range(256)) * (n_bytes // 256 + 1)
        self._block = b"#9%09d" % n_bytes + data[:n_bytes] + b"\n"
        self._out: deque[bytes] = deque()

    def receive(self, message: bytes) -> None:
        """Take a query."""
        answers = {b"DATA?": self._block, b"*IDN?": IDENTITY}
        if message in answers:
            self._out.append(answers[message])

    def output(self) -> bytes | None:
        """Return the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Forget what was not fetched."""
        self._out.clear()


def run_server(transport: str, n_bytes: int, pipe: Connection) -> None:
    """Serve until told to stop."""
    with serve(Ready(n_bytes), transport) as resource:
        pipe.send(resource)
        pipe.recv()


def served(transport: str, n_bytes: int) -> tuple[str, Callable[[], None]]:
    """Start a server in a process of its own; return its resource, and what ends it."""
    here, there = multiprocessing.Pipe()
    process = multiprocessing.Process(target=run_server, args=(transport, n_bytes, there))
    process.start()
    resource = here.recv()

    def end() -> None:
        here.send("stop")
        process.join()

    return resource, end


class Plain:
    """Reads the block off a plain socket, into one buffer.

    Args:
        resource: Where the server is.
        n_bytes: How large the block is.
    """

    def __init__(self, resource: str, n_bytes: int) -> None:
        found = re.search(r"::(\d+)::", resource)
        assert found is not None
        self._socket = socket.create_connection(("127.0.0.1", int(found[1])))
        self._socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        self._buffer = memoryview(bytearray(11 + n_bytes + 1))

    def read(self) -> None:
        """Read it once."""
        self._socket.sendall(b"DATA?\n")
        n_got = 0
        while n_got < len(self._buffer):
            n_got += self._socket.recv_into(self._buffer[n_got:])

    def close(self) -> None:
        """End the connection."""
        self._socket.close()


class Linked:
    """Reads the block through the link.

    Args:
        resource: Where the server is.
        n_bytes: How large the block is.
    """

    def __init__(self, resource: str, n_bytes: int) -> None:
        self._link = Link.open(resource, LinkSettings(timeout_s=5.0))
        self._n_bytes = n_bytes

    def read(self) -> None:
        """Read it once."""
        assert len(self._link.ask_block("DATA?", n_bytes=self._n_bytes)) == self._n_bytes

    def close(self) -> None:
        """End the connection."""
        self._link.close()


def shortest_s(readers: Sequence[Plain | Linked]) -> list[float]:
    """Return the shortest time of each; their turns alternate, so that all meet the same load."""
    times: list[list[float]] = [[] for _ in readers]
    for _ in range(N_TURNS):
        for reader, its_times in zip(readers, times, strict=True):
            began_s = time.perf_counter()
            reader.read()
            its_times.append(time.perf_counter() - began_s)
    return [min(its_times) for its_times in times]


def compare(n_bytes: int, width: str) -> None:
    """Print the rates of all transports beside that of a plain socket."""
    servers = [served(transport, n_bytes) for transport in ("socket", *NETWORK)]
    readers: list[Plain | Linked] = [Plain(servers[0][0], n_bytes)]
    readers += [Linked(resource, n_bytes) for resource, _ in servers[1:]]
    base_s, *rest_s = shortest_s(readers)
    for reader, (_, end) in zip(readers, servers, strict=True):
        reader.close()
        end()
    print(f"{N_SAMPLES} samples of {width}: plain socket {n_bytes / base_s / 1e6:.0f} MB/s")
    for transport, took_s in zip(NETWORK, rest_s, strict=True):
        rate = n_bytes / took_s / 1e6
        print(f"  {transport:7} {rate:6.0f} MB/s   {base_s / took_s:.2f} of it (>= {TARGET})")


def recovery_s(transport: str) -> float:
    """Return the time to be in step again after half a block."""
    fault = TransportFault(kind="half-stall", on="DATA", times=None)
    with serve(Ready(1_000_000), transport, fault) as resource:
        link = Link.open(resource, LinkSettings(timeout_s=0.3, block_timeout_s=0.3))

        def fail() -> None:
            try:
                link.ask_block("DATA?")
            except InstrumentError:
                return
            raise AssertionError("the fault did not strike")

        times: list[float] = []
        for _ in range(3):
            fail()
            began_s = time.perf_counter()
            link.recover()
            times.append(time.perf_counter() - began_s)
        link.close()
    return statistics.median(times)


def here(transport: str, n_bytes: int) -> None:
    """Print the rate from a server in this process."""
    with serve(Ready(n_bytes), transport) as resource:
        reader = Linked(resource, n_bytes)
        (took_s,) = shortest_s([reader])
        reader.close()
    print(f"  {transport:7} {n_bytes / took_s / 1e6:6.1f} MB/s   {n_bytes} bytes, in one process")


def main() -> None:
    """Print all figures."""
    for width, n_bytes in (("8 bit", N_SAMPLES), ("16 bit", 2 * N_SAMPLES)):
        compare(n_bytes, width)
    here("usbtmc", N_SAMPLES)
    here("pty", 100_000)
    for transport in TRANSPORTS:
        print(f"  {transport:7} in step after {recovery_s(transport):.2f} s (<= {TARGET_S})")


if __name__ == "__main__":
    main()
