"""Why a check came out as it did: one plain sentence each."""

from __future__ import annotations

from benchtool.judge.rules import Decision
from benchtool.judge.settling import dominant_source, periods_to_settle
from benchtool.model.design import Rule
from benchtool.model.quantity import Bound, Measured
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

NAMES = {
    "t_high": "high time",
    "t_low": "low time",
    "period": "period",
    "frequency": "frequency",
    "duty": "duty",
    "first_high": "first high time after power-up",
    "delay": "delay",
    "tau_charge": "charging R·C",
    "tau_discharge": "discharging R·C",
    "jitter_period": "period jitter",
    "jitter_cycle": "cycle-to-cycle jitter",
}
ONCE_A_POWER_UP = frozenset({"first_high", "delay"})


def explain_decision(
    quantity: str,
    measured: Measured,
    decision: Decision,
    rule: Rule,
    p_conform: float,
) -> str:
    """Say why a value got its verdict.

    Args:
        quantity: Timing name.
        measured: The value, in the limit's unit.
        decision: What the rule said.
        rule: The rule.
        p_conform: Conformance probability, 0 to 1.
    """
    if decision.verdict == "fail":
        return _beyond(quantity, measured, decision) + _shared_risk(rule, p_conform)
    if decision.verdict == "pass":
        return _inside(quantity, measured, decision) + _shared_risk(rule, p_conform)
    if not decision.zone:
        return _no_zone(quantity, measured, decision)
    return _near(quantity, measured, decision) + _settled_by(quantity, measured, decision, rule)


def _beyond(quantity: str, measured: Measured, decision: Decision) -> str:
    word = "below" if decision.side == "lower" else "above"
    distance = abs(decision.margin)
    limit = decision.limit
    parts = [f"{100 * distance / abs(limit):.3g} % of the limit"] if limit else []
    U = expanded(measured)
    if U > 0:
        parts.append(f"{_times(distance / U)} times its U")
    by = f" by {', '.join(parts)}" if parts else ""
    return (
        f"The {NAMES[quantity]}, {_value(measured)}, is {word} its {decision.side} limit of "
        f"{_exact(limit, measured.unit)}{by}."
    )


def _inside(quantity: str, measured: Measured, decision: Decision) -> str:
    U = expanded(measured)
    times = f", {_times(decision.margin / U)} times its U" if U > 0 else ""
    room = format_value(decision.margin, measured.unit, 3)
    return (
        f"The {NAMES[quantity]} is inside its limits; "
        f"to the {decision.side} limit there is room of {room}{times}."
    )


def _no_zone(quantity: str, measured: Measured, decision: Decision) -> str:
    return (
        f"No {NAMES[quantity]} could pass: the guard band of "
        f"{format_value(decision.guard_band, measured.unit, 2)} leaves nothing between the limits, "
        f"and {_largest(measured)}."
    )


def _near(quantity: str, measured: Measured, decision: Decision) -> str:
    outside = "above" if decision.side == "upper" else "below"
    place = "inside" if decision.margin >= 0 else outside
    distance = format_value(abs(decision.margin), measured.unit, 2)
    return (
        f"The {NAMES[quantity]}, {_value(measured)}, is only {distance} {place} its "
        f"{decision.side} limit of {_exact(decision.limit, measured.unit)}, and the guard band is "
        f"{format_value(decision.guard_band, measured.unit, 2)}"
    )


def _settled_by(quantity: str, measured: Measured, decision: Decision, rule: Rule) -> str:
    noun = "power-up" if quantity in ONCE_A_POWER_UP else "period"
    more = periods_to_settle(measured, decision.margin, rule)
    if more is None:
        return f"; more {noun}s would not settle it, and {_largest(measured)}."
    return f"; about {more} more {noun}{'' if more == 1 else 's'} would settle it."


def _largest(measured: Measured) -> str:
    source = dominant_source(measured)
    return (
        f"the largest part of the uncertainty is: {source}"
        if source
        else "its uncertainty would have to be smaller"
    )


def _shared_risk(rule: Rule, p_conform: float) -> str:
    if rule.name != "simple":
        return ""
    return (
        " The simple rule takes no account of the uncertainty: "
        f"the chance that the true value lies inside is {100 * p_conform:.3g} %."
    )


def explain_bound(
    quantity: str, bound: Bound, lower: float | None, upper: float | None, verdict: str
) -> str:
    """Say why a bound got its verdict.

    Args:
        quantity: Timing name.
        bound: What is known, in the limits' unit.
        lower: Lower limit, None where open.
        upper: Upper limit, None where open.
        verdict: pass, undecided or fail.
    """
    known = _bound_text(bound)
    if verdict == "pass":
        return f"The {NAMES[quantity]} has no value, but it is {known}, which is inside its limits."
    if verdict == "fail":
        return f"The {NAMES[quantity]} is {known}, {_crossed(bound, lower, upper)}."
    open_end = upper if bound.at_least is not None else lower
    remedy = (
        f"a record longer than {_exact(open_end, bound.unit)} would settle it"
        if bound.unit == "s" and bound.at_least is not None and open_end is not None
        else "a longer or finer record would settle it"
    )
    return f"The {NAMES[quantity]} is only known to be {known}; {remedy}."


def _crossed(bound: Bound, lower: float | None, upper: float | None) -> str:
    if upper is not None and bound.at_least is not None and bound.at_least > upper:
        share = (
            f" by at least {100 * (bound.at_least - upper) / upper:.3g} % of it" if upper else ""
        )
        return f"beyond its upper limit of {_exact(upper, bound.unit)}{share}"
    return f"below its lower limit of {_exact(lower or 0.0, bound.unit)}"


def explain_stretch(quantity: str, length_s: float, upper_s: float, *, whole: bool) -> str:
    """Say that the output stood still for longer than a limit allows.

    Args:
        quantity: Timing name.
        length_s: How long it stood still, seconds.
        upper_s: The limit that it outlasted, seconds.
        whole: Whether the whole record is without an edge.
    """
    where = "throughout the record" if whole else "at the end of the record"
    return (
        f"The output stood still for {format_value(length_s, 's')} {where}, longer than the "
        f"{_exact(upper_s, 's')} that the limits allow, so the {NAMES[quantity]} fails."
    )


def explain_halt(quantity: str, length_s: float) -> str:
    """Say that the output stopped, whatever the limits are.

    Args:
        quantity: Timing name.
        length_s: How long it stood still, seconds.
    """
    return (
        f"The output stood still for {format_value(length_s, 's')}, far longer than any part of "
        f"its cycle, so the {NAMES[quantity]} fails."
    )


def explain_nothing(quantity: str, *, sound: bool, between: bool) -> str:
    """Say that there is neither a value nor a bound.

    Args:
        quantity: Timing name.
        sound: Whether the record shows the output at all.
        between: Whether it is flat between the states.
    """
    name = NAMES[quantity]
    if between:
        return f"The trace shows neither of the two states, so it says nothing about the {name}."
    if sound:
        return f"The record gives no {name}; a longer one, or one that shows it, would settle it."
    return f"The record holds nothing about the {name}."


def _bound_text(bound: Bound) -> str:
    words = []
    if bound.at_least is not None:
        words.append(f"at least {format_value(bound.at_least, bound.unit)}")
    if bound.at_most is not None:
        words.append(f"at most {format_value(bound.at_most, bound.unit)}")
    return " and ".join(words)


def _value(measured: Measured) -> str:
    return format_measured(measured.value, expanded(measured), measured.unit)


def _exact(limit: float, unit: str) -> str:
    return format_value(limit, unit, 6)


def _times(multiple: float) -> str:
    """Return a multiple with three digits, and never with an exponent."""
    return f"{multiple:.3g}" if multiple < 1000 else f"{multiple:.0f}"
