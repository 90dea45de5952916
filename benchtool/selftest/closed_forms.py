"""Closed forms held against numerical integration, for every topology."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from types import MappingProxyType

from benchtool.circuits import TOPOLOGIES, Circuit, predict
from benchtool.selftest.checks import SelfCheck
from benchtool.selftest.integration import integrate_times

LIMIT_REL = 1e-8
"""Greatest relative difference: the integrator's own error lies near 1e-12."""

_SUPPLY_V = 12.0
_LOADED = Circuit(
    topology="astable",
    RA=100e3,
    RB=330e3,
    R=220e3,
    C=47e-9,
    supply=_SUPPLY_V,
    v_upper=_SUPPLY_V * 2 / 3,
    v_lower=_SUPPLY_V / 3,
    v_sat=0.037,
    r_on=9.5,
    i_discharge_leak=20e-9,
    i_bias=15e-9,
    i_leak=10e-9,
    delay_upper=20e-6,
    delay_lower=30e-6,
    output_high_drop=0.4,
    output_high_resistance=150.0,
    output_low=0.1,
    output_low_resistance=90.0,
    diode_drop=0.55,
    probe_r=10e6,
    probe_c=12e-12,
    shunt_ohm=22e6,
    leak_ohm=33e6,
    leak_to_v=_SUPPLY_V,
)
"""A circuit with every term other than zero; the delays are exaggerated so that they count."""


def _variants(name: str) -> Iterator[tuple[str, Circuit]]:
    """Yield what of a topology is tried: all its loads, and a capacitor with series resistance."""
    loaded = replace(_LOADED, topology=TOPOLOGIES[name].name)
    yield "loaded", loaded
    yield "series resistance", replace(loaded, probe_c=0.0, esr=4.7e3)
    if name == "astable-diode":
        yield "series diode", replace(loaded, series_diode_drop=0.5)
        yield "diode off before the threshold", replace(loaded, RA=330e3, RB=47e3)


def check_closed_forms(
    variants: Mapping[str, tuple[tuple[str, Circuit], ...]] | None = None,
) -> tuple[SelfCheck, ...]:
    """Hold the closed forms of every topology against the integrated node equation.

    Args:
        variants: Name of a line to the variants that it covers; None for ours.

    Returns:
        One line for each topology, with the worst relative difference over its times.
    """
    chosen = VARIANTS if variants is None else variants
    return tuple(_check(name, chosen[name]) for name in chosen)


VARIANTS: Mapping[str, tuple[tuple[str, Circuit], ...]] = MappingProxyType(
    {name: tuple(_variants(name)) for name in TOPOLOGIES}
)


def _check(name: str, variants: tuple[tuple[str, Circuit], ...]) -> SelfCheck:
    differences = [
        (abs(_difference(circuit, quantity, value)), quantity, label)
        for label, circuit in variants
        for quantity, value in integrate_times(circuit).items()
    ]
    worst, quantity, label = max(differences)
    return SelfCheck(
        name=f"closed form: {name}",
        found=worst,
        limit=LIMIT_REL,
        ok=worst <= LIMIT_REL,
        text=f"{len(differences)} times against the integrated node equation; the worst, "
        f"{quantity} ({label}), differs by {worst:.1e} of itself",
    )


def _difference(circuit: Circuit, quantity: str, integrated: float) -> float:
    predicted = getattr(predict(circuit), quantity)
    return float(predicted) / integrated - 1
