"""Nonlinear least squares: the damped Gauss-Newton method."""

from __future__ import annotations

import math

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.fitting.derivatives import Curve, Slopes, central_slopes
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_ROUNDS = 400
_SETTLED = 1e-13  # of the curve: a step that moves it by less changes nothing
_GAINED = 1e-14  # of the sum of squares: less than its rounding shows
_DAMPING = 1e-3  # at the start, of the squared column norms
_LEAST_DAMPING = 1e-14
_MOST_TRIALS = 60
_POLISHES = 3
_AHEAD = 0.1  # of the step: where the curve is looked at to see how it bends
_BEND = 0.75  # acceleration over step up to which the curve is taken as followed


@frozen_record(eq=False)
class Fit:
    """What a fit gives.

    Attributes:
        values: The parameters, shape (p,).
        unscaled: Inverse of JᵀJ over the weighted observations, shape (p, p).
        slopes: J, weighted residuals' derivative with its sign turned, shape (n, p).
        residuals: Weighted residuals, shape (n,).
        dof: n - p.
        n_rounds: Steps that were taken.
    """

    values: FloatArray
    unscaled: FloatArray
    slopes: FloatArray
    residuals: FloatArray
    dof: int
    n_rounds: int

    @property
    def sum_of_squares(self) -> float:
        """Sum of the squared weighted residuals."""
        return float(self.residuals @ self.residuals)

    @property
    def residual_sd(self) -> float:
        """Standard deviation of the weighted residuals; 0 where nothing is left over."""
        return math.sqrt(self.sum_of_squares / self.dof) if self.dof else 0.0

    @property
    def covariance(self) -> FloatArray:
        """Covariance of the parameters if the residuals are independent, shape (p, p)."""
        scaled: FloatArray = self.unscaled * self.residual_sd**2
        return scaled

    @property
    def deviations(self) -> FloatArray:
        """Standard deviations of the parameters if the residuals are independent, shape (p,)."""
        return np.sqrt(np.diag(self.covariance))


def fit_curve(
    curve: Curve,
    observed: FloatArray,
    start: FloatArray,
    *,
    u: FloatArray | None = None,
    slopes: Slopes | None = None,
) -> Fit:
    """Fit a curve to observations by weighted least squares.

    Args:
        curve: Parameters, shape (p,), to the curve at the observations, shape (n,).
        observed: Observations, shape (n,).
        start: Where the parameters begin, shape (p,).
        u: Standard uncertainty of each observation, relative to each other, shape (n,); None for
            all alike.
        slopes: Parameters to the derivatives of the curve, shape (n, p); None takes central
            differences.

    Returns:
        The fit.

    Raises:
        MeasurementError: ``fit-failed`` if there are fewer observations than parameters, if the
            curve is not finite at the start or a parameter acts on nothing, or if it does not
            settle.

    References:
        Levenberg 1944 and Marquardt 1963; scaling by column norms that never shrink: Moré 1978;
        damping by the gain ratio: Nielsen 1999; second-order step: Transtrum and Sethna 2012.
    """
    search = _Search(curve, np.asarray(observed, np.float64), u, slopes)
    return search.run(np.array(start, np.float64))


def _failed(text: str) -> MeasurementError:
    return MeasurementError(
        text,
        hint="Record more of the curve, or start the fit nearer to it.",
        code="fit-failed",
    )


class _Search:
    """One search for the least sum of squares: what it fits, and how far it is."""

    def __init__(
        self,
        curve: Curve,
        observed: FloatArray,
        u: FloatArray | None,
        slopes: Slopes | None,
    ) -> None:
        self._curve = curve
        self._observed = observed
        self._weights = np.ones(observed.size) if u is None else 1 / np.asarray(u, np.float64)
        self._slopes = slopes or central_slopes(curve)

    def run(self, values: FloatArray) -> Fit:
        if self._observed.size < values.size:
            raise _failed(f"{self._observed.size} observations cannot fix {values.size} parameters")
        residuals = self._residuals(values)
        if not np.isfinite(residuals).all():
            raise _failed("the curve is not finite where the fit starts")
        damping, growth = _DAMPING, 2.0
        norms = np.zeros(values.size)
        for n_rounds in range(_ROUNDS):
            jacobian = self._jacobian(values)
            norms = np.maximum(norms, _norms(jacobian))
            solver = _Solver(jacobian, norms)
            for _ in range(_MOST_TRIALS):
                step, gain = self._step(values, residuals, solver, damping)
                small = solver.length(step) <= _SETTLED * solver.length(values)
                if small or 0 <= gain <= _GAINED * float(residuals @ residuals):
                    return self._finished(self._polished(values + step), n_rounds)
                tried = self._residuals(values + step)
                ratio = _ratio(residuals, tried, gain)
                if ratio > 0:
                    damping = max(damping * max(1 / 3, 1 - (2 * ratio - 1) ** 3), _LEAST_DAMPING)
                    values, residuals, growth = values + step, tried, 2.0
                    break
                damping, growth = damping * growth, growth * 2
            else:
                return self._finished(self._polished(values), n_rounds)
        raise _failed(f"the fit has not settled after {_ROUNDS} steps")

    def _polished(self, values: FloatArray) -> FloatArray:
        """Return the parameters after plain steps, whose gain the squares no longer show."""
        for _ in range(_POLISHES):
            residuals, jacobian = self._residuals(values), self._jacobian(values)
            step = _Solver(jacobian, _norms(jacobian)).solve(residuals, _LEAST_DAMPING)
            tried = self._residuals(values + step)
            if not float(tried @ tried) <= float(residuals @ residuals) * (1 + 1e-10):
                break
            values = values + step
        return values

    def _residuals(self, values: FloatArray) -> FloatArray:
        with np.errstate(all="ignore"):
            left: FloatArray = (self._observed - self._curve(values)) * self._weights
        return left

    def _jacobian(self, values: FloatArray) -> FloatArray:
        jacobian: FloatArray = self._slopes(values) * self._weights[:, None]
        if not np.isfinite(jacobian).all():
            raise _failed("the curve has no finite derivative where the fit stands")
        return jacobian

    def _step(
        self,
        values: FloatArray,
        residuals: FloatArray,
        solver: _Solver,
        damping: float,
    ) -> tuple[FloatArray, float]:
        """Return a step and the sum of squares that the linearised curve would lose by it.

        A gain below 0 says that the curve bends too much for a step so long.
        """
        step = solver.solve(residuals, damping)
        gained = solver.jacobian @ step
        gain = float(gained @ (2 * residuals - gained))
        bent = self._bend(values, residuals, gained, step)
        if not np.isfinite(bent).all():
            return step, -gain
        correction = 0.5 * solver.solve(bent, damping)
        if solver.length(correction) > _BEND / 2 * solver.length(step):
            return step, -gain
        return step + correction, gain

    def _bend(
        self, values: FloatArray, residuals: FloatArray, gained: FloatArray, step: FloatArray
    ) -> FloatArray:
        """Return what the second derivative along the step leaves, as residuals."""
        ahead = self._residuals(values + _AHEAD * step)
        with np.errstate(all="ignore"):
            bent: FloatArray = 2 / _AHEAD * ((ahead - residuals) / _AHEAD + gained)
        return bent

    def _finished(self, values: FloatArray, n_rounds: int) -> Fit:
        residuals, jacobian = self._residuals(values), self._jacobian(values)
        norms = _norms(jacobian)
        if not norms.all():
            raise _failed("a parameter of the curve acts on none of the observations")
        _, triangle = np.linalg.qr(jacobian / norms)
        if np.min(np.abs(np.diag(triangle))) < 1e-13:
            raise _failed("two parameters of the curve act alike on all observations")
        inverse = np.linalg.inv(triangle) / norms[:, None]
        return Fit(
            values=values,
            unscaled=inverse @ inverse.T,
            slopes=jacobian,
            residuals=residuals,
            dof=residuals.size - values.size,
            n_rounds=n_rounds,
        )


def _norms(jacobian: FloatArray) -> FloatArray:
    norms: FloatArray = np.sqrt(np.einsum("ij,ij->j", jacobian, jacobian))
    return norms


class _Solver:
    """Solves min |J·x - b|² + damping·|norms·x|² by orthogonal triangles of J, made once."""

    def __init__(self, jacobian: FloatArray, norms: FloatArray) -> None:
        self.jacobian = jacobian
        self._units = np.where(norms > 0, norms, 1.0)
        self._active = norms > 0
        self._base, self._triangle = np.linalg.qr(jacobian / self._units)

    def solve(self, right: FloatArray, damping: float) -> FloatArray:
        """Return x for one b and one damping."""
        p = self._units.size
        below = np.diag(np.where(self._active, math.sqrt(damping), 1.0))
        base, triangle = np.linalg.qr(np.vstack([self._triangle, below]))
        turned = base[:p].T @ (self._base.T @ right)
        solution: FloatArray = np.linalg.solve(triangle, turned) / self._units
        return solution

    def length(self, step: FloatArray) -> float:
        """Return the length of a step, each parameter in its own unit."""
        return float(np.linalg.norm(self._units * step))


def _ratio(before: FloatArray, after: FloatArray, gain: float) -> float:
    """Return the loss of the sum of squares over the expected one; -1 where not finite."""
    if not np.isfinite(after).all() or gain <= 0:
        return -1.0
    with np.errstate(over="ignore"):
        return float((before - after) @ (before + after)) / gain
