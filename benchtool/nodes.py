"""What a record of the capacitor node brings to a diagnosis, besides the output's times."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING

from benchtool.circuits import circuit_at
from benchtool.errors import MeasurementError, UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Waveform
from benchtool.model.design import Design, Probe, Stage
from benchtool.model.diagnosis import Reading
from benchtool.model.node import NodeFit
from benchtool.model.quantity import Measured, Notice
from benchtool.observation import Settings
from benchtool.targets import Lineup
from benchtool.timing import Shape

if TYPE_CHECKING:
    from benchtool.node import Load, Terms

U_GAIN_REL = 0.005
"""Standard uncertainty of a voltage scale of which nothing is stated: assumed."""

_U_LOAD_REL = 0.01
_ANY_PROBE = Probe(r_ohm=20e6, c_f=6e-12)
_U_ANY_PROBE_REL = 1 / math.sqrt(3)
"""Of a probe of which nothing is stated: conductance and capacitance anywhere between nothing and
those of 10 MΩ and 12 pF, what most probes have (common practice)."""
_U_DELAY_REL = 0.3
_U_LEAST_V = 5e-3


@frozen_record(eq=False)
class NodeEvidence:
    """What the node says: readings, the fit behind them, and what was assumed.

    Attributes:
        readings: Its figures.
        fit: What they were taken from.
        warnings: What was assumed.
        is_loaded: Whether a probe of which nothing is stated was on it while the output ran.
    """

    readings: tuple[Reading, ...] = ()
    fit: NodeFit | None = None
    warnings: tuple[Notice, ...] = ()
    is_loaded: bool = False


NOTHING = NodeEvidence()


def read_node(
    lineup: Lineup,
    stage: Stage | None,
    design: Design,
    settings: Settings,
    *,
    apart: bool = False,
) -> NodeEvidence:
    """Return what the capacitor node of a capture says; nothing where it was not recorded.

    Args:
        lineup: The capture, its traces and their roles.
        stage: The stage; it may name the trace.
        design: Its supply and probe.
        settings: As settled for this run.
        apart: Whether the capture was made for the node's sake, apart from that of the output.

    Raises:
        UsageError: Where ``apart`` and there is none (``no-node``).
        MeasurementError: Where ``apart`` and it shows too little (``node-too-short``).
    """
    if stage is None:
        return NOTHING
    shape = _node(lineup, stage)
    if shape is None or not isinstance(shape.trace, Waveform) or shape.levels is None:
        if apart:
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
    from benchtool.node import fit_node, node_readings  # not where no node was recorded

    terms = _terms(stage, design, settings)
    try:
        fit = fit_node(shape.trace, shape.levels, terms=terms)
    except MeasurementError as error:
        if apart:
            raise
        notice = Notice(code="node-not-used", text=f"the node was left out: {error.message}")
        return NodeEvidence(warnings=(notice,))
    is_freed = design.probe.at != "capacitor" and (apart or _stated(settings) is not None)
    found, warnings = _as_diagnosed(fit, stage, design, settings, apart=apart)
    return NodeEvidence(
        readings=tuple(replace(item, is_freed=is_freed) for item in node_readings(found)),
        fit=found,
        warnings=(*fit.warnings, *warnings),
        is_loaded=not is_freed and design.probe.at != "capacitor",
    )


def _terms(stage: Stage, design: Design, settings: Settings) -> Terms:
    from benchtool.node import Terms

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
    fit: NodeFit, stage: Stage, design: Design, settings: Settings, *, apart: bool
) -> tuple[NodeFit, tuple[Notice, ...]]:
    """Return the node as the diagnosed circuit has it: with its probe, or freed of another."""
    if design.probe.at == "capacitor":  # the circuit has the same load
        return fit, ()
    from benchtool.node import remove_probe

    probe = _stated(settings)
    if probe is not None:
        return remove_probe(fit, _load(probe, stage, _U_LOAD_REL)), ()
    if not apart:
        text = "the probe on the node is taken as no load; state it with --probe"
        return fit, (Notice(code="assumed-no-probe-load", text=text),)
    text = (
        "the probe on the node is not stated: any load up to that of 10 MΩ is allowed for; "
        "--probe makes the node tell more"
    )
    freed = remove_probe(fit, _load(_ANY_PROBE, stage, _U_ANY_PROBE_REL))
    return freed, (Notice(code="assumed-probe-load", text=text),)


def _stated(settings: Settings) -> Probe | None:
    """Return the probe that was stated, None where it is none or no load."""
    probe = settings.options.probe
    return probe if probe is not None and math.isfinite(probe.r_ohm) else None


def place_probe(lineup: Lineup, design: Design, settings: Settings) -> Design:
    """Return the design with the stated probe on the node where the capture shows the node.

    The output beside it was recorded with the probe on the capacitor then.

    Args:
        lineup: The capture of the board as it is.
        design: With the probe as it was settled.
        settings: As settled for this run.
    """
    probe = _stated(settings)
    shapes = (_node(lineup, stage) for stage in design.stages)
    if probe is None or not any(shape and isinstance(shape.trace, Waveform) for shape in shapes):
        return design
    return replace(design, probe=replace(probe, at="capacitor"))


def _load(probe: Probe, stage: Stage, u_rel: float) -> Load:
    from benchtool.node import Load

    parts = stage.parts
    through = ("RA",) if stage.topology == "astable-diode" else ("RA", "RB", "R")
    charge = sum(part.value for ref, part in parts.items() if ref in through)
    discharge = parts["RB"].value if "RB" in parts else charge

    def ohms(value: float) -> Measured:
        return Measured(value=value, u=_U_LOAD_REL * value, unit="ohm")

    return Load(
        ohm=Measured(value=probe.r_ohm, u=u_rel * probe.r_ohm, unit="ohm"),
        farad=Measured(value=probe.c_f, u=u_rel * probe.c_f, unit="F"),
        charge_ohm=ohms(charge),
        discharge_ohm=ohms(discharge),
    )
