"""The best answer there can be for the population: marginal likelihoods by formulas of its own.

Exact curves on a fine grid of sizes, the scatter linearised at every size; nothing of the package.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from diagnose_population import (
    FAULTS,
    LOW,
    SIGNS,
    STEMS,
    Array,
    Board,
    Figures,
    healthy,
    hurt,
    observe,
    possible,
    sizes_for,
    top_effect,
)

STEP = 0.005


def linear(
    board: Board,
    letters: str,
    harm: Callable[[Figures], Figures],
    count: int,
    factors: Array | None = None,
) -> tuple[Array, Array]:
    """Return means (n, m) and covariances (n, m, m) of what is seen at each size.

    Args:
        board: The healthy board.
        letters: What is seen.
        harm: Function from healthy figures of shape (19, 1) to hurt ones of shape (19, n).
        count: n.
        factors: Factors on the spreads.
    """
    spreads = board.spreads() * (1.0 if factors is None else factors)
    z = np.zeros((9, 19, 1))
    for i, u in enumerate(0.3 * spreads):
        z[i, 1 + i], z[i, 10 + i] = u, -u
    seen, u = observe(board, harm(healthy(board, z)), letters)
    seen = np.broadcast_to(seen, (u.size, 19, count))
    jac = np.transpose((seen[:, 1:10] - seen[:, 10:]) / 0.6, (2, 0, 1))
    return seen[:, 0].T, jac @ np.transpose(jac, (0, 2, 1)) + np.diag(u**2)


def log_mixture(seen: Array, means: Array, covariances: Array, weights: Array) -> Array:
    """Return ln of the density of each board, seen (m, boards), under a mixture of Gaussians."""
    good = np.isfinite(means).all(1) & np.isfinite(covariances).all((1, 2))
    means, covariances, weights = means[good], covariances[good], weights[good]
    m = seen.shape[0]
    centre = means.mean(axis=0)
    means, seen = means - centre, seen - centre[:, None]
    precisions = np.linalg.inv(covariances)
    pulled = np.einsum("kij,kj->ki", precisions, means)
    constants = (means * pulled).sum(1) + np.linalg.slogdet(2 * np.pi * covariances)[1]
    constants -= 2 * np.log(weights)
    at = np.triu_indices(m)
    squares = precisions[:, at[0], at[1]] * np.where(at[0] == at[1], 1, 2)
    terms = -0.5 * np.concatenate([squares, -2 * pulled, constants[:, None]], axis=1)
    total = np.full(seen.shape[1], -np.inf)
    for start in range(0, seen.shape[1], 2048):
        block = seen[:, start : start + 2048]
        logs = terms @ np.concatenate([block[at[0]] * block[at[1]], block, np.ones_like(block[:1])])
        top = logs.max(0)
        total[start : start + 2048] = top + np.log(np.exp(logs - top).sum(0))
    return total


def evidence(
    board: Board, letters: str, seen: Array, factors: Array | None = None, step: float = STEP
) -> Array:
    """Return ln of the marginal likelihood of each fault for each board, shape (14, boards)."""
    logs = np.full((len(FAULTS), seen.shape[1]), -np.inf)
    for k in possible(board):
        signs = SIGNS.get(FAULTS[k], (0,))
        for sign in signs:
            top = top_effect(board, FAULTS[k], sign)
            n = int(np.ceil(np.log(top / LOW) / step))
            effects = LOW * (top / LOW) ** ((np.arange(n) + 0.5) / n)
            x = sizes_for(board, FAULTS[k], sign, effects)
            nodes = linear(board, letters, lambda f, k=k, x=x: hurt(FAULTS[k], f, x), n, factors)
            piece = log_mixture(seen, *nodes, np.full(n, 1 / n / len(signs)))
            logs[k] = np.logaddexp(logs[k], piece)
    return logs


def healthy_evidence(board: Board, letters: str, seen: Array) -> Array:
    """Return ln of the likelihood of the healthy board, shape (boards,)."""
    nodes = linear(board, letters, lambda f: f, 1)
    return log_mixture(seen, *nodes, np.ones(1))


def pair_evidence(board: Board, letters: str, seen: Array, points: int = 30) -> Array:
    """Return ln of the marginal likelihood of two faults at once, shape (boards,)."""
    total, pairs = np.full(seen.shape[1], -np.inf), 0
    live = possible(board)
    for a in live:
        for b in live:
            if a < b and STEMS[a] != STEMS[b]:
                pairs += 1
                total = np.logaddexp(total, _pair(board, letters, seen, (a, b), points))
    return total - np.log(pairs)


def _pair(board: Board, letters: str, seen: Array, pair: tuple[int, int], points: int) -> Array:
    first, second = (FAULTS[k] for k in pair)
    total = np.full(seen.shape[1], -np.inf)
    combos = [(s, t) for s in SIGNS.get(first, (0,)) for t in SIGNS.get(second, (0,))]
    for signs in combos:
        grids = []
        for name, sign in zip((first, second), signs, strict=True):
            top = top_effect(board, name, sign)
            effects = LOW * (top / LOW) ** ((np.arange(points) + 0.5) / points)
            grids.append(sizes_for(board, name, sign, effects))
        x, y = (grid.ravel() for grid in np.meshgrid(*grids, indexing="ij"))
        means, covariances = linear(
            board, letters, lambda f, x=x, y=y: hurt(second, hurt(first, f, x), y), x.size
        )
        grid = means.reshape(points, points, -1)
        for axis in (0, 1):  # what is seen within a cell of the grid
            width = np.gradient(grid, axis=axis).reshape(means.shape) / np.sqrt(12)
            covariances = covariances + width[:, :, None] * width[:, None, :]
        weights = np.full(x.size, 1 / x.size / len(combos))
        total = np.logaddexp(total, log_mixture(seen, means, covariances, weights))
    return total
