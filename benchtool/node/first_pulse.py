"""The first pulse after power-up as evidence: what it says that the steady ones do not."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType

from benchtool.circuits import Circuit, predict, settle_states
from benchtool.circuits.circuit import with_fields
from benchtool.errors import SolveError
from benchtool.frozen import frozen_record
from benchtool.model.node import FirstPulse, RatioCause
from benchtool.model.quantity import Measured
from benchtool.node.roots import find_root
from benchtool.uncertainty import expanded, propagate

IDEAL = math.log(3) / math.log(2)
"""First high over the steady ones: from 0 V to two thirds against from one third to two thirds."""

Ratio = Callable[[Circuit, float], float]


@frozen_record
class _Cause:
    """One thing that moves the ratio.

    Attributes:
        text: In a few words.
        unit: Of its size.
        size: Makes the usual size of a board, to show what it does.
        most: Makes the largest size that is believed; the sign too.
        ratio: The ratio with that size.
        both_ways: Whether it may have either sign.
        is_inverse: Whether sizes are computed with as the inverse of what they are shown as.
    """

    text: str
    unit: str
    size: Callable[[Circuit], float]
    most: Callable[[Circuit], float]
    ratio: Ratio
    both_ways: bool = False
    is_inverse: bool = False


def _times(circuit: Circuit) -> tuple[float, float]:
    """Return the first and the steady high time."""
    times = predict(circuit)
    if times.first_high is None or times.t_high is None:
        raise SolveError(
            f"a circuit of topology {circuit.topology} has no first high beside its others",
            hint="The first pulse is evidence on oscillators alone.",
        )
    return float(times.first_high), float(times.t_high)


def _predicted(circuit: Circuit) -> float:
    first_s, steady_s = _times(circuit)
    return first_s / steady_s if steady_s > 0 else math.inf  # where the thresholds meet


def _moved(*fields: str) -> Ratio:
    def ratio(circuit: Circuit, size: float) -> float:
        changes = {name: getattr(circuit, name) * (1 + size) for name in fields}
        return _predicted(with_fields(circuit, changes))

    return ratio


def _leaking(circuit: Circuit, conductance: float) -> float:
    present = 1 / float(circuit.shunt_ohm)
    total = present + conductance
    return _predicted(with_fields(circuit, {"shunt_ohm": 1 / total if total else math.inf}))


def _resistive(circuit: Circuit, size: float) -> float:
    return _predicted(with_fields(circuit, {"esr": circuit.esr + size}))


def _charged(circuit: Circuit, start_v: float) -> float:
    """Return the ratio where the capacitor begins at a voltage of its own."""
    charge = settle_states(circuit).charge
    plain = float(charge[0].rise_time(0.0, circuit.v_upper))
    begun = float(charge[0].rise_time(start_v, circuit.v_upper))
    first_s, steady_s = _times(circuit)
    return (first_s + begun - plain) / steady_s


def _ramped(circuit: Circuit, ramp_s: float) -> float:
    """Return the ratio where the supply rises evenly, the output being high from its begin.

    References:
        On a ramp of length r the node is at V·[1 - (tau/r)(1 - e^(-r/tau))] when it ends.
    """
    settled = settle_states(circuit).charge[0]
    tau_s, end_v = float(settled.tau), float(settled.v)
    if ramp_s == 0:
        return _predicted(circuit)
    behind = tau_s / ramp_s * -math.expm1(-ramp_s / tau_s)
    first_s, steady_s = _times(circuit)
    later_s = ramp_s + float(settled.rise_time(end_v * (1 - behind), circuit.v_upper))
    plain_s = float(settled.rise_time(0.0, circuit.v_upper))
    return (first_s + later_s - plain_s) / steady_s


def _charge_s(circuit: Circuit) -> float:
    return float(settle_states(circuit).charge[-1].tau)


_CAUSES: Mapping[str, _Cause] = MappingProxyType(
    {
        "upper-threshold": _Cause(
            text="the upper threshold lies elsewhere, the lower one as designed",
            unit="1",
            size=lambda _: 0.01,
            most=lambda c: 0.9 * (float(settle_states(c).charge[-1].v / c.v_upper) - 1),
            ratio=_moved("v_upper"),
            both_ways=True,
        ),
        "lower-threshold": _Cause(
            text="the lower threshold lies elsewhere, the upper one as designed",
            unit="1",
            size=lambda _: 0.01,
            most=lambda _: 0.5,
            ratio=_moved("v_lower"),
            both_ways=True,
        ),
        "control": _Cause(
            text="both thresholds are shifted alike, as a pulled control pin does",
            unit="1",
            size=lambda _: 0.01,
            most=lambda c: 0.9 * (float(settle_states(c).charge[-1].v / c.v_upper) - 1),
            ratio=_moved("v_upper", "v_lower"),
            both_ways=True,
        ),
        "leak": _Cause(
            text="a leak across the capacitor",
            unit="ohm",
            size=lambda c: 0.02 / float(settle_states(c).charge[-1].r),
            most=lambda c: (
                0.95
                * (float(settle_states(c).charge[-1].v / c.v_upper) - 1)
                / float(settle_states(c).charge[-1].r)
            ),
            ratio=_leaking,
            is_inverse=True,
        ),
        "esr": _Cause(
            text="a series resistance of the capacitor",
            unit="ohm",
            size=lambda c: 0.05 * float(settle_states(c).charge[-1].r),
            most=lambda c: 0.3 * float(settle_states(c).charge[-1].r),
            ratio=_resistive,
        ),
        "residual-charge": _Cause(
            text="a charge left on the capacitor when the supply came up",
            unit="V",
            size=lambda c: 0.01 * float(c.supply),
            most=lambda c: 0.98 * float(c.v_lower),
            ratio=_charged,
        ),
        "supply-ramp": _Cause(
            text="a supply that comes up slowly, counted from its begin",
            unit="s",
            size=lambda c: 0.01 * _charge_s(c),
            most=_charge_s,
            ratio=_ramped,
        ),
    }
)
_ONE_SLOPE = ("residual-charge", "supply-ramp")  # need a charge in one exponential


def judge_first_pulse(t_first: Measured, t_high: Measured, circuit: Circuit) -> FirstPulse:
    """Hold the first high after power-up against the steady ones.

    The ratio does not depend on R·C: what moves it is the thresholds, what loads the node, and how
    the board was when it was switched on.

    Args:
        t_first: The first high, seconds.
        t_high: The steady ones, seconds.
        circuit: The board as designed, an oscillator, all floats.

    Returns:
        The ratio, what it would be on the board as designed, and for each cause what a usual size
        of it does and what size alone would explain the ratio.

    Raises:
        SolveError: ``no-solution`` where the circuit has no such two times.

    References:
        ln 3/ln 2 at thresholds of one and two thirds and no load (design of the ideal astable);
        the shifts are computed by the circuit model.
    """
    ratio = propagate(
        t_first.value / t_high.value,
        "1",
        [(1 / t_high.value, t_first), (-t_first.value / t_high.value**2, t_high)],
    )
    expected = _predicted(circuit)
    charges = len(settle_states(circuit).charge)
    causes = tuple(
        _cause(name, cause, circuit, ratio, expected)
        for name, cause in _CAUSES.items()
        if charges == 1 or name not in _ONE_SLOPE
    )
    return FirstPulse(
        ratio=ratio,
        ideal=IDEAL,
        expected=expected,
        stands_out=abs(ratio.value - expected) > expanded(ratio),
        causes=causes,
    )


def _cause(
    name: str, cause: _Cause, circuit: Circuit, ratio: Measured, expected: float
) -> RatioCause:
    size, most = cause.size(circuit), cause.most(circuit)
    low = -most if cause.both_ways else 0.0
    needed = find_root(lambda x: cause.ratio(circuit, x) - ratio.value, low, most)
    return RatioCause(
        name=name,
        text=cause.text,
        unit=cause.unit,
        size=1 / size if cause.is_inverse else size,
        shift=cause.ratio(circuit, size) - expected,
        needed=1 / needed if needed and cause.is_inverse else needed,
    )
