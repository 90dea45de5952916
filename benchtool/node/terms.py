"""What is known of instrument and IC besides the trace."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import combine

TIMEBASE_REL = 50e-6
"""Half-width of the timebase where none is stated."""


@frozen_record
class Terms:
    """What is known of the instrument and the IC.

    Attributes:
        timebase_rel: Half-width of the timebase error, relative.
        u_gain_rel: Standard uncertainty of the voltage scale, relative.
        u_offset_v: Standard uncertainty of its zero, volts.
        delay_upper, delay_lower: From a threshold's crossing to the turn, seconds; None where
            they are not known.
    """

    timebase_rel: float = TIMEBASE_REL
    u_gain_rel: float = 0.0
    u_offset_v: float = 0.0
    delay_upper: Measured | None = None
    delay_lower: Measured | None = None


def volts(value: float, lines: list[Contribution], n: int, terms: Terms) -> Measured:
    """Return a voltage with what is common to all voltages of the record."""
    scale = Contribution(source="gain", u=value * terms.u_gain_rel, common=True)
    zero = Contribution(source="offset", u=terms.u_offset_v, common=True)
    return combine(value, "V", [*lines, scale, zero], n=n)
