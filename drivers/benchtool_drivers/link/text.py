"""Bytes of an exchange made fit to read, and commands joined to one message."""

from __future__ import annotations


def printable(data: bytes) -> str:
    r"""Return bytes as text in quotes, all but printable ASCII escaped: ``'#15\x00\n'``."""
    return repr(data)[1:] if data else ""


def joined(*commands: str) -> str:
    """Return several commands as one message (IEEE 488.2, 7.1.2; SCPI-99 volume 1, 6.2.4).

    Each begins at the root of the command tree: a colon is set before it, save before a common
    command. One message is one packet, and the instrument sees no pause within it.
    """
    return ";".join(
        command if not at or command.startswith(("*", ":")) else f":{command}"
        for at, command in enumerate(commands)
    )
