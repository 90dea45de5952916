"""A circuit of which only topology, IC and perhaps supply and one part are known."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace

from benchtool.circuits.families import TERM_UNITS
from benchtool.circuits.topologies import Topology
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.design import Band, Design, Ic, Part, Stage
from benchtool.model.quantity import Notice

DIODE_DROP_V = 0.5
"""Drop of a steering diode at an unknown current: that of some 0.1 mA, from memory."""

_UNKNOWN_SUPPLY_V = 5.0  # where the families' starting values are given; shares do not feel it
_PLACEHOLDER = {"RA": 100e3, "RB": 100e3, "R": 100e3, "C": 1e-6}


@frozen_record
class Bare:
    """A stage made for solving, whose part values mean nothing, and what was assumed for it."""

    stage: Stage
    design: Design
    warnings: tuple[Notice, ...]


def bare_circuit(
    topology: Topology, ic: Ic | None, supply_v: float | None, known: Mapping[str, float]
) -> Bare:
    """Return a stage and design that hold no more than is known.

    Args:
        topology: The topology.
        ic: The IC; None takes the CMOS family.
        supply_v: Supply in volts, None where unknown.
        known: Known parts; without one the terms that need ohms are left out.

    Raises:
        UsageError: If the topology cannot be solved from so little.
    """
    stated = ic or Ic(family="cmos")
    _refuse_too_little(topology, stated, supply_v)
    volts = _UNKNOWN_SUPPLY_V if supply_v is None else supply_v
    stage = Stage(
        name="",
        topology=topology.name,
        parts={ref: Part(ref=ref, value=_PLACEHOLDER[ref]) for ref in topology.parts},
        ic=_reduced(stated, left_out_units(supply_v, known)),
        diode_drop_v=DIODE_DROP_V if _needs_diode(topology, known) else None,
    )
    design = Design(name="", supply=Band(nominal=volts, lower=volts, upper=volts), stages=(stage,))
    return Bare(stage=stage, design=design, warnings=tuple(_assumed(topology, ic, supply_v, known)))


def _needs_diode(topology: Topology, known: Mapping[str, float]) -> bool:
    return topology.name == "astable-diode" and not known


def _refuse_too_little(topology: Topology, ic: Ic, supply_v: float | None) -> None:
    if topology.thresholds_stated and (ic.upper_threshold is None or ic.lower_threshold is None):
        raise UsageError(
            f"a circuit of topology {topology.name} cannot be solved without its thresholds",
            hint="Give a design file that states ic.upper_threshold and ic.lower_threshold.",
        )
    if supply_v is not None:
        return
    in_volts = any(
        item is not None and not item.of_supply for item in (ic.upper_threshold, ic.lower_threshold)
    )
    if in_volts or topology.name == "astable-diode":
        raise UsageError(
            f"a circuit of topology {topology.name} with levels in volts needs its supply",
            hint="Give the supply voltage.",
        )


def left_out_units(supply_v: float | None, known: Mapping[str, float]) -> set[str]:
    """Return the units of the IC's terms that cannot be taken into account."""
    units = set() if known else {"ohm", "A"}
    return units if supply_v is not None else units | {"A", "V"}


def _reduced(ic: Ic, units: set[str]) -> Ic:
    zero = {name: 0.0 for name, unit in TERM_UNITS.items() if unit in units}
    return replace(ic, terms={**ic.terms, **zero})


def _assumed(
    topology: Topology, ic: Ic | None, supply_v: float | None, known: Mapping[str, float]
) -> Iterator[Notice]:
    if ic is None:
        yield Notice(
            code="assumed-family", text="the IC family was not given: a CMOS timer was assumed"
        )
    if supply_v is None:
        yield Notice(
            code="assumed-supply",
            text="the supply is not known: only thresholds as shares of it were used, saturation "
            "voltages and output drops were left out",
        )
    if not known:
        yield Notice(
            code="assumed-ideal-resistances",
            text="no part value is known: on-resistances, bias and leakage currents were left out",
        )
    if _needs_diode(topology, known):
        yield Notice(
            code="assumed-diode-drop",
            text=f"the current of the steering diode is not known: {DIODE_DROP_V} V were assumed",
        )
