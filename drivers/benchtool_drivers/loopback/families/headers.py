"""Program messages: split into units, headers in their short and long forms.

References:
    IEEE 488.2-1992, clause 7; SCPI-1999, volume 1, clause 6.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from itertools import product


def split_message(message: str) -> Iterator[tuple[str, str]]:
    """Yield the header, in capitals and from the root, and the parameters of each unit."""
    path = ""
    for unit in re.findall(r'(?:[^;"]|"[^"]*")+', message):
        header, _, parameters = unit.strip().partition(" ")
        header = header.upper()
        if not header:
            continue
        if not header.startswith("*"):
            header = header[1:] if header.startswith(":") else path + header
            path = header.rpartition(":")[0]
            path += ":" if path else ""
        yield header, parameters.strip()


def spellings(pattern: str) -> Iterator[str]:
    """Yield all spellings of a header such as ``WAVeform[:DATA]?`` in capitals."""
    query = "?" if pattern.endswith("?") else ""
    nodes = re.findall(r"(\[?):?([*A-Za-z#]+)\]?", pattern.rstrip("?"))
    choices: list[list[str]] = []
    for optional, node in nodes:
        short = re.sub("[a-z]", "", node)
        words = {short, node.upper()} | ({""} if optional else set())
        choices.append(sorted(words))
    for chosen in product(*choices):
        yield ":".join(word for word in chosen if word) + query
