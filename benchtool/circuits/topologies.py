"""The topologies as data: which parts, what drives the node, what the products mean.

A new topology is a new entry of ``TOPOLOGIES``, or an entry point of another package in the
group ``benchtool.topologies`` that leads to a ``Topology``.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Literal

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.node import Drive
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.design import TopologyName
from benchtool.plugins import Registry

Charging = Callable[[Circuit], tuple[Drive, ...]]
Discharging = Callable[[Circuit], Drive]
Amount = Callable[[Circuit], Value]

_DISCHARGE_TERMS = ("discharge_saturation", "discharge_resistance", "discharge_leakage")
_OUTPUT_TERMS = (
    "output_high_drop",
    "output_high_resistance",
    "output_low",
    "output_low_resistance",
)
_DELAYS = ("delay_upper", "delay_lower")


@frozen_record
class Topology:
    """One way to time with a resistor and a capacitor.

    Attributes:
        name: As in the design file.
        title: What it is, a few words.
        parts: References of the parts it needs.
        charge: Drives of the charging node, in the order in which they take over.
        discharge: Drive of the discharging node; None for a single run.
        start: Node voltage from which a single run or the first high begins, volts.
        sunk: Current drawn from the node besides the drive while it charges, amperes.
        resistors: What the products multiply C with: charge and discharge side.
        products: What tau_charge and tau_discharge stand for.
        run: Quantity that a single run gives; None for an oscillator.
        ic_terms: Terms of the IC that act in it.
        forced_by_control: Whether the control pin sets the thresholds.
        thresholds_stated: Whether the design must state its thresholds.
        limits_of: Why some times are impossible, one sentence.
    """

    name: TopologyName
    title: str
    parts: tuple[str, ...]
    charge: Charging
    discharge: Discharging | None
    start: Amount
    sunk: Amount
    resistors: tuple[tuple[str, ...], tuple[str, ...]]
    products: tuple[str, str]
    run: Literal["t_high", "delay"] | None
    ic_terms: tuple[str, ...]
    forced_by_control: bool
    thresholds_stated: bool
    limits_of: str

    @property
    def has_two_products(self) -> bool:
        """Whether high and low time stand for different products."""
        return self.resistors[0] != self.resistors[1]

    @property
    def resistor_refs(self) -> tuple[str, ...]:
        """References of its resistors."""
        return tuple(ref for ref in self.parts if ref != "C")


def _nothing(_: Circuit) -> Value:
    return 0.0


def _node_current(circuit: Circuit) -> Value:
    return circuit.i_bias + circuit.i_leak


def _node_and_switch_current(circuit: Circuit) -> Value:
    return circuit.i_bias + circuit.i_leak + circuit.i_discharge_leak


def discharge_level(circuit: Circuit, pull_up: Value) -> Value:
    """Return the open-circuit voltage of the closed switch under its pull-up, volts."""
    saturation = circuit.v_sat * pull_up
    return (circuit.supply * circuit.r_on + saturation) / (pull_up + circuit.r_on)


def _astable_charge(circuit: Circuit) -> tuple[Drive, ...]:
    voc = circuit.supply - circuit.i_discharge_leak * circuit.RA
    return (Drive(voc=voc, rs=circuit.RA + circuit.RB),)


def _astable_discharge(circuit: Circuit) -> Drive:
    switch = circuit.RA * circuit.r_on / (circuit.RA + circuit.r_on)
    return Drive(voc=discharge_level(circuit, circuit.RA), rs=circuit.RB + switch)


def _diode_charge(circuit: Circuit) -> tuple[Drive, ...]:
    """RA and the diode alone, then RA and RB once the drop across RB is below the diode's."""
    source = circuit.supply - circuit.i_discharge_leak * circuit.RA
    voc = source - circuit.diode_drop
    if circuit.series_diode_drop is not None:
        return (Drive(voc=voc, rs=circuit.RA),)
    handover = voc - circuit.diode_drop * circuit.RA / circuit.RB
    return Drive(voc=voc, rs=circuit.RA, until_v=handover), *_astable_charge(circuit)


def _diode_discharge(circuit: Circuit) -> Drive:
    plain = _astable_discharge(circuit)
    if circuit.series_diode_drop is None:
        return plain
    return Drive(voc=plain.voc + circuit.series_diode_drop, rs=plain.rs)


def _output_charge(circuit: Circuit) -> tuple[Drive, ...]:
    high = circuit.supply - circuit.output_high_drop
    return (Drive(voc=high, rs=circuit.R + circuit.output_high_resistance),)


def _output_discharge(circuit: Circuit) -> Drive:
    return Drive(voc=circuit.output_low, rs=circuit.R + circuit.output_low_resistance)


def _supply_charge(circuit: Circuit) -> tuple[Drive, ...]:
    return (Drive(voc=circuit.supply, rs=circuit.R),)


def _switch_level(circuit: Circuit) -> Value:
    return discharge_level(circuit, circuit.R)


ASTABLE = Topology(
    name="astable",
    title="timer as an oscillator, charged through RA and RB, discharged through RB",
    parts=("RA", "RB", "C"),
    charge=_astable_charge,
    discharge=_astable_discharge,
    start=_nothing,
    sunk=_node_current,
    resistors=(("RA", "RB"), ("RB",)),
    products=("(RA+RB)·C", "RB·C"),
    run=None,
    ic_terms=(*_DISCHARGE_TERMS, "bias_current", *_DELAYS),
    forced_by_control=True,
    thresholds_stated=False,
    limits_of="An astable charges through RA and RB and discharges through RB alone, so at the "
    "usual thresholds its high time is longer than its low time.",
)
ASTABLE_DIODE = Topology(
    name="astable-diode",
    title="timer as an oscillator with a steering diode across RB",
    parts=("RA", "RB", "C"),
    charge=_diode_charge,
    discharge=_diode_discharge,
    start=_nothing,
    sunk=_node_current,
    resistors=(("RA",), ("RB",)),
    products=("RA·C", "RB·C"),
    run=None,
    ic_terms=(*_DISCHARGE_TERMS, "bias_current", *_DELAYS),
    forced_by_control=True,
    thresholds_stated=False,
    limits_of="Both times must be longer than the delays of the IC, and the diode must let the "
    "node reach the upper threshold.",
)
OUTPUT_FED = Topology(
    name="output-fed",
    title="timer as an oscillator, one resistor from its output to the node",
    parts=("R", "C"),
    charge=_output_charge,
    discharge=_output_discharge,
    start=_nothing,
    sunk=_node_current,
    resistors=(("R",), ("R",)),
    products=("R·C", "R·C"),
    run=None,
    ic_terms=("bias_current", *_DELAYS, *_OUTPUT_TERMS),
    forced_by_control=True,
    thresholds_stated=False,
    limits_of="Both times must be longer than the delays of the IC.",
)
ONE_SHOT = Topology(
    name="one-shot",
    title="timer as a one-shot",
    parts=("R", "C"),
    charge=_supply_charge,
    discharge=None,
    start=_switch_level,
    sunk=_node_and_switch_current,
    resistors=(("R",), ("R",)),
    products=("R·C", "R·C"),
    run="t_high",
    ic_terms=(*_DISCHARGE_TERMS, "bias_current", "delay_upper"),
    forced_by_control=True,
    thresholds_stated=False,
    limits_of="The pulse must be longer than the delay of the IC.",
)
SCHMITT = Topology(
    name="schmitt",
    title="Schmitt inverter as an oscillator",
    parts=("R", "C"),
    charge=_output_charge,
    discharge=_output_discharge,
    start=_nothing,
    sunk=_node_current,
    resistors=(("R",), ("R",)),
    products=("R·C", "R·C"),
    run=None,
    ic_terms=("bias_current", *_DELAYS, *_OUTPUT_TERMS),
    forced_by_control=False,
    thresholds_stated=True,
    limits_of="Both times must be longer than the delays of the inverter.",
)
POWER_ON = Topology(
    name="power-on",
    title="delay after power-up",
    parts=("R", "C"),
    charge=_supply_charge,
    discharge=None,
    start=_nothing,
    sunk=_node_current,
    resistors=(("R",), ("R",)),
    products=("R·C", "R·C"),
    run="delay",
    ic_terms=("bias_current", "delay_upper"),
    forced_by_control=False,
    thresholds_stated=False,
    limits_of="The delay must be longer than that of the IC.",
)

TOPOLOGIES: Mapping[str, Topology] = MappingProxyType(
    {
        entry.name: entry
        for entry in (ASTABLE, ASTABLE_DIODE, OUTPUT_FED, ONE_SHOT, SCHMITT, POWER_ON)
    }
)
_OUTSIDERS = Registry(group="benchtool.topologies", ours={})


def find_topology(name: str) -> Topology:
    """Return the topology called ``name``.

    Raises:
        UsageError: If there is none.
        TypeError: If another package registered something that is no ``Topology``.
    """
    if name in TOPOLOGIES:
        return TOPOLOGIES[name]
    try:
        found = _OUTSIDERS.load(name)
    except UsageError as error:
        known = ", ".join(TOPOLOGIES)
        raise UsageError(
            f"there is no topology called {name!r}", hint=f"Known: {known}."
        ) from error
    if not isinstance(found, Topology):
        raise TypeError(f"the entry point {name!r} leads to no Topology")
    return found
