"""Which further readings a board allows, each as the figures that it would add."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping

from benchtool.circuits import find_topology
from benchtool.diagnose.conditions import (
    MAIN,
    Condition,
    capacitor_condition,
    lifted_condition,
    shunt_condition,
    supply_condition,
)
from benchtool.diagnose.costs import Cost
from benchtool.diagnose.layout import Layout
from benchtool.diagnose.observables import Observable
from benchtool.diagnose.shunts import Asymptote, choose_shunt
from benchtool.frozen import frozen_record
from benchtool.model.design import Stage
from benchtool.parts.series import nearest

_U_TAU_SHARE = 0.6  # a fitted time constant against a fitted level, relative: assumed
_LEAST_SUPPLY_V = {"bipolar": 4.5, "cmos": 3.0}
"""Supplies that every timer of a family bears: common practice; others are not moved."""
_LOWER, _HIGHER, _MOST_SUPPLY_V = 2 / 3, 1.25, 15.0
_USUAL_U = 5e-4


@frozen_record(eq=False)
class Candidate:
    """A reading that could be taken.

    Attributes:
        name: As in the table of costs.
        observables: What it would add.
        value: What to clip on or set, in ``unit``; None where nothing is chosen.
        unit: Unit of ``value``.
    """

    name: str
    observables: tuple[Observable, ...]
    value: float | None = None
    unit: str = ""


Build = Callable[["Case", Cost], Candidate | None]


@frozen_record(eq=False)
class Case:
    """What was seen so far, and how far the node would rise with a shunt.

    Attributes:
        layout: What was seen.
        asymptote: Least clearance of the node over its upper threshold, with a resistor across.
    """

    layout: Layout
    asymptote: Asymptote

    @property
    def stage(self) -> Stage:
        """The stage."""
        return self.layout.stage

    def has(self, *names: str) -> bool:
        """Return whether one of these figures was seen on the board as it is."""
        return any(
            item.name in names and item.condition.name == MAIN.name
            for item in self.layout.observables
        )

    def has_condition(self, prefix: str) -> bool:
        """Return whether a condition of this sort was met."""
        return any(item.name.startswith(f"{prefix} ") for item in self.layout.conditions)


def candidates(
    layout: Layout, asymptote: Asymptote, costs: Mapping[str, Cost]
) -> Iterator[Candidate]:
    """Yield the readings that were not taken and that the board allows.

    Args:
        layout: What was seen.
        asymptote: How far the node would rise with a shunt.
        costs: Only what is in this table is proposed.
    """
    case = Case(layout=layout, asymptote=asymptote)
    for name, build in _BUILDERS.items():
        if name in costs and (found := build(case, costs[name])) is not None:
            yield found


def _figure(name: str, cost: Cost) -> Candidate:
    return Candidate(name=name, observables=(Observable(name=name, u=cost.u_rel),))


def _control_pin(case: Case, cost: Cost) -> Candidate | None:
    topology = find_topology(case.stage.topology)
    if not topology.forced_by_control or case.has("control-pin"):
        return None
    return _figure("control-pin", cost)


def _supply(case: Case, cost: Cost) -> Candidate | None:
    spread = any(axis.name == "supply" for axis in case.layout.board)
    return _figure("supply", cost) if spread and not case.has("supply") else None


def _discharge_pin(case: Case, cost: Cost) -> Candidate | None:
    switched = "discharge_resistance" in find_topology(case.stage.topology).ic_terms
    if not switched or case.has("discharge-pin"):
        return None
    return _figure("discharge-pin", cost)


def _node(case: Case, cost: Cost) -> Candidate | None:
    names = ["node-upper", "node-charge-end", "node-tau-charge"]
    if find_topology(case.stage.topology).discharge is not None:
        names += ["node-lower", "node-discharge-end", "node-tau-discharge"]
    if case.has(*names):
        return None
    factors = {name: _U_TAU_SHARE if "tau" in name else 1.0 for name in names}
    return Candidate(
        name="node",
        observables=tuple(
            Observable(name=name, u=cost.u_rel * factor) for name, factor in factors.items()
        ),
    )


def _power_up(case: Case, cost: Cost) -> Candidate | None:
    oscillates = find_topology(case.stage.topology).run is None and case.stage.divide == 1
    if not oscillates or case.has("first_high"):
        return None
    return Candidate(name="power-up", observables=(Observable(name="first_high", u=cost.u_rel),))


def _times(case: Case, condition: Condition) -> tuple[Observable, ...]:
    """Return the same times again under another condition, as well measured."""
    topology = find_topology(case.stage.topology)
    names: tuple[str, ...] = (topology.run,) if topology.run else ("t_high", "t_low")
    if case.stage.divide > 1:
        names = ("period",)
    known = {item.name: item.u for item in case.layout.observables}
    return tuple(
        Observable(name=name, condition=condition, u=known.get(name, _USUAL_U)) for name in names
    )


def _shunt(case: Case, cost: Cost) -> Candidate | None:
    ohm = choose_shunt(case.stage, case.asymptote)
    if ohm is None or case.has_condition("shunt"):
        return None
    condition = shunt_condition("shunt proposed", ohm, cost.u_rel * ohm)
    return Candidate(name="shunt", observables=_times(case, condition), value=ohm, unit="ohm")


def _probe_lifted(case: Case, _: Cost) -> Candidate | None:
    if case.has_condition("probe-lifted"):
        return None
    condition = lifted_condition("probe-lifted proposed")
    return Candidate(name="probe-lifted", observables=_times(case, condition))


def _added_capacitor(case: Case, cost: Cost) -> Candidate | None:
    if case.has_condition("added-capacitor"):
        return None
    farad = nearest(case.stage.parts["C"].value, "E6")
    condition = capacitor_condition("added-capacitor proposed", farad, cost.u_rel * farad)
    return Candidate(
        name="added-capacitor", observables=_times(case, condition), value=farad, unit="F"
    )


def _second_supply(case: Case, cost: Cost) -> Candidate | None:
    least_v = _LEAST_SUPPLY_V.get(case.stage.ic.family or "", math.inf)
    usual_v = case.layout.design.supply.nominal
    volt = usual_v * _LOWER if usual_v * _LOWER >= least_v else usual_v * _HIGHER
    fixed = case.stage.control_v is not None or not case.stage.ic.family
    if fixed or volt > _MOST_SUPPLY_V or case.has_condition("supply"):
        return None
    volt = float(f"{volt:.2g}")
    condition = supply_condition("supply proposed", volt, cost.u_rel * volt)
    return Candidate(
        name="second-supply", observables=_times(case, condition), value=volt, unit="V"
    )


def _part(ref: str) -> Build:
    def build(case: Case, cost: Cost) -> Candidate | None:
        if ref not in case.stage.parts or case.has(ref):
            return None
        return _figure(ref, cost)

    return build


_BUILDERS: Mapping[str, Build] = {
    "control-pin": _control_pin,
    "supply": _supply,
    "discharge-pin": _discharge_pin,
    "node": _node,
    "power-up": _power_up,
    "shunt": _shunt,
    "probe-lifted": _probe_lifted,
    "added-capacitor": _added_capacitor,
    "second-supply": _second_supply,
    **{ref: _part(ref) for ref in ("RA", "RB", "R", "C")},
}
