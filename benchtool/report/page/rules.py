"""The decision rule in words, with the share of risk it leaves."""

from __future__ import annotations

import math

from benchtool.model.design import Rule
from benchtool.uncertainty import coverage_factor, t_cdf
from benchtool.units import format_value

_SOURCES = "JCGM 106:2012, clause 8.3; ILAC-G8:09/2019, clause 4.2"


def rule_text(rule: Rule) -> str:
    """Return what a rule does, and what share of risk it leaves.

    Args:
        rule: Name, guard factor and coverage probability.
    """
    return {"guarded": _guarded, "simple": _simple, "nonbinary": _nonbinary}[rule.name](rule)


def boundary_risk(rule: Rule) -> float:
    """Return the chance that a value just accepted is in truth beyond the limit.

    Args:
        rule: Guard factor and coverage probability; the simple rule has no guard band.

    Returns:
        1 − Φ(guard·k), for the normal law and the nearer limit alone, 0 to 0.5.

    References:
        ILAC-G8:09/2019, clause 4.2 and its table of guard bands: w = U leaves at most 2.5 %.
    """
    guard = 0.0 if rule.name == "simple" else rule.guard
    return t_cdf(-guard * coverage_factor(math.inf, rule.coverage), math.inf)


def _guarded(rule: Rule) -> str:
    return (
        f"Guarded acceptance, with {_band(rule)}. A value passes if it keeps w from its limits, "
        "fails if it lies beyond one by more than w, and is undecided between: there the "
        "measurement proves neither. A value just accepted is in truth beyond the limit with a "
        f"chance of at most {_percent(boundary_risk(rule))}, and one just rejected within it "
        f"likewise. {_SOURCES}; ISO 14253-1."
    )


def _simple(rule: Rule) -> str:
    return (
        "Simple acceptance, without a guard band: a value passes if it lies between its limits "
        "or on one, and fails otherwise. The risk is shared: a value at a limit is wrongly "
        f"called with a chance of up to {_percent(boundary_risk(rule))}. The uncertainty does "
        f"not enter the verdict; the conformance probability shows it. {_SOURCES}."
    )


def _nonbinary(rule: Rule) -> str:
    return (
        f"Nonbinary statement, with {_band(rule)}. Pass: at least w inside the limits, with a "
        f"chance of at most {_percent(boundary_risk(rule))} to be in truth beyond. "
        "Conditional-pass: inside by less than w. Conditional-fail: beyond by no more than w; in "
        f"both the chance of a wrong call is up to 50 %. Fail: beyond by more than w. {_SOURCES}."
    )


def _band(rule: Rule) -> str:
    return (
        f"a guard band w of {rule.guard:g} times U, where U covers "
        f"{_percent(rule.coverage)} (k from Student's t)"
    )


def _percent(share: float) -> str:
    return format_value(share, "1", 2 if share < 0.9 else 4)
