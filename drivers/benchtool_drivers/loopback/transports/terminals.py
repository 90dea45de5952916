"""A pseudo-terminal, as ``ASRL<path>::INSTR`` reaches it: a serial line without its hardware.

The path is a link of our own, so that a line that has hung up can come back under its name. Baud
rate, parity and modem lines mean nothing on a pseudo-terminal.
"""

from __future__ import annotations

import os
import select
import shutil
import tempfile
import threading
import tty
from contextlib import suppress
from pathlib import Path

from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.streams import serve_stream


class TerminalTransport:
    """Serves one pseudo-terminal, and a new one after each hang-up."""

    def __init__(self) -> None:
        self._folder = Path(tempfile.mkdtemp(prefix="line-"))
        self._stopping = threading.Event()
        self._thread: threading.Thread | None = None

    def start(self, responder: Responder, port: int = 0) -> str:  # noqa: ARG002 - a port has no meaning here
        """Make the terminal."""
        path = self._folder / "tty"
        channel = TerminalChannel(path)
        self._thread = threading.Thread(target=self._run, args=(channel, responder), daemon=True)
        self._thread.start()
        return f"ASRL{path}::INSTR"

    def _run(self, channel: TerminalChannel, responder: Responder) -> None:
        try:
            while not self._stopping.is_set() and channel.plugged:
                with suppress(OSError):
                    serve_stream(channel, responder, self._stopping)
                responder.clear()
        finally:
            channel.close()

    def stop(self) -> None:
        """Take the terminal away."""
        self._stopping.set()
        try:
            if self._thread is not None:
                self._thread.join(2.0)
        finally:  # a second interruption may end the wait
            shutil.rmtree(self._folder, ignore_errors=True)


class TerminalChannel:
    """The far end of a pseudo-terminal.

    Args:
        path: The link under which the near end is found.
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        self.plugged = True
        self._far, self._near = self._pair()

    def _pair(self) -> tuple[int, int]:
        far, near = os.openpty()
        tty.setraw(near)
        os.set_blocking(far, False)
        fresh = self._path.with_suffix(".new")
        fresh.symlink_to(os.ttyname(near))
        fresh.replace(self._path)
        return far, near  # the near end is kept open: without anybody there the far end fails

    def receive(self, timeout_s: float) -> bytes | None:
        """Return what came."""
        readable, _, _ = select.select([self._far], [], [], timeout_s)
        return os.read(self._far, 1 << 16) if readable else None

    def send(self, data: bytes) -> None:
        """Send all of it; a reader that stops reading for a second loses the rest."""
        view = memoryview(data)
        while view:
            _, writable, _ = select.select([], [self._far], [], 1.0)
            if not writable:
                return
            view = view[os.write(self._far, view) :]

    def end(self, ending: str) -> None:
        """Hang up; unless it was unplugged the line comes back under the same name."""
        far, near = self._far, self._near
        self._drained()
        if ending == "unplug":
            self.plugged = False
            self._path.unlink(missing_ok=True)
            self._far = self._near = -1
        else:
            self._far, self._near = self._pair()
        os.close(near)
        os.close(far)

    def _drained(self) -> None:
        """Leave the reader a moment to take what was sent: a hang-up throws it away."""
        with suppress(OSError):
            select.select([], [], [], 0.02)

    def close(self) -> None:
        """Close both ends."""
        for end in (self._far, self._near):
            if end >= 0:
                os.close(end)
