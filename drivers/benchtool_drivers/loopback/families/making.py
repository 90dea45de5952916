"""The families by name."""

from __future__ import annotations

from collections.abc import Sequence

from benchtool_drivers.loopback.families.described import Described
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument, Volts
from benchtool_drivers.loopback.families.keyed import Keyed
from benchtool_drivers.loopback.families.listed import Listed
from benchtool_drivers.loopback.families.positional import Positional
from benchtool_drivers.loopback.families.standard import Standard

FAMILIES: dict[str, type[SimulatedInstrument]] = {
    "positional": Positional,
    "keyed": Keyed,
    "standard": Standard,
    "described": Described,
    "listed": Listed,
}
"""Name of a structure, and the instrument that has it."""


def make_family(
    name: str,
    *,
    volts: Volts,
    dt_s: float,
    channels: Sequence[str] = ("CH1",),
    fault: str | None = None,
    running: bool = False,
) -> SimulatedInstrument:
    """Return a simulated instrument.

    Args:
        name: One of ``FAMILIES``.
        volts: The volts of each channel, or what gives them at each trigger.
        dt_s: Sample interval in seconds.
        channels: Names of the channels, in their order.
        fault: One of ``CONTENT_FAULTS``, or None.
        running: Whether it runs by itself at first.

    Raises:
        ValueError: If there is no such family or fault.
    """
    if name not in FAMILIES:
        raise ValueError(f"no family is called {name!r}: {', '.join(FAMILIES)}")
    return FAMILIES[name](volts, dt_s, channels, fault=fault, running=running)
