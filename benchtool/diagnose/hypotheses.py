"""Hypotheses: each fault that a stage can have, with its grid of sizes and its prior share."""

from __future__ import annotations

import numpy as np

from benchtool.circuits import faults_of
from benchtool.circuits.circuit import Circuit
from benchtool.circuits.fault_entry import Fault
from benchtool.diagnose.priors import Priors
from benchtool.diagnose.sizes import Sizes, sizes_of
from benchtool.frozen import frozen_record
from benchtool.model.design import Stage

HEALTHY, UNEXPLAINED, TWO_FAULTS = "healthy", "unexplained", "two-faults"


@frozen_record(eq=False)
class Hypothesis:
    """One explanation.

    Attributes:
        fault: The fault; that called healthy moves nothing.
        sizes: Its grid of sizes.
        weight: Prior weight against the others.
    """

    fault: Fault
    sizes: Sizes
    weight: float

    @property
    def name(self) -> str:
        """Name of the fault."""
        return self.fault.name


def hypothesise(stage: Stage, circuit: Circuit, priors: Priors) -> tuple[Hypothesis, ...]:
    """Return the explanations for a stage, the healthy board first.

    Args:
        stage: Gives the kinds of its parts.
        circuit: Its nominal board, all floats.
        priors: What is held beforehand.
    """
    alone = Sizes(values=np.zeros(1), weights=np.ones(1), ends=(0, 1))
    found = []
    for fault in faults_of(stage.topology):
        if fault.name == HEALTHY:
            found.append(Hypothesis(fault=fault, sizes=alone, weight=priors.healthy_odds))
            continue
        weight = priors.weight(fault, stage)
        if weight <= 0 or (fault.name == "wrong-ic-family" and circuit.family is None):
            continue
        sizes = sizes_of(fault, priors.of(fault), circuit, priors.sizes)
        if sizes is not None:
            found.append(Hypothesis(fault=fault, sizes=sizes, weight=weight))
    return tuple(found)
