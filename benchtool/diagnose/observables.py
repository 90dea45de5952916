"""What can be seen of a board: each figure as a function of the circuit, as data.

Times, resistances and voltages that are never near zero are seen as logarithms, so that a relative
uncertainty is a plain one; the others as shares of the supply.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import cached_property
from types import MappingProxyType

import numpy as np

from benchtool.circuits import Prediction, States, predict, settle_states
from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.families import FAMILIES
from benchtool.circuits.topologies import find_topology
from benchtool.diagnose.conditions import MAIN, Condition
from benchtool.frozen import frozen_record

U_MODEL = 1e-4
"""Share of a time to which the model itself is trusted: its linearised scatter, assumed."""


class View:
    """One circuit, or many, with what is computed of it at most once."""

    def __init__(self, circuit: Circuit, design_supply_v: float) -> None:
        self.circuit = circuit
        self.design_supply_v = design_supply_v

    @cached_property
    def times(self) -> Prediction:
        """Its times."""
        return predict(self.circuit)

    @cached_property
    def states(self) -> States:
        """Its node in both states."""
        return settle_states(self.circuit)


Sight = Callable[[View], Value]


@frozen_record
class Sort:
    """A sort of observable.

    Attributes:
        see: What is seen: a logarithm, or a share of the design's supply.
        is_log: Which of both.
        quantity: What it is, in words.
        unit: Unit of the figure itself.
    """

    see: Sight
    is_log: bool
    quantity: str
    unit: str

    def plain(self, seen: float, supply_v: float) -> float:
        """Return the figure itself."""
        return float(np.exp(seen)) if self.is_log else seen * supply_v


@frozen_record(eq=False)
class Observable:
    """One figure seen under one condition.

    Attributes:
        name: Of the figure, as in ``SORTS``.
        condition: Under which it is seen.
        seen: What was seen, transformed as its sort says; NaN where it is only proposed.
        u: Its standard uncertainty, likewise.
    """

    name: str
    condition: Condition = MAIN
    seen: float = float("nan")
    u: float = 0.0

    @property
    def sort(self) -> Sort:
        """Its sort."""
        return SORTS[self.name]


def _time(name: str) -> Sight:
    def see(view: View) -> Value:
        value = getattr(view.times, name)
        return np.nan if value is None else _log(value)

    return see


def _field(name: str) -> Sight:
    return lambda view: _log(getattr(view.circuit, name))


def _log(value: Value) -> Value:
    with np.errstate(all="ignore"):
        logs: Value = np.log(value)
    return logs


def _discharge_pin(view: View) -> Value:
    """Return the closed switch under its pull-up and the middle of the capacitor's current."""
    circuit = view.circuit
    parts = find_topology(circuit.topology).parts
    pull_up = circuit.RA if "RA" in parts else circuit.R
    current = circuit.supply / pull_up
    if "RB" in parts:
        current = current + (circuit.v_upper + circuit.v_lower) / 2 / circuit.RB
    series = 1 / pull_up + (1 / circuit.RB if "RB" in parts else 0.0)
    level = (current * circuit.r_on + circuit.v_sat) / (1 + series * circuit.r_on)
    return level / view.design_supply_v


def _rise(view: View, field: str) -> Value:
    """Return a figure of the rise: of its first stretch where that reaches the upper threshold."""
    first, last = view.states.charge[0], view.states.charge[-1]
    if first is last or first.until_v is None:
        return _log(getattr(last, field))
    reaches = np.greater_equal(first.until_v, view.circuit.v_upper)
    return _log(np.where(reaches, getattr(first, field), getattr(last, field)))


def _charge_end(view: View) -> Value:
    return _rise(view, "v")


def _discharge_end(view: View) -> Value:
    discharge = view.states.discharge
    return np.nan if discharge is None else discharge.v / view.design_supply_v


def _charge_tau(view: View) -> Value:
    return _rise(view, "tau")


def _discharge_tau(view: View) -> Value:
    discharge = view.states.discharge
    return np.nan if discharge is None else _log(discharge.tau)


def _output_high(view: View) -> Value:
    """Return the high output; where it drives no timing part its drop is the family's."""
    circuit = view.circuit
    drop = circuit.output_high_drop
    if circuit.family is not None and not is_driving(circuit.topology):
        drop = FAMILIES[circuit.family].terms["output_high_drop"].at(circuit.supply)
    return (circuit.supply - drop) / view.design_supply_v


def is_driving(topology: str) -> bool:
    """Return whether the output charges the capacitor in a topology."""
    return "output_high_drop" in find_topology(topology).ic_terms


def _output_low(view: View) -> Value:
    return view.circuit.output_low / view.design_supply_v


def _sort(see: Sight, quantity: str, unit: str, *, is_log: bool = True) -> Sort:
    return Sort(see=see, is_log=is_log, quantity=quantity, unit=unit)


SORTS: Mapping[str, Sort] = MappingProxyType(
    {
        "t_high": _sort(_time("t_high"), "the high time", "s"),
        "t_low": _sort(_time("t_low"), "the low time", "s"),
        "period": _sort(_time("period"), "the period", "s"),
        "first_high": _sort(_time("first_high"), "the first high time", "s"),
        "delay": _sort(_time("delay"), "the delay", "s"),
        "control-pin": _sort(_field("v_control"), "the control pin", "V"),
        "supply": _sort(_field("supply"), "the supply", "V"),
        "discharge-pin": _sort(_discharge_pin, "the discharge pin", "V", is_log=False),
        "output-high": _sort(_output_high, "the output's high level", "V", is_log=False),
        "output-low": _sort(_output_low, "the output's low level", "V", is_log=False),
        "node-upper": _sort(_field("v_upper"), "the node's upper turning point", "V"),
        "node-lower": _sort(_field("v_lower"), "the node's lower turning point", "V"),
        "node-charge-end": _sort(_charge_end, "where the rise would end", "V"),
        "node-discharge-end": _sort(_discharge_end, "where the fall would end", "V", is_log=False),
        "node-tau-charge": _sort(_charge_tau, "the time constant of the rise", "s"),
        "node-tau-discharge": _sort(_discharge_tau, "the time constant of the fall", "s"),
        "RA": _sort(_field("RA"), "RA", "ohm"),
        "RB": _sort(_field("RB"), "RB", "ohm"),
        "R": _sort(_field("R"), "R", "ohm"),
        "C": _sort(_field("C"), "C", "F"),
    }
)
"""Everything that can be seen of a board that runs."""
