"""An early answer for slow circuits: from a part of one slope of the node, its end being known."""

from __future__ import annotations

from benchtool.circuits import circuit_at
from benchtool.errors import UsageError
from benchtool.model.capture import Waveform
from benchtool.model.design import Design, Stage
from benchtool.model.node import EarlyTau
from benchtool.model.quantity import Measured
from benchtool.node import find_early_tau
from benchtool.observation import Settings
from benchtool.targets import Lineup, find_channel

_U_THRESHOLD = 0.006  # of a threshold, relative: the spread of a family, see circuits.families


def early_answer(
    lineup: Lineup, end: Measured, design: Design | None, stage: Stage | None, settings: Settings
) -> tuple[EarlyTau, int]:
    """Return the time constant of the longest slope of the node, and which trace it is.

    Args:
        lineup: The capture, its traces and their roles.
        end: Voltage to which the slope would settle.
        design: Gives the supply, where there is one.
        stage: Gives the thresholds between which the node will go; None leaves out the lengths.
        settings: As settled for this run.

    Raises:
        UsageError: If no trace is a waveform that could be the node (``no-node``).
        MeasurementError: If the slope is too short, or beyond its end.
    """
    index = _index(lineup, stage, settings.options.read.channel)
    trace = lineup.shapes[index].trace
    if not isinstance(trace, Waveform) or trace.is_logic:
        raise UsageError(
            f"{trace.channel} is no waveform: a slope has volts",
            hint="Record the capacitor node with an instrument that samples volts.",
            code="no-node",
        )
    begin, target = _thresholds(end, stage, design)
    found = find_early_tau(
        trace, end, begin=begin, target=target, timebase_rel=settings.timebase_rel
    )
    return found, index


def _index(lineup: Lineup, stage: Stage | None, channel: str | None) -> int:
    named = channel or (stage.capacitor if stage else None)
    if named is not None:
        return find_channel(lineup.capture, named)
    if len(lineup.shapes) == 1:
        return 0
    found = [i for i, role in enumerate(lineup.roles) if role == "capacitor"]
    if len(found) == 1:
        return found[0]
    names = ", ".join(shape.trace.channel for shape in lineup.shapes[:16])
    raise UsageError(
        f"{lineup.capture.origin.source} holds several traces that could be the node",
        hint=f"Give --channel: {names}.",
        code="choose-channel",
    )


def _thresholds(
    end: Measured, stage: Stage | None, design: Design | None
) -> tuple[Measured | None, Measured | None]:
    """Return where the slope begins and where it will end, on the board as designed."""
    if stage is None or design is None:
        return None, None
    circuit = circuit_at(stage, design)
    lower, upper = (
        Measured(value=float(v), u=_U_THRESHOLD * float(v), unit="V")
        for v in (circuit.v_lower, circuit.v_upper)
    )
    rises = end.value > (lower.value + upper.value) / 2
    return (lower, upper) if rises else (upper, lower)
