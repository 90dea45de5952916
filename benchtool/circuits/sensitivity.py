"""How much each time moves with each figure of a circuit."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

import numpy as np

from benchtool.circuits.circuit import Circuit, with_fields
from benchtool.circuits.prediction import predict
from benchtool.circuits.topologies import find_topology
from benchtool.frozen import frozen_record

Shift = Callable[[Circuit, float], Circuit]

_TIMES = ("t_high", "t_low", "period", "first_high", "delay")


@frozen_record
class Sensitivity:
    """Relative change of each time for one unit of a figure.

    Attributes:
        per: Unit of the figure; ``1`` where its relative change is meant.
        t_high, t_low, period, first_high, delay: d ln(time) / d figure; None where the topology has
            no such time, NaN where the circuit is stuck.
    """

    per: str
    t_high: float | None = None
    t_low: float | None = None
    period: float | None = None
    first_high: float | None = None
    delay: float | None = None


@frozen_record
class _Figure:
    """A figure of the circuit that moves: by how much at a time, and how."""

    per: str
    step: Callable[[Circuit], float]
    shift: Shift


def _scaled(*fields: str) -> _Figure:
    def shift(circuit: Circuit, by: float) -> Circuit:
        return with_fields(circuit, {name: getattr(circuit, name) * (1 + by) for name in fields})

    return _Figure(per="1", step=lambda _: 1e-5, shift=shift)


def _added(field: str, per: str, step: Callable[[Circuit], float]) -> _Figure:
    def shift(circuit: Circuit, by: float) -> Circuit:
        return with_fields(circuit, {field: getattr(circuit, field) + by})

    return _Figure(per=per, step=step, shift=shift)


def _shunt(circuit: Circuit, by: float) -> Circuit:
    return with_fields(circuit, {"shunt_ohm": 1 / (1 / circuit.shunt_ohm + by)})


def _resistance(circuit: Circuit) -> float:
    refs = find_topology(circuit.topology).resistor_refs
    return float(sum(getattr(circuit, ref) for ref in refs))


def _small_ohm(circuit: Circuit) -> float:
    return 1e-5 * _resistance(circuit)


def _small_s(circuit: Circuit) -> float:
    return 1e-5 * _resistance(circuit) * float(circuit.C)


def _small_v(circuit: Circuit) -> float:
    return 1e-5 * float(circuit.supply)


def _small_a(circuit: Circuit) -> float:
    return _small_v(circuit) / _resistance(circuit)


def _small_siemens(circuit: Circuit) -> float:
    return 1e-5 / _resistance(circuit)


_FIGURES: Mapping[str, _Figure] = MappingProxyType(
    {
        "RA": _scaled("RA"),
        "RB": _scaled("RB"),
        "R": _scaled("R"),
        "C": _scaled("C"),
        "supply": _scaled("supply"),
        "thresholds": _scaled("v_upper", "v_lower"),
        "v_upper": _scaled("v_upper"),
        "v_lower": _scaled("v_lower"),
        "shunt": _Figure(per="S", step=_small_siemens, shift=_shunt),
        "i_leak": _added("i_leak", "A", _small_a),
        "i_bias": _added("i_bias", "A", _small_a),
        "i_discharge_leak": _added("i_discharge_leak", "A", _small_a),
        "esr": _added("esr", "ohm", _small_ohm),
        "v_sat": _added("v_sat", "V", _small_v),
        "r_on": _added("r_on", "ohm", _small_ohm),
        "delay_upper": _added("delay_upper", "s", _small_s),
        "delay_lower": _added("delay_lower", "s", _small_s),
        "output_high_drop": _added("output_high_drop", "V", _small_v),
        "output_high_resistance": _added("output_high_resistance", "ohm", _small_ohm),
        "output_low": _added("output_low", "V", _small_v),
        "output_low_resistance": _added("output_low_resistance", "ohm", _small_ohm),
        "diode_drop": _added("diode_drop", "V", _small_v),
    }
)


def sensitivities(circuit: Circuit) -> dict[str, Sensitivity]:
    """Return how much each time moves with each figure, at this circuit.

    ``supply`` leaves the thresholds where they are, in volts; ``thresholds`` moves both by the same
    share, as a control pin does; ``shunt`` is a conductance from the node to 0 V.

    Args:
        circuit: One board, all floats.

    References:
        Central differences, error below 1e-8 of the value.
    """
    refs = ("RA", "RB", "R")
    absent = {ref for ref in refs if ref not in find_topology(circuit.topology).parts}
    return {
        name: _differentiate(circuit, figure)
        for name, figure in _FIGURES.items()
        if name not in absent
    }


def _differentiate(circuit: Circuit, figure: _Figure) -> Sensitivity:
    step = figure.step(circuit)
    above, below = (predict(figure.shift(circuit, by)) for by in (step, -step))
    slopes = {}
    for name in _TIMES:
        up, down = getattr(above, name), getattr(below, name)
        slopes[name] = None if up is None else float(np.log(up / down) / (2 * step))
    return Sensitivity(per=figure.per, **slopes)
