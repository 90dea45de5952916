"""IC families: starting values of every term with its spread and where it comes from."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Literal

from benchtool.circuits.circuit import Value
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record

TERM_UNITS: Mapping[str, str] = MappingProxyType(
    {
        "discharge_saturation": "V",
        "discharge_resistance": "ohm",
        "discharge_leakage": "A",
        "bias_current": "A",
        "delay_upper": "s",
        "delay_lower": "s",
        "output_high_drop": "V",
        "output_high_resistance": "ohm",
        "output_low": "V",
        "output_low_resistance": "ohm",
        "u_threshold": "1",
        "u_split": "1",
    }
)
"""Every term of an IC by its design-file name, with its unit."""

_BIPOLAR_ONE_SHOT = (
    "from the published initial error of the one-shot, 1 % typical, SLFS022, read as u"
)
_BIPOLAR_ASTABLE = (
    "from the published initial error of the astable, 2.25 % typical, SLFS022, read as u"
)
_CMOS_ERROR = "from the published initial error, 1 % typical, SLFS043, read as u"


@frozen_record
class Term:
    """A starting value of one term.

    Attributes:
        value: SI unit of ``TERM_UNITS``, at ``at_supply_v`` where it depends on the supply.
        u_rel: Standard uncertainty as a share of the value.
        law: Normal, or rectangular from 0 to twice the value.
        origin: Where value and spread come from.
        at_supply_v: Supply to which the value refers, volts.
        supply_power: Power of the supply with which the value goes.
    """

    value: float
    u_rel: float = 0.0
    law: Literal["normal", "rectangular"] = "normal"
    origin: str
    at_supply_v: float = 5.0
    supply_power: float = 0.0

    def at(self, supply_v: Value) -> Value:
        """Return the value at a supply, in the term's unit."""
        if not self.supply_power:
            return self.value
        return self.value * (supply_v / self.at_supply_v) ** self.supply_power


@frozen_record
class Family:
    """A family of timer ICs."""

    name: str
    title: str
    terms: Mapping[str, Term]


_ZERO = Term(value=0.0, origin="no published figure read: taken as 0, state it where R is small")

BIPOLAR = Family(
    name="bipolar",
    title="bipolar 8-pin timer",
    terms=MappingProxyType(
        {
            "discharge_saturation": Term(
                value=0.037,
                u_rel=0.5,
                origin="line through two published saturation points, Doc ID 2182 Rev 6 "
                "(80 mV at 4.5 mA, 180 mV at 15 mA); spread assumed",
            ),
            "discharge_resistance": Term(
                value=9.5,
                u_rel=0.3,
                origin="slope of the line through two published saturation points, "
                "Doc ID 2182 Rev 6; spread assumed",
            ),
            "discharge_leakage": Term(
                value=20e-9, u_rel=0.5, origin="published typical, SLFS022; spread assumed"
            ),
            "bias_current": Term(
                value=15e-9,
                u_rel=3**-0.5,
                law="rectangular",
                origin="0 to the published typical 30 nA, SLFS022: it flows near VU only",
            ),
            "delay_upper": Term(value=0.16e-6, u_rel=0.3, origin="assumed"),
            "delay_lower": Term(value=0.16e-6, u_rel=0.3, origin="assumed"),
            "output_high_drop": Term(value=1.5, u_rel=0.15, origin="from memory; spread assumed"),
            "output_high_resistance": _ZERO,
            "output_low": _ZERO,
            "output_low_resistance": _ZERO,
            "u_threshold": Term(value=0.0055, origin=_BIPOLAR_ONE_SHOT),
            "u_split": Term(value=0.022, origin=_BIPOLAR_ASTABLE),
        }
    ),
)
CMOS = Family(
    name="cmos",
    title="CMOS 8-pin timer",
    terms=MappingProxyType(
        {
            "discharge_saturation": Term(value=0.0, origin="a field-effect switch has none"),
            "discharge_resistance": Term(
                value=14.0,
                u_rel=0.3,
                origin="published on-voltages, SLFS043: 14 ohm at 5 V and 7.7 ohm at 15 V, a power "
                "law of the supply through both; spread assumed",
                supply_power=-0.5442,
            ),
            "discharge_leakage": Term(
                value=0.1e-9, u_rel=0.5, origin="published typical, SLFS043; spread assumed"
            ),
            "bias_current": Term(value=0.0, origin="published typical is 10 pA, SLFS043"),
            "delay_upper": Term(
                value=0.14e-6,
                u_rel=0.3,
                origin="from the published highest frequency, SLFS043; spread assumed",
            ),
            "delay_lower": Term(
                value=0.14e-6,
                u_rel=0.3,
                origin="from the published highest frequency, SLFS043; spread assumed",
            ),
            "output_high_drop": Term(value=0.0, origin="a field-effect output has none"),
            "output_high_resistance": _ZERO,
            "output_low": _ZERO,
            "output_low_resistance": _ZERO,
            "u_threshold": Term(value=0.006, origin=_CMOS_ERROR),
            "u_split": Term(value=0.004, origin=_CMOS_ERROR),
        }
    ),
)

FAMILIES: Mapping[str, Family] = MappingProxyType({"bipolar": BIPOLAR, "cmos": CMOS})


def find_family(name: str) -> Family:
    """Return the IC family called ``name``.

    Raises:
        UsageError: If there is none.
    """
    if name not in FAMILIES:
        raise UsageError(
            f"there is no IC family called {name!r}",
            hint=f"Use {' or '.join(FAMILIES)}, or state the IC's terms in the design file.",
        )
    return FAMILIES[name]
