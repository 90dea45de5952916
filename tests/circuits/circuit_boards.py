"""Boards for the tests of the circuit model: the invented misting controller and its relatives."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchtool.circuits import Prediction
from benchtool.model.design import Band, Design, Ic, Part, Probe, Stage, Threshold, TopologyName
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Timing

MISTING = {"RA": 100e3, "RB": 330e3, "C": 47e-6}
TOLERANCES = {"RA": 0.01, "RB": 0.01, "R": 0.01, "C": 0.10}
SCHMITT_IC = Ic(
    family=None,
    terms={"u_threshold": 0.01},
    upper_threshold=Threshold(value=0.58),
    lower_threshold=Threshold(value=0.36),
)


def make_part(ref: str, value: float, **extra: Any) -> Part:
    tolerance = TOLERANCES[ref]
    return Part(ref=ref, value=value, lower_rel=-tolerance, upper_rel=tolerance, **extra)


def make_stage(
    topology: TopologyName = "astable",
    values: Mapping[str, float] = MISTING,
    family: str | None = "cmos",
    leakage_a: float = 0.0,
    **extra: Any,
) -> Stage:
    parts = {ref: make_part(ref, value) for ref, value in values.items()}
    parts["C"] = make_part("C", values["C"], leakage_a=leakage_a)
    ic = SCHMITT_IC if topology == "schmitt" else Ic(family=family)
    return Stage(**{"name": "spacing", "topology": topology, "parts": parts, "ic": ic, **extra})


def make_design(
    stage: Stage, supply_v: float = 12.0, supply_rel: float = 0.05, probe: Probe | None = None
) -> Design:
    supply = Band(
        nominal=supply_v, lower=supply_v * (1 - supply_rel), upper=supply_v * (1 + supply_rel)
    )
    return Design(name="Mist valve timer", supply=supply, stages=(stage,), probe=probe or Probe())


def measured(value: float, u_rel: float = 0.0, unit: str = "s") -> Measured:
    """A measured figure whose scatter is ``u_rel``, with a timebase all times share."""
    budget = (
        Contribution(source="scatter", u=u_rel * value, dof=20),
        Contribution(source="timebase", u=u_rel * value / 10, common=True),
    )
    u = sum(item.u**2 for item in budget) ** 0.5
    return Measured(value=value, u=u, unit=unit, dof=20, n=21, budget=budget)


def timing_of(prediction: Prediction, *names: str, u_rel: float = 0.0) -> Timing:
    """What a perfect measurement of the named times would hold."""
    return Timing(**{name: measured(float(getattr(prediction, name)), u_rel) for name in names})
