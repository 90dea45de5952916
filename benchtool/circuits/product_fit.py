"""Solving for the products, whatever the parts that make them up."""

from __future__ import annotations

import math
from collections.abc import Mapping

from benchtool.circuits.estimates import contradicts
from benchtool.circuits.fit import Disagreement, Fit, fit, place_fit
from benchtool.circuits.observations import Observation, without_first_high
from benchtool.circuits.starts import start_logs
from benchtool.circuits.topologies import find_topology
from benchtool.circuits.unknowns import likeliest_log_c, product_model
from benchtool.errors import SolveError
from benchtool.frozen import frozen_record
from benchtool.model.design import Design, Stage
from benchtool.model.quantity import Notice
from benchtool.uncertainty import expanded

_ROUNDS = 12


@frozen_record
class Case:
    """What is solved.

    Attributes:
        stage: The circuit.
        design: Its supply, temperature and probe.
        observations: The measured times.
        known: Part values taken as known.
        marked: Whether the stage's part values are a design's.
    """

    stage: Stage
    design: Design
    observations: tuple[Observation, ...]
    known: Mapping[str, float]
    marked: bool


@frozen_record(eq=False)
class SolvedProducts:
    """The solved products.

    Attributes:
        fit: None where the times do not determine the products.
        used: The times that went in.
        warnings: Which time contradicts the others.
    """

    fit: Fit | None
    used: tuple[Observation, ...]
    warnings: tuple[Notice, ...] = ()


def solve_products(case: Case) -> SolvedProducts:
    """Solve for the products; a first high time joins only where it fits the others.

    Raises:
        SolveError: If no products give the times.
    """
    topology = find_topology(case.stage.topology)
    names = {item.name for item in case.observations}
    if topology.has_two_products and not {"t_high", "t_low"} <= names:
        return SolvedProducts(fit=None, used=case.observations)
    steady = without_first_high(case.observations)
    found = _solve_steady(case, steady)
    if steady == case.observations or not steady:
        return SolvedProducts(fit=found, used=steady, warnings=_told(found.disagreement()))
    trial = place_fit(found.model, case.observations, found.logs)
    surplus = trial.disagreement()
    if surplus is not None and contradicts(surplus):
        return SolvedProducts(fit=found, used=steady, warnings=_told(surplus))
    joined = fit(found.model, case.observations, found.logs)
    return SolvedProducts(fit=joined, used=case.observations)


def _solve_steady(case: Case, observations: tuple[Observation, ...]) -> Fit:
    try:
        return _share_out(case, observations)
    except SolveError as error:
        topology = find_topology(case.stage.topology)
        times = ", ".join(f"{item.name} {item.measured.value:.6g} s" for item in observations)
        raise SolveError(
            f"no parts of a circuit of topology {topology.name} give {times}",
            hint=f"{topology.limits_of} Check the topology, the active level and the IC's terms.",
        ) from error


def _share_out(case: Case, observations: tuple[Observation, ...]) -> Fit:
    """Solve, share the products out among the parts, and solve again until both agree.

    How they are shared out acts through terms of second order only, so few rounds are needed.
    """
    stage, design, known = case.stage, case.design, case.known
    start = start_logs(stage, design, observations)
    log_c = likeliest_log_c(stage, start) if case.marked else math.log(stage.parts["C"].value)
    found = fit(product_model(stage, design, log_c, known, marked=case.marked), observations, start)
    if known or not case.marked:
        return found
    for _ in range(_ROUNDS):
        shared = likeliest_log_c(stage, found.logs)
        if abs(shared - log_c) < 1e-12:
            break
        log_c = shared
        found = fit(product_model(stage, design, log_c, known), observations, found.logs)
    return found


def _told(surplus: Disagreement | None) -> tuple[Notice, ...]:
    """Return a warning where one time is beyond U off what the others make of it."""
    if surplus is None or not contradicts(surplus):
        return ()
    left_out = " It was left out." if surplus.name == "first_high" else ""
    text = (
        f"{surplus.name} is {math.expm1(surplus.difference.value):+.2%} off what "
        f"{' and '.join(surplus.against)} make of it; U of the difference is "
        f"{expanded(surplus.difference):.2%}.{left_out}"
    )
    return (Notice(code="products-disagree", text=text),)
