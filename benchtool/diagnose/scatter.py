"""Healthy scatter: what may differ between good boards, as axes along which a circuit is moved."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Literal

import numpy as np

from benchtool.circuits import circuit_at, coordinates, find_topology
from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.coordinates import term_value
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Part, Stage
from benchtool.model.quantity import Notice

Scaled = Literal["capacitor", "thresholds", "none"]
Law = Literal["log", "share", "plain"]

_STEP = 0.5
"""Standard deviations by which an axis is moved to find its slopes; the error is of third order."""

_LEAST_REL: Mapping[str, float] = {"C": 0.10, "RA": 0.01, "RB": 0.01, "R": 0.01}
"""Tolerance taken where the design states none, half-width: assumed."""


@frozen_record
class Axis:
    """One independent way in which good boards, or the means of a capture, differ.

    Attributes:
        name: A coordinate of the circuit, or a name of a condition's own.
        centre: Where it is expected.
        u: Standard uncertainty.
        law: What both are of: ``log`` of the logarithm of a part's value over the marked one,
            ``share`` of the relative deviation of an IC's term, ``plain`` of the coordinate.
        scaled: What believed scatter it belongs to.
    """

    name: str
    centre: float
    u: float
    law: Law = "plain"
    scaled: Scaled = "none"


@frozen_record(eq=False)
class Deviations:
    """All axes at their centre, then each a step above, then each a step below: shape (1 + 2n, 1).

    Attributes:
        axes: The axes, in order.
    """

    axes: tuple[Axis, ...]

    @property
    def n_rows(self) -> int:
        """Number of points."""
        return 1 + 2 * len(self.axes)

    def of(self, axis: Axis) -> FloatArray:
        """Return the deviation from the axis's centre at every point."""
        column = np.zeros((self.n_rows, 1))
        index = self.axes.index(axis)
        column[1 + index] = _STEP * axis.u
        column[1 + len(self.axes) + index] = -_STEP * axis.u
        return column

    def named(self, name: str) -> Value:
        """Return the deviation of the axis of a name, 0 where there is none."""
        return next((self.of(axis) for axis in self.axes if axis.name == name), 0.0)

    def slopes(self, values: FloatArray) -> FloatArray:
        """Return the change for one standard uncertainty of each axis.

        Args:
            values: At every point, shape (1 + 2n, ...).

        Returns:
            Shape (n, ...).
        """
        n = len(self.axes)
        change: FloatArray = (values[1 : 1 + n] - values[1 + n :]) / (2 * _STEP)
        return change

    def factors(self, capacitor: float, thresholds: float) -> FloatArray:
        """Return what each axis's u is multiplied with when the believed scatters are."""
        by_kind = {"capacitor": capacitor, "thresholds": thresholds, "none": 1.0}
        return np.array([by_kind[axis.scaled] for axis in self.axes])


def healthy_axes(
    stage: Stage, design: Design, temperature: tuple[float, float] | None = None
) -> tuple[Axis, ...]:
    """Return the axes of a stage: parts, supply, temperature, the IC's terms.

    Args:
        stage: A stage of ``design``.
        design: Gives supply and temperature.
        temperature: What was read of it with its u, in place of the design's range.
    """
    return tuple(_axes(stage, design, temperature))


def _axes(stage: Stage, design: Design, temperature: tuple[float, float] | None) -> Iterator[Axis]:
    yield from (_part_axis(part) for part in stage.parts.values())
    for item in coordinates(stage, design):
        if item.kind == "part":
            continue
        if item.name == "temperature" and temperature:
            yield Axis(name=item.name, centre=temperature[0], u=temperature[1])
            continue
        if item.name in find_topology(stage.topology).ic_terms:
            yield Axis(name=item.name, centre=0.0, u=item.u / item.centre, law="share")
            continue
        scaled: Scaled = "thresholds" if "threshold" in item.name else "none"
        yield Axis(name=item.name, centre=item.centre, u=item.u, scaled=scaled)


def _part_axis(part: Part) -> Axis:
    lower, upper = part.lower_rel, part.upper_rel
    if lower == upper == 0:
        lower, upper = -_LEAST_REL[part.ref], _LEAST_REL[part.ref]
    return Axis(
        name=part.ref,
        centre=math.log1p((lower + upper) / 2),
        u=(upper - lower) / math.sqrt(12),
        law="log",
        scaled="capacitor" if part.ref == "C" else "none",
    )


def tolerance_notices(stage: Stage) -> Iterator[Notice]:
    """Yield what was assumed of parts without a tolerance."""
    for ref, part in stage.parts.items():
        if part.lower_rel == part.upper_rel == 0:
            percent = f"{100 * _LEAST_REL[ref]:g} %"
            yield Notice(
                code="assumed-tolerance",
                text=f"no tolerance is stated for {ref}: {percent} was assumed",
            )


def healthy_circuit(
    stage: Stage,
    design: Design,
    axes: tuple[Axis, ...],
    deviations: Deviations,
    overrides: Mapping[str, Value],
) -> Circuit:
    """Return the healthy circuit at every point of the deviations.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        axes: Those of ``deviations`` that are coordinates of the circuit.
        deviations: Where to be.
        overrides: Coordinates that a condition sets.
    """
    supply_v = overrides.get("supply", design.supply.nominal)
    point = {
        axis.name.partition("@")[0]: _value(axis, deviations, stage, supply_v) for axis in axes
    }
    return circuit_at(stage, design, {**point, **overrides})


def _value(axis: Axis, deviations: Deviations, stage: Stage, supply_v: Value) -> Value:
    """Return the coordinate that an axis moves, at every deviation."""
    value = axis.centre + deviations.of(axis)
    name = axis.name.partition("@")[0]
    if axis.law == "log":
        return stage.parts[name].value * np.exp(value)
    if axis.law == "share":
        return term_value(stage, name, supply_v) * (1 + value)
    return value
