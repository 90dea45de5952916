"""What a record of the capacitor node brings to a diagnosis, besides the output's times."""

from __future__ import annotations

import math

from benchtool.circuits import circuit_at
from benchtool.errors import MeasurementError, UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Waveform
from benchtool.model.design import Design, Probe, Stage
from benchtool.model.diagnosis import Reading
from benchtool.model.node import NodeFit
from benchtool.model.quantity import Measured, Notice
from benchtool.node import Load, Terms, fit_node, node_readings, remove_probe
from benchtool.observation import Settings
from benchtool.targets import Lineup
from benchtool.timing import Shape

U_GAIN_REL = 0.005
"""Standard uncertainty of a voltage scale of which nothing is stated: assumed."""

_U_LOAD_REL = 0.01
_U_DELAY_REL = 0.3
_U_LEAST_V = 5e-3


@frozen_record(eq=False)
class NodeEvidence:
    """What the node says: readings, the fit behind them, and what was assumed."""

    readings: tuple[Reading, ...] = ()
    fit: NodeFit | None = None
    warnings: tuple[Notice, ...] = ()


NOTHING = NodeEvidence()


def read_node(
    lineup: Lineup,
    stage: Stage | None,
    design: Design,
    settings: Settings,
    *,
    required: bool = False,
) -> NodeEvidence:
    """Return what the capacitor node of a capture says; nothing where it was not recorded.

    Args:
        lineup: The capture, its traces and their roles.
        stage: The stage; it may name the trace.
        design: Its supply and probe.
        settings: As settled for this run.
        required: Whether a capture without a node is an error.

    Raises:
        UsageError: Where ``required`` and there is none (``no-node``).
        MeasurementError: Where ``required`` and it shows too little (``node-too-short``).
    """
    if stage is None:
        return NOTHING
    shape = _node(lineup, stage)
    if shape is None or not isinstance(shape.trace, Waveform) or shape.levels is None:
        if required:
            raise UsageError(
                f"{lineup.capture.origin.source} holds no trace of the capacitor node",
                hint='Record the node, or name its trace in the design: capacitor = "...".',
                code="no-node",
            )
        return NOTHING
    if shape.levels.kind == "flat":
        u_v = max(shape.levels.u_low_v, U_GAIN_REL * abs(shape.levels.low_v), _U_LEAST_V)
        level = Reading(kind="node-level", value=shape.levels.low_v, u=u_v, unit="V")
        return NodeEvidence(readings=(level,))
    terms = _terms(stage, design, settings)
    try:
        fit = fit_node(shape.trace, shape.levels, terms=terms)
    except MeasurementError as error:
        if required:
            raise
        notice = Notice(code="node-not-used", text=f"the node was left out: {error.message}")
        return NodeEvidence(warnings=(notice,))
    found, warnings = _as_diagnosed(fit, stage, design, settings)
    return NodeEvidence(
        readings=node_readings(found), fit=found, warnings=(*fit.warnings, *warnings)
    )


def _terms(stage: Stage, design: Design, settings: Settings) -> Terms:
    circuit = circuit_at(stage, design)

    def delay(value: float) -> Measured:
        return Measured(value=value, u=_U_DELAY_REL * value, unit="s")

    return Terms(
        timebase_rel=settings.timebase_rel,
        u_gain_rel=U_GAIN_REL,
        delay_upper=delay(float(circuit.delay_upper)),
        delay_lower=delay(float(circuit.delay_lower)),
    )


def _node(lineup: Lineup, stage: Stage) -> Shape | None:
    """Return the trace that the design names as the capacitor's, or the only one that is one."""
    named = (stage.capacitor or "").casefold()
    pairs = list(zip(lineup.shapes, lineup.roles, strict=True))
    for shape, _ in pairs:
        if named and shape.trace.channel.casefold() == named:
            return shape
    found = [shape for shape, role in pairs if role == "capacitor"]
    return found[0] if len(found) == 1 else None


def _as_diagnosed(
    fit: NodeFit, stage: Stage, design: Design, settings: Settings
) -> tuple[NodeFit, tuple[Notice, ...]]:
    """Return the node as the diagnosed circuit has it: with its probe, or freed of another."""
    probe = settings.options.probe
    if design.probe.at == "capacitor":  # the circuit has the same load
        return fit, ()
    if probe is None or not math.isfinite(probe.r_ohm):
        text = "the probe on the node is taken as no load; state it with --probe"
        return fit, (Notice(code="assumed-no-probe-load", text=text),)
    return remove_probe(fit, _load(probe, stage)), ()


def _load(probe: Probe, stage: Stage) -> Load:
    parts = stage.parts
    charge = sum(part.value for ref, part in parts.items() if ref != "C")
    discharge = parts["RB"].value if "RB" in parts else charge

    def ohms(value: float) -> Measured:
        return Measured(value=value, u=_U_LOAD_REL * value, unit="ohm")

    return Load(
        ohm=ohms(probe.r_ohm),
        farad=Measured(value=probe.c_f, u=_U_LOAD_REL * probe.c_f, unit="F"),
        charge_ohm=ohms(charge),
        discharge_ohm=ohms(discharge),
    )
