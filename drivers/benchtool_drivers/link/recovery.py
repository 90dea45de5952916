"""Getting a connection back in step after a failed exchange, without touching any setting.

The rest of a block, or an answer that comes late, would be taken for the answer to the next
command, and so on for ever. What is under way is read and dropped, a device clear (IEEE 488.1)
empties the instrument's buffers where the transport has one, and the identity, which is known,
is asked for until it is the last thing that comes. ``*RST`` is never sent.
"""

from __future__ import annotations

import time

from benchtool_drivers.link.intake import FILL_BYTES
from benchtool_drivers.link.settings import LinkSettings
from benchtool_drivers.link.wire import Wire

IDENTITY = "*IDN?"
QUIET_S = 0.1
N_QUIET = 2
LONGEST_S = 5.0


def resynchronise(wire: Wire, settings: LinkSettings, identity: str) -> bool:
    """Bring the connection back in step.

    Args:
        wire: The connection.
        settings: How the instrument talks.
        identity: What it answers when asked who it is.

    Returns:
        Whether it is in step now; otherwise only a new connection helps.
    """
    if wire.broken or wire.gone():
        return False
    try:
        return calm(wire, settings) and _says_identity(wire, settings, identity)
    except Exception:  # the libraries raise what they like; a new connection comes next
        return False


def calm(wire: Wire, settings: LinkSettings) -> bool:
    """Drop whatever is under way; return whether it came to an end."""
    if not wire.has_end:
        return _drain(wire)
    if wire.can_clear and settings.device_clear == "auto":
        wire.clear()
    return True


def _drain(wire: Wire) -> bool:
    """Read and drop until the line was quiet twice."""
    scrap = bytearray(FILL_BYTES)
    end_s = time.monotonic() + LONGEST_S
    n_quiet = 0
    while n_quiet < N_QUIET:
        if time.monotonic() > end_s:
            return False
        try:
            wire.read_into(memoryview(scrap), QUIET_S)
            n_quiet = 0
        except TimeoutError:
            n_quiet += 1
    return True


def _says_identity(wire: Wire, settings: LinkSettings, identity: str) -> bool:
    """Ask who it is until that is the last thing that comes."""
    timeout_s = min(settings.timeout_s, 1.0)
    wire.write((IDENTITY + settings.write_termination).encode("ascii"), timeout_s)
    end_s = time.monotonic() + LONGEST_S
    got = bytearray()
    scrap = bytearray(FILL_BYTES)
    while time.monotonic() < end_s:
        n_read, ended = wire.read_into(memoryview(scrap), timeout_s)
        got += scrap[:n_read]
        del got[: -4 * (len(identity) + 16)]
        whole = ended if wire.has_end else _ends_with(got, settings)
        known = _without_prompt(got, settings).endswith(identity.strip().encode("latin-1"))
        if whole and known and (wire.has_end or _quiet(wire, scrap, got)):
            return True
    return False


def _ends_with(got: bytearray, settings: LinkSettings) -> bool:
    return got.endswith((settings.read_termination + settings.prompt).encode("ascii"))


def _without_prompt(got: bytearray, settings: LinkSettings) -> bytes:
    return bytes(got).removesuffix(settings.prompt.encode("ascii")).strip()


def _quiet(wire: Wire, scrap: bytearray, got: bytearray) -> bool:
    try:
        n_read, _ = wire.read_into(memoryview(scrap), QUIET_S)
    except TimeoutError:
        return True
    got += scrap[:n_read]
    return False
