"""What to measure next: the most information per minute first."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import islice

import numpy as np

from benchtool.diagnose.candidates import Candidate, candidates
from benchtool.diagnose.costs import Cost
from benchtool.diagnose.gain import (
    Foreseen,
    Live,
    expected_bits,
    foresee,
    least_clearance,
    live_nodes,
)
from benchtool.diagnose.posterior import Posterior
from benchtool.diagnose.words import join, name_fault
from benchtool.model.arrays import FloatArray
from benchtool.model.diagnosis import NextReading, Showing
from benchtool.units import format_value

LEAST_BITS, LEAST_BITS_PER_MINUTE = 0.05, 0.01
_MOST = 5
_LEAST_SUSPECT = 0.02
_MOST_SHOWN = 4


def propose(posterior: Posterior, costs: Mapping[str, Cost]) -> tuple[NextReading, ...]:
    """Return the readings that are worth their minutes.

    Args:
        posterior: What is held of the board.
        costs: What each reading takes.
    """
    worth = (
        item
        for item in rate_readings(posterior, costs)
        if item.gain_bits >= LEAST_BITS and item.bits_per_minute >= LEAST_BITS_PER_MINUTE
    )
    return tuple(islice(worth, _MOST))


def rate_readings(posterior: Posterior, costs: Mapping[str, Cost]) -> tuple[NextReading, ...]:
    """Return every reading that the board allows, the most information per minute first.

    Args:
        posterior: What is held of the board.
        costs: What each reading takes.
    """
    live = live_nodes(posterior)
    found = []
    for candidate in candidates(
        posterior.model.layout, lambda ohm: least_clearance(posterior, live, ohm), costs
    ):
        foreseen = foresee(posterior, live, candidate)
        bits = expected_bits(live, foreseen)
        shows = tuple(_shows(posterior, live, candidate, foreseen))
        found.append(_proposal(candidate, costs[candidate.name], bits, shows))
    return tuple(sorted(found, key=lambda item: -item.bits_per_minute))


def _proposal(
    candidate: Candidate, cost: Cost, bits: float, shows: tuple[Showing, ...]
) -> NextReading:
    return NextReading(
        reading=candidate.name,
        why=f"{_how(candidate, cost)}: {_tells(shows)}",
        gain_bits=bits,
        minutes=cost.minutes,
        caution=cost.caution,
        value=candidate.value,
        unit=candidate.unit,
        shows=shows,
    )


def _how(candidate: Candidate, cost: Cost) -> str:
    how = f"{cost.how[0].upper()}{cost.how[1:]}"
    if candidate.value is None:
        return how
    return f"{how} ({format_value(candidate.value, candidate.unit)})"


def _tells(shows: tuple[Showing, ...]) -> str:
    if not shows:
        return "it tells the suspects apart."
    quantity = shows[0].quantity
    figures = [
        f"{format_value(item.value, item.unit)} with {name_fault(item.fault)}"
        for item in shows
        if item.quantity == quantity
    ]
    return f"{quantity} would be about {join(figures)}."


def _shows(
    posterior: Posterior, live: Live, candidate: Candidate, foreseen: Foreseen
) -> Iterator[Showing]:
    """Yield the figure that tells the likeliest suspects apart best."""
    chances = np.bincount(live.labels, weights=live.weights)
    likeliest = [i for i in np.argsort(-chances).tolist() if chances[i] >= _LEAST_SUSPECT]
    figures = {
        label: found
        for label in likeliest[:_MOST_SHOWN]
        if (found := _moments(live, foreseen, label)) is not None
    }
    if not figures:
        return
    column = _telling(figures)
    item = candidate.observables[column]
    supply_v = posterior.model.layout.design.supply.nominal
    for label, (means, sds) in figures.items():
        value = item.sort.plain(float(means[column]), supply_v)
        scale = abs(value) if item.sort.is_log else supply_v
        yield Showing(
            fault=posterior.model.names[label],
            quantity=item.sort.quantity,
            value=value,
            u=float(sds[column]) * scale,
            unit=item.sort.unit,
        )


def _moments(live: Live, foreseen: Foreseen, label: int) -> tuple[FloatArray, FloatArray] | None:
    """Return means and standard deviations under one suspect, None where it would stop."""
    at = live.of(label)
    at = at[np.isfinite(foreseen.means[at]).all(axis=1)]
    if not at.size:
        return None
    weights = live.weights[at] / live.weights[at].sum()
    means = weights @ foreseen.means[at]
    within = np.diagonal(foreseen.covariances[at], axis1=1, axis2=2)
    variances = weights @ (within + (foreseen.means[at] - means) ** 2)
    return means, np.sqrt(variances)


def _telling(figures: Mapping[int, tuple[FloatArray, FloatArray]]) -> int:
    """Return the column in which the suspects lie furthest apart against their spread."""
    means = np.array([mean for mean, _ in figures.values()])
    spreads = np.array([sd for _, sd in figures.values()])
    apart = means.max(axis=0) - means.min(axis=0)
    return int(np.argmax(apart / spreads.mean(axis=0)))
