"""What was given to a diagnosis, to be typed again with one reading more."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

_ONCE = ("stage", "topology", "RA", "RB", "R", "C", "ic", "supply_nominal", "node")
_SETTINGS = ("probe", "temperature")
_OFTEN = (
    *("readings", "power_up", "shunt", "added_capacitor", "probe_lifted"),
    *("supply", "heated", "baseline", "good_board"),
)


def again(given: Mapping[str, Any]) -> tuple[str, ...]:
    """Return the options that bring the same evidence again.

    Args:
        given: The options as they were parsed, by the names of their parameters.
    """
    return tuple(_words(given))


def _words(given: Mapping[str, Any]) -> Iterator[str]:
    for name in (*_ONCE, *_SETTINGS):
        if given.get(name) is not None:
            yield from (_option(name), str(given[name]))
    for name in _OFTEN:
        for item in given.get(name) or ():
            words = item if isinstance(item, tuple) else (item,)
            yield from (_option(name), *map(str, words))


def _option(name: str) -> str:
    return "--reading" if name == "readings" else f"--{name.replace('_', '-')}"
