"""Concerns about a design that reads well: what physics says of it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

from benchtool.circuits import circuit_at, predict
from benchtool.judge.loading import examine_loading
from benchtool.judge.room import examine_limits
from benchtool.judge.wiring import examine_parts
from benchtool.model.decision import Concern
from benchtool.model.design import Design, Probe, Stage


def examine(design: Design, *, expected_u_rel: float | None = None) -> tuple[Concern, ...]:
    """Return what in a valid design cannot work, or not well, stage by stage.

    Args:
        design: A design without faults of form.
        expected_u_rel: Relative standard uncertainty to expect of a measured time; None takes
            that of the instrument's timebase, the least it can be.

    Returns:
        Errors where a good board cannot pass, warnings where it may not or where a figure is
        missing; empty for a sound design.
    """
    return tuple(
        concern for stage in design.stages for concern in _examine(stage, design, expected_u_rel)
    )


def _examine(stage: Stage, design: Design, u_rel: float | None) -> Iterator[Concern]:
    stuck = predict(circuit_at(stage, design)).stuck
    if stuck is not None:
        key, hint = _remedy(stage, design)
        yield Concern(
            severity="error",
            key=key,
            text=f"The nominal circuit of stage {stage.name} never switches: {stuck.reason}.",
            hint=hint,
        )
        yield from examine_parts(stage, design)
        return
    yield from examine_loading(stage, design)
    yield from examine_parts(stage, design)
    yield from examine_limits(stage, design, u_rel)


def _remedy(stage: Stage, design: Design) -> tuple[str, str]:
    """Return what to change, its key and a hint, by trying what would make the circuit run."""
    place = f"stage.{stage.name}"
    if _runs(stage, replace(design, probe=Probe())):
        return "probe.at", "Probe the output instead: at the capacitor this probe stops the board."
    if _runs(replace(stage, leak_ohm=math.inf), design):
        return f"{place}.leak", "State a higher leak resistance, or smaller resistors."
    if predict(circuit_at(stage, design, {"leakage": 0.0})).stuck is None:
        return f"{place}.C.leakage", "State a smaller leakage, or use smaller resistors."
    return place, "Check supply, thresholds and resistors: the node must cross both thresholds."


def _runs(stage: Stage, design: Design) -> bool:
    return predict(circuit_at(stage, design)).stuck is None
