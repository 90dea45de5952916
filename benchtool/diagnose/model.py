"""All hypotheses made ready for one layout of evidence."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.circuits import circuit_at
from benchtool.diagnose.hypotheses import Hypothesis, hypothesise
from benchtool.diagnose.layout import Layout
from benchtool.diagnose.likelihood import Nodes, axis_factors, log_evidence, log_sum, make_nodes
from benchtool.diagnose.pairs import PairDensity, pair_density
from benchtool.diagnose.priors import Priors
from benchtool.diagnose.tables import Boards, tabulate
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray


@frozen_record(eq=False)
class Model:
    """Everything needed to weigh what was seen.

    Attributes:
        layout: What was seen, or would be.
        priors: What is held beforehand.
        boards: Healthy boards at all deviations.
        hypotheses: The explanations, healthy first.
        nodes: Their Gaussians, in the same order.
        factors: Factors on the axes for each scatter averaged over, shape (scatters, a).
        pairs: Density of boards with two faults.
    """

    layout: Layout
    priors: Priors
    boards: Boards
    hypotheses: tuple[Hypothesis, ...]
    nodes: tuple[Nodes, ...]
    factors: FloatArray
    pairs: PairDensity

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the faults, in order."""
        return tuple(item.name for item in self.hypotheses)

    @property
    def log_prior(self) -> FloatArray:
        """Logarithms of the prior shares, ``unexplained`` last."""
        usual = self.priors.unexplained_odds
        weights = np.array([*(item.weight for item in self.hypotheses), usual])
        with np.errstate(divide="ignore"):
            shares: FloatArray = np.log(weights / weights.sum())
        return shares

    def log_shares(self, *, cautious: bool = False) -> FloatArray:
        """Return the logarithms of the shares of the scatters."""
        parts = self.priors.scatters
        given = np.array([item.cautious_share if cautious else item.share for item in parts])
        with np.errstate(divide="ignore"):
            logs: FloatArray = np.log(given / given.sum())
        return logs

    def weigh(self, seen: FloatArray, *, as_believed: bool = False) -> Weighed:
        """Return the evidence for each hypothesis.

        Args:
            seen: What was seen, shape (m, boards).
            as_believed: Whether only the scatter as believed is wanted.
        """
        n = 1 if as_believed else len(self.priors.scatters)
        rows = [log_evidence(nodes, seen, n) for nodes in self.nodes]
        return Weighed(model=self, by_scatter=np.stack(rows), pairs=self.pairs.log_density(seen))


@frozen_record(eq=False)
class Weighed:
    """The evidence for each hypothesis on each board, as logarithms.

    Attributes:
        model: Of what.
        by_scatter: Under each scatter, shape (hypotheses, scatters, boards).
        pairs: Of two faults, shape (boards,).
    """

    model: Model
    by_scatter: FloatArray
    pairs: FloatArray

    def evidence(self, *, cautious: bool = False) -> FloatArray:
        """Return ln of the marginal likelihoods, ``unexplained`` last: (hypotheses + 1, boards)."""
        logs = self.model.log_shares(cautious=cautious)
        singles = log_sum(self.by_scatter + logs[:, None], axis=1)
        return np.concatenate([singles, self.pairs[None]])

    def probabilities(self, *, cautious: bool = False) -> FloatArray:
        """Return the posterior shares, ``unexplained`` last: (hypotheses + 1, boards)."""
        return shares(self.evidence(cautious=cautious) + self.model.log_prior[:, None])

    def strangeness(self) -> FloatArray:
        """Return how much better two faults explain each board than one does, shape (boards,).

        The scatter is as believed: a wider one would explain away what a second fault did.
        """
        singles = self.by_scatter[:, 0] + self.model.log_prior[:-1, None]
        return self.pairs - log_sum(singles)


def make_model(layout: Layout, priors: Priors) -> Model:
    """Return all hypotheses of a stage, ready for what was seen."""
    stage, design = layout.stage, layout.design
    hypotheses = hypothesise(stage, circuit_at(stage, design), _widened(layout, priors))
    boards = Boards.of(layout)
    factors = axis_factors(boards.deviations, priors)
    tables = tuple(tabulate(boards, item, layout.observables) for item in hypotheses)
    return Model(
        layout=layout,
        priors=priors,
        boards=boards,
        hypotheses=hypotheses,
        nodes=tuple(make_nodes(table, layout.noise, factors) for table in tables),
        factors=factors,
        pairs=pair_density(tables, layout.noise),
    )


def _widened(layout: Layout, priors: Priors) -> Priors:
    """Return the priors; against itself small changes count too."""
    if all(item.is_faulty or not item.is_own_board for item in layout.conditions):
        return priors
    law = priors.sizes
    drifts = replace(law, lower=law.drift)
    return replace(priors, sizes=drifts)


def shares(log_weights: FloatArray) -> FloatArray:
    """Return weights that sum to 1 over the first axis, from their logarithms."""
    weights = np.exp(log_weights - log_weights.max(axis=0))
    normed: FloatArray = weights / weights.sum(axis=0)
    return normed
