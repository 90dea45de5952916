"""Decision rules: a value with its uncertainty against limits, guard bands drawn in.

References:
    JCGM 106:2012 clauses 7 and 8 (conformance probability, guarded acceptance and rejection);
    ILAC-G8:09/2019 clause 4.2 (simple, guarded and nonbinary statements); ISO 14253-1 (the
    region between acceptance and rejection decides nothing).
"""

from __future__ import annotations

import math
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.judge.verdict import worst
from benchtool.model.design import Rule, RuleName
from benchtool.model.judgement import VerdictName
from benchtool.model.quantity import Measured
from benchtool.uncertainty import chi_square_cdf, coverage_factor, t_cdf, whole_dof

Side = Literal["lower", "upper"]


@frozen_record
class Decision:
    """What a rule says of one value.

    Attributes:
        verdict: The worse of the two sides.
        guard_band: w in the value's unit, 0 under the simple rule.
        accept_lower, accept_upper: The limits drawn in by w; None where open, and both None
            where nothing is left between them.
        zone: Whether any value could pass.
        side: The side that decides: the one the value is nearest to or furthest beyond.
        limit: The limit on that side.
        margin: Distance to that limit, greater than 0 inside.
    """

    verdict: VerdictName
    guard_band: float
    accept_lower: float | None
    accept_upper: float | None
    zone: bool
    side: Side
    limit: float
    margin: float


def guard_band(u: float, dof: float, rule: Rule) -> float:
    """Return w, by which a rule draws the limits in.

    Args:
        u: Standard uncertainty, 0 or more.
        dof: Its degrees of freedom, ``inf`` where unlimited.
        rule: Rule, guard factor and coverage probability.

    Returns:
        guard·t((1 + coverage)/2, dof)·u in the unit of ``u``; 0 under the simple rule.

    References:
        JCGM 106:2012, 8.3.2 (w = r·U).
    """
    if rule.name == "simple" or u == 0:
        return 0.0
    return rule.guard * coverage_factor(dof, rule.coverage) * u


def decide(
    value: float, w: float, lower: float | None, upper: float | None, name: RuleName = "guarded"
) -> Decision:
    """Hold a value against limits of which at least one is given.

    Args:
        value: The estimate.
        w: Guard band in the value's unit, 0 or more.
        lower: Lower limit in the value's unit, None where open.
        upper: Upper limit, likewise.
        name: ``simple`` and ``guarded`` decide pass, undecided or fail (nothing is undecided
            with w = 0 but the rule without a guard); ``nonbinary`` calls the two halves of the
            undecided region conditional-pass and conditional-fail.

    Raises:
        ValueError: If both limits are open.

    References:
        JCGM 106:2012, 8.3 (acceptance and rejection intervals); ILAC-G8:09/2019, 4.2.1 to 4.2.3.
    """
    sides = _sides(value, lower, upper)
    verdicts = [_side_verdict(margin, w, _slack(limit, w), name) for _, limit, margin in sides]
    side, limit, margin = min(sides, key=lambda item: item[2])
    accept_lower, accept_upper, zone = accept_bounds(w, lower, upper)
    return Decision(
        verdict=worst(verdicts) or "unusable",
        guard_band=w,
        accept_lower=accept_lower,
        accept_upper=accept_upper,
        zone=zone,
        side=side,
        limit=limit,
        margin=margin,
    )


def _sides(
    value: float, lower: float | None, upper: float | None
) -> list[tuple[Side, float, float]]:
    """Return each given limit with the value's distance to it, greater than 0 inside."""
    sides: list[tuple[Side, float, float]] = []
    if lower is not None:
        sides.append(("lower", lower, value - lower))
    if upper is not None:
        sides.append(("upper", upper, upper - value))
    if not sides:
        raise ValueError("a decision needs a lower or an upper limit")
    return sides


def _slack(limit: float, w: float) -> float:
    """Return what binary arithmetic may add to or take from ``margin - w``.

    A value that lies on limit ± w in decimal figures must be found there. The value and the
    limit are each half a unit in the last place (ulp) off their decimals, w with its two
    products up to 2, the difference half a one: 3.5 ulp of the largest number at hand. Without
    a guard band nothing is computed and the comparison is exact. The slack hangs on the limit
    and not on the value, so a value nearer to the limit never gets the better verdict.
    """
    return 4 * math.ulp(abs(limit) + w) if w > 0 else 0.0


def _side_verdict(margin: float, w: float, slack: float, name: RuleName) -> VerdictName:
    if margin >= w - slack:
        return "pass"
    if margin < -w - slack:
        return "fail"
    if name != "nonbinary":
        return "undecided"
    return "conditional-pass" if margin >= 0 else "conditional-fail"


def accept_bounds(
    w: float, lower: float | None, upper: float | None
) -> tuple[float | None, float | None, bool]:
    """Return the acceptance limits and whether anything lies between them.

    Args:
        w: Guard band, 0 or more.
        lower: Lower limit, None where open.
        upper: Upper limit, None where open.

    References:
        JCGM 106:2012, 8.3.2 and 8.3.3.
    """
    accept_lower = None if lower is None else lower + w
    accept_upper = None if upper is None else upper - w
    if accept_lower is None or accept_upper is None or accept_lower <= accept_upper:
        return accept_lower, accept_upper, True
    if accept_lower - accept_upper <= _slack(abs(accept_lower), w):
        middle = (accept_lower + accept_upper) / 2
        return middle, middle, True
    return None, None, False


def conformance_probability(measured: Measured, lower: float | None, upper: float | None) -> float:
    """Return the probability that the quantity itself lies between its limits.

    Args:
        measured: The estimate; its dof give Student's law.
        lower: Lower limit in the same unit, None where open.
        upper: Upper limit, likewise.

    Returns:
        F_t((H − y)/u) − F_t((L − y)/u), 0 to 1; for u = 0, whether y lies inside.

    References:
        JCGM 106:2012, clauses 7.3 (one limit) and 7.4 (two), with Student's law for the normal
        one where u is estimated (JCGM 101:2008, 6.4.9.2).
    """
    y, u, dof = measured.value, measured.u, measured.dof
    if u == 0:
        return float((lower is None or y >= lower) and (upper is None or y <= upper))
    above_lower = 1.0 if lower is None else t_cdf((y - lower) / u, dof)
    above_upper = 0.0 if upper is None else t_cdf((y - upper) / u, dof)
    return max(0.0, above_lower - above_upper)


def scatter_conformance_probability(
    measured: Measured, lower: float | None, upper: float | None
) -> float:
    """Return the probability that a standard deviation itself lies between its limits.

    Args:
        measured: The estimated standard deviation with its degrees of freedom.
        lower: Lower limit in the same unit, 0 or more, None where open.
        upper: Upper limit, likewise.

    Returns:
        P(L ≤ σ ≤ H), from ν·s²/σ² being chi-square with ν degrees of freedom, 0 to 1.

    References:
        JCGM 106:2012, clause 7.1; Abramowitz & Stegun 26.4.1 for the law of s².
    """
    if measured.u == 0 or math.isinf(measured.dof):
        return conformance_probability(measured, lower, upper)
    above_lower = 1.0 if lower is None else _chance_above(measured, lower)
    above_upper = 0.0 if upper is None else _chance_above(measured, upper)
    # The chance of lying above a limit falls as the limit rises: the difference is that between.
    return max(0.0, above_lower - above_upper)


def _chance_above(measured: Measured, limit: float) -> float:
    """Return P(σ > limit), given s and its degrees of freedom."""
    if limit <= 0:
        return 1.0
    return chi_square_cdf(whole_dof(measured.dof) * (measured.value / limit) ** 2, measured.dof)
