"""What correlated noise leaves of the certainty of a fit.

Neighbouring residuals of a recorded curve are alike (mains hum, slow noise, filters, codes), so
that many samples say little more than a few. A plain fit takes each for an observation of its own.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from benchtool.fitting.least_squares import Fit
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray

LENGTHS = (0.7, 1.5, 3.0, 7.0, 15.0, 40.0)
"""Correlation lengths that are tried, in places."""

SHARES = (0.1, 0.35, 0.7, 0.93, 0.998)
"""Shares of the correlated part in the variance that are tried."""

_LEAST_PARTS = 6  # from which the scatter between parts is worth more than its noise


@frozen_record(eq=False)
class Noise:
    """Noise of a fit and the certainty that it leaves.

    Attributes:
        covariance: Of the parameters, shape (p, p).
        dof: Degrees of freedom of each parameter's uncertainty, shape (p,).
        sd: Standard deviation of a weighted residual.
        length: Correlation length in places, 0 for none.
        inflation: Variance of each parameter over that of independent residuals, shape (p,).
    """

    covariance: FloatArray
    dof: FloatArray
    sd: float
    length: float
    inflation: FloatArray


def judge_noise(
    fit: Fit, places: FloatArray, blocks: IntArray, parts: IntArray | None = None
) -> Noise:
    """Return the covariance of a fit whose residuals are correlated within blocks.

    Args:
        fit: The fit.
        places: Where each observation lies in its block, shape (n,), ascending in a block.
        blocks: Number of each observation's block, shape (n,), not decreasing; blocks are
            independent.
        parts: Part of the record to which each observation belongs, shape (n,): what is slower than
            a block moves all blocks of a part alike; None where each block is its own.

    Returns:
        The covariance that the fit has under noise of a white and an exponentially correlated
        part, averaged over what their length and share may be. A parameter on which six parts or
        more act has at least the uncertainty that their disagreement gives.

    References:
        Restricted likelihood: Patterson and Thompson 1971 (it does not count what the fit has
        absorbed as quiet); covariance of least squares under correlated noise:
        (JᵀJ)⁻¹·JᵀΓJ·(JᵀJ)⁻¹; between parts: Liang and Zeger 1986.
    """
    rows = _cut(blocks)
    groups = _alike(fit, places, rows)
    found = [_under(fit, groups, 0.0, 0.0)]
    found += [_under(fit, groups, length, share) for length in LENGTHS for share in SHARES]
    logs = np.array([item.log_likelihood for item in found])
    chances = np.exp(logs - logs.max())
    chances /= chances.sum()
    within: FloatArray = np.tensordot(chances, np.array([item.covariance for item in found]), 1)
    plain = np.maximum(np.diag(fit.covariance), 1e-300)
    length = float(chances @ [item.length for item in found])
    dof = np.maximum(1.0, fit.dof / np.maximum(1 + 2 * length, np.diag(within) / plain))
    grown, dof = _between(fit, blocks if parts is None else parts, within, dof)
    covariance = within * np.outer(grown, grown)
    return Noise(
        covariance=covariance,
        dof=dof,
        sd=float(chances @ [item.sd for item in found]),
        length=length,
        inflation=np.diag(covariance) / plain,
    )


def _cut(blocks: IntArray) -> list[slice]:
    limits = (int(x) for x in np.flatnonzero(np.diff(blocks)) + 1)
    return [slice(a, b) for a, b in pairwise([0, *limits, blocks.size])]


@frozen_record(eq=False)
class _Group:
    """Blocks with the same places.

    Attributes:
        apart: Distance of each two places, shape (m, m).
        slopes, residuals: Of each block, shapes (k, m, p) and (k, m, 1).
    """

    apart: FloatArray
    slopes: FloatArray
    residuals: FloatArray


def _alike(fit: Fit, places: FloatArray, rows: list[slice]) -> list[_Group]:
    members: dict[bytes, list[slice]] = {}
    for part in rows:
        members.setdefault(places[part].tobytes(), []).append(part)
    return [
        _Group(
            apart=np.abs(places[parts[0]][:, None] - places[parts[0]][None, :]),
            slopes=np.array([fit.slopes[part] for part in parts]),
            residuals=np.array([fit.residuals[part, None] for part in parts]),
        )
        for parts in members.values()
    ]


@frozen_record(eq=False)
class _Under:
    """The fit under one sort of noise."""

    log_likelihood: float
    covariance: FloatArray
    sd: float
    length: float


def _under(fit: Fit, groups: list[_Group], length: float, share: float) -> _Under:
    """Return the restricted likelihood of the residuals and the covariance under that noise."""
    n, p = fit.slopes.shape
    log_det, meat, inner = 0.0, np.zeros((p, p)), np.zeros((p + 1, p + 1))
    for group in groups:
        gamma = np.eye(len(group.apart))
        if share:
            gamma = (1 - share) * gamma + share * np.exp(-group.apart / length)
        root = np.linalg.cholesky(gamma)
        white = np.linalg.inv(root) @ np.concatenate([group.slopes, group.residuals], axis=2)
        flat = white.reshape(-1, p + 1)
        inner += flat.T @ flat
        seen = (root.T @ group.slopes).reshape(-1, p)
        meat += seen.T @ seen
        log_det += 2 * len(group.slopes) * float(np.log(np.diag(root)).sum())
    scale = 1 / np.sqrt(np.diag(inner)[:p])
    normal, right = inner[:p, :p] * np.outer(scale, scale), inner[:p, p] * scale
    left = max(float(inner[p, p] - right @ np.linalg.solve(normal, right)), 1e-300)
    log_normal = float(np.linalg.slogdet(normal)[1]) - 2 * float(np.log(scale).sum())
    dof = max(n - p, 1)
    variance = left / dof
    return _Under(
        log_likelihood=-0.5 * (log_det + log_normal + dof * float(np.log(variance))),
        covariance=fit.unscaled @ meat @ fit.unscaled * variance,
        sd=float(np.sqrt(variance)),
        length=length * share,
    )


def _between(
    fit: Fit, parts: IntArray, within: FloatArray, dof: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return by how much each uncertainty grows as the parts disagree, and its dof then."""
    rows = [np.flatnonzero(parts == number) for number in range(int(parts.max()) + 1)]
    scores = np.array([fit.slopes[part].T @ fit.residuals[part] for part in rows])
    acting = np.array([np.any(fit.slopes[part] != 0, axis=0) for part in rows])
    n_acting = acting.sum(axis=0)
    spread = np.sqrt(np.sum((scores @ fit.unscaled) ** 2, axis=0))
    own = np.sqrt(np.diag(within))
    n_spare = np.maximum(1, n_acting - 2)
    seen = spread * np.sqrt(n_acting / n_spare)
    wider = (n_acting >= _LEAST_PARTS) & (seen > own)
    grown = np.where(wider, seen / np.maximum(own, 1e-300), 1.0)
    return grown, np.where(wider, np.minimum(dof, n_spare), dof)
