"""The instrument that a verb is about: its resource, the log, and what is said before."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool_drivers.link import ExchangeLog

log_option = click.option("--log", metavar="FILE", help="Log the exchange with the instrument.")


def resource_of(name: str) -> str:
    """Return the resource of a name: that of the kit, or the name itself.

    Raises:
        UsageError: If it is no resource and the kit has no such instrument (``no-such-source``).
    """
    if "::" in name:
        return name
    from benchtool.cli.kit import instrument_in_kit, user_kit

    kit = user_kit()
    if kit and name in kit.instruments:
        return instrument_in_kit(name).resource or name
    if name.startswith("/dev/") or name.upper().startswith("COM"):
        raise UsageError(
            f"{name!r} is a serial port, and no resource",
            hint=f"An instrument at a serial port is ASRL{name}::INSTR. One that sends edges by "
            f"itself is not asked: benchtool watch {name}.",
            code="no-such-source",
        )
    raise UsageError(
        f"{name!r} is neither a resource nor an instrument of your kit",
        hint="Give a resource such as TCPIP::192.0.2.7::hislip0::INSTR; "
        "`benchtool instruments list` shows what is connected.",
        code="no-such-source",
    )


def exchange_log(path: str | None) -> Any:
    """Return the log of an exchange as a context; of nothing where no file is named.

    It holds whole answers, so that it can be played back.
    """
    from contextlib import nullcontext

    from benchtool_drivers.link import ExchangeLog

    found: ExchangeLog | nullcontext[None] = (
        ExchangeLog(Path(path), whole=True) if path else nullcontext()
    )
    return found
