"""Suspects as they are reported: probability, figure with its interval, group and reason."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import circuit_at
from benchtool.diagnose.groups import describe_group, directions, group_suspects
from benchtool.diagnose.hypotheses import TWO_FAULTS, UNEXPLAINED
from benchtool.diagnose.posterior import Posterior, estimate
from benchtool.diagnose.twofaults import Pair
from benchtool.diagnose.words import FIELD_UNITS, describe_suspect
from benchtool.model.diagnosis import Group, Suspect
from benchtool.model.quantity import Measured

_LEAST_ESTIMATED = 0.002
_NOTHING_LISTED = (
    "What was measured lies outside what one fault of the list gives on a board like this."
)


def list_suspects(
    posterior: Posterior, pairs: tuple[Pair, ...]
) -> tuple[tuple[Suspect, ...], tuple[Group, ...]]:
    """Return all suspects, likeliest first, and the groups they form.

    Args:
        posterior: What is held of the board.
        pairs: Pairs of faults that explain what a single one does not.
    """
    compass = directions(posterior)
    members = group_suspects(posterior)
    groups = tuple(
        describe_group(number, group, posterior, compass)
        for number, group in enumerate(members, start=1)
    )
    number_of = {index: number for number, group in enumerate(members, start=1) for index in group}
    count = len(posterior.model.hypotheses)
    found = [_suspect(posterior, index, number_of.get(index)) for index in range(count)]
    found.extend(_rest(float(posterior.probabilities[-1]), pairs))
    return tuple(sorted(found, key=lambda item: -item.probability)), groups


def _suspect(posterior: Posterior, index: int, group: int | None) -> Suspect:
    fault = posterior.model.hypotheses[index].fault
    behind = float(posterior.evidence[index] - posterior.evidence[:-1].max())
    suspect = Suspect(
        fault=fault.name,
        part=fault.part,
        probability=float(posterior.probabilities[index]),
        likelihood_ratio=float(np.exp(behind)),
        group=group,
        why=fault.seen,
    )
    if suspect.probability < _LEAST_ESTIMATED:
        return suspect
    sized = _with_figure(suspect, posterior, index)
    return replace(sized, why=describe_suspect(sized, fault.seen))


def _with_figure(suspect: Suspect, posterior: Posterior, index: int) -> Suspect:
    """Return the suspect with the figure that has moved, unchanged where there is none."""
    figure = estimate(posterior, index)
    if figure is None:
        return suspect
    fault = posterior.model.hypotheses[index].fault
    field = fault.move.fields[0]
    unit = FIELD_UNITS.get(field, fault.unit) if fault.unit == "1" else fault.unit
    return replace(
        suspect,
        estimate=Measured(value=figure.value, u=figure.u, unit=unit),
        lower=figure.lower,
        upper=figure.upper,
        nominal=_nominal(posterior, field),
    )


def _nominal(posterior: Posterior, field: str) -> float | None:
    layout = posterior.model.layout
    value = float(getattr(circuit_at(layout.stage, layout.design), field))
    return value if 0 < value < math.inf else None


def _rest(unexplained: float, pairs: tuple[Pair, ...]) -> Iterator[Suspect]:
    """Yield what no single fault explains, shared between the best pairs and the unknown."""
    left = unexplained
    for pair in pairs:
        share = unexplained * pair.share
        left -= share
        yield Suspect(
            fault=TWO_FAULTS,
            faults=pair.faults,
            probability=share,
            why=f"Both at once would give it: {pair.words}.",
        )
    yield Suspect(fault=UNEXPLAINED, probability=max(left, 0.0), why=_NOTHING_LISTED)
