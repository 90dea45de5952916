"""Under what conditions a board is seen: what each capture changes, as data."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import replace
from types import MappingProxyType

import numpy as np

from benchtool.circuits.circuit import Circuit, Value, with_fields
from benchtool.diagnose.scatter import Axis, Deviations, healthy_circuit
from benchtool.frozen import frozen_record
from benchtool.model.design import Design, Stage
from benchtool.model.diagnosis import Observation

Change = Callable[[Circuit, Deviations], Circuit]

_DOUBLING_K = 10.0  # a leak doubles with about every 10 K: common practice
_U_DOUBLING = 0.3  # of the logarithm of that growth: assumed
_U_TEMPCO_PER_K = 3e-4  # of a part whose coefficient is not stated: assumed
_HEATING = "heating"


def _unchanged(circuit: Circuit, _: Deviations) -> Circuit:
    return circuit


@frozen_record(eq=False)
class Condition:
    """How the board was while it was seen.

    Attributes:
        name: Of the condition; ``main`` is the board as it is.
        change: What is done to the board, faults and all.
        supply_v: Supply, volts; None as the design says.
        axes: What its own means add to the uncertainty.
        is_faulty: Whether the fault was there.
        is_own_board: Whether it is the same board; another one scatters on its own.
    """

    name: str = "main"
    change: Change = _unchanged
    supply_v: float | None = None
    axes: tuple[Axis, ...] = ()
    is_faulty: bool = True
    is_own_board: bool = True


MAIN = Condition()
"""The board as it is."""


def condition_of(observation: Observation, number: int) -> Condition:
    """Return the condition of a capture.

    Args:
        observation: The capture.
        number: Tells it from others of the same role.
    """
    build = _CONDITIONS.get(observation.role)
    return MAIN if build is None else build(observation, f"{observation.role} {number}")


def shunt_condition(name: str, ohm: float, u_ohm: float) -> Condition:
    """Return the board with a known resistor across its capacitor."""
    axis = Axis(name=name, centre=0.0, u=max(u_ohm, 1e-6 * ohm) / ohm)

    def change(circuit: Circuit, deviations: Deviations) -> Circuit:
        added = ohm * np.exp(deviations.named(name))
        return with_fields(circuit, {"shunt_ohm": 1 / (1 / circuit.shunt_ohm + 1 / added)})

    return Condition(name=name, change=change, axes=(axis,))


def capacitor_condition(name: str, farad: float, u_farad: float) -> Condition:
    """Return the board with a known capacitor beside its own."""
    axis = Axis(name=name, centre=0.0, u=max(u_farad, 1e-6 * farad) / farad)

    def change(circuit: Circuit, deviations: Deviations) -> Circuit:
        return with_fields(circuit, {"C": circuit.C + farad * np.exp(deviations.named(name))})

    return Condition(name=name, change=change, axes=(axis,))


def supply_condition(name: str, volt: float, u_volt: float) -> Condition:
    """Return the board at another supply."""
    axis = Axis(name=name, centre=volt, u=max(u_volt, 1e-6 * volt))
    return Condition(name=name, supply_v=volt, axes=(axis,))


def _shunt(item: Observation, name: str) -> Condition:
    return shunt_condition(name, _value(item), item.u)


def _capacitor(item: Observation, name: str) -> Condition:
    return capacitor_condition(name, _value(item), item.u)


def _supply(item: Observation, name: str) -> Condition:
    return supply_condition(name, _value(item), item.u)


def lifted_condition(name: str) -> Condition:
    """Return the board with no probe at its capacitor."""

    def change(circuit: Circuit, _: Deviations) -> Circuit:
        return with_fields(circuit, {"probe_r": math.inf, "probe_c": 0.0})

    return Condition(name=name, change=change)


def _probe_lifted(_: Observation, name: str) -> Condition:
    return lifted_condition(name)


def _baseline(item: Observation, name: str) -> Condition:
    return Condition(name=name, is_faulty=False, is_own_board=item.same_board)


def _heated(item: Observation, name: str) -> Condition:
    rise_k = _value(item) - 25.0
    part = item.part or "C"
    growth = Axis(name=f"{name} {_HEATING}", centre=0.0, u=_U_DOUBLING)
    tempco = Axis(name=name, centre=0.0, u=max(_U_TEMPCO_PER_K * abs(rise_k), 1e-6))

    def change(circuit: Circuit, deviations: Deviations) -> Circuit:
        grown = 2.0 ** (rise_k / _DOUBLING_K * np.exp(deviations.named(growth.name)))
        if part == "IC":
            return with_fields(circuit, {"i_discharge_leak": circuit.i_discharge_leak * grown})
        moved: dict[str, Value] = {part: getattr(circuit, part) * np.exp(deviations.named(name))}
        if part == "C":
            moved["shunt_ohm"] = circuit.shunt_ohm / grown
            moved["i_leak"] = circuit.i_leak * grown
        return with_fields(circuit, moved)

    return Condition(name=name, change=change, axes=(growth, tempco))


def _value(item: Observation) -> float:
    if item.value is None:
        raise ValueError(f"the capture {item.role} needs its value")
    return item.value


_CONDITIONS: Mapping[str, Callable[[Observation, str], Condition]] = MappingProxyType(
    {
        "shunt": _shunt,
        "added-capacitor": _capacitor,
        "supply": _supply,
        "probe-lifted": _probe_lifted,
        "baseline": _baseline,
        "heated": _heated,
    }
)


def own_axes(condition: Condition, board: tuple[Axis, ...]) -> tuple[Axis, ...]:
    """Return what a condition adds to the board's axes: its means, and another board's scatter."""
    if condition.is_own_board:
        return condition.axes
    other = tuple(replace(axis, name=f"{axis.name}@{condition.name}") for axis in board)
    return (*condition.axes, *other)


def board_under(
    condition: Condition,
    stage: Stage,
    design: Design,
    board: tuple[Axis, ...],
    deviations: Deviations,
) -> Circuit:
    """Return the healthy board before the condition's change, at every deviation.

    Args:
        condition: Under which it is seen.
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        board: Axes of the board.
        deviations: All axes, those of conditions too.
    """
    axes = board
    if not condition.is_own_board:
        axes = tuple(axis for axis in deviations.axes if axis.name.endswith(f"@{condition.name}"))
    overrides: dict[str, Value] = {}
    if condition.supply_v is not None:
        overrides["supply"] = condition.supply_v + deviations.named(condition.name)
    return healthy_circuit(stage, design, axes, deviations, overrides)
