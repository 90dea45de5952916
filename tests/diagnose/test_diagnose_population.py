"""Over simulated boards: as good as the best answer there can be, and as sure as it is right."""

from __future__ import annotations

import diagnose_boards as boards
import diagnose_optimum as optimum
import diagnose_population as population
import numpy as np
import pytest

from benchtool.diagnose.model import make_model
from benchtool.diagnose.posterior import simulate, weigh_single

N = 1500


def engine_logs(board, letters, seen):
    model = make_model(boards.make_layout(board, letters), boards.equal_priors())
    weighed = model.weigh(seen)
    rows = np.full((len(population.FAULTS), seen.shape[1]), -np.inf)
    for k, name in enumerate(population.FAULTS):
        if name in model.names:
            rows[k] = weighed.evidence()[model.names.index(name)]
    return model, weighed, rows


def drawn(board, letters, n=N, **how):
    rng = np.random.default_rng(20)
    labels, figures = population.draw(board, n, rng, **how)
    seen = population.measure(board, figures, letters, rng)
    runs = np.isfinite(seen).all(axis=0)
    return labels[runs], seen[:, runs]


@pytest.mark.parametrize("board", population.BOARDS, ids=lambda item: item.name)
@pytest.mark.parametrize("letters", ["O", "OKS"])
def test_the_first_suspect_is_right_as_often_as_can_be(board, letters):
    """Within 0.02 of the optimum, and 0.02 bit of its log-loss."""
    labels, seen = drawn(board, letters)
    _, _, ours = engine_logs(board, letters, seen)
    best = optimum.evidence(board, letters, seen, step=0.02)
    at = np.arange(labels.size)
    right = [np.mean(item.argmax(0) == labels) for item in (ours, best)]
    loss = [-np.log2(population.shares(item)[labels, at]).mean() for item in (ours, best)]
    assert abs(right[0] - right[1]) < 0.02
    assert loss[0] - loss[1] < 0.02


def test_what_is_stated_is_what_is_observed():
    """In every tenth of 200 boards or more, within 0.05 and twice the scatter of the count."""
    board = population.BOARDS[0]
    labels, seen = drawn(board, "O", 5000)
    _, _, logs = engine_logs(board, "O", seen)
    chances = population.shares(logs)
    stated, right = chances.max(0), chances.argmax(0) == labels
    tenths = np.minimum((stated * 10).astype(int), 9)
    counted = [t for t in range(10) if np.count_nonzero(tenths == t) >= 200]
    assert len(counted) >= 6
    for t in counted:
        inside = tenths == t
        slack = 2 * np.sqrt(0.25 / inside.sum())
        assert abs(stated[inside].mean() - right[inside].mean()) < 0.05 + slack


def test_the_top_group_holds_the_truth_and_is_small():
    """At least 0.985 with fewer than 2.8 members, from the output alone."""
    board = population.BOARDS[0]
    labels, seen = drawn(board, "O")
    _, _, logs = engine_logs(board, "O", seen)
    inside = logs > logs.max(0) + np.log(1 / 20)
    assert inside[labels, np.arange(labels.size)].mean() >= 0.985
    assert inside.sum(0).mean() < 2.8


def test_certain_is_seldom_wrong_even_when_the_capacitors_scatter_twice_as_much():
    """At most 1 % as believed; at most 4 % of the certain when C scatters twice, and 2 % chance."""
    board = population.BOARDS[0]
    for factors, most in ((None, 0.01), (population.scaled("capacitor", 2.0), 0.06)):
        labels, seen = drawn(board, "O", 3000, factors=factors)
        model, weighed, logs = engine_logs(board, "O", seen)
        chances = weighed.probabilities(cautious=True)
        best = logs.argmax(0)
        rows = np.array([model.names.index(name) for name in population.FAULTS])
        sure = chances[rows[best], np.arange(best.size)] >= 0.95
        assert sure.sum() > 300
        assert np.mean(best[sure] != labels[sure]) <= most


def test_two_faults_are_told_from_one_as_often_as_promised():
    """0.91 with control pin and shunt at 5 % false alarm, within 0.05 and the scatter of 600."""
    board = population.BOARDS[0]
    refused, cuts = [], None
    for two in (False, True):
        _, seen = drawn(board, "OKS", 600, two=two)
        model, weighed, logs = engine_logs(board, "OKS", seen)
        cuts = boards.strangeness_cuts(model, 600) if cuts is None else cuts
        refused.append(np.mean(weighed.strangeness() > cuts[logs.argmax(0)]))
    assert refused[0] == pytest.approx(0.05, abs=0.02)
    assert refused[1] > 0.86 - 0.03


def test_the_test_of_a_single_fault_refuses_one_in_twenty():
    """Boards with C low against boards with C low: p is even between 0 and 1, 5 % below 0.05."""
    board = population.BOARDS[0]
    model = make_model(boards.make_layout(board, "OK"), boards.equal_priors())
    index = model.names.index("C-low")
    usual = simulate(model, model.nodes[index], 2000)
    cut = np.quantile(model.weigh(usual).strangeness(), 0.95)
    assert weigh_single(model, index, float(cut)).p_value == pytest.approx(0.05, abs=0.02)


def test_healthy_boards_are_called_healthy():
    """0.97 at prior odds of 6 to each fault, 1 % for the count of 1,500."""
    board = population.BOARDS[0]
    rng = np.random.default_rng(6)
    z = rng.standard_normal((9, N)) * board.spreads()[:, None]
    seen = population.measure(board, population.healthy(board, z), "O", rng)
    model = make_model(boards.make_layout(board, "O"), boards.equal_priors(healthy_odds=6.0))
    called = model.weigh(seen).probabilities()[:-1].argmax(0) == 0
    assert called.mean() == pytest.approx(0.97, abs=0.014)
