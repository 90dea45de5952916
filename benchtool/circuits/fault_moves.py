"""The ways in which a fault moves the figures of a circuit."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from benchtool.circuits.circuit import Circuit, Value, with_fields
from benchtool.circuits.families import FAMILIES
from benchtool.circuits.topologies import find_topology
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record

PROBE_OHM_FARAD = 1e6 * 100e-12
"""Probe resistance times capacitance: 1 Mohm with 100 pF, 10 Mohm with 10 pF (common practice)."""

_TERM_FIELDS = {
    "discharge_saturation": "v_sat",
    "discharge_resistance": "r_on",
    "discharge_leakage": "i_discharge_leak",
    "bias_current": "i_bias",
}
_SAME_NAMES = (
    "delay_upper",
    "delay_lower",
    "output_high_drop",
    "output_high_resistance",
    "output_low",
    "output_low_resistance",
)


@frozen_record
class Move:
    """A change of a circuit by a size.

    Attributes:
        fields: Circuit fields that it moves, the first being the one whose value is estimated.
        act: Returns the moved circuit.
    """

    fields: tuple[str, ...]
    act: Callable[[Circuit, Value], Circuit]


def nothing() -> Move:
    """Leave the circuit as it is."""
    return Move(fields=(), act=lambda circuit, _: circuit)


def scale(*fields: str) -> Move:
    """Change the fields by the size as a relative change."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        return with_fields(circuit, {name: getattr(circuit, name) * (1 + size) for name in fields})

    return Move(fields=fields, act=act)


def add(*fields: str) -> Move:
    """Add the size to the fields."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        return with_fields(circuit, {name: getattr(circuit, name) + size for name in fields})

    return Move(fields=fields, act=act)


def put(field: str) -> Move:
    """Set the field to the size."""
    return Move(fields=(field,), act=lambda circuit, size: with_fields(circuit, {field: size}))


def parallel(field: str) -> Move:
    """Put a resistance of the size in parallel with the field's."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        return with_fields(circuit, {field: 1 / (1 / getattr(circuit, field) + 1 / size)})

    return Move(fields=(field,), act=act)


def leak_to_supply() -> Move:
    """Add a leak of the size from the node to the supply, joined with any leak there is."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        present, added = 1 / circuit.leak_ohm, 1 / size
        total = present + added
        rail_v = (circuit.leak_to_v * present + circuit.supply * added) / total
        return with_fields(circuit, {"leak_ohm": 1 / total, "leak_to_v": rail_v})

    return Move(fields=("leak_ohm", "leak_to_v"), act=act)


def probe() -> Move:
    """Hang a probe of the size in ohms, with its usual capacitance, on the node."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        loaded = parallel("probe_r").act(circuit, size)
        return with_fields(loaded, {"probe_c": circuit.probe_c + PROBE_OHM_FARAD / size})

    return Move(fields=("probe_r", "probe_c"), act=act)


def open_diode() -> Move:
    """Let the steering diode conduct no more: its drop takes the whole supply."""
    return Move(
        fields=("diode_drop",),
        act=lambda circuit, _: with_fields(circuit, {"diode_drop": circuit.supply}),
    )


def short_diode() -> Move:
    """Bridge RB, and with it any diode in its branch, by a resistance of the size."""

    def act(circuit: Circuit, size: Value) -> Circuit:
        bridged = parallel("RB").act(circuit, size)
        drops: dict[str, Value] = {"diode_drop": 0.0}
        if circuit.series_diode_drop is not None:
            drops["series_diode_drop"] = 0.0
        return with_fields(bridged, drops)

    return Move(fields=("RB", "diode_drop", "series_diode_drop"), act=act)


def other_family() -> Move:
    """Put the starting values of the other IC family in place of this one's."""
    return Move(fields=("family", *_TERM_FIELDS.values(), *_SAME_NAMES), act=_swap_family)


def _swap_family(circuit: Circuit, _: Value) -> Circuit:
    others = [family for name, family in FAMILIES.items() if name != circuit.family]
    if circuit.family not in FAMILIES:
        raise UsageError(
            "the wrong IC family needs a right one to start from",
            hint="State the IC's family in the design: bipolar or cmos.",
        )
    names = find_topology(circuit.topology).ic_terms
    changes = {
        _TERM_FIELDS.get(name, name): others[0].terms[name].at(circuit.supply) for name in names
    }
    return replace(with_fields(circuit, changes), family=others[0].name)


def charge_ohm(circuit: Circuit) -> Value:
    """Return the resistance through which the node charges, ohms."""
    return find_topology(circuit.topology).charge(circuit)[-1].rs


def discharge_ohm(circuit: Circuit) -> Value:
    """Return the resistor through which the node discharges, ohms."""
    return circuit.RB if "RB" in find_topology(circuit.topology).parts else circuit.R


def supply_v(circuit: Circuit) -> Value:
    """Return the supply, volts."""
    return circuit.supply


def pull_up_a(circuit: Circuit) -> Value:
    """Return the current of the supply through the resistor at the discharge pin, amperes."""
    pull_up = circuit.RA if "RA" in find_topology(circuit.topology).parts else circuit.R
    return circuit.supply / pull_up


def one(_: Circuit) -> Value:
    """Return 1, for sizes that are absolute or relative already."""
    return 1.0
