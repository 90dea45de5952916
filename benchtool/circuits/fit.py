"""Solving the model for its unknowns, and carrying uncertainties through it."""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.observations import Observation, log_covariance, log_times
from benchtool.circuits.prediction import predict
from benchtool.circuits.unknowns import Model
from benchtool.errors import SolveError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import propagate

Output = Callable[[Circuit], Value]
Outputs = Callable[[Circuit], tuple[Value, ...]]

_ROUNDS = 80
_LONGEST_STEP = 1.0  # in the logarithm: no unknown moves by more than a factor of e at once
_SMALLEST_STEP = 1e-9  # the next step, taken too, is its square
_ROUNDING = 1e-9  # contributions below this share of the value are rounding of the differences
_FLOOR_REL = 1e-7  # a time counts as no better known than this when several are weighed


@frozen_record(eq=False)
class Slopes:
    """Logarithms of some outputs and how they move.

    Attributes:
        value: Shape (n,).
        by_unknown: Derivatives by the unknowns, shape (n, k).
        by_nuisance: Derivatives by the nuisances times their u, shape (n, q).
    """

    value: FloatArray
    by_unknown: FloatArray
    by_nuisance: FloatArray


@frozen_record
class Disagreement:
    """How far a time lies from what other times make of it.

    Attributes:
        name: The time.
        against: The times that it is held against.
        difference: Relative, with its uncertainty.
    """

    name: str
    against: tuple[str, ...]
    difference: Measured


@frozen_record(eq=False)
class Fit:
    """A solved model.

    Attributes:
        model: What was solved.
        observations: The times that it answers, shape (m,).
        logs: Logarithms of the unknowns.
        gain: Derivatives of the unknowns by the logarithms of the times, shape (k, m).
        slopes: Of the times, at the solution.
    """

    model: Model
    observations: tuple[Observation, ...]
    logs: tuple[float, ...]
    gain: FloatArray
    slopes: Slopes

    @property
    def circuit(self) -> Circuit:
        """The solved circuit."""
        return self.model.circuit(self.logs)

    def carry(self, output: Output, unit: str) -> Measured:
        """Return a positive figure of the solved circuit with its uncertainty.

        Args:
            output: Takes the circuit, floats or arrays.
            unit: SI unit of the figure.

        References:
            JCGM 100:2008, equation (13). An error e of a nuisance q moves the times' logarithms by
            Jq·e and so the unknowns by -K·Jq·e, K being the gain.
        """
        at = differentiate(self.model, self.logs, lambda circuit: (output(circuit),))
        value = float(np.exp(at.value[0]))
        by_time = at.by_unknown[0] @ self.gain
        by_nuisance = at.by_nuisance[0] - by_time @ self.slopes.by_nuisance
        return self._budget(value, unit, value * by_time, value * by_nuisance)

    def disagreement(self) -> Disagreement | None:
        """Return how far a time left over is from what the others make of it.

        Returns:
            None where no time is left over. With several left over, the one furthest off in its
            own uncertainty.
        """
        basis = _basis(self.slopes.by_unknown)
        names = tuple(item.name for item in self.observations)
        found = [
            Disagreement(
                name=name,
                against=tuple(names[i] for i in basis),
                difference=self._surplus(index, basis),
            )
            for index, name in enumerate(names)
            if index not in basis
        ]
        return max(found, key=_in_own_u, default=None)

    def _surplus(self, index: int, basis: tuple[int, ...]) -> Measured:
        """Return ln(measured/predicted) of one time, predicted from those of the basis."""
        rows = list(basis)
        by_basis = self.slopes.by_unknown[index] @ np.linalg.inv(self.slopes.by_unknown[rows])
        by_time = np.zeros(len(self.observations))
        by_time[rows], by_time[index] = -by_basis, 1.0
        residual = log_times(self.observations) - self.slopes.value
        return self._budget(
            float(by_time @ residual), "1", by_time, -by_time @ self.slopes.by_nuisance
        )

    def _budget(
        self, value: float, unit: str, by_log_time: FloatArray, by_nuisance: FloatArray
    ) -> Measured:
        inputs = [
            (float(factor) / item.measured.value, item.measured)
            for factor, item in zip(by_log_time, self.observations, strict=True)
        ]
        scale = abs(value) if unit != "1" else 1.0
        extra = [
            Contribution(source=item.source, u=float(u), common=True, note=item.note)
            for item, u in zip(self.model.nuisances, by_nuisance, strict=True)
            if abs(u) > _ROUNDING * scale
        ]
        return propagate(value, unit, inputs, extra)


def _basis(by_unknown: FloatArray) -> tuple[int, ...]:
    """Return which times determine the unknowns: the first that do so about as well as any."""
    n_times, n_unknown = by_unknown.shape
    sets = list(combinations(range(n_times), n_unknown))
    volumes = [abs(float(np.linalg.det(by_unknown[list(rows)]))) for rows in sets]
    return next(
        rows for rows, volume in zip(sets, volumes, strict=True) if volume >= 0.3 * max(volumes)
    )


def _in_own_u(item: Disagreement) -> float:
    return abs(item.difference.value) / max(item.difference.u, _FLOOR_REL)


def differentiate(model: Model, logs: tuple[float, ...], outputs: Outputs) -> Slopes:
    """Return the logarithms of some outputs and their slopes by central differences.

    All neighbours are computed in one row of boards.
    """
    n_unknown, us = len(logs), [item.u for item in model.nuisances]
    steps = np.concatenate([np.full(n_unknown, 1e-5), np.full(len(us), 1e-2)])
    rows = np.vstack([np.zeros(len(steps)), np.diag(steps), -np.diag(steps)])
    at = tuple(logs[i] + rows[:, i] for i in range(n_unknown))
    shifts = tuple(us[i] * rows[:, n_unknown + i] for i in range(len(us)))
    circuit = model.circuit(at, shifts)
    with np.errstate(all="ignore"):
        values = np.array([np.log(one + np.zeros(len(rows))) for one in outputs(circuit)])
    up, down = values[:, 1 : 1 + len(steps)], values[:, 1 + len(steps) :]
    slopes = (up - down) / (2 * steps)
    return Slopes(
        value=values[:, 0], by_unknown=slopes[:, :n_unknown], by_nuisance=slopes[:, n_unknown:]
    )


def fit(model: Model, observations: tuple[Observation, ...], start: tuple[float, ...]) -> Fit:
    """Solve a model for its unknowns; of more times than unknowns the best compromise.

    Args:
        model: What is solved.
        observations: At least as many times as unknowns.
        start: Logarithms of the unknowns to begin with.

    Raises:
        SolveError: If no values of the unknowns give these times.

    References:
        Gauss-Newton on the logarithms, weighted by the inverse covariance of the times, the
        nuisances' share included (generalised least squares).
    """
    outputs = _times_of(tuple(item.name for item in observations))
    target, covariance = log_times(observations), log_covariance(observations)
    logs = _runnable(model, outputs, np.array(start))
    for _ in range(_ROUNDS):
        slopes = differentiate(model, tuple(logs.tolist()), outputs)
        gain = _gain(slopes, covariance)
        step = gain @ (target - slopes.value)
        if not np.all(np.isfinite(step)):
            break
        if np.max(np.abs(step)) < _SMALLEST_STEP:
            return Fit(
                model=model,
                observations=observations,
                logs=tuple((logs + step).tolist()),
                gain=gain,
                slopes=slopes,
            )
        logs = _advance(model, outputs, logs, step)
    raise SolveError("no parts give these times", hint="Check the times and the topology.")


def place_fit(model: Model, observations: tuple[Observation, ...], logs: tuple[float, ...]) -> Fit:
    """Return the fit as it would stand at given unknowns, whatever the times say."""
    names = tuple(item.name for item in observations)
    slopes = differentiate(model, logs, _times_of(names))
    gain = _gain(slopes, log_covariance(observations))
    return Fit(model=model, observations=observations, logs=logs, gain=gain, slopes=slopes)


def _times_of(names: tuple[str, ...]) -> Outputs:
    def outputs(circuit: Circuit) -> tuple[Value, ...]:
        prediction = predict(circuit)
        return tuple(getattr(prediction, name) for name in names)

    return outputs


def _gain(slopes: Slopes, covariance: FloatArray) -> FloatArray:
    """Return d(unknown)/d(ln time): the inverse, or the weighted pseudo-inverse."""
    n_times, n_unknown = slopes.by_unknown.shape
    try:
        if n_times == n_unknown:
            return np.asarray(np.linalg.inv(slopes.by_unknown), dtype=np.float64)
        spread = covariance + slopes.by_nuisance @ slopes.by_nuisance.T
        weighted = np.linalg.solve(spread + np.eye(n_times) * _FLOOR_REL**2, slopes.by_unknown)
        normal = weighted.T @ slopes.by_unknown
        return np.asarray(np.linalg.solve(normal, weighted.T), dtype=np.float64)
    except np.linalg.LinAlgError:
        return np.full((n_unknown, n_times), np.nan)


def _runs(model: Model, outputs: Outputs, logs: FloatArray) -> bool:
    circuit = model.circuit(tuple(logs.tolist()))
    return all(np.isfinite(value) for value in outputs(circuit))


def _runnable(model: Model, outputs: Outputs, start: FloatArray) -> FloatArray:
    """Return the start, made smaller until the circuit runs: leaks stop large resistors."""
    for factor in range(16):
        if _runs(model, outputs, start - 0.5 * factor):
            return start - 0.5 * factor
    return start


def _advance(model: Model, outputs: Outputs, logs: FloatArray, step: FloatArray) -> FloatArray:
    """Return the next point: the step, cut to a factor of e and to where the circuit runs."""
    share = min(1.0, _LONGEST_STEP / float(np.max(np.abs(step))))
    for _ in range(40):
        if _runs(model, outputs, logs + share * step):
            return logs + share * step
        share /= 2
    return logs
