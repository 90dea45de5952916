"""Which measured times bear on a circuit's products."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.circuits.topologies import Topology
from benchtool.errors import SolveError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing
from benchtool.uncertainty import propagate


@frozen_record
class Observation:
    """A measured time and the name of the predicted one that it stands for."""

    name: str
    measured: Measured


def observe(timing: Timing, topology: Topology, divide: int = 1) -> tuple[Observation, ...]:
    """Choose the measured times that the topology's model can answer.

    Args:
        timing: What was measured; bounds are no use here.
        topology: Which times mean something.
        divide: Cycles that the output counts; above 1 only the period means anything.

    Raises:
        SolveError: If there is none, or one is not greater than 0.
    """
    if topology.run is not None:
        found = dict(_present(timing, (topology.run,)))
    elif divide > 1:
        found = dict(_present(timing, ("period",)))
    else:
        found = _high_and_low(timing)
        found.update(_present(timing, ("first_high",)))
    _refuse_nonsense(found, topology)
    return tuple(Observation(name=name, measured=item) for name, item in found.items())


def _present(timing: Timing, names: tuple[str, ...]) -> Iterator[tuple[str, Measured]]:
    for name in names:
        item = getattr(timing, name)
        if isinstance(item, Measured):
            yield name, item


def _high_and_low(timing: Timing) -> dict[str, Measured]:
    """Return both times; made of period and duty where they were not measured themselves."""
    found = dict(_present(timing, ("t_high", "t_low")))
    if len(found) == 2:
        return found
    period, duty = timing.period, timing.duty
    if not isinstance(period, Measured):
        return found
    if isinstance(duty, Measured):
        return _split(period, duty)
    if found:
        return _complete(found, period)
    return {"period": period}


def _split(period: Measured, duty: Measured) -> dict[str, Measured]:
    share = duty.value
    high = propagate(period.value * share, "s", [(share, period), (period.value, duty)])
    low = propagate(period.value * (1 - share), "s", [(1 - share, period), (-period.value, duty)])
    return {"t_high": high, "t_low": low}


def _complete(found: dict[str, Measured], period: Measured) -> dict[str, Measured]:
    (name, item), *_ = found.items()
    rest = propagate(period.value - item.value, "s", [(1.0, period), (-1.0, item)])
    other = "t_low" if name == "t_high" else "t_high"
    both = {name: item, other: rest}
    return {key: both[key] for key in ("t_high", "t_low")}


def _refuse_nonsense(found: dict[str, Measured], topology: Topology) -> None:
    if not found:
        wanted = topology.run or "t_high and t_low, or period and duty"
        raise SolveError(
            f"no time was given that a circuit of topology {topology.name} can be solved from",
            hint=f"It needs {wanted}.",
            code="too-few-times",
        )
    for name, item in found.items():
        if item.value <= 0:
            raise SolveError(
                f"{name} is {item.value:.6g} s; a time is greater than 0",
                hint="Check the times, and that the duty lies between 0 and 1.",
            )


def log_times(observations: tuple[Observation, ...]) -> FloatArray:
    """Return the logarithms of the measured times, shape (m,)."""
    return np.log([item.measured.value for item in observations])


def log_covariance(observations: tuple[Observation, ...]) -> FloatArray:
    """Return the covariance of the logarithms of the times, shape (m, m).

    References:
        JCGM 100:2008, 5.2: contributions of one source that are common are fully correlated.
    """
    relative = [item.measured.u / item.measured.value for item in observations]
    matrix = np.diag(np.square(relative))
    shared = [_common(item.measured) for item in observations]
    for i, first in enumerate(shared):
        for j, second in enumerate(shared):
            if i != j:
                matrix[i, j] = sum(first[name] * second[name] for name in first.keys() & second)
    return matrix


def _common(measured: Measured) -> dict[str, float]:
    return {part.source: part.u / measured.value for part in measured.budget if part.common}


def without_first_high(observations: tuple[Observation, ...]) -> tuple[Observation, ...]:
    """Return the observations less the first high time after power-up."""
    return tuple(item for item in observations if item.name != "first_high")
