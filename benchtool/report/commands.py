"""Commands to copy, quoted for a shell."""

from __future__ import annotations

import shlex

from benchtool.model.result import Source


def quoted(name: str) -> str:
    """Return a file name as a shell word; one that begins with a dash gets ``./`` before it.

    Standard input cannot be read again: it comes out as ``FILE``.
    """
    if name == "-":
        return "FILE"
    return shlex.quote(f"./{name}" if name.startswith("-") else name)


def same_capture(source: Source) -> str:
    """Return the words that read a file again as it was read: its name and the options given."""
    return " ".join([quoted(source.name), *map(shlex.quote, source.options)])
