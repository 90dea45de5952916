"""A terminal that is drawn on and whose keys are read one by one; left as it was found."""

from __future__ import annotations

import os
import signal
import sys
from types import FrameType, TracebackType
from typing import TYPE_CHECKING, Any, TextIO

if TYPE_CHECKING:
    from benchtool.report.screen.watch import Row, Tone

_ENTER = "\x1b[?1049h\x1b[?25l\x1b[?7l"  # other screen, no cursor, no wrapping
_LEAVE = "\x1b[0m\x1b[?7h\x1b[?25h\x1b[?1049l"
_SMALLEST = (20, 2)
_COLOURS: dict[Tone, str] = {"good": "1;32", "doubt": "1;33", "bad": "1;31"}
_WEIGHTS: dict[Tone, str] = {"strong": "1", "faint": "2", "good": "1", "doubt": "1", "bad": "1"}
_ENDING = ("SIGINT", "SIGTERM", "SIGHUP")


class Keyboard:
    """Keys one by one and unseen, from the terminal even where stdin is something else."""

    def __init__(self) -> None:
        self._fd: int | None = None
        self._own = False
        self._before: Any = None

    def __enter__(self) -> Keyboard:
        try:
            import termios
        except ImportError:  # no such terminals on this system
            return self
        self._fd = self._open()
        if self._fd is None:
            return self
        try:
            self._before = termios.tcgetattr(self._fd)
        except termios.error:
            self._close()
            return self
        now = termios.tcgetattr(self._fd)
        now[3] &= ~(termios.ICANON | termios.ECHO)
        now[6][termios.VMIN], now[6][termios.VTIME] = 0, 0
        now[6][termios.VSUSP] = b"\x00"  # a stopped watch would leave the terminal as it is
        termios.tcsetattr(self._fd, termios.TCSADRAIN, now)
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if self._fd is not None and self._before is not None:
            import termios

            try:
                termios.tcsetattr(self._fd, termios.TCSAFLUSH, self._before)
            except termios.error:  # the terminal has gone
                self._before = None
        self._close()

    @property
    def works(self) -> bool:
        """Whether there are keys at all."""
        return self._fd is not None

    def pressed(self) -> str:
        """Return the keys pressed since the last call; never waits."""
        if self._fd is None:
            return ""
        import select

        try:
            if not select.select([self._fd], [], [], 0)[0]:
                return ""
            return os.read(self._fd, 64).decode("ascii", "ignore")
        except OSError:  # the terminal has gone
            return ""

    def _open(self) -> int | None:
        try:
            if sys.stdin is not None and sys.stdin.isatty():
                return sys.stdin.fileno()
            self._own = True
            return os.open("/dev/tty", os.O_RDONLY | os.O_NOCTTY)
        except (OSError, ValueError):
            return None

    def _close(self) -> None:
        if self._own and self._fd is not None:
            os.close(self._fd)
        self._fd, self._own = None, False


class Canvas:
    """The terminal's other screen; only rows that changed are sent.

    Args:
        stream: A terminal.
        no_color: Leave colours out; weight stays.
    """

    def __init__(self, stream: TextIO, *, no_color: bool) -> None:
        self._stream = stream
        self._codes = _WEIGHTS if no_color else {**_WEIGHTS, **_COLOURS}
        self._shown: list[str] = []
        self._size = (0, 0)
        self._handlers: dict[int, Any] = {}
        self._is_told = False

    def __enter__(self) -> Canvas:
        for name in _ENDING:
            number = getattr(signal, name, None)
            if number is not None:
                self._handlers[number] = signal.signal(number, self._note_ending)
        self._send(_ENTER)
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        try:
            self._send(_LEAVE)
        except OSError:  # the terminal has gone
            self._shown = []
        for number, handler in self._handlers.items():
            signal.signal(number, handler)

    def heed(self) -> None:
        """End as Ctrl-C does where a signal has asked for it since.

        A signal that raised by itself could come in the middle of anything, such as a lock of a
        library, and leave the terminal as it must not be left.

        Raises:
            KeyboardInterrupt: If the watch is to end.
        """
        if self._is_told:
            raise KeyboardInterrupt

    def _note_ending(self, _signal: int, _frame: FrameType | None) -> None:
        if self._is_told:  # told twice: something hangs
            raise KeyboardInterrupt
        self._is_told = True

    @property
    def encoding(self) -> str:
        """The terminal's encoding."""
        return self._stream.encoding or "ascii"

    def size(self) -> tuple[int, int]:
        """Return columns and rows as they are now."""
        try:
            found = os.get_terminal_size(self._stream.fileno())
        except (OSError, ValueError):
            return 80, 24
        if not found.columns or not found.lines:
            return 80, 24
        return max(found.columns, _SMALLEST[0]), max(found.lines, _SMALLEST[1])

    def draw(self, rows: list[Row]) -> None:
        """Draw rows from the top; what is left below is cleared."""
        size = self.size()
        painted = [self._painted(row, size[0]) for row in rows[: size[1]]]
        sent = ""
        if size != self._size:
            self._size, self._shown, sent = size, [], "\x1b[2J"
        before = [*self._shown, *[""] * (len(painted) - len(self._shown))]
        painted += [""] * (len(before) - len(painted))
        for number, (old, new) in enumerate(zip(before, painted, strict=True), start=1):
            if old != new:
                sent += f"\x1b[{number};1H{new}\x1b[0m\x1b[K"
        self._shown = painted
        if sent:
            self._send(sent)

    def ring(self) -> None:
        """Ring the terminal's bell."""
        self._send("\a")

    def _painted(self, row: Row, width: int) -> str:
        from benchtool.report.text import spelled

        painted, room = "", width
        for text, tone in row:
            shown = spelled(text, self.encoding)[:room]
            room -= len(shown)
            code = self._codes.get(tone, "")
            painted += f"\x1b[{code}m{shown}\x1b[0m" if code and shown.strip() else shown
        return painted

    def _send(self, text: str) -> None:
        self._stream.write(text)
        self._stream.flush()
