"""A diagnosis as JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Callable

    from benchtool.model.diagnosis import Diagnosis, NextReading, Suspect
    from benchtool.model.node import EarlyTau
    from benchtool.model.picking import Combinations
    from benchtool.model.quantity import Quantity

Json = dict[str, Any]


def diagnosis_parts(
    found: Diagnosis | None, quantity: Callable[[Quantity | None], Json | None]
) -> Json:
    """Return what a document holds of a diagnosis: suspects, groups, next and what goes with them.

    Args:
        found: The diagnosis; None gives nothing.
        quantity: Writes a quantity.
    """
    if found is None:
        return {}
    test = found.single
    return {
        "suspects": [_suspect(item, quantity(item.estimate)) for item in found.suspects],
        "groups": [
            {
                "number": item.number,
                "members": list(item.members),
                "probability": item.probability,
                "why": item.why,
            }
            for item in found.groups
        ],
        "next": [_next(item) for item in found.next],
        "certain": found.is_certain,
        "single_fault": test and {"p_value": test.p_value, "false_alarm": test.false_alarm},
        "stuck": found.stuck,
        "stop": found.stop,
        "sentence": found.sentence,
        "used": list(found.used),
        "directions": [
            {"fault": item.fault, "dln_high": item.dln_high, "dln_low": item.dln_low}
            for item in found.directions
        ],
    }


def combination_parts(found: Combinations | None) -> Json:
    """Return which preferred values could give the products; nothing where nobody asked."""
    if found is None:
        return {}
    best = [
        {"parts": item.parts, "off_charge": item.off_charge, "off_discharge": item.off_discharge}
        for item in found.best
    ]
    return {"combinations": {"fitting": found.n_fitting, "best": best}}


def early_parts(found: EarlyTau | None, quantity: Callable[[Quantity | None], Json | None]) -> Json:
    """Return an early answer from a part of one slope; nothing where there is none."""
    if found is None:
        return {}
    early = {
        "tau": quantity(found.tau),
        "end": quantity(found.end),
        "rises": found.rises,
        "covered": found.covered,
        "arrives": quantity(found.arrives),
        "length": quantity(found.length),
    }
    return {"early": early}


def _suspect(item: Suspect, estimate: Json | None) -> Json:
    made: Json = {"fault": item.fault}
    if item.faults:
        made["faults"] = list(item.faults)
    return made | {
        "part": item.part,
        "probability": item.probability,
        "estimate": estimate,
        "lower": item.lower,
        "upper": item.upper,
        "nominal": item.nominal,
        "likelihood_ratio": item.likelihood_ratio,
        "group": item.group,
        "why": item.why,
    }


def _next(item: NextReading) -> Json:
    return {
        "reading": item.reading,
        "why": item.why,
        "gain_bits": item.gain_bits,
        "minutes": item.minutes,
        "caution": item.caution,
        "value": item.value,
        "unit": item.unit,
        "shows": [
            {
                "fault": shown.fault,
                "quantity": shown.quantity,
                "value": shown.value,
                "u": shown.u,
                "unit": shown.unit,
            }
            for shown in item.shows
        ],
    }
