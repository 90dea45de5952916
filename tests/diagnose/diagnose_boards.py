"""The boards of the population as the engine knows them: stage, design, and what may be seen."""

from __future__ import annotations

import math
from dataclasses import replace
from types import MappingProxyType

import diagnose_population as population
import numpy as np

from benchtool.circuits import FAULTS
from benchtool.diagnose.conditions import MAIN, own_axes, shunt_condition, supply_condition
from benchtool.diagnose.layout import Layout
from benchtool.diagnose.model import Model
from benchtool.diagnose.observables import Observable
from benchtool.diagnose.posterior import simulate
from benchtool.diagnose.priors import DEFAULT_PRIORS, Prior, Priors, SizeLaw
from benchtool.diagnose.scatter import healthy_axes
from benchtool.model.design import Band, Design, Ic, Part, Stage
from benchtool.model.diagnosis import Evidence, Observation, Reading
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing

U_TIME = 5e-4
_FIGURES = {
    "P": (("first_high", 1e-3),),
    "K": (("control-pin", 3e-3),),
    "N": (
        ("node-upper", 5e-3),
        ("node-lower", 5e-3),
        ("node-charge-end", 5e-3),
        ("node-discharge-end", 5e-3),
        ("node-tau-charge", 3e-3),
        ("node-tau-discharge", 3e-3),
    ),
    "R": (("RB", 5e-3),),
}


def make_stage(board: population.Board) -> tuple[Stage, Design]:
    """Return the board with the population's scatter as its tolerances: u = half-width/√3."""
    marked = {"RA": (board.ra, 0.006), "RB": (board.rb, 0.006), "C": (board.c, 0.03)}
    parts = {
        ref: Part(ref=ref, value=value, lower_rel=-u * math.sqrt(3), upper_rel=u * math.sqrt(3))
        for ref, (value, u) in marked.items()
    }
    stage = Stage(name="timer", topology="astable", parts=parts, ic=Ic(family=board.family))
    supply = Band(nominal=board.v, lower=board.v, upper=board.v)
    return stage, Design(name="board", supply=supply, stages=(stage,))


def equal_priors(healthy_odds: float = 0.0, unexplained_odds: float = 0.0) -> Priors:
    """Return the population's priors: its 14 faults alike, sizes without a tail."""
    table = {
        name: replace(
            DEFAULT_PRIORS.table.get(name, Prior()),
            weight=float(name in population.FAULTS),
            by_kind=MappingProxyType({}),
        )
        for name in FAULTS
    }
    return replace(
        DEFAULT_PRIORS,
        table=MappingProxyType(table),
        healthy_odds=healthy_odds,
        unexplained_odds=unexplained_odds,
        sizes=SizeLaw(tail=0.0),
    )


def make_layout(board: population.Board, letters: str) -> Layout:
    """Return the layout of what is seen, without figures; seen as in the population."""
    stage, design = make_stage(board)
    own = healthy_axes(stage, design)
    observables = tuple(item for letter in letters for item in _observables(board, letter))
    conditions = {item.condition.name: item.condition for item in observables}.values()
    return Layout(
        stage=stage,
        design=design,
        board=own,
        axes=(*own, *(axis for item in conditions for axis in own_axes(item, own))),
        observables=observables,
        noise=np.diag([item.u**2 for item in observables]),
    )


def _observables(board: population.Board, letter: str) -> tuple[Observable, ...]:
    if letter in _FIGURES:
        return tuple(Observable(name=name, u=u) for name, u in _FIGURES[letter])
    condition = {
        "O": MAIN,
        "S": shunt_condition("shunt 1", board.shunt, 0.01 * board.shunt),
        "V": supply_condition("supply 1", board.v * 2 / 3, 1e-6),
    }[letter]
    return tuple(
        Observable(name=name, condition=condition, u=U_TIME) for name in ("t_high", "t_low")
    )


def seconds(value: float, u_rel: float = U_TIME) -> Measured:
    """Return a measured time."""
    return Measured(value=value, u=value * u_rel, unit="s")


def make_evidence(
    t_high_s: float, t_low_s: float, *readings: Reading, captures: tuple[Observation, ...] = ()
) -> Evidence:
    """Return the main capture's times with readings and further captures."""
    timing = Timing(t_high=seconds(t_high_s), t_low=seconds(t_low_s))
    return Evidence(observations=(Observation(timing=timing), *captures), readings=readings)


def control_pin(volt: float) -> Reading:
    """Return a reading of the control pin, 0.3 %."""
    return Reading(kind="control-pin", value=volt, u=0.003 * volt, unit="V")


def strangeness_cuts(model: Model, n: int = 2000) -> np.ndarray:
    """Return above which strangeness each first suspect is no single fault, 5 % false alarm."""
    cuts = np.full(len(population.FAULTS), np.inf)
    for k, name in enumerate(population.FAULTS):
        if name in model.names:
            nodes = model.nodes[model.names.index(name)]
            usual = model.weigh(simulate(model, nodes, n), as_believed=True).strangeness()
            cuts[k] = np.quantile(usual, 0.95)
    return cuts
