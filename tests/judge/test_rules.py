"""Decision rules against JCGM 106 and ILAC-G8, and at their exact boundaries."""

import math
import tomllib
from decimal import Decimal
from pathlib import Path

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy import integrate, stats

from benchtool.judge.rules import (
    conformance_probability,
    decide,
    guard_band,
    scatter_conformance_probability,
)
from benchtool.judge.verdict import WORST_FIRST, worst
from benchtool.model.design import Rule
from benchtool.model.quantity import Measured

PUBLISHED = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "conformity_examples.toml").read_text("utf-8")
)
TWO_SIGMA = 0.954499736103642  # coverage of k = 2, which ILAC-G8 and JCGM 106 use


def _measured(value: float, u: float, dof: float = math.inf) -> Measured:
    return Measured(value=value, u=u, unit="s", dof=dof)


@pytest.mark.parametrize("name", ["breakdown_voltage", "burst_pressure", "viscosity"])
def test_jcgm_106_conformance_probability(name: str) -> None:
    case = PUBLISHED[name]
    p = conformance_probability(
        _measured(case["value"], case["u"]), case.get("lower"), case.get("upper")
    )
    assert p == pytest.approx(case["exact"], abs=1e-12)
    assert round(p, 2) == case["published"]


def test_jcgm_106_one_sided_distances() -> None:
    case = PUBLISHED["one_sided"]
    for p, z in zip(case["p"], case["z"], strict=True):
        assert conformance_probability(_measured(z, 1.0), 0.0, None) == pytest.approx(p, abs=1e-12)
        assert conformance_probability(_measured(-z, 1.0), None, 0.0) == pytest.approx(p, abs=1e-12)


def test_jcgm_106_risks_of_a_lot_of_resistors() -> None:
    """The published global risks follow when ``decide`` sorts the lot."""
    case = PUBLISHED["resistor_lot"]
    lower, upper, u = case["lower"], case["upper"], case["u"]
    process = stats.norm(case["process_mean"], case["process_sd"])
    accepted = decide(case["process_mean"], case["w"], lower, upper)
    assert (accepted.accept_lower, accepted.accept_upper) == pytest.approx((1499.82, 1500.18))

    def joint(true: float) -> float:
        seen = stats.norm(true, u)
        passed = seen.cdf(accepted.accept_upper) - seen.cdf(accepted.accept_lower)
        return float(process.pdf(true) * passed)

    inside = integrate.quad(joint, lower, upper)[0]
    outside = (
        integrate.quad(joint, upper, upper + 1)[0] + integrate.quad(joint, lower - 1, lower)[0]
    )
    conforming = process.cdf(upper) - process.cdf(lower)
    assert conforming == pytest.approx(case["exact_conforming"], abs=1e-9)
    assert outside == pytest.approx(case["exact_consumer_risk"], abs=1e-7)
    assert conforming - inside == pytest.approx(case["exact_producer_risk"], abs=1e-7)
    assert round(outside, 2) == case["published_consumer_risk"]
    assert round(conforming - inside, 2) == case["published_producer_risk"]


@pytest.mark.parametrize("case", PUBLISHED["guard"], ids=lambda case: case["name"])
def test_ilac_g8_greatest_risk_of_an_accepted_item(case: dict[str, float]) -> None:
    u = 1.0
    w = guard_band(u, math.inf, Rule(guard=case["guard"], coverage=TWO_SIGMA))
    assert w == pytest.approx(case["guard"] * 2, abs=1e-12)
    accepted = decide(10 - w, w, None, 10.0)
    assert accepted.verdict == "pass"
    risk = 1 - conformance_probability(_measured(10 - w, u), None, 10.0)
    assert risk <= case["risk"]


@pytest.mark.parametrize("case", PUBLISHED["nonbinary"], ids=lambda case: str(case["value"]))
def test_ilac_g8_nonbinary_upper_limit(case: dict[str, object]) -> None:
    assert decide(case["value"], 0.3, None, 10.0, "nonbinary").verdict == case["verdict"]


@pytest.mark.parametrize("case", PUBLISHED["nonbinary"], ids=lambda case: str(case["value"]))
def test_ilac_g8_nonbinary_lower_limit_is_its_mirror_image(case: dict[str, object]) -> None:
    assert decide(-case["value"], 0.3, -10.0, None, "nonbinary").verdict == case["verdict"]


@pytest.mark.parametrize(
    ("value", "verdict"),
    [
        (9.6999, "fail"),
        (9.7, "undecided"),
        (10.2999, "undecided"),
        (10.3, "pass"),
        (15.0, "pass"),
        (19.7, "pass"),
        (19.7001, "undecided"),
        (20.3, "undecided"),
        (20.3001, "fail"),
    ],
)
def test_guarded_rule_at_its_boundaries(value: float, verdict: str) -> None:
    assert decide(value, 0.3, 10.0, 20.0).verdict == verdict


@pytest.mark.parametrize(
    ("value", "verdict"), [(9.9999, "fail"), (10.0, "pass"), (20.0, "pass"), (20.0001, "fail")]
)
def test_simple_rule_knows_no_middle(value: float, verdict: str) -> None:
    w = guard_band(5.0, 3, Rule(name="simple"))
    assert w == 0.0
    assert decide(value, w, 10.0, 20.0, "simple").verdict == verdict


def test_without_a_guard_band_the_comparison_is_exact() -> None:
    assert decide(math.nextafter(10.0, 0.0), 0.0, 10.0, None).verdict == "fail"
    assert decide(10.0, 0.0, 10.0, None).verdict == "pass"


def test_slack_is_a_few_units_in_the_last_place_and_no_more() -> None:
    edge = 10.0 + 0.3
    assert decide(edge - 3 * math.ulp(edge), 0.3, 10.0, None).verdict == "pass"
    assert decide(edge - 9 * math.ulp(edge), 0.3, 10.0, None).verdict == "undecided"


SMALL_DECIMALS = st.decimals(
    min_value=Decimal("0.001"), max_value=Decimal(1000), places=3, allow_nan=False
)


@settings(derandomize=True, deadline=None)
@given(limit=SMALL_DECIMALS, w=SMALL_DECIMALS, scale=st.integers(-9, 3))
def test_equality_in_decimal_figures_passes_in_binary(
    limit: Decimal, w: Decimal, scale: int
) -> None:
    """L + w, H − w, L − w and H + w computed in decimals are on the kind side of the boundary."""
    L, W = limit.scaleb(scale), w.scaleb(scale)
    H = L + 10 * W
    bounds = (float(W), float(L), float(H))
    assert decide(float(L + W), *bounds).verdict == "pass"
    assert decide(float(H - W), *bounds).verdict == "pass"
    assert decide(float(L - W), *bounds).verdict == "undecided"
    assert decide(float(H + W), *bounds).verdict == "undecided"
    step = W / 1_000_000
    assume(step > L * Decimal("1e-12"))
    assert decide(float(L + W - step), *bounds).verdict == "undecided"
    assert decide(float(L - W - step), *bounds).verdict == "fail"


FINITE = st.floats(-1e6, 1e6)


@settings(derandomize=True, deadline=None)
@given(
    limit=FINITE,
    w=st.floats(0, 1e5),
    values=st.tuples(FINITE, FINITE),
    name=st.sampled_from(["guarded", "nonbinary"]),
)
def test_a_value_further_inside_a_limit_never_has_the_worse_verdict(
    limit: float, w: float, values: tuple[float, float], name: str
) -> None:
    small, large = sorted(values)

    def rank(value: float, lower: float | None, upper: float | None) -> int:
        return WORST_FIRST.index(decide(value, w, lower, upper, name).verdict)

    assert rank(small, limit, None) <= rank(large, limit, None)
    assert rank(small, None, limit) >= rank(large, None, limit)


@settings(derandomize=True, deadline=None)
@given(
    lower=FINITE,
    width=st.floats(0, 1e6),
    w=st.floats(0, 1e5),
    value=FINITE,
    name=st.sampled_from(["guarded", "nonbinary"]),
)
def test_two_limits_give_the_worse_of_either_alone(
    lower: float, width: float, w: float, value: float, name: str
) -> None:
    upper = lower + width
    alone = [decide(value, w, *one, name).verdict for one in ((lower, None), (None, upper))]
    assert decide(value, w, lower, upper, name).verdict == worst(alone)


@settings(derandomize=True, deadline=None)
@given(
    lower=FINITE,
    width=st.floats(0, 1e6),
    value=FINITE,
    ws=st.tuples(st.floats(0, 1e5), st.floats(0, 1e5)),
)
def test_more_uncertainty_never_decides_more(
    lower: float, width: float, value: float, ws: tuple[float, float]
) -> None:
    small, large = sorted(ws)
    with_small = decide(value, small, lower, lower + width).verdict
    with_large = decide(value, large, lower, lower + width).verdict
    assert with_large in (with_small, "undecided")


@settings(derandomize=True, deadline=None)
@given(
    lower=FINITE,
    width=st.floats(0, 1e6),
    value=FINITE,
    u=st.floats(1e-6, 1e5),
    dof=st.integers(1, 600),
)
def test_a_pass_means_a_conformance_probability_of_at_least_the_coverage(
    lower: float, width: float, value: float, u: float, dof: int
) -> None:
    rule = Rule(coverage=0.95)
    upper = lower + width
    w = guard_band(u, dof, rule)
    assume(w > 1e-6 * abs(lower))
    p = conformance_probability(_measured(value, u, dof), lower, upper)
    verdict = decide(value, w, lower, upper).verdict
    # 2.5 % at most beyond each limit; 1e-6 for the rounding of y - L against w.
    if verdict == "pass":
        assert p >= 0.95 - 1e-6
    if verdict == "fail":
        assert p <= 0.025 + 1e-6


def test_no_zone_is_left_between_limits_closer_than_two_guard_bands() -> None:
    narrow = decide(10.05, 0.06, 10.0, 10.1)
    assert (narrow.accept_lower, narrow.accept_upper, narrow.zone) == (None, None, False)
    assert narrow.verdict == "undecided"
    assert decide(10.17, 0.06, 10.0, 10.1).verdict == "fail"
    assert decide(10.05, 0.06, 10.0, 10.1, "nonbinary").verdict == "conditional-pass"


def test_two_guard_bands_that_just_meet_leave_one_point() -> None:
    single = decide(0.2, 0.1, 0.1, 0.3)
    assert single.zone
    assert single.verdict == "pass"
    assert single.accept_lower == pytest.approx(0.2, abs=1e-15)
    assert single.accept_upper == pytest.approx(0.2, abs=1e-15)


def test_one_limit_leaves_the_other_side_open() -> None:
    upper_only = decide(5.0, 0.1, None, 10.0)
    assert (upper_only.accept_lower, upper_only.accept_upper) == (None, pytest.approx(9.9))
    assert upper_only.side == "upper"
    assert decide(1e9, 0.1, 10.0, None).verdict == "pass"


def test_the_deciding_limit_is_the_nearest_or_the_one_crossed() -> None:
    assert decide(11.0, 0.1, 10.0, 20.0).side == "lower"
    beyond = decide(22.0, 0.1, 10.0, 20.0)
    assert (beyond.side, beyond.margin) == ("upper", -2.0)


def test_no_limit_at_all_is_no_decision() -> None:
    with pytest.raises(ValueError, match="needs a lower or an upper"):
        decide(1.0, 0.1, None, None)


def test_guard_band_is_guard_times_student_t_times_u() -> None:
    w = guard_band(0.2, 9.7, Rule(guard=0.83, coverage=0.9))
    assert w == pytest.approx(0.83 * stats.t.ppf(0.95, 9) * 0.2, rel=1e-12)


def test_no_uncertainty_needs_no_guard_band() -> None:
    assert guard_band(0.0, 1, Rule()) == 0.0
    exact = _measured(10.0, 0.0)
    assert conformance_probability(exact, 10.0, 11.0) == 1.0
    assert conformance_probability(exact, 10.1, 11.0) == 0.0
    assert conformance_probability(exact, None, 9.9) == 0.0


def test_conformance_probability_has_students_tails() -> None:
    p = conformance_probability(_measured(10.0, 1.0, 4), 8.0, 13.0)
    assert p == pytest.approx(stats.t.cdf(3, 4) - stats.t.cdf(-2, 4), abs=1e-12)


def test_scatter_conformance_is_chi_square() -> None:
    s, dof, lower, upper = 2e-3, 24, 1.5e-3, 2.5e-3
    seen = Measured(value=s, u=s / math.sqrt(2 * dof), unit="s", dof=dof)
    p = scatter_conformance_probability(seen, lower, upper)
    expected = stats.chi2.cdf(dof * (s / lower) ** 2, dof) - stats.chi2.cdf(
        dof * (s / upper) ** 2, dof
    )
    assert p == pytest.approx(expected, abs=1e-12)
    assert scatter_conformance_probability(seen, None, upper) == pytest.approx(
        stats.chi2.sf(dof * (s / upper) ** 2, dof), abs=1e-12
    )
    assert scatter_conformance_probability(seen, 0.0, None) == 1.0


def test_scatter_conformance_covers_as_stated() -> None:
    """Of many boards whose sd is at the limit, the stated probability is uniform."""
    rng = stats.chi2(9)
    draws = rng.ppf([(k + 0.5) / 400 for k in range(400)])
    limit = 1.0
    p = [
        scatter_conformance_probability(
            Measured(value=math.sqrt(x / 9) * limit, u=0.1, unit="s", dof=9), None, limit
        )
        for x in draws
    ]
    # Deciles of 400 evenly spaced draws: one draw of grain.
    for decile in range(1, 10):
        share = sum(value <= decile / 10 for value in p) / 400
        assert share == pytest.approx(decile / 10, abs=1 / 400)


def test_worst_verdict_follows_the_order() -> None:
    assert worst(reversed(WORST_FIRST)) == "fail"
    assert worst(["pass", "conditional-pass", "undecided", "unusable"]) == "unusable"
    assert worst(["pass", "conditional-pass", "conditional-fail"]) == "conditional-fail"
    assert worst([]) is None
