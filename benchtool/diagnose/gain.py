"""What a further reading is expected to tell: bits of information on which fault it is."""

from __future__ import annotations

import numpy as np

from benchtool.diagnose.candidates import Candidate
from benchtool.diagnose.likelihood import Nodes
from benchtool.diagnose.model import shares
from benchtool.diagnose.posterior import Posterior, condition
from benchtool.diagnose.tables import Boards, tabulate
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray

_SEED = 20250308
_SAMPLES = 400
_MOST_NODES = 800
_NEGLIGIBLE = 1e-6


@frozen_record(eq=False)
class Live:
    """The nodes that are still in play, those of the scatter as believed.

    Attributes:
        labels: Index of each node's hypothesis, shape (k,).
        rows: Its place among the hypothesis's nodes, shape (k,).
        weights: Its share, shape (k,).
    """

    labels: IntArray
    rows: IntArray
    weights: FloatArray

    def of(self, label: int) -> IntArray:
        """Return which of the nodes belong to a hypothesis."""
        return np.flatnonzero(self.labels == label)


@frozen_record(eq=False)
class Foreseen:
    """What a candidate would show at every live node.

    Attributes:
        means: Expected figures, shape (k, n).
        covariances: Shape (k, n, n).
    """

    means: FloatArray
    covariances: FloatArray


def live_nodes(posterior: Posterior) -> Live:
    """Return the nodes that matter."""
    labels, rows, logs = [], [], []
    for label, (nodes, values) in enumerate(
        zip(posterior.model.nodes, posterior.logs, strict=True)
    ):
        plain = np.flatnonzero(nodes.scatter_index == 0)
        labels.append(np.full(plain.size, label))
        rows.append(plain)
        logs.append(values[plain] + posterior.model.log_prior[label])
    weights = shares(np.concatenate(logs))
    kept = np.argsort(-weights, kind="stable")[:_MOST_NODES]
    kept = np.sort(kept[weights[kept] > _NEGLIGIBLE * weights.max()])
    return Live(
        labels=np.concatenate(labels)[kept],
        rows=np.concatenate(rows)[kept],
        weights=weights[kept] / weights[kept].sum(),
    )


def foresee(posterior: Posterior, live: Live, candidate: Candidate) -> Foreseen:
    """Return what a candidate would show at every live node, given what was seen."""
    layout = posterior.model.layout.extended(candidate.observables)
    boards = Boards.of(layout.only(candidate.observables))
    n, k = len(candidate.observables), live.weights.size
    means, covariances = np.empty((k, n)), np.empty((k, n, n))
    noise = np.diag([item.u**2 for item in candidate.observables])
    for label in np.flatnonzero(np.bincount(live.labels)).tolist():
        at = live.of(label)
        nodes = posterior.model.nodes[label]
        rows = live.rows[at]
        table = tabulate(boards, nodes.table.hypothesis, candidate.observables)
        slopes = table.slopes[nodes.size_index[rows]]
        known = condition(picked(nodes, rows), posterior.seen, posterior.model.layout.noise)
        own = known.pulls.shape[1] - 1  # axes that were there before; the last is the grid's cell
        old, new = slopes[:, :, [*range(own), -1]], slopes[:, :, own:-1]
        expected = np.einsum("kna,ka->kn", old, known.pulls)
        means[at] = table.means[nodes.size_index[rows]] + expected
        covariances[at] = (
            old @ known.spreads @ old.transpose(0, 2, 1) + new @ new.transpose(0, 2, 1) + noise
        )
    return Foreseen(means=means, covariances=covariances)


def picked(nodes: Nodes, rows: IntArray) -> Nodes:
    """Return some nodes of a hypothesis."""
    return Nodes(
        table=nodes.table,
        log_weights=nodes.log_weights[rows],
        scatter_index=nodes.scatter_index[rows],
        size_index=nodes.size_index[rows],
        factors=nodes.factors[rows],
        coefficients=nodes.coefficients[rows],
        origin=nodes.origin,
    )


def expected_bits(live: Live, foreseen: Foreseen) -> float:
    """Return the expected decrease of the entropy over the faults, in bits.

    References:
        Mutual information of fault and reading, averaged over a fixed sample of what the reading
        may show; Lindley 1956, "On a measure of the information provided by an experiment".
    """
    at = np.flatnonzero(np.isfinite(foreseen.means).all(axis=1))
    if not at.size:
        return 0.0
    means, covariances = foreseen.means[at], foreseen.covariances[at]
    labels, weights = live.labels[at], live.weights[at] / live.weights[at].sum()
    roots = np.linalg.cholesky(covariances).astype(np.float64)
    picks = np.searchsorted(np.cumsum(weights), (np.arange(_SAMPLES) + 0.5) / _SAMPLES)
    picks = np.minimum(picks, weights.size - 1)
    pulls = np.random.default_rng(_SEED).standard_normal((_SAMPLES, means.shape[1]))
    drawn = means[picks] + np.einsum("snm,sm->sn", roots[picks], pulls)
    logs = _log_densities(drawn, means, roots) + np.log(weights)
    chances = shares(logs.T)
    by_fault = np.stack([chances[labels == label].sum(axis=0) for label in np.unique(labels)])
    before = np.array([weights[labels == label].sum() for label in np.unique(labels)])
    return max(0.0, float(_entropy(before)) - float(np.mean(_entropy(by_fault))))


def _log_densities(drawn: FloatArray, means: FloatArray, roots: FloatArray) -> FloatArray:
    """Return ln of the density of every drawn reading at every node, shape (samples, k)."""
    whitening = np.linalg.inv(roots)
    whitened = np.einsum("kij,kj->ki", whitening, means)
    k, n = means.shape
    turned = (drawn @ whitening.reshape(k * n, n).T).reshape(-1, k, n) - whitened
    log_dets = np.log(np.diagonal(whitening, axis1=1, axis2=2)).sum(axis=1)
    logs: FloatArray = log_dets - (turned**2).sum(axis=2) / 2
    return logs


def _entropy(chances: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        terms = np.where(chances > 0, -chances * np.log2(chances), 0.0)
    bits: FloatArray = terms.sum(axis=0)
    return bits


def least_clearance(posterior: Posterior, live: Live, ohm: float) -> float:
    """Return how far the node clears its upper threshold with a resistor across the capacitor.

    Args:
        posterior: What is held of the board.
        live: What is still in play; a suspect counts with all its live sizes.
        ohm: The resistor.

    Returns:
        The least over all live suspects, as a share of the supply.
    """
    from benchtool.diagnose.conditions import shunt_condition
    from benchtool.diagnose.observables import Observable

    condition_ = shunt_condition("shunt tried", ohm, 0.01 * ohm)
    names = ("node-charge-end", "node-upper")
    trial = Candidate(
        name="shunt",
        observables=tuple(Observable(name=name, condition=condition_, u=1e-3) for name in names),
    )
    foreseen = foresee(posterior, live, trial)
    supply_v = posterior.model.layout.design.supply.nominal
    ends, uppers = np.exp(foreseen.means).T
    heavy = live.weights > 1e-3 * live.weights.max()
    clearances = np.nan_to_num((ends - uppers) / supply_v, nan=-1.0)
    return float(np.min(clearances[heavy]))
