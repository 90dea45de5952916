"""How likely each fault is before anything was measured, and of what size: data.

The weights compare faults with each other; ``healthy_odds`` sets the healthy board against all of
them together. None of them is a published figure: each says whether it is common practice or
assumed, and each can be replaced.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import field
from types import MappingProxyType

from benchtool.circuits.fault_entry import Fault
from benchtool.frozen import frozen_record
from benchtool.model.design import Stage

_PRACTICE = "common practice"
_ASSUMED = "assumed"


@frozen_record
class Prior:
    """What is held of one fault beforehand.

    Attributes:
        weight: Against the other faults, 1 being usual.
        by_kind: Weight where the part is of that kind, in place of ``weight``.
        by_effect: Whether its size goes by its effect on the times; else by the fault's own range.
        least: Value of the moved figure below which it is not considered, in its unit.
        rare_beyond: Value of the moved figure above which it gets rarer in proportion.
        peaks: Values of the figure near which most of them lie, in its unit.
        origin: Where the weight is from.
    """

    weight: float = 1.0
    by_kind: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))
    by_effect: bool = True
    least: float = 0.0
    rare_beyond: float = math.inf
    peaks: tuple[float, ...] = ()
    origin: str = _ASSUMED


@frozen_record
class SizeLaw:
    """How large the effect of a fault is, as |change of ln t| of the time that moves more.

    Log-uniform between ``lower`` and ``upper``; a share ``tail`` lies log-uniform beyond, up to
    ``most``.

    Attributes:
        lower, upper: Usual range.
        tail: Share beyond it.
        most: Where that ends.
        drift: Lower end of the usual range where a baseline tells small changes.
        step: Relative step of the grid of sizes; its cells have their own width in the
            likelihood, so that it may be coarse against what was measured.
    """

    lower: float = 0.05
    upper: float = 0.40
    tail: float = 0.05
    most: float = 2.5
    drift: float = 0.001
    step: float = 0.02


@frozen_record
class Scatter:
    """A scatter that is averaged over, since nobody knows a scatter exactly.

    Attributes:
        capacitor, thresholds: Factors on what is believed of them.
        share: Its weight in the probabilities.
        cautious_share: Its weight where the question is whether to be certain: a scatter believed
            too small makes wrong answers look certain.
    """

    capacitor: float
    thresholds: float
    share: float
    cautious_share: float


AS_BELIEVED = Scatter(capacitor=1.0, thresholds=1.0, share=0.9, cautious_share=0.5)


@frozen_record
class Priors:
    """All that is held beforehand.

    Attributes:
        table: By the name of the fault; a fault without an entry has a usual ``Prior``.
        healthy_odds: Healthy against any single fault.
        unexplained_odds: Nothing in the list against any single fault.
        two_faults_odds: All pairs of faults together against any single fault.
        sizes: Law of the effects.
        scatters: What is averaged over, as believed first.
        false_alarm: Share of single-fault boards that the single-fault test may refuse.
    """

    table: Mapping[str, Prior]
    healthy_odds: float = 6.0
    unexplained_odds: float = 0.02
    two_faults_odds: float = 0.1
    sizes: SizeLaw = field(default_factory=SizeLaw)
    scatters: tuple[Scatter, ...] = (
        AS_BELIEVED,
        Scatter(capacitor=2.0, thresholds=1.0, share=0.05, cautious_share=0.28),
        Scatter(capacitor=1.0, thresholds=2.0, share=0.05, cautious_share=0.22),
    )
    false_alarm: float = 0.05

    def of(self, fault: Fault) -> Prior:
        """Return what is held of a fault."""
        return self.table.get(fault.name, USUAL)

    def weight(self, fault: Fault, stage: Stage) -> float:
        """Return the weight of a fault on a stage, by the kind of its part where that is known."""
        prior = self.of(fault)
        part = stage.parts.get(fault.part) if fault.part else None
        kind = part.kind if part else None
        return prior.by_kind.get(kind, prior.weight) if kind else prior.weight


USUAL = Prior()
"""Of a fault without an entry."""


def _kinds(**weights: float) -> Mapping[str, float]:
    return MappingProxyType(weights)


DEFAULT_PRIORS = Priors(
    table=MappingProxyType(
        {
            # Wet electrolytics dry out and leak; film and class 1 ceramic hardly do either.
            "C-low": Prior(
                weight=1.0,
                by_kind=_kinds(electrolytic=2.0, tantalum=1.0, ceramic=1.5, film=0.3),
                origin=_PRACTICE,
            ),
            "C-high": Prior(
                weight=0.5,
                by_kind=_kinds(electrolytic=0.7, tantalum=0.3, ceramic=0.3, film=0.2),
                origin=_PRACTICE,
            ),
            "C-leaky": Prior(
                weight=1.0,
                by_kind=_kinds(electrolytic=2.0, tantalum=2.0, ceramic=0.3, film=0.1),
                origin=_PRACTICE,
            ),
            # Dried-out electrolytics reach some hundred ohms, rarely kilohms.
            "C-esr": Prior(
                weight=0.1,
                rare_beyond=1e3,
                by_kind=_kinds(electrolytic=0.5, tantalum=0.1, ceramic=0.02, film=0.02),
                origin=_PRACTICE,
            ),
            "C-open": Prior(weight=0.2, by_effect=False, origin=_PRACTICE),
            "C-short": Prior(
                weight=0.2,
                by_kind=_kinds(tantalum=1.0, film=0.05),
                by_effect=False,
                origin=_PRACTICE,
            ),
            # Carbon composition rises with age; a low resistor is mostly a wrong one or a bridge.
            "RA-low": Prior(weight=0.3, least=1e3, origin=_PRACTICE),
            "RA-high": Prior(weight=0.7, by_kind=_kinds(carbon=2.0), origin=_PRACTICE),
            "RA-open": Prior(weight=0.3, by_effect=False, origin=_PRACTICE),
            "RB-low": Prior(weight=0.3, origin=_PRACTICE),
            "RB-high": Prior(weight=0.7, by_kind=_kinds(carbon=2.0), origin=_PRACTICE),
            "RB-open": Prior(weight=0.3, by_effect=False, origin=_PRACTICE),
            "R-low": Prior(weight=0.3, origin=_PRACTICE),
            "R-high": Prior(weight=0.7, by_kind=_kinds(carbon=2.0), origin=_PRACTICE),
            "R-open": Prior(weight=0.3, by_effect=False, origin=_PRACTICE),
            # Two resistors by the same share is a wrong batch or damp, not two accidents.
            "R-all-low": Prior(weight=0.03),
            "R-all-high": Prior(weight=0.03),
            "discharge-leak": Prior(weight=0.3),
            "discharge-weak": Prior(weight=0.3),
            "control-low": Prior(weight=0.7, origin=_PRACTICE),
            "control-high": Prior(weight=0.4, origin=_PRACTICE),
            "control-bypass-missing": Prior(weight=0.1, by_effect=False),
            "upper-threshold": Prior(weight=0.2),
            "lower-threshold": Prior(weight=0.2),
            "node-leak-to-supply": Prior(weight=0.5, origin=_PRACTICE),
            "slow-ic": Prior(weight=0.1, by_effect=False),
            "wrong-ic-family": Prior(weight=0.2, by_effect=False, origin=_PRACTICE),
            # Most probes have 1 or 10 MΩ.
            "probe-load": Prior(weight=0.3, by_effect=False, peaks=(1e6, 10e6), origin=_PRACTICE),
            "output-high-drop": Prior(weight=0.4),
            "output-low-rise": Prior(weight=0.4),
            "diode-open": Prior(weight=0.5, by_effect=False, origin=_PRACTICE),
            "diode-short": Prior(weight=0.5, by_effect=False, origin=_PRACTICE),
        }
    )
)
"""The tool's own."""
