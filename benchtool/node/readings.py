"""The figures of a node as readings for the diagnosis."""

from __future__ import annotations

from benchtool.model.diagnosis import Reading, ReadingKind
from benchtool.model.node import NodeFit
from benchtool.model.quantity import Measured


def node_readings(fit: NodeFit) -> tuple[Reading, ...]:
    """Return what a fitted node says, each figure as a reading.

    Args:
        fit: The node; with the probe's load in it where the diagnosed circuit has the probe too.
    """
    figures: tuple[tuple[ReadingKind, Measured | None], ...] = (
        ("node-upper", fit.upper),
        ("node-lower", fit.lower),
        ("node-charge-end", fit.charge.end if fit.charge else None),
        ("node-discharge-end", fit.discharge.end if fit.discharge else None),
        ("node-tau-charge", fit.charge.tau if fit.charge else None),
        ("node-tau-discharge", fit.discharge.tau if fit.discharge else None),
    )
    return tuple(
        Reading(kind=kind, value=figure.value, u=figure.u, unit=figure.unit)
        for kind, figure in figures
        if figure is not None and figure.u > 0
    )
