"""What each further reading costs and what to beware of: data, to be replaced where it differs."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from benchtool.frozen import frozen_record


@frozen_record
class Cost:
    """One way to learn more.

    Attributes:
        minutes: Work that it takes; the table's figures are assumed.
        u_rel: Standard uncertainty to expect of it, as a share of the figure; of the supply for
            a voltage that may be near zero.
        caution: What to beware of, one sentence.
        how: What to do, a few words.
    """

    minutes: float
    u_rel: float
    caution: str
    how: str


_LIVE = (
    "The board is powered: an earth-referenced clip on a mains-fed board is a short circuit, so "
    "use an isolated supply or a differential probe."
)
_OFF = "Power off, and let the capacitor discharge through a resistor before touching it."
_LOADS = "Loads may start by themselves when power returns."

COSTS: Mapping[str, Cost] = MappingProxyType(
    {
        "control-pin": Cost(
            minutes=0.5, u_rel=0.003, caution=_LIVE, how="read the control pin with a voltmeter"
        ),
        "supply": Cost(
            minutes=0.5, u_rel=0.002, caution=_LIVE, how="read the supply at the IC's own pins"
        ),
        "discharge-pin": Cost(
            minutes=1.0,
            u_rel=0.001,
            caution=_LIVE,
            how="read the discharge pin while the output is low",
        ),
        "node": Cost(
            minutes=1.5,
            u_rel=0.005,
            caution=f"{_LIVE} State the probe's ohms and picofarads: it loads the node.",
            how="record the capacitor's voltage over a few cycles",
        ),
        "power-up": Cost(
            minutes=1.0,
            u_rel=0.001,
            caution=f"{_LOADS} Let the capacitor discharge before.",
            how="record from before the supply is switched on",
        ),
        "shunt": Cost(
            minutes=1.5,
            u_rel=0.01,
            caution=f"{_LIVE} Clip it on with the power off, and keep the capacitor's polarity.",
            how="clip a known resistor across the capacitor and record again",
        ),
        "probe-lifted": Cost(
            minutes=1.0,
            u_rel=0.0005,
            caution=_LIVE,
            how="take any probe off the capacitor and record the output again",
        ),
        "added-capacitor": Cost(
            minutes=1.5,
            u_rel=0.01,
            caution=f"{_OFF} Keep the capacitor's polarity and rated voltage.",
            how="clip a known capacitor across the one that is there and record again",
        ),
        "second-supply": Cost(
            minutes=1.5,
            u_rel=0.002,
            caution=f"Stay within the ratings of the IC and of the loads. {_LOADS}",
            how="record again at another supply",
        ),
        "RA": Cost(minutes=4.0, u_rel=0.005, caution=_OFF, how="lift one leg of RA and measure it"),
        "RB": Cost(minutes=4.0, u_rel=0.005, caution=_OFF, how="lift one leg of RB and measure it"),
        "R": Cost(minutes=4.0, u_rel=0.005, caution=_OFF, how="lift one leg of R and measure it"),
        "C": Cost(
            minutes=5.0, u_rel=0.01, caution=_OFF, how="lift one leg of the capacitor, measure it"
        ),
    }
)
"""By the name of the reading."""
