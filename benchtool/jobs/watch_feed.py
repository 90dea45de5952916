"""A source read in a thread of its own, so that keys and clock go on while it is waited for."""

from __future__ import annotations

import threading
from queue import Empty, Full, Queue
from types import TracebackType

from benchtool.errors import NoTriggerError
from benchtool.instruments import Stream
from benchtool.model.capture import Capture
from benchtool.model.counted import Counted

Found = Capture | Counted

_WAIT_S = 0.2
_LAST_WAIT_S = 1.0


class Feed:
    """Captures of a stream as they come; used in a ``with`` block, which closes the stream.

    Args:
        stream: The stream.
        pace_s: Least time between two captures; those of a stream overlap, and one that sends
            each edge by itself would otherwise be measured at each of them.
    """

    def __init__(self, stream: Stream, *, pace_s: float = 0.0) -> None:
        self._stream = stream
        self._pace_s = pace_s
        self._queue: Queue[Found | BaseException] = Queue(maxsize=2)
        self._stopped = threading.Event()
        self._thread = threading.Thread(target=self._read, name="feed", daemon=True)

    def __enter__(self) -> Feed:
        self._thread.start()
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._stopped.set()
        self._thread.join(_LAST_WAIT_S)
        self._stream.close()

    def take(self, timeout_s: float) -> Found | None:
        """Return the next capture, None where none came within the time.

        Raises:
            NoTriggerError: If nothing was recorded in time; the next capture may follow.
            BaseException: What ended the stream, such as an ``InstrumentError``.
        """
        try:
            found = self._queue.get(timeout=timeout_s)
        except Empty:
            return None
        if isinstance(found, BaseException):
            raise found
        return found

    def _read(self) -> None:
        """Hand on captures; one that waits to be taken holds the source back."""
        while not self._stopped.is_set():
            found: Found | BaseException | None
            try:
                found = self._stream.newest(_WAIT_S)
            except BaseException as error:
                found = error
            if found is not None:
                self._put(found)
                self._stopped.wait(self._pace_s)
            if isinstance(found, BaseException) and not isinstance(found, NoTriggerError):
                return

    def _put(self, found: Found | BaseException) -> None:
        while not self._stopped.is_set():
            try:
                self._queue.put(found, timeout=_WAIT_S)
            except Full:
                continue
            return
