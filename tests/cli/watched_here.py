"""Runs ``benchtool watch`` on played records; started by the tests as a process of its own.

``python watched_here.py N PAUSE_S ARGUMENT...``: N records, so far apart, of a trimmer that is
turned after the fifth.
"""

from __future__ import annotations

import signal
import sys
import time
from collections.abc import Iterable, Iterator
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1] / "jobs"))

from moving_boards import RB_OHM, Played, records, steps

from benchtool.cli.main import main
from benchtool.jobs import sources
from benchtool.model.capture import Capture

RESOURCE = "TCPIP::192.0.2.7::hislip0::INSTR"


def played(n: int, pause_s: float) -> Played:
    """Return a stream of ``n`` records."""
    settings = steps((350e3, min(n, 5)), (RB_OHM, max(0, n - 5)))
    return Played(_paused(records(settings, periods=4.5), pause_s))


def _paused(captures: Iterable[Capture], pause_s: float) -> Iterator[Capture]:
    for capture in captures:
        time.sleep(pause_s)
        yield capture


if __name__ == "__main__":
    # a shell tells a job in the background to ignore Ctrl-C
    signal.signal(signal.SIGINT, signal.default_int_handler)
    stream = played(int(sys.argv[1]), float(sys.argv[2]))
    sources.open_stream = lambda wanted: stream  # noqa: ARG005 - whatever is named
    sys.exit(main(["watch", *sys.argv[3:]]))
