"""The U that a plan expects, held against what measuring says of simulated captures."""

import math

import numpy as np
import pytest
from judged_boards import board

from benchtool.judge.plan_figures import Counts, Cycle, Setting, expect_figures, expect_single
from benchtool.judge.plan_sampling import Sampling, sample_edges
from benchtool.judge.responses import respond_nominally
from benchtool.model.design import Ic
from benchtool.model.plan import Means
from benchtool.model.quantity import Measured
from benchtool.pipeline import measure
from benchtool.simulation import Acquisition, simulate_stage
from benchtool.uncertainty import expanded

STAGE, DESIGN = board(ic=Ic(family="cmos"))
NOMINAL = respond_nominally(STAGE, DESIGN)
PERIOD_S = NOMINAL["period"]
CYCLE = Cycle(t_high=NOMINAL["t_high"], t_low=NOMINAL["t_low"], period=PERIOD_S)
QUANTITIES = ("t_high", "t_low", "period", "frequency", "duty")
SEEDS = 24


def compare(per_period: float, n: int, sd_rel: float, **means: object) -> dict[str, float]:
    """Return rms measured U over expected U, for records that hold n to n + 1 periods.

    ``measure`` is the judge here: its own coverage is tested elsewhere, against exact truth.
    """
    rate_hz = per_period / PERIOD_S
    kind = means.pop("kind", "waveform")
    setting = Setting(
        cycle=CYCLE,
        sampling=sample_edges(Means(**means), rate_hz, 12.0),
        means=Means(period_sd_rel=sd_rel, **means),
    )
    ratios: dict[str, list[float]] = {name: [] for name in QUANTITIES}
    for seed in range(SEEDS):
        acquisition = Acquisition(
            rate_hz=rate_hz,
            duration_s=(n + 0.9) * PERIOD_S,
            kind=kind,
            jitter_rel=sd_rel,
            **means,
        )
        capture, _ = simulate_stage(STAGE, DESIGN, acquisition, seed=seed)
        timing = measure(capture).results[0].timing
        for name in QUANTITIES:
            seen = getattr(timing, name)
            if isinstance(seen, Measured):
                counts = Counts(t_high=seen.n, t_low=seen.n, period=seen.n)
                ratio = expanded(seen) / expanded(expect_figures(setting, counts)[name])
                ratios[name].append(ratio)
    return {name: math.sqrt(np.mean(np.square(row))) for name, row in ratios.items() if row}


@pytest.mark.parametrize(
    ("per_period", "n", "sd_rel"), [(2000.37, 10, 1e-3), (2000.37, 60, 5e-4), (200000.37, 25, 1e-4)]
)
def test_where_the_scatter_rules_plan_and_measurement_agree(
    per_period: float, n: int, sd_rel: float
) -> None:
    """U measured from n intervals scatters by 1/√(2n), at most 22 %; over 24 seeds by 5 %.

    Of some 25 on a grid two ways to say U meet, of which measuring takes the smaller.
    """
    for name, ratio in compare(per_period, n, sd_rel, kind="sampled-logic").items():
        assert 0.85 < ratio < 1.2, name


@pytest.mark.parametrize(
    ("per_period", "n", "sd_rel"), [(300.37, 8, 3e-5), (300.37, 25, 3e-5), (500.37, 45, 2e-5)]
)
def test_where_the_grid_rules_they_agree_within_a_quarter(
    per_period: float, n: int, sd_rel: float
) -> None:
    """Rounding errors repeat from seed to seed and do not average: f is one fraction."""
    for name, ratio in compare(per_period, n, sd_rel).items():
        assert 0.75 < ratio < 1.25, name


@pytest.mark.parametrize("n", [3, 5])
def test_of_a_few_intervals_they_agree_within_a_third(n: int) -> None:
    """Student's k of 2 to 4 degrees of freedom is 2.8 to 4.3, so that chance moves U by a third."""
    for name, ratio in compare(2000.37, n, 1e-3).items():
        assert 0.67 < ratio < 1.4, name


def test_rounding_that_evens_out_along_a_record_scatters_the_more_inside_it() -> None:
    """Three periods of 200 and 201 steps scatter by 1.2 times what one of them alone is off.

    Nothing but the grid is at work, so that chance enters by the phase alone.
    """
    ratio = compare(200.37, 3, 1e-6)["period"]
    assert 0.9 < ratio < 1.1


def test_scatter_that_rounding_leaves_behind_is_expected() -> None:
    """Of 50 widths with a twentieth of a step of their own measuring takes four times as much.

    Within a factor of 1.67: half of the records show none, and the rms rests on the others.
    """
    rate_hz, n, sd_rel = 500.37 / PERIOD_S, 50, 1e-4
    setting = Setting(
        cycle=CYCLE,
        sampling=sample_edges(Means(), rate_hz, 12.0),
        means=Means(period_sd_rel=sd_rel),
    )
    seen = []
    for seed in range(SEEDS):
        acquisition = Acquisition(
            rate_hz=rate_hz,
            duration_s=(n + 0.9) * PERIOD_S,
            kind="sampled-logic",
            jitter_rel=sd_rel,
        )
        capture, _ = simulate_stage(STAGE, DESIGN, acquisition, seed=seed)
        seen.append(_scatter(measure(capture).results[0].timing.t_high))
    figures = expect_figures(setting, Counts(t_high=n, t_low=n, period=n))
    expected = _scatter(figures["t_high"])
    assert 0.6 < math.sqrt(np.mean(np.square(seen))) / expected < 1.67
    own = sd_rel * math.sqrt(PERIOD_S * CYCLE.t_high / n)
    assert expected > 2 * own


def _scatter(figure: Measured) -> float:
    return sum(term.u for term in figure.budget if term.source == "scatter")


@pytest.mark.parametrize(("bandwidth", "bits", "noise_v"), [(1.2, 8, 0.05), (4.0, 12, 0.02)])
def test_slow_edges_with_noise_and_codes_agree(bandwidth: float, bits: int, noise_v: float) -> None:
    """One-pole edges of 5 to 18 samples; the period from both directions is a little surer."""
    means = {"bandwidth_hz": bandwidth, "bits": bits, "noise_v": noise_v}
    for name, ratio in compare(1000.37, 12, 5e-4, **means).items():
        assert 0.75 < ratio < 1.25, name


@pytest.mark.parametrize("bandwidth", [0.3, 1.2])
def test_noise_alone_on_slow_edges_agrees(bandwidth: float) -> None:
    """Nothing but noise over slew scatters, so that the slew and the points of a fit are at stake.

    The fit takes the slew over its window, a little less than in the middle; and at 0.3 Hz an edge
    takes 7 % of the low time, so that levels settle less than planned.
    """
    means = {"bandwidth_hz": bandwidth, "noise_v": 0.3}
    for name, ratio in compare(1000.37, 20, 0.0, **means).items():
        assert 0.9 < ratio < 1.35, name


def test_a_single_interval_is_what_measuring_makes_of_one() -> None:
    """Nothing is estimated: assumed jitter, grid and timebase are the same figures.

    1e-3: the lengths differ by up to a sample in 1000.
    """
    setting = Setting(
        cycle=CYCLE, sampling=sample_edges(Means(), 1000.37 / PERIOD_S, 12.0), means=Means()
    )
    expected = expect_figures(setting, Counts(t_high=1, t_low=1, period=1))
    found = 0
    for seed in range(12):
        acquisition = Acquisition(rate_hz=1000.37 / PERIOD_S, duration_s=1.7 * PERIOD_S)
        capture, _ = simulate_stage(STAGE, DESIGN, acquisition, seed=seed)
        timing = measure(capture).results[0].timing
        for name in QUANTITIES:
            seen = getattr(timing, name)
            if isinstance(seen, Measured) and seen.n == 1:
                assert expanded(seen) == pytest.approx(expanded(expected[name]), rel=1e-3), name
                found += 1
    assert found > 20


def test_the_budget_of_one_interval_is_the_sum_by_hand() -> None:
    setting = Setting(
        cycle=CYCLE,
        sampling=Sampling(step_s=0.01, grid_s=0.01),
        means=Means(timebase_rel=1e-4, jitter_rel=1e-3),
    )
    by_hand = math.sqrt((10e-3**2 + 1e-3**2) / 3 + 0.01**2 / 6)
    assert expect_single(setting, 10.0).u == pytest.approx(by_hand)


def test_the_timebase_cancels_in_the_duty_and_in_nothing_else() -> None:
    def expected(timebase_rel: float) -> dict[str, Measured]:
        means = Means(timebase_rel=timebase_rel, period_sd_rel=1e-6)
        setting = Setting(cycle=CYCLE, sampling=sample_edges(means, 1e3, 12.0), means=means)
        return expect_figures(setting, Counts(t_high=20, t_low=20, period=20))

    good, bad = expected(1e-6), expected(1e-2)
    assert bad["duty"].u == pytest.approx(good["duty"].u)
    for name in ("t_high", "t_low", "period", "frequency"):
        assert bad[name].u > 20 * good[name].u


def test_a_figure_without_an_interval_is_left_out() -> None:
    setting = Setting(cycle=CYCLE, sampling=sample_edges(Means(), 1e3, 12.0), means=Means())
    assert set(expect_figures(setting, Counts(t_high=1, t_low=0, period=0))) == {"t_high"}


def test_edges_within_a_sample_are_not_interpolated() -> None:
    fast = sample_edges(Means(bandwidth_hz=1e6, bits=8, noise_v=0.1), 1e3, 12.0)
    assert not fast.resolved
    slow = sample_edges(Means(bandwidth_hz=30.0, bits=8, noise_v=0.1), 1e3, 12.0)
    assert slow.resolved
    assert slow.edge_u_s > 0
