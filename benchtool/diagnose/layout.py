"""Evidence laid out as one vector: what was seen, its covariance, and the bounds beside it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import circuit_at, find_topology
from benchtool.circuits import observations as times
from benchtool.diagnose.conditions import (
    MAIN,
    Condition,
    condition_of,
    lifted_condition,
    own_axes,
)
from benchtool.diagnose.observables import SORTS, U_MODEL, Observable, View, is_driving
from benchtool.diagnose.scatter import Axis, healthy_axes
from benchtool.errors import SolveError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Evidence, Observation, Reading
from benchtool.model.quantity import Notice
from benchtool.uncertainty import t_quantile

_NORMAL_K = 1.959964
_U_OUTPUT_V = {"output-high": 0.25, "output-low": 0.1}
"""How well an output's level is known that drives a load of which nothing is stated: assumed."""

_FREED = lifted_condition("node 0")
"""The board without any probe: a node whose own probe was taken off shows no other either."""


@frozen_record(eq=False)
class Layout:
    """What was seen of one board, or would be.

    Attributes:
        stage, design: The board as designed.
        board: Axes of the board's own scatter.
        axes: All axes: the board's, then those of the conditions.
        observables: What was seen, in order.
        noise: Covariance of the measurement, shape (m, m).
        bounds: Readings that bound a part's value.
    """

    stage: Stage
    design: Design
    board: tuple[Axis, ...]
    axes: tuple[Axis, ...]
    observables: tuple[Observable, ...]
    noise: FloatArray
    bounds: tuple[Reading, ...] = ()

    @property
    def seen(self) -> FloatArray:
        """What was seen, shape (m,)."""
        return np.array([item.seen for item in self.observables])

    @property
    def conditions(self) -> tuple[Condition, ...]:
        """Conditions in order, each once."""
        return tuple({item.condition.name: item.condition for item in self.observables}.values())

    def extended(self, proposed: tuple[Observable, ...]) -> Layout:
        """Return the layout with figures that might be seen, their errors independent."""
        added = tuple(
            axis
            for condition in {item.condition.name: item.condition for item in proposed}.values()
            for axis in own_axes(condition, self.board)
            if axis not in self.axes
        )
        m, k = len(self.observables), len(proposed)
        noise = np.zeros((m + k, m + k))
        noise[:m, :m] = self.noise
        noise[range(m, m + k), range(m, m + k)] = [item.u**2 for item in proposed]
        return replace(
            self,
            axes=(*self.axes, *added),
            observables=(*self.observables, *proposed),
            noise=noise,
        )

    def only(self, observables: tuple[Observable, ...]) -> Layout:
        """Return the layout with these figures alone, all axes kept."""
        noise = np.diag([item.u**2 for item in observables])
        return replace(self, observables=observables, noise=noise)


def lay_out(evidence: Evidence, stage: Stage, design: Design) -> Layout:
    """Lay evidence out as a vector.

    Raises:
        SolveError: If there is neither a time nor a reading.
    """
    timed = tuple(_timed(evidence, stage))
    figures = tuple(item for item in evidence.readings if _is_figure(item, stage, design))
    observables = (
        *(item for item, _ in timed),
        *(_figure(item, stage, design) for item in figures),
    )
    if not observables:
        raise SolveError(
            "there is no time and no reading that bears on the circuit",
            hint="Give a capture with at least one whole interval, or a reading.",
            code="too-few-times",
        )
    board = healthy_axes(stage, design, _temperature(evidence))
    conditions = {item.condition.name: item.condition for item in observables}.values()
    added = (axis for condition in conditions for axis in own_axes(condition, board))
    return Layout(
        stage=stage,
        design=design,
        board=board,
        axes=(*board, *added),
        observables=observables,
        noise=_noise(observables, tuple(item for _, item in timed)),
        bounds=tuple(item for item in evidence.readings if _is_bound(item, stage)),
    )


def _timed(evidence: Evidence, stage: Stage) -> Iterator[tuple[Observable, times.Observation]]:
    topology = find_topology(stage.topology)
    for number, capture in enumerate(evidence.observations):
        condition = condition_of(capture, number)
        for item in _times_of(capture, stage):
            if topology.name == "power-on" and item.name != "delay":
                continue
            observable = Observable(
                name=item.name,
                condition=condition,
                seen=math.log(item.measured.value),
                u=_relative_u(item),
            )
            yield observable, item


def _times_of(capture: Observation, stage: Stage) -> tuple[times.Observation, ...]:
    if capture.state is not None:
        return ()
    try:
        return times.observe(capture.timing, find_topology(stage.topology), stage.divide)
    except SolveError as error:
        if error.code != "too-few-times":
            raise
        first = capture.timing.first_high
        return () if first is None else (times.Observation(name="first_high", measured=first),)


def _relative_u(item: times.Observation) -> float:
    """Return the relative u, widened where few degrees of freedom make it doubtful."""
    measured = item.measured
    widened = t_quantile(0.975, measured.dof) / _NORMAL_K
    return math.hypot(measured.u / measured.value * widened, U_MODEL)


def _noise(observables: tuple[Observable, ...], timed: tuple[times.Observation, ...]) -> FloatArray:
    noise = np.diag([item.u**2 for item in observables])
    if timed:
        shared = times.log_covariance(timed)
        np.fill_diagonal(shared, 0.0)
        n = len(timed)
        noise[:n, :n] += shared
    return noise


def _is_figure(reading: Reading, stage: Stage, design: Design) -> bool:
    """Return whether a reading is a figure that the nominal board has."""
    if reading.kind == "part":
        return reading.way == "isolated" and reading.part in stage.parts
    if reading.kind not in SORTS:
        return False
    view = View(circuit_at(stage, design), design.supply.nominal)
    return bool(np.isfinite(SORTS[reading.kind].see(view)))


def _is_bound(reading: Reading, stage: Stage) -> bool:
    return reading.kind == "part" and reading.way != "isolated" and reading.part in stage.parts


def _figure(reading: Reading, stage: Stage, design: Design) -> Observable:
    name = reading.part or reading.kind
    condition = _FREED if reading.is_freed else MAIN
    if not SORTS[name].is_log:
        supply_v = design.supply.nominal
        loose_v = 0.0 if is_driving(stage.topology) else _U_OUTPUT_V.get(name, 0.0)
        seen, u = reading.value / supply_v, math.hypot(reading.u, loose_v) / supply_v
        return Observable(name=name, condition=condition, seen=seen, u=u)
    if reading.value <= 0:
        raise SolveError(
            f"the reading {reading.name} is {reading.value:g} {reading.unit}; it is greater than 0",
            hint="Check the figure and its unit.",
        )
    seen, u = math.log(reading.value), reading.u / reading.value
    return Observable(name=name, condition=condition, seen=seen, u=u)


def left_out(evidence: Evidence, layout: Layout) -> Iterator[Notice]:
    """Yield which readings bear on nothing in this circuit."""
    stage, design = layout.stage, layout.design
    for item in evidence.readings:
        if item.kind == "temperature" or _is_bound(item, stage):
            continue
        if not _is_figure(item, stage, design):
            yield Notice(
                code="reading-left-out",
                text=f"the reading {item.name} says nothing about a circuit of topology "
                f"{stage.topology} that runs: it was left out",
            )


def _temperature(evidence: Evidence) -> tuple[float, float] | None:
    return next(
        ((item.value, item.u) for item in evidence.readings if item.kind == "temperature"), None
    )
