"""Plays a log of exchanges back: a user's report becomes an instrument that answers as his did."""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterable
from pathlib import Path

from benchtool.errors import InputError
from benchtool_drivers.link.exchange import Exchange, read_exchanges


class Playback:
    """A subject that gives each command the answers it got, in their order.

    The last answer to a command is given again when it is asked more often, so that a wait may
    take more or fewer turns. A command that is not in the log is answered by nothing, and said.

    Args:
        exchanges: What was said, of one connection.
        say: Is told of each command that is not in the log.

    Attributes:
        unexpected: The commands that are not in the log.

    Raises:
        InputError: If the log does not hold an answer whole.
    """

    def __init__(
        self, exchanges: Iterable[Exchange], *, say: Callable[[str], None] | None = None
    ) -> None:
        self.unexpected: list[str] = []
        self._say = say
        self._answers: dict[str, deque[bytes]] = {}
        self._out: deque[bytes] = deque()
        for exchange in exchanges:
            if exchange.n_bytes != len(exchange.answer):
                raise InputError(
                    f"Line {exchange.line} of the log holds {len(exchange.answer)} of the "
                    f"{exchange.n_bytes} bytes that answered {exchange.command}.",
                    hint="Record it again with whole answers, and then play that back.",
                )
            self._answers.setdefault(exchange.command, deque()).append(exchange.answer)

    @classmethod
    def load(
        cls, path: Path | str, *, resource: str = "", say: Callable[[str], None] | None = None
    ) -> Playback:
        """Read a log and make it a subject.

        Args:
            path: The log.
            resource: Which connection, where the log holds several.
            say: Is told of each command that is not in the log.

        Raises:
            InputError: If it is no log, holds several connections and none was named, or does not
                hold an answer whole.
        """
        exchanges = read_exchanges(path)
        resources = sorted({exchange.resource for exchange in exchanges})
        chosen = resource or (resources[0] if len(resources) == 1 else "")
        if chosen not in resources:
            raise InputError(
                f"{path} holds exchanges with {', '.join(resources) or 'nobody'}.",
                hint="Name the one to play back.",
            )
        return cls((entry for entry in exchanges if entry.resource == chosen), say=say)

    def receive(self, message: bytes) -> None:
        """Take a command."""
        command = message.decode("latin-1")
        answers = self._answers.get(command)
        if answers is None:
            self.unexpected.append(command)
            if self._say is not None:
                self._say(command)
            return
        answer = answers.popleft() if len(answers) > 1 else answers[0]
        if answer:
            self._out.append(answer)

    def output(self) -> bytes | None:
        """Return the next answer."""
        return self._out.popleft() if self._out else None

    def clear(self) -> None:
        """Forget answers that were not fetched."""
        self._out.clear()
