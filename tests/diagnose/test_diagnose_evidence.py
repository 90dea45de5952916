"""Marginal likelihoods, intervals and slopes against integration and formulas of their own."""

from __future__ import annotations

import math
from dataclasses import replace

import diagnose_boards as boards
import diagnose_population as population
import numpy as np
import pytest

from benchtool.diagnose.layout import lay_out
from benchtool.diagnose.model import make_model
from benchtool.diagnose.observables import Observable
from benchtool.diagnose.posterior import estimate, make_posterior
from benchtool.diagnose.tables import Boards, tabulate
from benchtool.model.diagnosis import Reading
from benchtool.uncertainty import normal_cdf

BOARD = population.BOARDS[0]
NOISE = 0.01
"""So wide that a grid of 0.75 % in C, and few points in each other axis, integrate well."""
RIVALS = (("C-low", "RB-low"), ("RA-low", "node-leak-to-supply"), ("RB-high", "C-high"))


def wide_layout(seen):
    layout = boards.make_layout(BOARD, "OK")
    observables = tuple(
        Observable(name=item.name, condition=item.condition, seen=value, u=NOISE)
        for item, value in zip(layout.observables, seen, strict=True)
    )
    return replace(layout, observables=observables, noise=NOISE**2 * np.eye(3))


def brute_force(fault, seen):
    """Every size, C and four other axes on a grid: densities with weights, and C of each point."""
    rules = [np.polynomial.hermite_e.hermegauss(n) for n in (3, 5, 7, 3)]  # RA, RB, VU, split
    z_c = np.linspace(-4, 4, 33)
    rules.insert(2, (z_c, np.exp(-(z_c**2) / 2)))
    n = 60
    top = population.top_effect(BOARD, fault)
    effects = population.LOW * (top / population.LOW) ** ((np.arange(n) + 0.5) / n)
    x = population.sizes_for(BOARD, fault, 0, effects)
    axes = np.meshgrid(*(points for points, _ in rules), indexing="ij")
    weights = np.einsum("a,b,c,d,e->abcde", *(w / w.sum() for _, w in rules)).ravel()
    z = np.zeros((9, weights.size, 1))
    for i, axis in enumerate(axes):
        z[i, :, 0] = axis.ravel() * BOARD.spreads()[i]
    figures = population.hurt(fault, population.healthy(BOARD, z), x)
    rows, _ = population.observe(BOARD, figures, "OK")
    apart = (rows - np.asarray(seen)[:, None, None]) / NOISE
    density = np.exp(-(apart**2).sum(0) / 2) / (NOISE * math.sqrt(2 * math.pi)) ** 3
    return density * weights[:, None] / n, np.broadcast_to(figures["c"], density.shape)


def typical_board(fault, effect=0.15):
    x = population.sizes_for(BOARD, fault, 0, np.array([effect]))
    rows, _ = population.observe(
        BOARD, population.hurt(fault, population.healthy(BOARD, np.zeros((9, 1))), x), "OK"
    )
    return rows[:, 0]


@pytest.fixture(scope="module")
def seen():
    return typical_board("C-low") + np.array([0.004, -0.006, 0.003])


@pytest.mark.parametrize("names", RIVALS, ids="-or-".join)
def test_marginal_likelihoods_are_those_of_integration_on_a_grid(names):
    """To 1 %, and so are Bayes factors; a rival that needs the tails of the scatter, to 3 %."""
    seen = typical_board(names[0], 0.08) + np.array([0.004, -0.006, 0.003])
    model = make_model(wide_layout(seen), boards.equal_priors())
    ours = model.weigh(seen[:, None]).by_scatter[:, 0, 0]
    for name, within in zip(names, (0.01, 0.03), strict=True):
        whole = math.log(brute_force(name, seen)[0].sum())
        assert ours[model.names.index(name)] == pytest.approx(whole, abs=within)


def test_the_interval_of_a_size_is_that_of_integration_on_a_grid(seen):
    """JCGM 101: quantiles of the weighted grid; within 0.3 %, a step of the grid being 0.5 %."""
    plain = boards.equal_priors()
    alone = replace(plain, scatters=plain.scatters[:1])
    posterior = make_posterior(make_model(wide_layout(seen), alone))
    ours = estimate(posterior, posterior.model.names.index("C-low"))
    weights, farads = brute_force("C-low", seen)
    order = np.argsort(farads.ravel())
    level = np.cumsum(weights.ravel()[order]) / weights.sum()
    theirs = np.interp((0.025, 0.975), level, farads.ravel()[order])
    assert (ours.lower, ours.upper) == pytest.approx(tuple(theirs), rel=3e-3)
    assert ours.lower < ours.value < ours.upper


def test_the_sensitivities_are_those_of_the_notes():
    """VU with VL tracking +2.164 | 0; VL alone -0.721 | -1.443; C +1 | +1."""
    layout = boards.make_layout(BOARD, "O")
    healthy_boards = Boards.of(layout)
    model = make_model(layout, boards.equal_priors(healthy_odds=1.0))
    slopes = tabulate(healthy_boards, model.hypotheses[0], layout.observables).slopes[0]
    per_unit = {
        axis.name: slopes[:, i] / axis.u for i, axis in enumerate(healthy_boards.deviations.axes)
    }
    assert per_unit["upper_threshold"] == pytest.approx((2.164, 0.0), abs=2e-3)
    assert per_unit["threshold_split"] == pytest.approx((-0.721, -1.443), abs=2e-3)
    assert per_unit["C"] == pytest.approx((1.0, 1.0), abs=1e-3)


@pytest.mark.parametrize(
    ("fault", "size", "high", "low"),
    [
        ("C-leaky", 430e6, 1.164 * 430e3 / 430e6, -330e3 / 430e6),
        ("discharge-leak", 1e-7, 2.164 * 1e-7 * 100e3 / 12 / 1.0, 0.0),
        ("upper-threshold", 1e-3, 2.885e-3, 1.443e-3),
        ("lower-threshold", 1e-3, -0.721e-3, -1.443e-3),
    ],
)
def test_a_small_fault_moves_the_times_as_the_notes_say(fault, size, high, low):
    """One part in a thousand: the second order is below 1 % of it."""
    layout = boards.make_layout(BOARD, "O")
    model = make_model(layout, boards.equal_priors(healthy_odds=1.0))
    hypothesis = model.hypotheses[model.names.index(fault)]
    moved = tabulate(model.boards, hypothesis, layout.observables, np.array([size])).means[0]
    shift = moved - model.nodes[0].table.means[0]
    assert shift == pytest.approx((high, low), rel=1e-2, abs=1e-6)


def test_a_coarse_grid_of_sizes_leaves_no_gaps():
    """Evidence on a grid four times as coarse is the same, though measured to 0.05 %."""
    priors = boards.equal_priors()
    layout = boards.make_layout(BOARD, "OKS")
    rng = np.random.default_rng(4)
    labels, figures = population.draw(BOARD, 200, rng)
    seen = population.measure(BOARD, figures, "OKS", rng)
    fine, coarse = (
        make_model(layout, replace(priors, sizes=replace(priors.sizes, step=step)))
        .weigh(seen)
        .evidence()[:-1]
        for step in (0.005, 0.02)
    )
    live = fine > fine.max(0) - 5
    assert np.abs(fine - coarse)[live].max() < 0.02
    assert labels.size == 200


def test_an_in_circuit_bound_weighs_as_the_chance_that_it_holds():
    """RB 330k against at least 335k with u 1 %, its own scatter being 0.6 %."""
    stage, design = boards.make_stage(BOARD)
    high, low, _ = population.times(population.healthy(BOARD, np.zeros((9, 1))))
    bound = Reading(kind="part", part="RB", value=335e3, u=3.35e3, unit="ohm", way="at-least")
    evidence = []
    for readings in ((), (bound,)):
        given = boards.make_evidence(float(high[0]), float(low[0]), *readings)
        model = make_model(lay_out(given, stage, design), boards.equal_priors(healthy_odds=1.0))
        evidence.append(make_posterior(model).evidence[0])
    # The times narrow RB's scatter little: they fix RB times C, and C scatters five times as much.
    u = math.hypot(0.01, 0.006)
    expected = 1 - normal_cdf(math.log(335e3 / 330e3) / u)
    assert math.exp(evidence[1] - evidence[0]) == pytest.approx(expected, abs=0.02)
