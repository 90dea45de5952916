"""The figures of a preamble, by name."""

from __future__ import annotations

import math
from collections.abc import Mapping

from benchtool_drivers.dialect.records import Lookup
from benchtool_drivers.dialect.vocabulary import FIELD_UNITS, FIELDS
from benchtool_drivers.digitiser.numerals import has_unit, is_whole
from benchtool_drivers.digitiser.talk import Talk


class Fields:
    """The figures of a preamble.

    Args:
        talk: Where they came from.
        texts: Each field as it was answered.
        command: The query that gave most of them, for messages.
    """

    def __init__(self, talk: Talk, texts: Mapping[str, str], command: str) -> None:
        self._talk = talk
        self._texts = texts
        self._command = command
        self._units: Mapping[str, str] = talk.dialect.body.preamble.units

    def __contains__(self, name: str) -> bool:
        return name in self._texts

    def texts(self) -> Mapping[str, str]:
        """Return each field as it was answered."""
        return self._texts

    def number(self, name: str, default: float | None = None) -> float:
        """Return a field as a finite number in SI units.

        Raises:
            ReplyError: If it is no finite number.
        """
        if name not in self._texts and default is not None:
            return default
        text = self._texts[name]
        value = self._talk.number(text, self._called(name), self._command)
        if not math.isfinite(value) or abs(value) >= 9e36:
            raise self._unfit(name, "a finite number")
        if name in self._units and has_unit(text):
            raise self._talk.wrong(
                f"{self._called(name)} is {text!r}, with a unit of its own",
                hint=f"Take {name} out of units in [preamble]: units are for bare numbers.",
                command=self._command,
                expected="a number without a unit",
                got=text,
                code="bad-preamble",
            )
        return value * FIELD_UNITS[self._units.get(name, "1")]

    def above_zero(self, name: str) -> float:
        """Return a field that must be greater than 0."""
        value = self.number(name)
        if not value > 0:
            raise self._unfit(name, "a number greater than 0")
        return value

    def other_than_zero(self, name: str) -> float:
        """Return a field that must not be 0."""
        value = self.number(name)
        if value == 0:
            raise self._unfit(name, "a number other than 0")
        return value

    def count(self, name: str) -> int:
        """Return a field that counts something."""
        value = self.number(name)
        if not is_whole(value) or not 0 <= value < 1 << 40:
            raise self._unfit(name, "a whole number")
        return int(value)

    def look_up(self, lookup: str | Lookup, what: str) -> str:
        """Return the word that fields stand for.

        Raises:
            ReplyError: If the dialect does not know what they say.
        """
        if isinstance(lookup, str):
            return lookup
        word = "".join(self._word(name) for name in lookup.names)
        if word in lookup.map:
            return lookup.map[word]
        raise self._talk.wrong(
            f"{'+'.join(lookup.names)} is {word!r}, and the dialect's {what} knows "
            f"{', '.join(map(repr, lookup.map))}",
            hint=f"Add it to the map of {what} in the dialect file, as the manual says.",
            command=self._command,
            expected=f"one of {', '.join(lookup.map)}",
            got=word,
        )

    def _word(self, name: str) -> str:
        """Return a field as look-ups write it: a whole number without sign or fraction."""
        text = self._texts[name].strip().strip('"')
        try:
            value = float(text)
        except ValueError:
            return text
        return str(int(value)) if is_whole(value) else text

    def _called(self, name: str) -> str:
        meaning = FIELDS.get(name)
        return f"{name} ({meaning})" if meaning else name

    def _unfit(self, name: str, expected: str) -> Exception:
        text = self._texts[name]
        return self._talk.wrong(
            f"{self._called(name)} is {text!r}, which is not {expected}",
            hint="Compare the fields of the dialect's preamble with the manual.",
            command=self._command,
            expected=expected,
            got=text,
            code="bad-preamble",
        )
