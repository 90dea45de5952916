"""Verdict words in letters of three rows."""

from __future__ import annotations

_LETTERS: dict[str, tuple[str, str, str]] = {
    "A": ("▄▀▀▄", "█▄▄█", "█  █"),
    "B": ("█▀▀▄", "█▀▀▄", "█▄▄▀"),
    "C": ("▄▀▀▀", "█   ", "▀▄▄▄"),
    "D": ("█▀▀▄", "█  █", "█▄▄▀"),
    "E": ("█▀▀▀", "█▀▀ ", "█▄▄▄"),
    "F": ("█▀▀▀", "█▀▀ ", "█   "),
    "I": ("█", "█", "█"),
    "L": ("█   ", "█   ", "█▄▄▄"),
    "N": ("█▄ █", "█ ▀█", "█  █"),
    "P": ("█▀▀▄", "█▄▄▀", "█   "),
    "S": ("▄▀▀▀", "▀▀▀▄", "▄▄▄▀"),
    "U": ("█  █", "█  █", "▀▄▄▀"),
}


def large(word: str) -> tuple[str, ...]:
    """Return ``word`` in three rows of block characters, or spaced out in one row.

    Words with letters that the verdicts do not need, and words too long for 80 columns, come
    spaced out: ``C O N D I T I O N A L - P A S S``.
    """
    letters = word.upper()
    if len(letters) > 9 or not set(letters) <= _LETTERS.keys():
        return (" ".join(letters),)
    return tuple(" ".join(_LETTERS[letter][row] for letter in letters) for row in range(3))
