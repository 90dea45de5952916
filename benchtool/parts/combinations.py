"""Which parts of the E-series could give the products that were measured.

Times tell products of resistance and capacitance and nothing of a part alone: (k·RA, k·RB, C/k)
gives the same output for every k. Preferred values leave a list that can be counted.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.picking import Combination, Combinations
from benchtool.model.quantity import Measured
from benchtool.parts.series import series_of, values
from benchtool.uncertainty import expanded, propagate

RESISTORS_OHM = (100.0, 10e6)
CAPACITORS_F = (10e-12, 10e-3)
"""Values that timing circuits are built with: common practice."""

_RESISTOR_SERIES, _CAPACITOR_SERIES = "E24", "E6"
_STEPS = {"E3": 0, "E6": 1, "E12": 2, "E24": 3}
_AS_COMMON = math.log(2)  # each finer series is taken to be half as common (assumed)
_USUAL_OHM = 100e3
"""Middle of the timing resistors, most of them within a decade of it: common practice. Without it
nothing would tell 100k with 47u from 10k with 470u."""

Refs = Sequence[str]


def fit_combinations(
    tau_charge: Measured,
    tau_discharge: Measured,
    *,
    charge: Refs,
    discharge: Refs,
    resistor_tolerance_rel: float = 0.05,
    capacitor_tolerance_rel: float = 0.2,
    most: int = 10,
) -> Combinations:
    """Return which E24 resistors and E6 capacitors fit the measured products.

    A set fits where parts inside their tolerances give both products inside their U.

    Args:
        tau_charge: Product while charging, seconds.
        tau_discharge: Product while discharging, seconds.
        charge: Resistors in series that charge: ``("RA", "RB")`` of an astable, ``("RA",)`` with a
            steering diode, ``("R",)`` of a circuit with one.
        discharge: Resistors that discharge: ``("RB",)`` or ``("R",)``.
        resistor_tolerance_rel: Half-width of the resistors' tolerance.
        capacitor_tolerance_rel: Half-width of the capacitor's tolerance.
        most: Length of the list; ``n_fitting`` counts all.

    Raises:
        ValueError: If the resistors stand in none of these ways, or a product is not above 0.
    """
    case = _Case(
        tau_charge=tau_charge,
        tau_discharge=tau_discharge,
        charge=tuple(charge),
        discharge=tuple(discharge),
        r_rel=resistor_tolerance_rel,
        c_rel=capacitor_tolerance_rel,
    )
    if min(tau_charge.value, tau_discharge.value) <= 0:
        raise ValueError("a product of resistance and capacitance is greater than 0")
    found = sorted(_fitting(case), key=lambda item: (item.cost, -item.parts["C"]))
    return Combinations(n_fitting=len(found), best=tuple(found[:most]))


def ratio_of_resistors(tau_charge: Measured, tau_discharge: Measured) -> Measured:
    """Return RA/RB of an astable, which needs no part value: the capacitor cancels.

    Args:
        tau_charge: (RA+RB)·C in seconds.
        tau_discharge: RB·C in seconds; errors common to both are taken once.
    """
    charge, discharge = tau_charge.value, tau_discharge.value
    inputs = [(1 / discharge, tau_charge), (-charge / discharge**2, tau_discharge)]
    return propagate(charge / discharge - 1, "1", inputs)


@frozen_record
class _Case:
    tau_charge: Measured
    tau_discharge: Measured
    charge: tuple[str, ...]
    discharge: tuple[str, ...]
    r_rel: float
    c_rel: float

    def range_of(self, product: Measured) -> tuple[float, float]:
        """Return the range of a product, seconds."""
        U = expanded(product)
        return max(product.value - U, 0.0), product.value + U


def _preferred(series: str, least: float, most: float) -> FloatArray:
    decades = range(math.floor(math.log10(least)), math.ceil(math.log10(most)) + 1)
    found = [float(f"{value:g}e{decade}") for decade in decades for value in values(series)]
    return np.array([value for value in found if least <= value <= most])


def _fitting(case: _Case) -> Iterator[Combination]:
    resistors = _preferred(_RESISTOR_SERIES, *RESISTORS_OHM)
    for c_f in _preferred(_CAPACITOR_SERIES, *CAPACITORS_F):
        x_least, x_most = _discharging(case, resistors, float(c_f))
        for low_ohm in resistors[x_least <= x_most]:
            yield from _with_charge(case, resistors, float(low_ohm), float(c_f))


def _with_charge(
    case: _Case, resistors: FloatArray, low_ohm: float, c_f: float
) -> Iterator[Combination]:
    """Yield the sets with this discharging resistor and capacitor that fit both products."""
    (low,) = case.discharge
    if case.charge == case.discharge:
        if _both_ways(case, low_ohm, c_f):
            yield _combination(case, {low: low_ohm, "C": c_f}, low_ohm, low_ohm)
        return
    (high,) = (ref for ref in case.charge if ref != low)
    for ohm in resistors[_exists(case, resistors, low_ohm, c_f)]:
        total = float(ohm) + (low_ohm if low in case.charge else 0.0)
        yield _combination(case, {high: float(ohm), low: low_ohm, "C": c_f}, total, low_ohm)


def _both_ways(case: _Case, ohm: float, c_f: float) -> bool:
    """Return whether one resistor and one capacitor give a product inside both ranges."""
    least = ohm * c_f * (1 - case.r_rel) * (1 - case.c_rel)
    most = ohm * c_f * (1 + case.r_rel) * (1 + case.c_rel)
    ranges = [case.range_of(case.tau_charge), case.range_of(case.tau_discharge)]
    least, most = max([least, *(r[0] for r in ranges)]), min([most, *(r[1] for r in ranges)])
    return least <= most


def _discharging(
    case: _Case, low_ohm: FloatArray | float, c_f: float
) -> tuple[FloatArray, FloatArray]:
    """Return the least and the most capacitance with which discharging fits, farads."""
    low = np.atleast_1d(np.asarray(low_ohm, dtype=np.float64))
    d_least, d_most = case.range_of(case.tau_discharge)
    return (
        np.maximum(c_f * (1 - case.c_rel), d_least / (low * (1 + case.r_rel))),
        np.minimum(c_f * (1 + case.c_rel), d_most / (low * (1 - case.r_rel))),
    )


def _exists(
    case: _Case, high: FloatArray, low_ohm: float, c_f: float
) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Return for which charging resistors parts inside their tolerances give both products.

    Every condition is linear in the capacitance x, so each set of parts leaves a range of x.
    """
    down, up = 1 - case.r_rel, 1 + case.r_rel
    x_least, x_most = _discharging(case, low_ohm, c_f)
    least, most = case.range_of(case.tau_charge)
    if case.discharge[0] in case.charge:
        x_least = np.maximum(x_least, least / ((high + low_ohm) * up))
        x_most = np.minimum(x_most, most / ((high + low_ohm) * down))
        d_least, d_most = case.range_of(case.tau_discharge)
        least, most = least - d_most, most - d_least  # what is left for the other resistor
    found: np.ndarray[tuple[int], np.dtype[np.bool_]] = np.maximum(
        x_least, least / (high * up)
    ) <= np.minimum(x_most, most / (high * down))
    return found


def _combination(
    case: _Case, parts: dict[str, float], charge_ohm: float, discharge_ohm: float
) -> Combination:
    off = np.array(
        [
            charge_ohm * parts["C"] / case.tau_charge.value - 1,
            discharge_ohm * parts["C"] / case.tau_discharge.value - 1,
        ]
    )
    misfit = float(off @ np.linalg.solve(_covariance(case, parts, charge_ohm), off))
    steps = sum(_STEPS.get(series_of(value) or "", len(_STEPS)) for value in parts.values())
    decades = [math.log10(parts[ref] / _USUAL_OHM) for ref in parts.keys() - {"C"}]
    return Combination(
        parts=parts,
        off_charge=float(off[0]),
        off_discharge=float(off[1]),
        cost=misfit / 2 + _AS_COMMON * steps + (math.fsum(decades) / len(decades)) ** 2 / 2,
    )


def _covariance(case: _Case, parts: dict[str, float], charge_ohm: float) -> FloatArray:
    """Return the covariance of the two relative products over tolerances and U of the timing."""
    own = np.array(
        [
            (case.tau_charge.u / case.tau_charge.value) ** 2,
            (case.tau_discharge.u / case.tau_discharge.value) ** 2,
        ]
    )
    covariance = np.diag(np.maximum(own, 1e-12)) + case.c_rel**2 / 3
    for ref in parts.keys() - {"C"}:
        weights = np.array(
            [
                parts[ref] / charge_ohm if ref in case.charge else 0.0,
                1.0 if ref in case.discharge else 0.0,
            ]
        )
        covariance = covariance + np.outer(weights, weights) * case.r_rel**2 / 3
    return covariance
