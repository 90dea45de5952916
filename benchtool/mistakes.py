"""What cannot be meant where captures and readings are brought together for a diagnosis."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from benchtool.circuits import circuit_at, find_topology, predict
from benchtool.circuits.circuit import with_fields
from benchtool.errors import MeasurementError, UsageError
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Reading
from benchtool.model.quantity import Notice
from benchtool.model.result import Analysis, StageResult
from benchtool.units import format_value

if TYPE_CHECKING:
    from benchtool.evidence import Companion

_OF_A_STAGE = ("supply", "temperature")
"""Readings that hold for the whole board."""

_LEAST_RECORD = 2.0  # times the time that a healthy board stays in a state


def told_apart(
    main: Analysis,
    further: Sequence[tuple[Companion, Analysis]],
    readings: Sequence[Reading],
) -> None:
    """Refuse what is the same twice, and a reading that might be of several stages.

    Args:
        main: What was observed in the capture of the board as it is.
        further: What was observed in further captures.
        readings: Figures that were brought.

    Raises:
        UsageError: ``same-capture`` or ``stage-not-named``.
    """
    for item, seen in further:
        same = seen.sources[0].sha256 == main.sources[0].sha256
        if same and seen.sources[0].sha256 and item.role != "power-up":
            raise UsageError(
                f"{item.source} is given twice: as the board as it is, and as --{item.role}",
                hint=f"Record again for --{item.role}, or leave it out.",
                code="same-capture",
            )
    own = next((item.name for item in readings if item.kind not in _OF_A_STAGE), None)
    if own is not None and len(main.results) > 1:
        stages = ", ".join(str(result.stage) for result in main.results)
        raise UsageError(
            f"the reading {own} may be of any stage: {stages}",
            hint="Say which with --stage.",
            code="stage-not-named",
        )


def refuse_short(result: StageResult, design: Design) -> None:
    """Refuse to call a board dead of which too little was recorded.

    Args:
        result: What was observed of a stage.
        design: Its supply.

    Raises:
        MeasurementError: ``no-interval``, where a healthy board might stay in a state that long.
    """
    if result.flat is None or result.flat.state is None or result.design is None:
        return
    if find_topology(result.design.topology).run is not None:
        return
    times = predict(circuit_at(result.design, design))
    usual = times.t_high if result.flat.state == "high" else times.t_low
    usual_s = float(times.period or 0.0) / 2 if usual is None else float(usual)
    if result.flat.length_s < _LEAST_RECORD * usual_s:
        raise MeasurementError(
            f"the record of {format_value(result.flat.length_s, 's')} shows no edge, and a healthy "
            f"board stays {result.flat.state} for {format_value(usual_s, 's', 3)}",
            hint=f"Record {format_value(2 * _LEAST_RECORD * usual_s, 's', 2)} or more.",
            code="no-interval",
        )


def refuse_stopping(
    stage: Stage | None, companions: Sequence[tuple[Companion, StageResult]], design: Design
) -> None:
    """Refuse a resistor across the capacitor with which the board could not have run.

    Args:
        stage: The circuit as designed.
        companions: Further captures, and what was observed in each.
        design: Its supply.

    Raises:
        UsageError: ``shunt-too-small``.
    """
    for item, seen in companions:
        if stage is None or item.role != "shunt" or seen.flat is not None or not item.value:
            continue
        circuit = circuit_at(stage, design)
        ohm = 1 / (1 / float(circuit.shunt_ohm) + 1 / item.value)
        times = predict(with_fields(circuit, {"shunt_ohm": ohm}))
        first = times.period if stage.divide > 1 else times.t_high
        if first is not None and not math.isfinite(float(first)):
            raise UsageError(
                f"with {format_value(item.value, 'ohm')} across the capacitor this board would "
                f"stand still, yet {item.source} runs",
                hint="Check the value of the resistor that was clipped on.",
                code="shunt-too-small",
            )


def unused_notices(
    result: StageResult,
    companions: Sequence[tuple[Companion, StageResult]],
    readings: Sequence[Reading],
) -> tuple[Notice, ...]:
    """Return what was brought and says nothing, on a board that runs or stands still.

    Args:
        result: What was observed of a stage.
        companions: Further captures, and what was observed in each.
        readings: Figures that were brought.
    """
    stands = result.flat is not None and result.flat.state is not None
    found = []
    for item, seen in companions:
        still = seen.flat is not None and seen.flat.state is not None
        if stands or still:
            which = "the board stands still" if stands else "it shows no edge"
            text = f"the --{item.role} capture {item.source} was left out: {which}"
            found.append(Notice(code="capture-left-out", text=text))
    if stands:
        names = [item.name for item in readings if item.kind != "node-level"]
        found += [
            Notice(
                code="reading-left-out",
                text=f"the reading {name} was left out: the board stands still",
            )
            for name in names
            if not name.startswith("node-")
        ]
    return tuple(found)
