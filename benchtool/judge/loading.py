"""Does what hangs on the timing node stop it or shift it: tolerances, leakage, probe, delays."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from types import MappingProxyType

from benchtool.circuits import Stuck, circuit_at, coordinates, predict
from benchtool.judge.extremes import find_corners
from benchtool.judge.responses import respond_nominally
from benchtool.model.decision import Concern
from benchtool.model.design import Design, Probe, Stage
from benchtool.units import format_value

NOTICEABLE = 1e-3
"""Share of a time from which a probe's shift is worth a word."""

DELAY_SHARE = 1e-2
"""Share of the period from which the IC's delays, known to some 30 %, matter."""

_TIMES = ("t_high", "t_low", "period", "delay")


def examine_loading(stage: Stage, design: Design) -> Iterator[Concern]:
    """Yield concerns about what loads the node of a stage that runs nominally.

    Args:
        stage: A stage of ``design``.
        design: Gives supply and probe.
    """
    yield from _stopping(stage, design)
    yield from _probe(stage, design)
    yield from _delays(stage, design)


def _stopping(stage: Stage, design: Design) -> Iterator[Concern]:
    stopped = find_corners(stage, design).stopped
    if not stopped:
        return
    alone = _stops_alone(stage, design)
    if alone is None:
        yield Concern(
            severity="warning",
            key=f"stage.{stage.name}",
            text=f"Permitted parts can stop the circuit together ({stopped}).",
            hint="Tighten the tolerances or lower the charging resistance.",
        )
        return
    name, value, unit, stuck = alone
    place = "C.leakage" if name == "leakage" else name
    yield Concern(
        severity="warning",
        key=f"stage.{stage.name}.{place}" if unit else f"stage.{stage.name}",
        text=(
            f"{name.replace('_', ' ').capitalize()} of {format_value(value, unit or '1', 3)}, "
            f"which the design permits, stops the circuit: {stuck.reason}."
        ),
        hint="Permit less of it, or lower the resistance that charges the node.",
    )


_KIND_UNITS = MappingProxyType({"supply": "V", "temperature": "degC", "leakage": "A"})


def _stops_alone(stage: Stage, design: Design) -> tuple[str, float, str, Stuck] | None:
    """Return the one coordinate whose end stops the circuit by itself, if there is one."""
    for axis in coordinates(stage, design):
        for end in (axis.upper, axis.lower):
            stuck = predict(circuit_at(stage, design, {axis.name: end})).stuck
            if stuck is not None:
                part_unit = "F" if axis.name == "C" else "ohm"
                unit = part_unit if axis.kind == "part" else _KIND_UNITS.get(axis.kind, "")
                return axis.name, end, unit, stuck
    return None


def _probe(stage: Stage, design: Design) -> Iterator[Concern]:
    if design.probe.at != "capacitor":
        return
    loaded = respond_nominally(stage, design)
    free = respond_nominally(stage, replace(design, probe=Probe()))
    shifts = {
        name: _relative(loaded[name], free[name]) for name in _TIMES if free.get(name) is not None
    }
    worst = max(shifts, key=lambda name: abs(shifts[name]), default=None)
    if worst is None or abs(shifts[worst]) < NOTICEABLE:
        return
    figures = ", ".join(f"{name} by {100 * share:+.2g} %" for name, share in shifts.items())
    yield Concern(
        severity="warning",
        key="probe.at",
        text=f"The probe at the capacitor of stage {stage.name} shifts {figures}.",
        hint="Probe the output instead, or use a probe of higher resistance; the shift is computed "
        "into the limits as long as the probe is stated.",
    )


def _relative(value: float | None, reference: float | None) -> float:
    return 0.0 if value is None or not reference else value / reference - 1


def _delays(stage: Stage, design: Design) -> Iterator[Concern]:
    prompt = MappingProxyType({**stage.ic.terms, "delay_upper": 0.0, "delay_lower": 0.0})
    without = replace(stage, ic=replace(stage.ic, terms=prompt))
    name = next((n for n in ("period", "t_high", "delay") if _has(stage, design, n)), None)
    if name is None:
        return
    real = respond_nominally(stage, design)[name] or 0.0
    ideal = respond_nominally(without, design)[name] or real
    share = 1 - ideal / real
    if share < DELAY_SHARE:
        return
    yield Concern(
        severity="warning",
        key=f"stage.{stage.name}.ic",
        text=(
            f"The delays of the IC make up {100 * share:.2g} % of the {name} of "
            f"{format_value(real, 's', 3)}, and their starting values are no published limits."
        ),
        hint="State delay_upper and delay_lower as measured on a good board, or time more slowly.",
    )


def _has(stage: Stage, design: Design, name: str) -> bool:
    return respond_nominally(stage, design).get(name) is not None
