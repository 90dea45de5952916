"""From evidence to the answer."""

from __future__ import annotations

from collections.abc import Mapping

from benchtool.diagnose.costs import COSTS, Cost
from benchtool.diagnose.groups import directions, used_names
from benchtool.diagnose.hypotheses import TWO_FAULTS, UNEXPLAINED
from benchtool.diagnose.layout import lay_out, left_out
from benchtool.diagnose.model import make_model
from benchtool.diagnose.posterior import Posterior, make_posterior
from benchtool.diagnose.priors import DEFAULT_PRIORS, Priors
from benchtool.diagnose.proposals import propose
from benchtool.diagnose.scatter import tolerance_notices
from benchtool.diagnose.stuck import diagnose_stuck
from benchtool.diagnose.suspects import list_suspects
from benchtool.diagnose.twofaults import rank_pairs
from benchtool.diagnose.words import sum_up
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Diagnosis, Evidence, NextReading, Suspect

CERTAIN = 0.95


def diagnose(
    evidence: Evidence,
    stage: Stage,
    design: Design,
    *,
    priors: Priors = DEFAULT_PRIORS,
    costs: Mapping[str, Cost] = COSTS,
) -> Diagnosis:
    """Rank what may have happened to a board, and name the cheapest next reading.

    Args:
        evidence: Captures and readings of the board.
        stage: The circuit as it was designed: parts with their tolerances, the IC.
        design: Its supply, temperature and probe.
        priors: What is held of the faults beforehand.
        costs: What further readings take; one that is not in the table is not proposed.

    Returns:
        Suspects with probabilities that sum to 1, groups, and readings to take next.

    Raises:
        SolveError: If there is neither a time nor a standstill to diagnose, or a time is not
            greater than 0.
    """
    if evidence.state is not None:
        return diagnose_stuck(evidence, stage, design, priors=priors)
    layout = lay_out(evidence, stage, design)
    posterior = make_posterior(make_model(layout, priors))
    pairs = () if posterior.single.passes else rank_pairs(posterior)
    suspects, groups = list_suspects(posterior, pairs)
    is_certain = _is_certain(posterior, suspects[0])
    proposals = () if is_certain else propose(posterior, costs)
    return Diagnosis(
        suspects=suspects,
        groups=groups,
        next=proposals,
        is_certain=is_certain,
        single=posterior.single,
        stop=_stop(proposals, is_certain=is_certain),
        sentence=sum_up(
            suspects,
            groups[0].members if groups else (),
            proposals,
            is_certain=is_certain,
            is_single=posterior.single.passes,
        ),
        used=tuple(used_names(posterior)),
        directions=directions(posterior),
        warnings=(*tolerance_notices(stage), *left_out(evidence, layout)),
    )


def _is_certain(posterior: Posterior, best: Suspect) -> bool:
    if not posterior.single.passes or best.fault in (UNEXPLAINED, TWO_FAULTS):
        return False
    cautious = float(posterior.cautious[posterior.model.names.index(best.fault)])
    return min(best.probability, cautious) >= CERTAIN


def _stop(proposals: tuple[NextReading, ...], *, is_certain: bool) -> str:
    if is_certain:
        return "Nothing more needs to be measured."
    if proposals:
        return ""
    return "No reading in the table of costs would tell enough to be worth its minutes."
