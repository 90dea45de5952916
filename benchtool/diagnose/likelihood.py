"""Likelihoods: a Gaussian at every size of every hypothesis, for one board or many at once."""

from __future__ import annotations

import numpy as np

from benchtool.diagnose.priors import Priors
from benchtool.diagnose.scatter import Deviations
from benchtool.diagnose.tables import Table
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray

_BLOCK = 4096


@frozen_record(eq=False)
class Nodes:
    """The Gaussians of one hypothesis: every size under every scatter that is averaged over.

    Attributes:
        table: What the hypothesis would show.
        log_weights: Logarithm of each node's share of its scatter's, shape (k,).
        scatter_index: Which scatter each node has, shape (k,).
        size_index: Which size of the table each node has, shape (k,).
        factors: What each node's slopes are multiplied with, shape (k, a).
        coefficients: Of the logarithm of weight times density, in the terms of ``features``.
        origin: What the features are measured from, shape (m,).
    """

    table: Table
    log_weights: FloatArray
    scatter_index: IntArray
    size_index: IntArray
    factors: FloatArray
    coefficients: FloatArray
    origin: FloatArray


def axis_factors(deviations: Deviations, priors: Priors) -> FloatArray:
    """Return factors on all axes for each scatter that is averaged over, shape (scatters, a)."""
    rows = [
        np.append(deviations.factors(item.capacitor, item.thresholds), 1.0)  # the grid's own cell
        for item in priors.scatters
    ]
    return np.array(rows)


def make_nodes(table: Table, noise: FloatArray, factors: FloatArray) -> Nodes:
    """Return the Gaussians of a hypothesis.

    Args:
        table: What it would show.
        noise: Covariance of the measurement, shape (m, m).
        factors: Factors on the axes, shape (scatters, a).
    """
    possible = np.isfinite(table.means).all(axis=1) & np.isfinite(table.slopes).all(axis=(1, 2))
    at = np.flatnonzero(possible)
    with np.errstate(divide="ignore"):
        log_sizes = np.log(table.hypothesis.sizes.weights)
    index = np.tile(at, len(factors))
    rows = np.repeat(factors, at.size, axis=0)
    log_weights = log_sizes[index]
    origin = table.means[at].mean(axis=0) if at.size else np.zeros(noise.shape[0])
    scaled = table.slopes[index] * rows[:, None, :]
    covariance = scaled @ scaled.transpose(0, 2, 1) + noise
    return Nodes(
        table=table,
        log_weights=log_weights,
        scatter_index=np.repeat(np.arange(len(factors)), at.size),
        size_index=index,
        factors=rows,
        coefficients=_coefficients(table.means[index] - origin, covariance, log_weights),
        origin=origin,
    )


def _coefficients(means: FloatArray, covariance: FloatArray, log_weights: FloatArray) -> FloatArray:
    """Return ln(weight · density) as a quadratic form's coefficients, shape (k, q)."""
    m = means.shape[1]
    precision = np.linalg.inv(covariance)
    upper = np.triu_indices(m)
    doubled = np.where(upper[0] == upper[1], 1.0, 2.0)
    pulled = np.einsum("kij,kj->ki", precision, means)
    constant = (means * pulled).sum(axis=1) + np.linalg.slogdet(covariance)[1]
    constant += m * np.log(2 * np.pi) - 2 * log_weights
    squares = precision[:, upper[0], upper[1]] * doubled
    joined: FloatArray = -0.5 * np.concatenate([squares, -2 * pulled, constant[:, None]], axis=1)
    return joined


def features(seen: FloatArray) -> FloatArray:
    """Return squares, products, values and 1 of what was seen on each board, shape (q, boards)."""
    upper = np.triu_indices(seen.shape[0])
    return np.concatenate([seen[upper[0]] * seen[upper[1]], seen, np.ones((1, seen.shape[1]))])


def node_logs(nodes: Nodes, seen: FloatArray) -> FloatArray:
    """Return ln(weight · density) of every node for every board, shape (k, boards).

    Args:
        nodes: Of one hypothesis.
        seen: What was seen, shape (m, boards).
    """
    logs: FloatArray = nodes.coefficients @ features(seen - nodes.origin[:, None])
    return logs


def log_evidence(nodes: Nodes, seen: FloatArray, n_scatters: int) -> FloatArray:
    """Return ln of the marginal likelihood of a hypothesis under each scatter for every board.

    Args:
        nodes: Of the hypothesis.
        seen: What was seen, shape (m, boards).
        n_scatters: How many of the scatters are wanted, from the first.

    Returns:
        Shape (scatters, boards).
    """
    total = np.full((n_scatters, seen.shape[1]), -np.inf)
    wanted = np.flatnonzero(nodes.scatter_index < n_scatters)
    if not wanted.size:
        return total
    coefficients = nodes.coefficients[wanted]
    for start in range(0, seen.shape[1], _BLOCK):
        block = slice(start, start + _BLOCK)
        logs = coefficients @ features(seen[:, block] - nodes.origin[:, None])
        total[:, block] = log_sum(logs.reshape(n_scatters, -1, logs.shape[1]), axis=1)
    return total


def log_sum(logs: FloatArray, axis: int = 0) -> FloatArray:
    """Return the logarithm of the sum of exponentials over an axis."""
    top = logs.max(axis=axis, keepdims=True)
    top = np.where(np.isfinite(top), top, 0.0)
    with np.errstate(divide="ignore"):
        summed = top + np.log(np.exp(logs - top).sum(axis=axis, keepdims=True))
    squeezed: FloatArray = summed.squeeze(axis)
    return squeezed
