"""The best pairs of faults, where no single one explains what was seen."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import combinations

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.fault_entry import Fault
from benchtool.circuits.fault_moves import Move
from benchtool.diagnose.hypotheses import Hypothesis
from benchtool.diagnose.likelihood import log_sum
from benchtool.diagnose.model import Model
from benchtool.diagnose.posterior import Posterior
from benchtool.diagnose.sizes import Sizes
from benchtool.diagnose.tables import Table, tabulate
from benchtool.diagnose.words import join, name_fault
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_COARSE, _FINE = 48, 28
_EXACT_PAIRS = 8
_MOST_PAIRS = 3
_LEAST_SHARE = 0.02


@frozen_record
class Pair:
    """Two faults at once.

    Attributes:
        faults: Their names.
        share: Of what no single fault explains.
        words: Both in words.
    """

    faults: tuple[str, str]
    share: float
    words: str


@frozen_record(eq=False)
class _Thin:
    """A hypothesis on few sizes."""

    hypothesis: Hypothesis
    shifts: FloatArray
    log_weights: FloatArray


def rank_pairs(posterior: Posterior) -> tuple[Pair, ...]:
    """Return the pairs of faults that explain best what one does not.

    Args:
        posterior: What is held of the board.
    """
    model, priors = posterior.model, posterior.model.priors
    rough = sorted(_rough(model, posterior.seen), key=lambda item: -item[0])[:_EXACT_PAIRS]
    exact = [
        (_exact(model, posterior.seen, first, second), first.name, second.name)
        for _, first, second in rough
    ]
    total = sum(item.weight for item in model.hypotheses[1:]) ** 2 / 2
    weights = {item.name: item.weight for item in model.hypotheses}
    logs = np.array(
        [
            log + np.log(weights[a] * weights[b] / total * priors.two_faults_odds)
            for log, a, b in exact
        ]
        + [posterior.evidence[-1] + np.log(max(priors.unexplained_odds, 1e-12))]
    )
    shares = np.exp(logs - log_sum(logs))
    return tuple(_named(exact, shares))


def _named(exact: list[tuple[float, str, str]], shares: FloatArray) -> Iterator[Pair]:
    order = np.argsort(-shares[:-1], kind="stable")[:_MOST_PAIRS]
    for index in order.tolist():
        if shares[index] >= _LEAST_SHARE:
            _, first, second = exact[index]
            words = join([name_fault(first), name_fault(second)], "with")
            yield Pair(faults=(first, second), share=float(shares[index]), words=words)


def _rough(model: Model, seen: FloatArray) -> Iterator[tuple[float, Hypothesis, Hypothesis]]:
    """Yield every pair with ln of its evidence if what both move added up."""
    healthy = model.nodes[0].table
    scatter = healthy.slopes[0] @ healthy.slopes[0].T + model.layout.noise
    root = np.linalg.cholesky(scatter)
    thin = [_thin(nodes.table, healthy, root) for nodes in model.nodes[1:]]
    point = np.linalg.solve(root, seen - healthy.means[0])
    for first, second in combinations([item for item in thin if item is not None], 2):
        if first.hypothesis.fault.move.fields == second.hypothesis.fault.move.fields:
            continue
        misfit = point - first.shifts[:, None] - second.shifts[None]
        logs = first.log_weights[:, None] + second.log_weights[None]
        logs = logs - (misfit**2).sum(axis=2) / 2
        prior = np.log(first.hypothesis.weight * second.hypothesis.weight)
        yield float(log_sum(logs.ravel())) + prior, first.hypothesis, second.hypothesis


def _thin(table: Table, healthy: Table, root: FloatArray) -> _Thin | None:
    possible = np.flatnonzero(np.isfinite(table.means).all(axis=1))
    if not possible.size:
        return None
    at = possible[:: max(1, possible.size // _COARSE)]
    shifts = np.linalg.solve(root, (table.means[at] - healthy.means[0]).T).T
    weights = table.hypothesis.sizes.weights[at]
    return _Thin(
        hypothesis=table.hypothesis,
        shifts=shifts,
        log_weights=np.log(weights / weights.sum()),
    )


def _exact(model: Model, seen: FloatArray, first: Hypothesis, second: Hypothesis) -> float:
    """Return ln of the evidence of both at once, on a coarse grid with the full circuit."""
    sizes, weights, shape = _grid(first, second)
    both = Hypothesis(
        fault=_joined(first, second, sizes),
        sizes=Sizes(values=np.arange(float(weights.size)), weights=weights, ends=(0, weights.size)),
        weight=1.0,
    )
    numbers = np.arange(float(weights.size))
    table = tabulate(model.boards, both, model.layout.observables, numbers)
    means = table.means.reshape(*shape, -1)
    cells = (_cells(means), _cells(means.swapaxes(0, 1)).swapaxes(0, 1))
    flat = [cell.reshape(table.means.shape)[:, :, None] for cell in cells]
    slopes = np.concatenate([table.slopes * model.factors[0], *flat], axis=2)
    return _log_mixture(seen, table.means, slopes, model.layout.noise, weights)


def _cells(means: FloatArray) -> FloatArray:
    """Return the spread within each cell along the first axis; the nearer neighbour counts.

    Sizes of both signs lie in one grid: across their gap nothing is spread.
    """
    if len(means) < 2:
        return np.zeros_like(means)
    steps = np.diff(means, axis=0)
    before, after = np.concatenate([steps[:1], steps]), np.concatenate([steps, steps[-1:]])
    nearer = np.linalg.norm(before, axis=2) < np.linalg.norm(after, axis=2)
    widths: FloatArray = np.nan_to_num(np.where(nearer[:, :, None], before, after))
    return widths / math.sqrt(12)


def _log_mixture(
    seen: FloatArray, means: FloatArray, slopes: FloatArray, noise: FloatArray, weights: FloatArray
) -> float:
    possible = np.isfinite(means).all(axis=1) & np.isfinite(slopes).all(axis=(1, 2))
    if not possible.any():
        return -np.inf
    means, slopes, weights = means[possible], slopes[possible], weights[possible]
    covariance = slopes @ slopes.transpose(0, 2, 1) + noise
    misfit = seen - means
    distances = (misfit * np.linalg.solve(covariance, misfit[:, :, None])[:, :, 0]).sum(axis=1)
    log_dets = np.linalg.slogdet(2 * np.pi * covariance)[1]
    return float(log_sum(np.log(weights) - distances / 2 - log_dets / 2))


def _grid(
    first: Hypothesis, second: Hypothesis
) -> tuple[tuple[FloatArray, FloatArray], FloatArray, tuple[int, int]]:
    picks = [_picks(item) for item in (first, second)]
    (values_a, weights_a), (values_b, weights_b) = picks
    a, b = np.meshgrid(values_a, values_b, indexing="ij")
    return (a.ravel(), b.ravel()), np.outer(weights_a, weights_b).ravel(), a.shape


def _picks(hypothesis: Hypothesis) -> tuple[FloatArray, FloatArray]:
    sizes = hypothesis.sizes
    step = max(1, sizes.values.size // _FINE)
    values, weights = sizes.values[step // 2 :: step], sizes.weights[step // 2 :: step]
    return values, weights / weights.sum()


def _joined(first: Hypothesis, second: Hypothesis, sizes: tuple[FloatArray, FloatArray]) -> Fault:
    a, b = sizes

    def act(circuit: Circuit, number: Value) -> Circuit:
        at = np.asarray(number).astype(int)
        return second.fault.move.act(first.fault.move.act(circuit, a[at]), b[at])

    move = Move(fields=(), act=act)
    return Fault(name="two-faults", topologies=(), part=None, move=move, unit="", seen="")
