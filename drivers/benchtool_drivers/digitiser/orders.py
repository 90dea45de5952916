"""What is asked of an instrument, held against what its dialect offers."""

from __future__ import annotations

from benchtool.errors import UsageError
from benchtool.instruments import Order
from benchtool_drivers.dialect.records import Dialect


def channels_of(dialect: Dialect, wanted: tuple[str, ...] = ()) -> tuple[str, ...]:
    """Return the channels to read: those wanted, or the dialect's own.

    Raises:
        UsageError: If the dialect has no such channel (``no-such-channel``).
    """
    keys = dialect.channel
    unknown = [name for name in wanted if name not in keys.names]
    if unknown:
        raise UsageError(
            f"the dialect {dialect.name} knows no channel {unknown[0]!r}",
            hint=f"Its channels are {', '.join(keys.names)}.",
            code="no-such-channel",
        )
    own = keys.names if keys.interleaved else keys.default or keys.names[:1]
    return wanted or own


def check_order(dialect: Dialect, order: Order) -> None:
    """Refuse an order before anything is sent.

    Raises:
        UsageError: If it wants a trigger that the dialect cannot force (``no-forced-trigger``), or
            a setting that is no command (``bad-setting``).
    """
    if order.force and not dialect.body.acquire.force:
        raise UsageError(
            f"the dialect {dialect.name} has no command to force a trigger",
            hint="Force it at the instrument, or add force to [acquire] of the dialect.",
            code="no-forced-trigger",
        )
    for command in order.settings:
        if not (command.isascii() and command.isprintable() and command.strip()):
            raise UsageError(
                f"{command!r} is no command: printable ASCII is wanted",
                hint="Give one command a setting, without line feeds.",
                code="bad-setting",
            )
