r"""The exchange log: what was said to an instrument and what it answered, as JSON lines.

The first line says what the file is::

    {"log": "benchtool-exchange/1", "started": "2031-03-02T03:12:00Z"}

Then one line for each exchange, as soon as it is over::

    {"at_s": 0.0121, "command": "SYST:ERR?", "took_s": 0.0004, "n_bytes": 14,
     "hex": "302c224e6f206572726f72220a", "text": "'0,\"No error\"\n'"}

- ``at_s`` counts from the first line on; ``took_s`` is the time until the answer was there.
- ``n_bytes`` counts the bytes of the answer, header and terminator among them; 0 for a command
  without an answer.
- ``hex`` and ``text`` show its first 64 bytes.
- ``whole`` holds all of a longer answer in base64, where the log was asked to keep whole answers;
  without it such an answer cannot be played back.
- ``error`` is there where the exchange failed: the code of the error.

And one for each event of the link itself: ``{"at_s": 2.1, "note": "resynchronised"}``.

Each line also carries ``resource``, since several links may write to one file; a file that is
continued holds a first line for each time that it was.
"""

from __future__ import annotations

import base64
import json
import time
from contextlib import suppress
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from typing import Any

from benchtool.errors import InputError
from benchtool.frozen import frozen_record
from benchtool_drivers.link.intake import FIRST_BYTES
from benchtool_drivers.link.text import printable

FORMAT = "benchtool-exchange/1"


@frozen_record
class Exchange:
    """One exchange of a log.

    Attributes:
        resource: The connection.
        command: What was sent.
        answer: What came back, as far as the log holds it.
        n_bytes: How many bytes came.
        error: The code of the error it ended with, empty for none.
        line: Where it stands in the file.
    """

    resource: str
    command: str
    answer: bytes
    n_bytes: int
    error: str
    line: int


def read_exchanges(path: Path | str) -> tuple[Exchange, ...]:
    """Read the exchanges of a log, in their order.

    Raises:
        InputError: If the file cannot be read, or is no such log.
    """
    try:
        lines = Path(path).read_text(encoding="utf-8").splitlines()
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(
            f"The log {path} cannot be read: {error}.", hint="Give a log of exchanges."
        ) from error
    found: list[Exchange] = []
    for number, text in enumerate(lines, start=1):
        try:
            entry = json.loads(text)
            if number == 1 and entry["log"] != FORMAT:
                raise ValueError(f"it is {entry['log']}, not {FORMAT}")
            if "command" in entry:
                found.append(_exchange(entry, number))
        except (ValueError, LookupError, TypeError) as error:
            raise InputError(
                f"Line {number} of {path} is no line of a log of exchanges: {error}.",
                hint="A log is read as it was written; cut lines off its end only.",
            ) from error
    return tuple(found)


def _exchange(entry: dict[str, Any], line: int) -> Exchange:
    whole = entry.get("whole")
    answer = bytes.fromhex(entry["hex"]) if whole is None else base64.b64decode(whole)
    return Exchange(
        resource=str(entry.get("resource", "")),
        command=str(entry["command"]),
        answer=answer,
        n_bytes=int(entry["n_bytes"]),
        error=str(entry.get("error", "")),
        line=line,
    )


class ExchangeLog:
    """Writes what is said to a file, line by line.

    Args:
        path: The file; one of that name is continued.
        whole: Keep whole answers, so that the file can be played back.

    Raises:
        InputError: If the file cannot be written.
    """

    def __init__(self, path: Path | str, *, whole: bool = False) -> None:
        self.whole = whole
        self._path = path
        try:
            self._file = Path(path).open("a", encoding="utf-8")  # noqa: SIM115 - closed by close()
        except OSError as error:
            raise InputError(
                f"The log {path} cannot be written: {error.strerror}.",
                hint="Choose another file for the log.",
            ) from error
        self._start_s = time.monotonic()
        started = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
        try:
            self._put({"log": FORMAT, "started": started})
        except InputError:
            self.close()
            raise

    def exchange(
        self,
        resource: str,
        command: str,
        *,
        answer: bytes = b"",
        n_bytes: int = 0,
        began_s: float | None = None,
        error: str = "",
    ) -> None:
        """Write one exchange.

        Args:
            resource: The connection.
            command: What was sent.
            answer: The first bytes of what came, or all of it.
            n_bytes: How many came.
            began_s: When the command was sent, on the clock of ``time.monotonic``.
            error: The code of the error it ended with.
        """
        now_s = time.monotonic()
        began_s = now_s if began_s is None else began_s
        line: dict[str, Any] = {
            "at_s": round(began_s - self._start_s, 6),
            "resource": resource,
            "command": command,
            "took_s": round(now_s - began_s, 6),
            "n_bytes": n_bytes,
            "hex": answer[:FIRST_BYTES].hex(),
            "text": printable(answer[:FIRST_BYTES]),
        }
        if FIRST_BYTES < n_bytes <= len(answer):
            line["whole"] = base64.b64encode(answer).decode("ascii")
        if error:
            line["error"] = error
        self._put(line)

    def note(self, resource: str, text: str) -> None:
        """Write an event of the link."""
        at_s = round(time.monotonic() - self._start_s, 6)
        self._put({"at_s": at_s, "resource": resource, "note": text})

    def _put(self, line: dict[str, Any]) -> None:
        try:
            self._file.write(json.dumps(line, ensure_ascii=True) + "\n")
            self._file.flush()
        except OSError as error:
            raise InputError(
                f"The log {self._path} cannot be written: {error.strerror}.",
                hint="Choose another file for the log; captures written before stand.",
                code="not-writable",
            ) from error

    def close(self) -> None:
        """Close the file; what a full disk keeps it from writing was told before."""
        with suppress(OSError):
            self._file.close()

    def __enter__(self) -> ExchangeLog:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()
