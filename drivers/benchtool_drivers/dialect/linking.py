"""From the [link] table of a dialect to the settings of a link."""

from __future__ import annotations

from typing import Literal, cast

from benchtool_drivers.dialect.records import LinkKeys
from benchtool_drivers.link import LinkSettings


def link_settings(keys: LinkKeys) -> LinkSettings:
    """Return how to talk to an instrument of a dialect."""
    none = keys.error_none if keys.error_bits is None else _none_of(keys.error_bits)
    return LinkSettings(
        write_termination=keys.write_termination,
        read_termination=keys.read_termination,
        timeout_s=keys.timeout_s,
        block_timeout_s=keys.block_timeout_s,
        deadline_s=keys.deadline_s,
        query_delay_s=keys.query_delay_s,
        echo=keys.echo,
        prompt=keys.prompt,
        error_query=keys.error_query or None,
        error_none=none,
        device_clear=cast("Literal['auto', 'none']", keys.device_clear),
    )


def _none_of(bits: int) -> str:
    """Return a pattern of all bytes in which none of some bits is set, as numbers are printed."""
    clean = [str(value) for value in range(256) if not value & bits]
    return rf"^\s*\+?(?:{'|'.join(clean)})\s*$"
