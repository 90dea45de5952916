"""Commands to copy, quoted for a shell."""

from __future__ import annotations

import shlex


def quoted(name: str) -> str:
    """Return a file name as a shell word; one that begins with a dash gets ``./`` before it.

    Standard input cannot be read again: it comes out as ``FILE``.
    """
    if name == "-":
        return "FILE"
    return shlex.quote(f"./{name}" if name.startswith("-") else name)
