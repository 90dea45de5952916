"""The probe's own load, taken off the figures of a node."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.node import NodeFit, SlopeFit
from benchtool.model.quantity import Measured
from benchtool.uncertainty import propagate


@frozen_record
class Load:
    """A probe on the node, and what tells how much it matters; one of the last three will do.

    Attributes:
        ohm: Its resistance to 0 V.
        farad: Its capacitance.
        charge_ohm: Resistance through which the node charges, without the probe.
        discharge_ohm: The same for the discharge.
        supply: Voltage to which the node would charge without the probe.
    """

    ohm: Measured
    farad: Measured
    charge_ohm: Measured | None = None
    discharge_ohm: Measured | None = None
    supply: Measured | None = None


Inputs = dict[str, float]


def remove_probe(fit: NodeFit, load: Load) -> NodeFit:
    """Return the figures of a node as they would be without the probe.

    Args:
        fit: The node as it was recorded.
        load: The probe.

    Returns:
        The same with asymptotes and time constants freed of it; thresholds do not change.

    Raises:
        UsageError: Where nothing tells the resistance that the probe loads.

    References:
        With R the drive's resistance and x = R/Rp: V = V'(1 + x), R·C = tau'(1 + x) - R·Cp
        (superposition at the node). Where R of one state is known the other's follows from
        tau_d'/tau_c' = [x_d/(1 + x_d)]/[x_c/(1 + x_c)]; where the unloaded V is, x_c = V/V' - 1.
    """
    known = _known(fit, load)
    _refuse_nothing(fit, load)
    return replace(
        fit,
        charge=fit.charge and _freed(fit.charge, known, "charge"),
        discharge=fit.discharge and _freed(fit.discharge, known, "discharge"),
    )


def _known(fit: NodeFit, load: Load) -> dict[str, Measured]:
    named: dict[str, Measured | None] = {
        "probe_ohm": load.ohm,
        "probe_f": load.farad,
        "charge_ohm": load.charge_ohm,
        "discharge_ohm": load.discharge_ohm,
        "supply": load.supply,
        "charge_end": fit.charge.end if fit.charge else None,
        "charge_tau": fit.charge.tau if fit.charge else None,
        "discharge_end": fit.discharge.end if fit.discharge else None,
        "discharge_tau": fit.discharge.tau if fit.discharge else None,
    }
    return {name: item for name, item in named.items() if item is not None}


def _refuse_nothing(fit: NodeFit, load: Load) -> None:
    both = fit.charge is not None and fit.discharge is not None
    charge = load.charge_ohm or (load.supply if fit.charge else None)
    for slope, own, other in (
        (fit.charge, charge, load.discharge_ohm),
        (fit.discharge, load.discharge_ohm, charge),
    ):
        if slope is not None and own is None and (other is None or not both):
            raise UsageError(
                "the load of a probe depends on the resistance that it loads, and none was given",
                hint="Give the design (RA and RB as marked will do), or the supply.",
            )


def _share(inputs: Inputs, kind: str) -> float:
    """Return R over the probe's resistance."""
    own, other = f"{kind}_ohm", "charge" if kind == "discharge" else "discharge"
    if own in inputs:
        return inputs[own] / inputs["probe_ohm"]
    if kind == "charge" and "supply" in inputs:
        return inputs["supply"] / inputs["charge_end"] - 1
    x = _share(inputs, other)
    loaded = inputs[f"{kind}_tau"] / inputs[f"{other}_tau"] * x / (1 + x)
    return loaded / (1 - loaded)


def _freed(slope: SlopeFit, known: dict[str, Measured], kind: str) -> SlopeFit:
    def end(inputs: Inputs) -> float:
        return inputs[f"{kind}_end"] * (1 + _share(inputs, kind))

    def tau(inputs: Inputs) -> float:
        x = _share(inputs, kind)
        pile_s = x * inputs["probe_ohm"] * inputs["probe_f"]
        return inputs[f"{kind}_tau"] * (1 + x) - pile_s

    return replace(slope, end=_computed(end, known, "V"), tau=_computed(tau, known, "s"))


def _computed(figure: Callable[[Inputs], float], known: dict[str, Measured], unit: str) -> Measured:
    inputs = {name: item.value for name, item in known.items()}
    value = figure(inputs)
    factors: list[tuple[float, Measured]] = []
    for name, item in known.items():
        small = max(item.u, 1e-6 * abs(item.value)) or 1e-9
        ahead, behind = (figure({**inputs, name: item.value + s}) for s in (small, -small))
        factor = (ahead - behind) / (2 * small)
        if factor and math.isfinite(factor):
            factors.append((factor, item))
    return propagate(value, unit, factors)
