"""The JSON document of a watch: that of an analysis, and where the reading stands."""

from __future__ import annotations

from typing import Any

from benchtool.model.quantity import Measured
from benchtool.model.result import Analysis
from benchtool.model.watch import WATCHED_UNITS, Reading
from benchtool.report.document import analysis_document, quantity
from benchtool.uncertainty import expanded

Json = dict[str, Any]


def watch_document(reading: Reading, now_s: float, *, version: str, made_at: str) -> Json:
    """Return the document of one update, ready for ``json.dumps``.

    Args:
        reading: What is known.
        now_s: Now, on the clock of the watcher.
        version: Version of benchtool.
        made_at: UTC time in ISO 8601 with a Z.
    """
    plan, result = reading.plan, reading.result
    analysis = Analysis(
        command="watch",
        sources=(reading.source,) if reading.source else (),
        results=(result,) if result else (),
        verdict=reading.verdict,
        rule=plan.rule if plan.design else None,
        design=plan.design,
        timebase_rel=plan.timebase_rel,
        instrument=plan.instrument,
        warnings=(reading.trouble,) if reading.trouble else (),
    )
    document = analysis_document(analysis, version=version, made_at=made_at)
    if result is not None and result.verdict is not None:
        document["results"][0]["verdict"] = result.verdict
    document["watch"] = _watch(reading, now_s)
    return document


def _watch(reading: Reading, now_s: float) -> Json:
    plan, distance = reading.plan, reading.distance
    came_s, every_s = reading.came_at_s, reading.every_s
    age_s = None if came_s is None else max(0.0, now_s - came_s)
    goal = plan.goal
    return {
        "update": reading.n_updates,
        "quantity": plan.quantity,
        "value": quantity(reading.value),
        "averaged_n": reading.n_averaged,
        "goal": goal
        and {
            "value": goal.value,
            "unit": WATCHED_UNITS[plan.quantity],
            "source": goal.source,
        },
        "distance": distance,
        "distance_rel": distance / goal.value if distance is not None and goal else None,
        "distance_in_U": _in_U(reading),
        "moved": reading.moved,
        "change": quantity(reading.change),
        "heading": reading.heading,
        "age_s": age_s,
        "due_in_s": None if age_s is None or every_s is None else every_s - age_s,
        "marks": [{"number": mark.number, "value": quantity(mark.value)} for mark in reading.marks],
    }


def _in_U(reading: Reading) -> float | None:
    if not isinstance(reading.value, Measured) or reading.distance is None:
        return None
    U = expanded(reading.value)
    return reading.distance / U if U > 0 else None
