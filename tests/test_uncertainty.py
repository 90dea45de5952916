"""Uncertainty against the GUM's worked examples and against scipy's distributions."""

import math
import tomllib
from pathlib import Path
from statistics import fmean

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import (
    chi_square_cdf,
    chi_square_quantile,
    combine,
    coverage_factor,
    effective_dof,
    expanded,
    propagate,
    t_cdf,
    t_quantile,
    whole_dof,
)

GUM = tomllib.loads(
    (Path(__file__).parent / "reference" / "gum_examples.toml").read_text(encoding="utf-8")
)

DOFS = (1, 2, 3, 4, 5, 16, 29, 100, 399, 400)


@pytest.mark.parametrize("dof", DOFS)
@pytest.mark.parametrize("t", [-40.0, -2.5, -0.1, 0.0, 0.7, 3.0, 12.7])
def test_student_cdf_agrees_with_scipy(t: float, dof: int) -> None:
    # 1e-13: the sum has at most 200 terms of order 1.
    assert t_cdf(t, dof) == pytest.approx(stats.t.cdf(t, dof), abs=1e-13)


@pytest.mark.parametrize("dof", [*DOFS, 401, 1000, 100_000])
@pytest.mark.parametrize("p", [0.0005, 0.025, 0.2, 0.5, 0.9, 0.975, 0.995, 0.99865])
def test_student_quantile_agrees_with_scipy(p: float, dof: int) -> None:
    # 1e-8 is what the expansion in 1/dof promises above 400; below, bisection to 1e-13.
    tolerance = 1e-8 if dof > 400 else 1e-11
    assert t_quantile(p, dof) == pytest.approx(stats.t.ppf(p, dof), rel=tolerance, abs=1e-12)


@pytest.mark.parametrize("dof", [401, 1000, 100_000])
@pytest.mark.parametrize("t", [-1e9, -65.0, -12.0, -3.0, -0.5, 0.0, 1.96, 4.0, 11.9, 12.1, 1e5])
def test_student_cdf_of_many_dof_agrees_with_scipy(t: float, dof: int) -> None:
    assert t_cdf(t, dof) == pytest.approx(stats.t.cdf(t, dof), abs=1e-8)


def test_unlimited_dof_give_the_normal_law() -> None:
    assert coverage_factor(math.inf) == pytest.approx(1.959963984540054, abs=1e-15)
    assert t_cdf(1.0, math.inf) == pytest.approx(stats.norm.cdf(1.0), abs=1e-15)


@settings(derandomize=True, deadline=None)
@given(st.floats(0.001, 0.999), st.integers(1, 2000))
def test_student_quantile_inverts_the_cdf(p: float, dof: int) -> None:
    assert t_cdf(t_quantile(p, dof), dof) == pytest.approx(p, abs=1e-8)


@pytest.mark.parametrize("p", [0.0, 1.0, -0.1, 1.5])
def test_a_quantile_of_no_probability_is_refused(p: float) -> None:
    with pytest.raises(ValueError, match="between 0 and 1"):
        t_quantile(p, 5)


@pytest.mark.parametrize("dof", [1, 2, 3, 4, 11, 30, 99, 100, 999, 1000])
@pytest.mark.parametrize("share", [0.01, 0.3, 0.8, 1.0, 1.1, 1.5, 4.0])
def test_chi_square_cdf_agrees_with_scipy(dof: int, share: float) -> None:
    # 1e-11: each term comes from exp(log) of arguments up to 1e3 times the rounding 1e-16.
    assert chi_square_cdf(dof * share, dof) == pytest.approx(
        stats.chi2.cdf(dof * share, dof), abs=1e-11
    )


def test_chi_square_of_a_million_dof_neither_overflows_nor_vanishes() -> None:
    # 1e-8: logarithms of order 1e7 carry 1e-9.
    for share in (0.5, 0.999, 1.0, 1.001, 2.0):
        expected = stats.chi2.cdf(1e6 * share, 1_000_000)
        assert chi_square_cdf(1e6 * share, 1_000_000) == pytest.approx(expected, abs=1e-8)


def test_chi_square_ends() -> None:
    assert chi_square_cdf(0.0, 3) == 0.0
    assert chi_square_cdf(-1.0, 3) == 0.0
    assert chi_square_cdf(math.inf, 3) == 1.0


def test_dof_are_truncated_never_rounded() -> None:
    assert whole_dof(16.99) == 16
    assert whole_dof(0.4) == 1
    assert math.isinf(whole_dof(math.inf))


@pytest.mark.parametrize("u", [0.1, 0.01, 1e-3 / 3, 7e-7])
@pytest.mark.parametrize("dof", [1, 11, 35, 98])
def test_one_contribution_keeps_its_whole_dof_through_the_sums(u: float, dof: int) -> None:
    alone = combine(1.0, "s", [Contribution(source="scatter", u=u, dof=dof)])
    assert whole_dof(alone.dof) == dof


def test_gum_g41_welch_satterthwaite() -> None:
    case = GUM["G41"]
    budget = [
        Contribution(source=f"input {n}", u=u, dof=n - 1)
        for u, n in zip(case["relative_u_percent"], case["n"], strict=True)
    ]
    result = combine(100.0, "1", budget)
    assert result.u == pytest.approx(case["exact_u"], abs=1e-9)
    assert round(result.u, 2) == case["published_u"]
    assert result.dof == pytest.approx(case["exact_dof"], abs=1e-8)
    assert round(effective_dof(budget), 1) == case["published_dof"]


def test_gum_g41_expanded_uncertainty_uses_19_dof_as_published() -> None:
    # 18.9987 truncates to 18; the GUM's text prints 19.0 and takes t(19) = 2.09.
    case = GUM["G41"]
    assert round(coverage_factor(case["published_dof"]), 2) == case["published_t95"]
    assert round(coverage_factor(19) * case["exact_u"], 1) == case["published_U"]


def test_gum_h1_end_gauge() -> None:
    case = GUM["H1"]
    third = 1 / math.sqrt(3)
    difference = combine(
        215.0,
        "m",
        [Contribution(source=name, u=u, dof=dof) for name, u, dof in case["difference"]],
    )
    assert difference.u == pytest.approx(case["exact_u_d"], abs=1e-12)
    length = case["l_s"]
    d_alpha = Measured(value=0.0, u=1e-6 * third, unit="1/K", dof=50)
    d_theta = Measured(value=0.0, u=0.05 * third, unit="1", dof=2)
    standard = Measured(value=length, u=25.0, unit="m", dof=18)
    result = propagate(
        length + 215.0,
        "m",
        [
            (1.0, standard),
            (1.0, difference),
            (-case["nominal_length"] * case["theta_mean"], d_alpha),
            (-case["nominal_length"] * case["alpha_s"], d_theta),
        ],
    )
    assert result.u == pytest.approx(case["exact_u"], rel=1e-12)
    assert round(result.u) == case["published_u"]
    assert whole_dof(result.dof) == case["published_dof"]
    assert result.dof == pytest.approx(case["exact_dof"], abs=1e-6)
    assert round(coverage_factor(result.dof, 0.99), 2) == case["published_t99"]
    # The GUM multiplies the rounded 32 nm by 2.92; unrounded it is 92.5.
    assert round(case["published_u"] * case["published_t99"]) == case["published_U99"]
    assert expanded(result, 0.99) == pytest.approx(92.48, abs=0.01)


def _observed(values: list[float], unit: str) -> Measured:
    """Return a mean whose observations are named, so that shared sets correlate.

    The deviations of the k-th set enter all three quantities as one common error each:
    Σ_k d_ik·d_jk/(n(n−1)) is then the covariance of two means, GUM equation (17).
    """
    mean = fmean(values)
    n = len(values)
    budget = tuple(
        Contribution(
            source=f"set {k}", u=(value - mean) / math.sqrt(n * (n - 1)), dof=n - 1, common=True
        )
        for k, value in enumerate(values)
    )
    u = math.sqrt(sum(term.u**2 for term in budget))
    return Measured(value=mean, u=u, unit=unit, dof=n - 1, n=n, budget=budget)


@pytest.fixture
def impedance() -> dict[str, Measured]:
    case = GUM["H2"]
    V = _observed(case["V_volt"], "V")
    current = _observed([value * 1e-3 for value in case["I_mA"]], "A")
    phase = _observed(case["phi_rad"], "1")
    size = V.value / current.value
    cosine, sine = math.cos(phase.value), math.sin(phase.value)

    def output(value: float, turned: float) -> Measured:
        factors = (value / V.value, -value / current.value, turned)
        inputs = zip(factors, (V, current, phase), strict=True)
        return propagate(value, "ohm", inputs)

    return {
        "V": V,
        "I": current,
        "phi": phase,
        "R": output(size * cosine, -size * sine),
        "X": output(size * sine, size * cosine),
        "Z": output(size, 0.0),
    }


def test_gum_h2_inputs(impedance: dict[str, Measured]) -> None:
    for name, mean, u in zip(
        ("V", "I", "phi"), GUM["H2"]["mean"], GUM["H2"]["u_mean_exact"], strict=True
    ):
        # Published means have 5 to 6 digits.
        assert impedance[name].value == pytest.approx(mean, rel=1e-5)
        assert impedance[name].u == pytest.approx(u, rel=1e-9)


def test_gum_h2_outputs_with_correlated_inputs(impedance: dict[str, Measured]) -> None:
    for name, value, u in zip(
        ("R", "X", "Z"), GUM["H2"]["exact"], GUM["H2"]["u_exact"], strict=True
    ):
        published, published_u = GUM["H2"][name]
        assert impedance[name].value == pytest.approx(value, abs=1e-8)
        # The published value is of rounded means for Z: one unit of its last digit.
        assert impedance[name].value == pytest.approx(published, abs=1e-3)
        assert impedance[name].u == pytest.approx(u, rel=1e-9)
        assert impedance[name].u == pytest.approx(published_u, abs=1e-3)


@pytest.mark.parametrize(("first", "second"), [("R", "X"), ("R", "Z"), ("X", "Z")])
def test_gum_h2_correlation_of_outputs(
    impedance: dict[str, Measured], first: str, second: str
) -> None:
    """The variance of a sum through ``propagate`` holds the covariance of its terms."""
    a, b = impedance[first], impedance[second]
    total = propagate(a.value + b.value, "ohm", [(1.0, a), (1.0, b)])
    r = (total.u**2 - a.u**2 - b.u**2) / (2 * a.u * b.u)
    assert r == pytest.approx(GUM["H2"][f"r_{first}{second}"], abs=5e-4)


def test_gum_h2_would_be_wrong_without_correlations(impedance: dict[str, Measured]) -> None:
    R = impedance["R"]
    separate = [
        (R.value / impedance["V"].value, impedance["V"]),
        (-R.value / impedance["I"].value, impedance["I"]),
        (-impedance["X"].value, impedance["phi"]),
    ]
    alone = combine(
        R.value,
        "ohm",
        [Contribution(source=str(k), u=f * item.u) for k, (f, item) in enumerate(separate)],
    )
    assert alone.u == pytest.approx(GUM["H2"]["u_ignoring_correlation"][0], abs=5e-4)
    assert alone.u > 2.5 * R.u


def test_jcgm_101_sum_of_four_normal_inputs() -> None:
    case = GUM["S1_9_2_2"]
    inputs = [(1.0, Measured(value=0.0, u=1.0, unit="1")) for _ in range(4)]
    total = propagate(0.0, "1", inputs)
    assert total.u == case["u"]
    assert round(expanded(total), 2) == case["interval_95"][1]


def test_jcgm_101_normal_law_is_wide_for_a_dominant_rectangle() -> None:
    """Clause 9.2.4: the GUM's interval is ±19.9 where the true one is ±17.0."""
    case = GUM["S1_9_2_4"]
    inputs = [(1.0, Measured(value=0.0, u=u, unit="1")) for u in (1.0, 1.0, 1.0, 10.0)]
    total = propagate(0.0, "1", inputs)
    assert round(total.u, 1) == case["u"]
    assert round(expanded(total), 1) == case["interval_95_gum"][1]
    draws = np.random.default_rng(20310302).uniform(-1, 1, (4, 400_000)) * math.sqrt(3)
    draws[3] *= 10
    # 0.1: the published last digit; the quantile of 4e5 draws scatters by 0.03.
    assert np.quantile(draws.sum(axis=0), 0.975) == pytest.approx(
        case["interval_95_mc"][1], abs=0.1
    )


def test_an_error_common_to_both_terms_cancels_in_their_difference() -> None:
    timebase = Contribution(source="timebase", u=0.3, common=True)
    scatter = Contribution(source="scatter", u=0.4, dof=9)
    one = combine(10.0, "s", [timebase, scatter], n=10)
    other = combine(9.0, "s", [timebase, scatter], n=7)
    difference = propagate(1.0, "s", [(1.0, one), (-1.0, other)])
    assert difference.u == pytest.approx(0.4 * math.sqrt(2), rel=1e-12)
    assert difference.n == 7
    assert [term.source for term in difference.budget] == ["scatter", "scatter"]


@pytest.mark.parametrize("dof", [1, 2, 5, 31, 999, 20_000])
@pytest.mark.parametrize("p", [1e-6, 0.025, 0.5, 0.975, 0.999])
def test_chi_square_quantile_agrees_with_scipy(p: float, dof: int) -> None:
    """To 1e-8 of itself: what is left of the closed form's digits."""
    assert chi_square_quantile(p, dof) == pytest.approx(stats.chi2.ppf(p, dof), rel=1e-8)


def test_chi_square_quantile_refuses_what_is_no_probability() -> None:
    with pytest.raises(ValueError, match="between 0 and 1"):
        chi_square_quantile(1.0, 3)
