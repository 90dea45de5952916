"""Boards with two faults, as a density: the alternative to a single fault."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import combinations

import numpy as np

from benchtool.diagnose.tables import Table
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_PIECES = 2


@frozen_record(eq=False)
class PairDensity:
    """A Gaussian for every pair of faults: what they move adds up.

    Attributes:
        log_weights: Logarithms of the pairs' shares, shape (pairs,).
        means: What is expected, shape (pairs, m).
        whitening: Inverse Cholesky factors of the covariances, shape (pairs, m, m).
    """

    log_weights: FloatArray
    means: FloatArray
    whitening: FloatArray

    def log_density(self, seen: FloatArray) -> FloatArray:
        """Return the logarithm of the density of what was seen on each board.

        Args:
            seen: Shape (m, boards).
        """
        m = seen.shape[0]
        total = np.full(seen.shape[1], -np.inf)
        log_norms = np.log(np.diagonal(self.whitening, axis1=1, axis2=2)).sum(axis=1)
        log_norms += self.log_weights - m / 2 * math.log(2 * math.pi)
        for mean, whitening, log_norm in zip(self.means, self.whitening, log_norms, strict=True):
            distances = ((whitening @ (seen - mean[:, None])) ** 2).sum(axis=0)
            total = np.logaddexp(total, log_norm - distances / 2)
        return total


def pair_density(tables: tuple[Table, ...], noise: FloatArray) -> PairDensity:
    """Return the density of boards with two faults.

    Args:
        tables: What each hypothesis would show, the healthy board first.
        noise: Covariance of the measurement, shape (m, m).
    """
    healthy, *faulty = tables
    scatter = healthy.slopes[0] @ healthy.slopes[0].T + noise
    origin = healthy.means[0]
    pieces = [piece for table in faulty for piece in _pieces(table, origin)]
    log_weights, means, covariances = [], [], []
    for (moved_a, w_a, m_a, c_a), (moved_b, w_b, m_b, c_b) in combinations(pieces, 2):
        if moved_a != moved_b:  # what is low is not high besides
            log_weights.append(math.log(w_a * w_b))
            means.append(origin + m_a + m_b)
            covariances.append(c_a + c_b + scatter)
    if not means:
        log_weights, means, covariances = [0.0], [origin], [100 * scatter]
    logs = np.array(log_weights)
    return PairDensity(
        log_weights=logs - np.logaddexp.reduce(logs),
        means=np.array(means),
        whitening=np.linalg.inv(np.linalg.cholesky(np.array(covariances))),
    )


def _pieces(
    table: Table, origin: FloatArray
) -> list[tuple[tuple[str, ...], float, FloatArray, FloatArray]]:
    """Return moved figures, weight, mean shift and its covariance of pieces of a fault's curve."""
    found = []
    for stretch in _parts(table):
        shifts, weights = table.means[stretch] - origin, table.hypothesis.sizes.weights[stretch]
        possible = np.isfinite(shifts).all(axis=1)
        share = float(weights[possible].sum())
        if share <= 0:
            continue
        w = weights[possible] / share
        mean = w @ shifts[possible]
        apart = shifts[possible] - mean
        covariance = (apart * w[:, None]).T @ apart
        found.append(
            (table.hypothesis.fault.move.fields, share * table.hypothesis.weight, mean, covariance)
        )
    return found


def _parts(table: Table) -> Iterator[slice]:
    """Yield stretches of sizes that are short enough to be nearly straight."""
    for stretch in table.hypothesis.sizes.halves():
        step = math.ceil((stretch.stop - stretch.start) / _PIECES)
        for start in range(stretch.start, stretch.stop, step):
            yield slice(start, min(start + step, stretch.stop))
