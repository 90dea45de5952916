"""The settings of an instrument: read and recorded, never changed."""

from __future__ import annotations

from benchtool.errors import InstrumentTimeoutError, RefusedError
from benchtool.model.capture import StructurePoint
from benchtool.model.quantity import Notice
from benchtool_drivers.digitiser.talk import Talk

_TIMEOUT_S = 1.0


class Settings:
    """Reads the settings that a dialect names.

    An instrument that does not know one of them still gives its record; that one is told of, and
    not asked for again.

    Args:
        talk: The instrument.
    """

    def __init__(self, talk: Talk) -> None:
        self._talk = talk
        self._mute: set[str] = set()

    def read(self, channels: tuple[str, ...]) -> tuple[list[StructurePoint], tuple[Notice, ...]]:
        """Return the settings, and what was noticed.

        Args:
            channels: The channels whose own settings are read.
        """
        found: list[StructurePoint] = []
        silent: list[str] = []
        for name, query in self._talk.dialect.settings.items():
            own = "{channel}" in query
            for channel in channels if own else channels[:1]:
                command = query.format(channel=channel)
                if command in self._mute:
                    continue
                label = f"{name} {channel}" if own else name
                answer = self._answer(label, query, channel)
                if answer is None:
                    silent.append(command)
                    continue
                point = StructurePoint(name=label, value=answer, evidence=command, sure="stated")
                found.append(point)
        self._mute.update(silent)
        if silent:
            self._talk.errors()
        return found, _not_read(silent)

    def _answer(self, label: str, query: str, channel: str) -> str | None:
        try:
            return self._talk.ask(query, label, timeout_s=_TIMEOUT_S, channel=channel)
        except (RefusedError, InstrumentTimeoutError):
            return None


def _not_read(commands: list[str]) -> tuple[Notice, ...]:
    if not commands:
        return ()
    return (
        Notice(
            code="setting-not-read",
            text=f"the instrument gives no answer to {', '.join(commands)}: these settings are "
            "not recorded",
        ),
    )
