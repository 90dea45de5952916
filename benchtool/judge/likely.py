"""The likeliest moved part, from the direction in which both times moved; None where it is open.

One change at a time is fitted to the logarithms of high and low time, the other tolerances being
healthy scatter. This is no diagnosis: no priors, no second fault, no further readings.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping

import numpy as np

from benchtool.circuits import Coordinate, coordinates, find_topology
from benchtool.frozen import frozen_record
from benchtool.judge.responses import respond
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Stage
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing

_STRANGE = 5.99
"""Chi-square above which scatter does not explain the times: 95 % of healthy pairs lie below."""

_APART = 3.0
"""Difference in chi-square from which a change is left out: a likelihood ratio of e^1.5 = 4.5."""

_MOST_NAMED = 3
_MODEL_U = 1e-3  # the model itself is not trusted beyond this share of a time
_STEPS = 2001
_WIDEST = math.log(10)

_PAIR = ("t_high", "t_low")


@frozen_record
class _Change:
    """One thing moved as far as fits best.

    Attributes:
        words: What moved and by how much.
        chi_square: What healthy scatter would have to explain besides.
    """

    words: str
    chi_square: float


def name_likely_part(stage: Stage, design: Design, timing: Timing | None) -> str | None:
    """Return one sentence on the part that would explain the times, None where none stands out.

    Args:
        stage: A stage of ``design``.
        design: Gives the nominal parts and how far healthy ones scatter.
        timing: The measured times.

    References:
        Direction in (dln t_high, dln t_low): C at 45°, RB at atan(t_high/t_low), RA and the
        control pin both at 0°, so these two are only ever named together.
    """
    topology = find_topology(stage.topology)
    names = (topology.run,) if topology.run else _PAIR
    seen = [getattr(timing, name, None) for name in names]
    measured = [item for item in seen if isinstance(item, Measured) and item.value > 0]
    if len(measured) < len(names) or stage.divide > 1:
        return None
    case = _Case.of(stage, design, names, measured)
    if case is None or case.scatter_explains():
        return None
    if topology.run:
        return _product_sentence(case)
    return _sentence(sorted(case.changes(), key=lambda change: change.chi_square))


def _sentence(changes: list[_Change]) -> str | None:
    if not changes or changes[0].chi_square > _STRANGE:
        return None
    close = [item for item in changes if item.chi_square <= changes[0].chi_square + _APART]
    if len(close) > _MOST_NAMED:
        return None
    *first, last = [item.words for item in close]
    words = f"{', '.join(first)} or {last}" if first else last
    return f"{words[0].upper()}{words[1:]} would explain both times."


@frozen_record(eq=False)
class _Case:
    """The measured times beside the nominal ones, in logarithms."""

    stage: Stage
    design: Design
    names: tuple[str, ...]
    seen: FloatArray
    u_seen: FloatArray
    nominal: FloatArray
    shifts: tuple[FloatArray, ...]

    @classmethod
    def of(
        cls, stage: Stage, design: Design, names: tuple[str, ...], measured: list[Measured]
    ) -> _Case | None:
        """Return the case, None where the nominal board is stuck."""
        nominal = _logs(stage, design, names, {}, 1)[:, 0]
        if np.isnan(nominal).any():
            return None
        return cls(
            stage=stage,
            design=design,
            names=names,
            seen=np.log([item.value for item in measured]),
            u_seen=np.array([item.u / item.value for item in measured]),
            nominal=nominal,
            shifts=tuple(_shift(stage, design, names, axis) for axis in coordinates(stage, design)),
        )

    def scatter_explains(self) -> bool:
        """Say whether healthy parts may give these times."""
        residual = (self.seen - self.nominal)[:, None]
        return float(self._chi_square(residual)[0]) <= _STRANGE

    def changes(self) -> Iterator[_Change]:
        """Yield the best fit of every single change that the topology knows."""
        topology = find_topology(self.stage.topology)
        steps = np.linspace(-_WIDEST, _WIDEST, _STEPS)
        for ref in topology.parts:
            change = self._fit(ref, self.stage.parts[ref].value * np.exp(steps))
            if change is not None:
                share = change[0] / self.stage.parts[ref].value - 1
                yield _Change(words=f"{ref} {_percent(share)}", chi_square=change[1])
        if topology.forced_by_control:
            change = self._fit("upper_threshold", np.linspace(-0.6, 0.49, _STEPS))
            if change is not None:
                words = f"a control pin {_percent(change[0])}"
                yield _Change(words=words, chi_square=change[1])
        most_a = self.design.supply.nominal / max(
            self.stage.parts[ref].value for ref in topology.resistor_refs
        )
        change = self._fit("leakage", np.linspace(0.0, most_a, _STEPS))
        if change is not None:
            yield _Change(words="a leak at the capacitor", chi_square=change[1])

    def _fit(self, name: str, values: FloatArray) -> tuple[float, float] | None:
        """Return the value of one coordinate that fits best, with its chi-square."""
        found = self._best(name, values)
        if found is None:
            return None
        step = float(np.abs(np.diff(values)).max())
        around = np.linspace(found[0] - step, found[0] + step, 201)
        return self._best(name, around[(around >= values[0]) & (around <= values[-1])])

    def _best(self, name: str, values: FloatArray) -> tuple[float, float] | None:
        logs = _logs(self.stage, self.design, self.names, {name: values}, values.size)
        misfit = self._chi_square(self.seen[:, None] - logs)
        if np.isnan(misfit).all():
            return None
        best = int(np.nanargmin(misfit))
        return float(values[best]), float(misfit[best])

    def _chi_square(self, residual: FloatArray) -> FloatArray:
        """Return each column's chi-square over measurement and healthy scatter.

        The scatter of the part that is moved may stay in: the best fit leaves nothing in its
        direction.
        """
        covariance: FloatArray = np.diag(self.u_seen**2 + _MODEL_U**2)
        for shift in self.shifts:
            covariance += np.outer(shift, shift)
        total: FloatArray = (residual * np.linalg.solve(covariance, residual)).sum(axis=0)
        return total


def _logs(
    stage: Stage,
    design: Design,
    names: tuple[str, ...],
    point: Mapping[str, FloatArray],
    size: int,
) -> FloatArray:
    """Return the logarithms of the named times, one row a name; NaN where stuck."""
    rows = respond(stage, design, point, size=size)
    with np.errstate(all="ignore"):
        logs: FloatArray = np.log(np.stack([rows[name] for name in names]))
    logs[:, np.isnan(logs).any(axis=0)] = np.nan
    return logs


def _shift(stage: Stage, design: Design, names: tuple[str, ...], axis: Coordinate) -> FloatArray:
    """Return what one standard deviation of a coordinate does to the logarithms."""
    ends = np.array([axis.centre - axis.u, axis.centre + axis.u])
    logs = _logs(stage, design, names, {axis.name: ends}, 2)
    shift: FloatArray = (logs[:, 1] - logs[:, 0]) / 2
    return np.nan_to_num(shift)


def _product_sentence(case: _Case) -> str:
    share = math.exp(float(case.seen[0] - case.nominal[0])) - 1
    return (
        f"R·C {_percent(share)} would explain the time; "
        "the output alone cannot tell R, C and the thresholds apart."
    )


def _percent(share: float) -> str:
    size = float(f"{abs(100 * share):.2g}")
    return f"{size:g} % {'low' if share < 0 else 'high'}"
