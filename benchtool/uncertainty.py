"""Combining uncertainties and expanding them: Student t, Welch–Satterthwaite, common errors.

The quantiles are closed forms, so that measuring needs no statistics library at start-up.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from functools import lru_cache
from itertools import accumulate, takewhile
from operator import mul

from benchtool.model.quantity import Contribution, Measured

COVERAGE = 0.95
_LN2 = math.log(2)
_MANY_DOF = 100_000
_STIRLING = 100
_LOST = 1e-20  # of a sum: what no double can tell
_LARGE_DOF = 400  # above this the expansions in 1/dof are good to better than 1e-8
_FAR = 12.0  # beyond it, and above _LARGE_DOF, the tail holds less than 1e-27


def whole_dof(dof: float) -> float:
    """Truncate degrees of freedom to a whole number of at least 1, or ``inf``.

    References:
        JCGM 100:2008, G.4.1: if nu_eff is not an integer, truncate to the next lower integer.
    """
    # Sums of squares may leave a whole number a few units in the last place short of itself.
    return max(1.0, math.floor(dof * (1 + 1e-12))) if math.isfinite(dof) else math.inf


def normal_cdf(x: float) -> float:
    """Return the probability that a standard normal deviate is at most ``x``."""
    return math.erfc(-x / math.sqrt(2)) / 2


def normal_quantile(p: float) -> float:
    """Return the standard normal deviate below which lies the probability ``p``, 0 < p < 1.

    References:
        Abramowitz & Stegun 26.2.23 for the start, good to 4.5e-4; three steps of Newton's method
        bring it to the digits of a float.

    Example:
        >>> round(normal_quantile(0.975), 6)
        1.959964
    """
    tail = min(p, 1 - p)
    s = math.sqrt(-2 * math.log(tail))
    x = s - (2.515517 + s * (0.802853 + s * 0.010328)) / (
        1 + s * (1.432788 + s * (0.189269 + s * 0.001308))
    )
    for _ in range(3):
        density = math.exp(-x * x / 2) / math.sqrt(2 * math.pi)
        x += (math.erfc(x / math.sqrt(2)) / 2 - tail) / density
    return x if p > 0.5 else -x


def t_cdf(t: float, dof: float) -> float:
    """Return the probability that Student's t is at most ``t``.

    Args:
        t: Quantile.
        dof: Degrees of freedom; truncated to a whole number, ``inf`` for the normal law.

    References:
        Abramowitz & Stegun 26.7.3 and 26.7.4 (whole dof), 26.7.8 (large dof).
    """
    nu = whole_dof(dof)
    if math.isinf(nu):
        return normal_cdf(t)
    if nu > _LARGE_DOF:
        return normal_cdf(_normal_equivalent(t, nu)) if abs(t) <= _FAR else float(t > 0)
    return 0.5 + math.copysign(_central_area(abs(t), int(nu)) / 2, t)


def _central_area(t: float, nu: int) -> float:
    """Return P(|T| <= t) for whole ``nu``: A&S 26.7.3 (odd) and 26.7.4 (even)."""
    theta = math.atan(t / math.sqrt(nu))
    sine, cosine = math.sin(theta), math.cos(theta)
    if nu == 1:
        return 2 * theta / math.pi
    odd = nu % 2
    term = cosine if odd else 1.0
    total = term
    for i in range(2 + odd, nu - 1, 2):
        term *= cosine * cosine * (i - 1) / i
        total += term
    return 2 / math.pi * (theta + sine * total) if odd else sine * total


def _normal_equivalent(t: float, nu: float) -> float:
    """Return the normal deviate of equal probability, solving A&S 26.7.5 by Newton's method."""
    x = t
    for _ in range(20):
        step = (_t_expansion(x, nu) - t) / (1 + (3 * x * x + 1) / (4 * nu))
        x -= step
        if abs(step) < 1e-12 * max(1.0, abs(x)):
            break
    return x


def _t_expansion(x: float, nu: float) -> float:
    """Return Student's quantile from the normal one, A&S 26.7.5."""
    x3, x5, x7 = x**3, x**5, x**7
    return (
        x
        + (x3 + x) / (4 * nu)
        + (5 * x5 + 16 * x3 + 3 * x) / (96 * nu**2)
        + (3 * x7 + 19 * x5 + 17 * x3 - 15 * x) / (384 * nu**3)
    )


@lru_cache(maxsize=1024)
def t_quantile(p: float, dof: float) -> float:
    """Return Student's t below which lies the probability ``p``.

    Args:
        p: Probability, 0 < p < 1.
        dof: Degrees of freedom; truncated to a whole number, ``inf`` for the normal law.

    Raises:
        ValueError: If ``p`` is not between 0 and 1.

    Example:
        >>> round(t_quantile(0.975, 16), 3)
        2.12
    """
    if not 0 < p < 1:
        raise ValueError(f"a probability lies between 0 and 1, got {p}")
    nu = whole_dof(dof)
    x = normal_quantile(p)
    if math.isinf(nu):
        return x
    if nu > _LARGE_DOF:
        return _t_expansion(x, nu)
    return math.copysign(_bisect_t(max(p, 1 - p), nu), p - 0.5)


def _bisect_t(p: float, nu: float) -> float:
    """Find t with ``t_cdf(t, nu) == p`` for ``p >= 0.5``."""
    low, high = 0.0, 2.0
    while t_cdf(high, nu) < p:
        low, high = high, high * 2
    while high - low > 1e-13 * high:
        middle = (low + high) / 2
        if middle in (low, high):
            break
        low, high = (middle, high) if t_cdf(middle, nu) < p else (low, middle)
    return (low + high) / 2


def chi_square_cdf(x: float, dof: float) -> float:
    """Return the probability that chi-square is at most ``x``.

    Args:
        x: Quantile, 0 or more.
        dof: Degrees of freedom; truncated to a whole number of at least 1, and finite.

    References:
        Abramowitz & Stegun 26.4.4 (odd dof) and 26.4.5 (even dof), summed from the largest term
        on, so that a million degrees of freedom neither overflow nor vanish.

    Example:
        >>> round(chi_square_cdf(3.841458820694124, 1), 12)
        0.95
    """
    if x <= 0:
        return 0.0
    if math.isinf(x):
        return 1.0
    half = x / 2
    first = 0.5 if whole_dof(dof) % 2 else 0.0
    tail = math.erfc(math.sqrt(half)) if first else 0.0
    tail += math.fsum(_poisson_terms(half, first, whole_dof(dof) / 2 - 1))
    return min(1.0, max(0.0, 1 - tail))


def _poisson_terms(half: float, first: float, last: float) -> Iterator[float]:
    """Yield ``exp(-half) * half**k / k!`` for k from ``first`` to ``last``, less what is lost.

    Each follows from its neighbour, outwards from the largest and as far as a sum can tell.
    """
    if last < first:
        return
    peak = first + min(last - first, max(0.0, math.floor(half - first)))
    largest = _poisson_term(half, peak)
    yield largest
    below = ((peak - k) / half for k in range(int(peak - first)))
    above = (half / (peak + 1 + k) for k in range(int(last - peak)))
    for ratios in (below, above):
        terms = accumulate(ratios, mul, initial=largest)
        next(terms)
        yield from takewhile(lambda term: term > _LOST * largest, terms)


def _poisson_term(half: float, k: float) -> float:
    """Return ``exp(-half) * half**k / k!``; of large k by Stirling's series, which cancels nothing.

    References:
        Abramowitz & Stegun 6.1.41; the next term is below 1e-17 from k = 100 on.
    """
    if k < _STIRLING:
        return math.exp(k * math.log(half) - half - math.lgamma(k + 1))
    off = (half - k) / k
    series = 1 / (12 * k) - 1 / (360 * k**3) + 1 / (1260 * k**5)
    return math.exp(k * (math.log1p(off) - off) - series) / math.sqrt(2 * math.pi * k)


@lru_cache(maxsize=1024)
def chi_square_quantile(p: float, dof: float) -> float:
    """Return the chi-square below which lies the probability ``p``.

    Args:
        p: Probability, 0 < p < 1.
        dof: Degrees of freedom; truncated to a whole number of at least 1, and finite.

    Raises:
        ValueError: If ``p`` is not between 0 and 1.

    References:
        Abramowitz & Stegun 26.4.17 (Wilson–Hilferty) for the start, then Newton's method on
        26.4.4 and 26.4.5; above 100,000 degrees of freedom the start, good to 1e-7, stands.

    Example:
        >>> round(chi_square_quantile(0.95, 1), 6)
        3.841459
    """
    if not 0 < p < 1:
        raise ValueError(f"a probability lies between 0 and 1, got {p}")
    nu = whole_dof(dof)
    spread = 2 / (9 * nu)
    x = nu * max(1 - spread + normal_quantile(p) * math.sqrt(spread), 0.01) ** 3
    if nu > _MANY_DOF:
        return x
    for _ in range(60):
        density = math.exp((nu / 2 - 1) * math.log(x) - x / 2 - math.lgamma(nu / 2) - _LN2 * nu / 2)
        better = max(x - (chi_square_cdf(x, nu) - p) / density, x / 10)
        if abs(better - x) <= 1e-12 * x:
            break
        x = better
    return x


def coverage_factor(dof: float, coverage: float = COVERAGE) -> float:
    """Return k, so that ``k*u`` covers the two-sided probability ``coverage``."""
    return t_quantile((1 + coverage) / 2, whole_dof(dof))


def expanded(measured: Measured, coverage: float = COVERAGE) -> float:
    """Return U = k·u in the unit of ``measured``."""
    return coverage_factor(measured.dof, coverage) * measured.u


def effective_dof(contributions: Iterable[Contribution]) -> float:
    """Return the effective degrees of freedom of independent contributions.

    References:
        JCGM 100:2008, equation (G.2b), Welch–Satterthwaite.
    """
    terms = list(contributions)
    variance = sum(term.u**2 for term in terms)
    spread = sum(term.u**4 / term.dof for term in terms)
    return variance**2 / spread if spread > 0 else math.inf


def combine(
    value: float, unit: str, contributions: Iterable[Contribution], *, n: int = 1
) -> Measured:
    """Return a measured value from its budget of independent contributions.

    Args:
        value: The estimate.
        unit: SI unit of the estimate.
        contributions: Standard uncertainties in ``unit``; those of zero are left out.
        n: Number of observations.

    References:
        JCGM 100:2008, equation (10) with independent inputs, and (G.2b).
    """
    budget = tuple(term for term in contributions if term.u != 0)
    u = math.sqrt(sum(term.u**2 for term in budget))
    return Measured(value=value, u=u, unit=unit, dof=effective_dof(budget), n=n, budget=budget)


def propagate(
    value: float,
    unit: str,
    inputs: Iterable[tuple[float, Measured]],
    extra: Iterable[Contribution] = (),
) -> Measured:
    """Return a value computed from measured inputs, with errors they share taken once.

    Args:
        value: The computed estimate.
        unit: Its SI unit.
        inputs: Pairs of sensitivity coefficient (unit / input's unit) and input.
        extra: Further contributions in ``unit``.

    References:
        JCGM 100:2008, equation (13); contributions of one source that are common are fully
        correlated, all others independent.
    """
    pairs = list(inputs)
    terms = [part for factor, item in pairs for part in _scaled_budget(item, factor)]
    n = min((item.n for _, item in pairs), default=1)
    return combine(value, unit, _merge_common([*terms, *extra]), n=n)


def _scaled_budget(item: Measured, factor: float) -> list[Contribution]:
    budget = item.budget or (Contribution(source="input", u=item.u, dof=item.dof),)
    return [part.scaled(factor) for part in budget]


def _merge_common(terms: list[Contribution]) -> list[Contribution]:
    """Add the signed contributions of each common source; keep the others apart."""
    merged: dict[str, Contribution] = {}
    separate: list[Contribution] = []
    for term in terms:
        if not term.common:
            separate.append(term)
            continue
        known = merged.get(term.source)
        total = term.u + (known.u if known else 0.0)
        merged[term.source] = Contribution(
            source=term.source, u=total, dof=term.dof, common=True, note=term.note
        )
    return [*separate, *merged.values()]
