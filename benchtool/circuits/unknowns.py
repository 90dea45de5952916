"""What a solution looks for, and what it takes with an uncertainty."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.coordinates import Point, circuit_at, coordinates, term_origin
from benchtool.circuits.topologies import Topology, find_topology
from benchtool.frozen import frozen_record
from benchtool.model.design import Design, Part, Stage

Placing = Callable[[tuple[Value, ...], Point], dict[str, Value]]

LEAST_U_REL = 0.01 / math.sqrt(3)
"""A part is taken to be at least 1 % uncertain when products are shared out among parts."""

SHARE = "share of R and C"
"""Name of the one freedom that the products leave: more resistance and less capacitance."""


@frozen_record
class Nuisance:
    """Something the times depend on that is not looked for.

    Attributes:
        name: Its coordinate.
        source: Its name in an uncertainty budget.
        centre: Where it is taken to be.
        u: Standard uncertainty.
        note: Where value and u come from.
    """

    name: str
    source: str
    centre: float
    u: float
    note: str = ""


@frozen_record
class Model:
    """Times as a function of unknowns and nuisances.

    Attributes:
        stage, design: The circuit that is solved.
        place: Makes part values of the logarithms of the unknowns (and of ``SHARE``).
        nuisances: What else moves the times.
        fixed: Part values that are known.
    """

    stage: Stage
    design: Design
    place: Placing
    nuisances: tuple[Nuisance, ...]
    fixed: Mapping[str, float]

    def circuit(self, logs: tuple[Value, ...], shifts: tuple[Value, ...] | None = None) -> Circuit:
        """Return the circuit at the unknowns, with the nuisances off their centre by ``shifts``."""
        moved = shifts or (0.0,) * len(self.nuisances)
        point: dict[str, Value] = {**self.fixed}
        for item, shift in zip(self.nuisances, moved, strict=True):
            point[item.name] = item.centre + shift
        placed = self.place(logs, point)
        point.pop(SHARE, None)
        return circuit_at(self.stage, self.design, {**point, **placed})


def product_model(
    stage: Stage,
    design: Design,
    log_c: float,
    known: Mapping[str, float],
    *,
    marked: bool = True,
) -> Model:
    """Return the model whose unknowns are ln(RA·C), ln(RB·C), or ln(R·C).

    Args:
        stage: The circuit.
        design: Its supply, temperature and probe.
        log_c: Logarithm of the capacitance with which products are shared out, where no part is
            known.
        known: Parts of known value; the first decides how the products are shared out.
        marked: Whether the stage's part values are a design's, so that their tolerances say how
            well that share is known.
    """
    topology = find_topology(stage.topology)
    around = list(_surrounding_nuisances(stage, design))
    if marked and not known:
        u_share = _u_share(stage, topology)
        around.append(Nuisance(name=SHARE, source=SHARE, centre=0.0, u=u_share))
    return Model(
        stage=stage,
        design=design,
        place=_sharing(topology, log_c, known),
        nuisances=tuple(around),
        fixed={},
    )


def _sharing(topology: Topology, log_c: float, known: Mapping[str, float]) -> Placing:
    def place(logs: tuple[Value, ...], point: Point) -> dict[str, Value]:
        by_ref = dict(zip(topology.resistor_refs, logs, strict=True))
        if known:
            ref, value = next(iter(known.items()))
            c = math.log(value) if ref == "C" else by_ref[ref] - math.log(value)
        else:
            c = log_c + point.get(SHARE, 0.0)
        return {"C": np.exp(c), **{ref: np.exp(log - c) for ref, log in by_ref.items()}}

    return place


def part_model(
    stage: Stage, design: Design, unknown: tuple[str, ...], known: Mapping[str, float]
) -> Model:
    """Return the model whose unknowns are ln of the named parts.

    Args:
        stage: The circuit.
        design: Its supply, temperature and probe.
        unknown: References of the parts looked for.
        known: Parts of known value; all others are as marked, within their tolerance.
    """
    marked = tuple(
        Nuisance(
            name=item.name,
            source=f"tolerance of {item.name}",
            centre=item.centre,
            u=item.u,
            note="as marked",
        )
        for item in coordinates(stage, design)
        if item.kind == "part" and item.name not in unknown and item.name not in known
    )
    return Model(
        stage=stage,
        design=design,
        place=lambda logs, _: {ref: np.exp(log) for ref, log in zip(unknown, logs, strict=True)},
        nuisances=(*_surrounding_nuisances(stage, design), *marked),
        fixed={ref: value for ref, value in known.items() if ref not in unknown},
    )


def _surrounding_nuisances(stage: Stage, design: Design) -> tuple[Nuisance, ...]:
    return tuple(
        Nuisance(
            name=item.name,
            source=item.name.replace("_", " "),
            centre=item.centre,
            u=item.u,
            note=_note(stage, item.name),
        )
        for item in coordinates(stage, design)
        if item.kind != "part"
    )


def _note(stage: Stage, name: str) -> str:
    terms = {"upper_threshold": "u_threshold", "threshold_split": "u_split"}
    term = terms.get(name, name)
    if name in terms or name in find_topology(stage.topology).ic_terms:
        return term_origin(stage, term)
    return "from memory" if name.endswith("diode_drop") else "range in the design"


def part_u_rel(part: Part) -> float:
    """Return the relative standard uncertainty with which a part is as marked."""
    return max((part.upper_rel - part.lower_rel) / math.sqrt(12), LEAST_U_REL)


def _u_share(stage: Stage, topology: Topology) -> float:
    """Return u of ln C when all products are known: the parts' tolerances combined."""
    weight = sum(part_u_rel(stage.parts[ref]) ** -2 for ref in topology.parts)
    return 1 / math.sqrt(weight)


def likeliest_log_c(stage: Stage, logs: tuple[float, ...]) -> float:
    """Return ln C when the products are shared out so that the fewest parts have moved.

    With two resistors each part has a say in what C must be for itself to be as marked; the median
    lets one part be off. With one resistor the part of the wider tolerance takes it.
    """
    topology = find_topology(stage.topology)
    marked_c = math.log(stage.parts["C"].value)
    votes = {
        ref: log - math.log(stage.parts[ref].value)
        for ref, log in zip(topology.resistor_refs, logs, strict=True)
    }
    if len(votes) > 1:
        return float(np.median([*votes.values(), marked_c]))
    (ref, vote), *_ = votes.items()
    wider = part_u_rel(stage.parts["C"]) >= part_u_rel(stage.parts[ref])
    return vote if wider else marked_c
