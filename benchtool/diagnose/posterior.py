"""One board's posterior: probabilities, sizes with their intervals, and whether one fault does."""

from __future__ import annotations

import math

import numpy as np

from benchtool.diagnose.likelihood import Nodes, log_sum, node_logs
from benchtool.diagnose.model import Model, shares
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.diagnosis import Reading, SingleTest

_SEED = 20240229
_STRANGERS = 600  # simulated boards behind the single-fault test: its 5 % is good to 0.9 %
_QUANTILES = (0.025, 0.975)
_CLOSE = 1e-4  # of the logarithm of an interval's end
_LIGHT = 1e-4  # share of a node against the heaviest that moves no quantile


@frozen_record(eq=False)
class Gaussians:
    """What is known at every node of a hypothesis once something was seen.

    Attributes:
        weights: Share of each node within the hypothesis, shape (k,).
        pulls: Mean of the axes in standard uncertainties, shape (k, a).
        spreads: Covariance of the axes, likewise, shape (k, a, a).
    """

    weights: FloatArray
    pulls: FloatArray
    spreads: FloatArray


@frozen_record(eq=False)
class Posterior:
    """What is held of one board.

    Attributes:
        model: The hypotheses.
        seen: What was seen, shape (m,).
        evidence: ln of the marginal likelihoods, ``unexplained`` last.
        probabilities: Their shares after all, ``unexplained`` last.
        cautious: The same with wider scatters weighing more.
        single: Whether a single fault explains it.
        logs: ln(weight · density) of the nodes of each hypothesis, bounds included.
    """

    model: Model
    seen: FloatArray
    evidence: FloatArray
    probabilities: FloatArray
    cautious: FloatArray
    single: SingleTest
    logs: tuple[FloatArray, ...]


def make_posterior(model: Model) -> Posterior:
    """Return what is held of the board after what was seen of it."""
    seen = model.layout.seen
    weighed = model.weigh(seen[:, None])
    logs = tuple(_node_logs(model, nodes, seen) for nodes in model.nodes)
    evidence, cautious = weighed.evidence()[:, 0], weighed.evidence(cautious=True)[:, 0]
    if model.layout.bounds:
        held = np.array([float(log_sum(rows)) if rows.size else -np.inf for rows in logs])
        with np.errstate(invalid="ignore"):
            change = np.nan_to_num(held - evidence[:-1], nan=0.0, neginf=-np.inf)
        evidence = np.append(evidence[:-1] + change, evidence[-1])
        cautious = np.append(cautious[:-1] + change, cautious[-1])
    best = int(np.argmax(evidence[:-1] + model.log_prior[:-1]))
    return Posterior(
        model=model,
        seen=seen,
        evidence=evidence,
        probabilities=shares(evidence + model.log_prior),
        cautious=shares(cautious + model.log_prior),
        single=weigh_single(
            model, best, float(weighed.strangeness()[0]), posterior_weights=logs[best]
        ),
        logs=logs,
    )


def _node_logs(model: Model, nodes: Nodes, seen: FloatArray) -> FloatArray:
    """Return ln(weight · density) of every node, with scatter shares and bounds."""
    if not nodes.log_weights.size:
        return np.zeros(0)
    logs = node_logs(nodes, seen[:, None])[:, 0] + model.log_shares()[nodes.scatter_index]
    for bound in model.layout.bounds:
        logs = logs + _log_bound(model, nodes, seen, bound)
    return logs


def _log_bound(model: Model, nodes: Nodes, seen: FloatArray, bound: Reading) -> FloatArray:
    """Return ln of the probability that a part keeps a bound, at every node."""
    from benchtool.diagnose.observables import Observable
    from benchtool.diagnose.tables import tabulate

    item = Observable(name=bound.part or "")
    table = tabulate(model.boards, nodes.table.hypothesis, (item,))
    known = condition(nodes, seen, model.layout.noise)
    slope = table.slopes[nodes.size_index, 0] * nodes.factors
    mean = table.means[nodes.size_index, 0] + (slope * known.pulls).sum(axis=1)
    variance = np.einsum("ka,kab,kb->k", slope, known.spreads, slope)
    u = np.sqrt(np.maximum(variance, 0.0) + (bound.u / bound.value) ** 2)
    room = (math.log(bound.value) - mean) / u
    if bound.way == "at-least":
        room = -room
    logs: FloatArray = np.log(np.maximum(normal_cdfs(room), 1e-300))
    return logs


def condition(nodes: Nodes, seen: FloatArray, noise: FloatArray) -> Gaussians:
    """Return the axes at every node given what was seen.

    References:
        Axes z ~ N(0, 1), seen = mean + J·z + noise: z | seen ~ N(K·(seen - mean), 1 - K·J) with
        K = J'·(J·J' + N)^-1.
    """
    slopes = nodes.table.slopes[nodes.size_index] * nodes.factors[:, None, :]
    covariance = slopes @ slopes.transpose(0, 2, 1) + noise
    gain = slopes.transpose(0, 2, 1) @ np.linalg.inv(covariance)
    misfit = seen - nodes.table.means[nodes.size_index]
    pulls = np.einsum("kam,km->ka", gain, misfit)
    logs = node_logs(nodes, seen[:, None])[:, 0]
    return Gaussians(
        weights=shares(logs),
        pulls=pulls,
        spreads=np.eye(slopes.shape[2]) - gain @ slopes,
    )


@frozen_record
class Figure:
    """The moved figure of a fault: estimate, standard uncertainty and 95 % interval."""

    value: float
    u: float
    lower: float
    upper: float


def estimate(posterior: Posterior, index: int) -> Figure | None:
    """Return the figure that a fault has moved, None where it has none.

    Args:
        posterior: What is held of the board.
        index: Of the hypothesis.

    References:
        JCGM 101:2008, 7.7: the probabilistically symmetric interval of the distribution, here a
        mixture of normal laws of the figure's logarithm.
    """
    nodes, logs = posterior.model.nodes[index], posterior.logs[index]
    figures = nodes.table.figure[nodes.size_index]
    if not logs.size or not np.isfinite(figures).any():
        return None
    known = condition(nodes, posterior.seen, posterior.model.layout.noise)
    weights = shares(logs)
    slope = nodes.table.figure_slopes[nodes.size_index] * nodes.factors
    means = figures + (slope * known.pulls).sum(axis=1)
    variances = np.einsum("ka,kab,kb->k", slope, known.spreads, slope)
    kept = weights > _LIGHT * weights.max()
    return _mixture(weights[kept] / weights[kept].sum(), means[kept], variances[kept])


def _mixture(weights: FloatArray, means: FloatArray, variances: FloatArray) -> Figure:
    sds = np.sqrt(np.maximum(variances, 1e-12))
    middle = float(weights @ means)
    sd = math.sqrt(float(weights @ (sds**2 + (means - middle) ** 2)))
    lower, upper = (_quantile(weights, means, sds, p) for p in _QUANTILES)
    value = math.exp(middle)
    return Figure(value=value, u=value * sd, lower=math.exp(lower), upper=math.exp(upper))


def _quantile(weights: FloatArray, means: FloatArray, sds: FloatArray, p: float) -> float:
    """Return where a mixture of normal laws reaches the probability ``p``, by bisection."""
    low, high = float((means - 6 * sds).min()), float((means + 6 * sds).max())
    while high - low > _CLOSE:
        middle = (low + high) / 2
        below = float(weights @ normal_cdfs((middle - means) / sds))
        low, high = (middle, high) if below < p else (low, middle)
    return (low + high) / 2


def normal_cdfs(x: FloatArray) -> FloatArray:
    """Return the probabilities that a standard normal deviate is at most each value.

    References:
        Abramowitz & Stegun 7.1.26, error below 1.5e-7.
    """
    t = 1 / (1 + 0.3275911 * np.abs(x) / math.sqrt(2))
    series = t * (
        0.254829592 + t * (-0.284496736 + t * (1.421413741 + t * (-1.453152027 + t * 1.061405429)))
    )
    tail = series * np.exp(-(x**2) / 2) / 2
    chances: FloatArray = np.where(x > 0, 1 - tail, tail)
    return chances


def weigh_single(
    model: Model, best: int, strangeness: float, posterior_weights: FloatArray | None = None
) -> SingleTest:
    """Return how a board compares with simulated boards that have the likeliest fault.

    A fault larger than most is stranger than most, and still a single one: where the boards of
    all sizes are less strange, those of the size that was found are asked too.

    Args:
        model: The hypotheses.
        best: Index of the likeliest single hypothesis.
        strangeness: How much better two faults explain the board than one.
        posterior_weights: Logarithms of the weights of its nodes given what was seen; None asks
            boards of all sizes alone.
    """
    nodes, false_alarm = model.nodes[best], model.priors.false_alarm
    p_value = _share_stranger(model, nodes, nodes.log_weights, strangeness)
    if posterior_weights is not None and p_value < false_alarm:
        p_value = max(p_value, _share_stranger(model, nodes, posterior_weights, strangeness))
    return SingleTest(p_value=p_value, false_alarm=false_alarm)


def _share_stranger(
    model: Model, nodes: Nodes, log_weights: FloatArray, strangeness: float
) -> float:
    boards = simulate(model, nodes, _STRANGERS, log_weights)
    usual = model.weigh(boards, as_believed=True).strangeness()
    return float((np.count_nonzero(usual >= strangeness) + 1) / (usual.size + 1))


def simulate(
    model: Model, nodes: Nodes, count: int, log_weights: FloatArray | None = None
) -> FloatArray:
    """Return what boards with one fault show, the scatter as believed: shape (m, count).

    Args:
        model: The hypotheses.
        nodes: Of the fault.
        count: Number of boards.
        log_weights: Of the nodes, in place of their prior weights.
    """
    rng = np.random.default_rng(_SEED)
    noise = np.linalg.cholesky(model.layout.noise)
    plain = nodes.scatter_index == 0
    share = shares((nodes.log_weights if log_weights is None else log_weights)[plain])
    size = nodes.size_index[plain][rng.choice(share.size, count, p=share)]
    slopes, means = nodes.table.slopes[size], nodes.table.means[size]
    pulls = rng.standard_normal((count, slopes.shape[2]))
    expected = means + np.einsum("nma,na->nm", slopes, pulls)
    seen: FloatArray = expected.T + noise @ rng.standard_normal((noise.shape[0], count))
    return seen
