"""Which suspects cannot be told apart, and why."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from benchtool.diagnose.hypotheses import HEALTHY
from benchtool.diagnose.posterior import Posterior
from benchtool.diagnose.words import join
from benchtool.model.arrays import IntArray
from benchtool.model.diagnosis import Direction, Group

LEAST_RATIO = 1 / 20
"""Of the likelihoods: what is below it against the best of a group is told apart."""

_LEAST_SHOWN = 0.002
_MOST_GROUPS = 4
_STILL = 2e-3  # a change of ln t that nobody would call one
_ALIKE_RAD = math.radians(8)
_HIGH, _LOW = "high time", "low time"


def group_suspects(posterior: Posterior) -> tuple[tuple[int, ...], ...]:
    """Return the groups as indices of hypotheses, the best group and suspect first."""
    count = len(posterior.model.hypotheses)
    left = [int(i) for i in np.argsort(-posterior.probabilities[:count], kind="stable")]
    left = [i for i in left if np.isfinite(posterior.evidence[i])]
    groups: list[tuple[int, ...]] = []
    while left and len(groups) < _MOST_GROUPS:
        best = left[0]
        if groups and posterior.probabilities[best] < _LEAST_SHOWN:
            break
        cut = posterior.evidence[best] + math.log(LEAST_RATIO)
        members = tuple(i for i in left if posterior.evidence[i] > cut)
        groups.append(members)
        left = [i for i in left if i not in members]
    return tuple(groups)


def directions(posterior: Posterior) -> tuple[Direction, ...]:
    """Return this board's point and each live fault's direction, in the plane of both times."""
    names = [
        item.name for item in posterior.model.layout.observables if item.condition.name == "main"
    ]
    if not {"t_high", "t_low"} <= set(names):
        return ()
    seen = [item.name for item in posterior.model.layout.observables]
    at: IntArray = np.array([seen.index("t_high"), seen.index("t_low")])
    healthy = posterior.model.nodes[0].table.means[0, at]
    point = posterior.seen[at] - healthy
    found = [Direction(fault="this board", dln_high=float(point[0]), dln_low=float(point[1]))]
    for nodes, logs in zip(posterior.model.nodes, posterior.logs, strict=True):
        if logs.size and nodes.table.hypothesis.name != HEALTHY:
            size = nodes.size_index[int(np.argmax(logs))]
            shift = nodes.table.means[size, at] - healthy
            name = nodes.table.hypothesis.name
            found.append(Direction(fault=name, dln_high=float(shift[0]), dln_low=float(shift[1])))
    return tuple(found)


def describe_group(
    number: int, members: tuple[int, ...], posterior: Posterior, compass: tuple[Direction, ...]
) -> Group:
    """Return a group with the reason in words."""
    names = tuple(posterior.model.names[i] for i in members)
    probability = float(posterior.probabilities[list(members)].sum())
    why = _reason(names, posterior, compass) if len(names) > 1 else ""
    return Group(number=number, members=names, probability=min(probability, 1.0), why=why)


def _reason(names: tuple[str, ...], posterior: Posterior, compass: tuple[Direction, ...]) -> str:
    used = _sources(posterior)
    if HEALTHY in names:
        return (
            f"What was measured ({used}) lies within what healthy parts do, and the others would "
            "move it no further than that."
        )
    arrows = [item for item in compass if item.fault in names]
    if not arrows:
        return f"All of them can give what was measured ({used})."
    effects = dict.fromkeys(_effect(item) for item in arrows)
    if len(effects) == 1 and _alike(arrows):
        return (
            f"All of them {next(iter(effects))}, in the same proportion; {used} cannot tell them "
            "apart."
        )
    return (
        f"Each of them, at a size of its own and within the tolerances of the other parts, gives "
        f"what was measured; {used} cannot tell them apart."
    )


def _sources(posterior: Posterior) -> str:
    return join(list(used_names(posterior)), "and")


def used_names(posterior: Posterior) -> Iterator[str]:
    """Yield what was taken into account, in words, each once."""
    found = dict.fromkeys(
        _source(item.name, item.condition.name) for item in posterior.model.layout.observables
    )
    yield from found
    for bound in posterior.model.layout.bounds:
        yield bound.name


def _source(name: str, condition: str) -> str:
    if condition != "main" and not name.startswith("node-"):
        return f"the {condition.rpartition(' ')[0]} capture"
    if name in ("t_high", "t_low", "period", "delay"):
        return "the output"
    if name == "first_high":
        return "the first high after power-up"
    if name.startswith("node-"):
        return "the capacitor's trace"
    return name if name.isupper() else f"the {name.replace('-', ' ')}"


def _effect(item: Direction) -> str:
    high, low = _verb(item.dln_high), _verb(item.dln_low)
    if high == low:
        return f"{high} both times" if high != "leave" else "leave both times"
    return f"{high} the {_HIGH} and {low} the {_LOW}"


def _verb(change: float) -> str:
    if abs(change) < _STILL:
        return "leave"
    return "lengthen" if change > 0 else "shorten"


def _alike(arrows: list[Direction]) -> bool:
    angles = np.array([math.atan2(item.dln_low, item.dln_high) for item in arrows])
    apart = np.angle(np.exp(1j * (angles - angles[0])))
    return bool(np.abs(apart).max() < _ALIKE_RAD)
