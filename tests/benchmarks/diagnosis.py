"""Hold the diagnosis against the best answer there can be, over simulated boards.

    python tests/benchmarks/diagnosis.py [boards]

Population and Bayes-optimal answers are those of diagnose_population.py and diagnose_optimum.py in
tests/diagnose, which use nothing of the package. Printed, not asserted: value, bound (computed
here), and the figure aimed at. The reliability is over 25,000 boards.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "diagnose"))

import diagnose_boards as boards
import diagnose_optimum as optimum
import diagnose_population as population

from benchtool.diagnose.costs import COSTS
from benchtool.diagnose.engine import CERTAIN
from benchtool.diagnose.layout import lay_out
from benchtool.diagnose.model import Model, Weighed, make_model
from benchtool.diagnose.posterior import make_posterior
from benchtool.diagnose.proposals import rate_readings
from benchtool.model.diagnosis import Evidence, Observation
from benchtool.model.timing import Timing

AIMS = {
    population.BOARDS[0].name: (0.66, 0.85, 0.84, 0.985, 0.987, 0.994, 0.995),
    population.BOARDS[1].name: (0.61, None, None, None, 0.97, None, None),
    population.BOARDS[2].name: (0.55, None, None, None, 0.91, None, None),
    population.BOARDS[3].name: (0.62, None, None, None, 0.99, None, None),
}
BITS = {
    "control-pin": 1.08,
    "node": 0.65,
    "power-up": 0.59,
    "shunt": 0.50,
    "second-supply": 0.15,
    "RB": 0.05,
}
TWO_AIMS = {
    ("100k 330k 47u 12 V cmos", "output"): 0.44,
    ("100k 330k 47u 12 V cmos", "control pin + shunt"): 0.91,
    ("100k 330k 47u 12 V cmos", "+ power-up"): 0.92,
    ("47k 22k 1u 12 V bipolar", "output"): 0.37,
    ("47k 22k 1u 12 V bipolar", "control pin + shunt"): 0.84,
}
RELIABILITY_BOARDS = 25_000
PAIR_BOARDS = 2000
NEXT_BOARDS = 120


class Sample:
    """Boards with one fault each, what is seen of them, and what the engine holds of them."""

    def __init__(
        self,
        board: population.Board,
        letters: str,
        n: int,
        *,
        factors: np.ndarray | None = None,
        two: bool = False,
        seed: int = 1,
    ) -> None:
        rng = np.random.default_rng(seed)
        labels, figures = population.draw(board, n, rng, factors=factors, two=two)
        seen = population.measure(board, figures, letters, rng)
        runs = np.isfinite(seen).all(axis=0)
        self.board, self.letters = board, letters
        self.labels, self.seen = labels[runs], seen[:, runs]

    def weigh(self, model: Model) -> Weighed:
        """Return what the engine holds of the boards."""
        return model.weigh(self.seen)


def by_fault(model: Model, values: np.ndarray) -> np.ndarray:
    """Return the engine's rows in the order of the population, -inf where it has none."""
    rows = np.full((len(population.FAULTS), values.shape[1]), -np.inf)
    for k, name in enumerate(population.FAULTS):
        if name in model.names:
            rows[k] = values[model.names.index(name)]
    return rows


def top_and_loss(logs: np.ndarray, labels: np.ndarray) -> tuple[float, float]:
    """Return the share of first suspects that are right, and the mean loss in bits."""
    chances = population.shares(logs)
    right = float(np.mean(chances.argmax(0) == labels))
    return right, float(np.mean(-np.log2(chances[labels, np.arange(labels.size)] + 1e-300)))


def show_ranking(n: int) -> None:
    """Print first suspects and log-loss of all boards and sets."""
    print(f"\nFirst suspect right and log-loss, {n} boards each (engine / optimum / aim)")
    for board in population.BOARDS:
        for (name, letters), aim in zip(population.SETS.items(), AIMS[board.name], strict=True):
            if aim is None:
                continue
            sample = Sample(board, letters, n)
            model = make_model(boards.make_layout(board, letters), boards.equal_priors())
            ours = top_and_loss(by_fault(model, sample.weigh(model).evidence()[:-1]), sample.labels)
            best = top_and_loss(optimum.evidence(board, letters, sample.seen), sample.labels)
            print(
                f"{board.name:24} {name:20} {ours[0]:.4f} / {best[0]:.4f} / {aim:.3f}   "
                f"loss {ours[1]:.4f} / {best[1]:.4f} bit"
            )


def show_groups_and_reliability(n: int) -> None:
    """Print group coverage and size, and stated against observed by tenths."""
    print("\nTop group holds the truth (aim 0.985), members (aim < 2.8 from the output of CMOS)")
    print("Stated minus observed in each tenth of >= 1,000 boards, first suspect (aim 0.05)")
    for board in population.BOARDS:
        for name in ("output", "control pin", "control pin + shunt"):
            letters = population.SETS[name]
            sample = Sample(board, letters, n)
            model = make_model(boards.make_layout(board, letters), boards.equal_priors())
            logs = by_fault(model, sample.weigh(model).evidence()[:-1])
            inside = logs > logs.max(0) + np.log(1 / 20)
            held = inside[sample.labels, np.arange(sample.labels.size)].mean()
            chances = population.shares(logs)
            stated, right = chances.max(0), chances.argmax(0) == sample.labels
            tenths = np.minimum((stated * 10).astype(int), 9)
            gaps = [
                f"{stated[tenths == t].mean() - right[tenths == t].mean():+.3f}"
                for t in range(10)
                if np.count_nonzero(tenths == t) >= 1000
            ]
            size = inside.sum(0).mean()
            print(f"{board.name:24} {name:20} {held:.4f}  {size:.2f}   {' '.join(gaps)}")


def show_certain(n: int) -> None:
    """Print how often the answer is certain, and wrong then."""
    print("\nCertain (>= 0.95), and wrong among them: probability alone, then as is_certain says")
    for board in population.BOARDS:
        for name in ("output", "control pin", "control pin + shunt"):
            letters = population.SETS[name]
            model = make_model(boards.make_layout(board, letters), boards.equal_priors())
            cuts = boards.strangeness_cuts(model)
            for kind, factors in (
                ("as believed", None),
                ("C twice", population.scaled("capacitor", 2.0)),
                ("thresholds twice", population.scaled("thresholds", 2.0)),
            ):
                sample = Sample(board, letters, n, factors=factors, seed=3)
                print(f"{board.name:24} {name:20} {kind:17} {_certain(model, sample, cuts)}")
            best = population.shares(
                optimum.evidence(board, letters, Sample(board, letters, n, seed=3).seen)
            )
            print(f"{'':46} optimum           share {np.mean(best.max(0) >= CERTAIN):.3f}")


def _certain(model: Model, sample: Sample, cuts: np.ndarray) -> str:
    weighed = sample.weigh(model)
    chances = population.shares(by_fault(model, weighed.evidence()[:-1]))
    cautious = population.shares(by_fault(model, weighed.evidence(cautious=True)[:-1]))
    best, wrong = chances.argmax(0), chances.argmax(0) != sample.labels
    plain = chances.max(0) >= CERTAIN
    wary = plain & (cautious[best, np.arange(best.size)] >= CERTAIN)
    said = wary & (weighed.strangeness() <= cuts[best])
    return "   ".join(
        f"{label} {mask.mean():.3f} wrong {wrong[mask].mean():.4f}"
        for label, mask in (("p", plain), ("cautious", wary), ("and single", said))
    )


def show_healthy(n: int) -> None:
    """Print what a healthy hypothesis costs and gives."""
    print("\nHealthy at prior odds 6 to each fault: healthy called so (aim 0.97) / optimum;")
    print("first suspect right / optimum with the same list / without healthy")
    board = population.BOARDS[0]
    for name in ("output", "control pin + shunt", "node"):
        letters = population.SETS[name]
        model = make_model(boards.make_layout(board, letters), boards.equal_priors(6.0))
        sample = Sample(board, letters, n)
        rng = np.random.default_rng(5)
        z = rng.standard_normal((9, n)) * board.spreads()[:, None]
        good = population.measure(board, population.healthy(board, z), letters, rng)
        odds = np.log(6.0)
        ours, theirs = [], []
        for seen in (good, sample.seen):
            logs = model.weigh(seen).evidence()[:-1]
            ours.append(np.vstack([by_fault(model, logs), logs[:1] + odds]))
            best = optimum.evidence(board, letters, seen)
            well = optimum.healthy_evidence(board, letters, seen)
            theirs.append(np.vstack([best, well + odds]))
        called = [np.mean(item[0].argmax(0) == len(population.FAULTS)) for item in (ours, theirs)]
        right = [np.mean(item[1].argmax(0) == sample.labels) for item in (ours, theirs)]
        without = np.mean(ours[1][:-1].argmax(0) == sample.labels)
        print(
            f"{name:20} {called[0]:.4f} / {called[1]:.4f}    "
            f"{right[0]:.4f} / {right[1]:.4f} / {without:.4f}"
        )


def show_two_faults(n: int) -> None:
    """Print how often two faults are seen not to be one."""
    print(f"\nTwo faults seen not to be one, {n} boards (engine / optimum / aim), false alarm 5 %")
    for (board_name, name), aim in TWO_AIMS.items():
        board = next(item for item in population.BOARDS if item.name == board_name)
        letters = population.SETS[name]
        model = make_model(boards.make_layout(board, letters), boards.equal_priors())
        cuts = boards.strangeness_cuts(model)
        one, two = (Sample(board, letters, n, two=flag, seed=7) for flag in (False, True))
        refused = [_refused(model, item, cuts) for item in (one, two)]
        ratios = [
            optimum.pair_evidence(board, letters, item.seen)
            - np.logaddexp.reduce(optimum.evidence(board, letters, item.seen, step=0.02), axis=0)
            for item in (one, two)
        ]
        best = np.mean(ratios[1] > np.quantile(ratios[0], 0.95))
        print(
            f"{board_name:24} {name:20} {refused[1]:.3f} / {best:.3f} / {aim:.2f}   "
            f"false alarm {refused[0]:.3f}"
        )


def _refused(model: Model, sample: Sample, cuts: np.ndarray) -> float:
    weighed = sample.weigh(model)
    best = by_fault(model, weighed.evidence()[:-1]).argmax(0)
    return float(np.mean(weighed.strangeness() > cuts[best]))


def show_next(n: int) -> None:
    """Print the expected bits a minute after the output alone, averaged over boards."""
    print(f"\nBits a minute after the output alone, mean over {n} boards (engine / aim)")
    for board in (population.BOARDS[0], population.BOARDS[3]):
        sample = Sample(board, "O", n, seed=11)
        stage, design = boards.make_stage(board)
        totals: dict[str, float] = {}
        started = time.process_time()
        for high, low in np.exp(sample.seen).T:
            timing = Timing(t_high=boards.seconds(float(high)), t_low=boards.seconds(float(low)))
            evidence = Evidence(observations=(Observation(timing=timing),))
            model = make_model(lay_out(evidence, stage, design), boards.equal_priors())
            for item in rate_readings(make_posterior(model), COSTS):
                totals[item.reading] = totals.get(item.reading, 0.0) + item.bits_per_minute
        took_s = (time.process_time() - started) / n
        print(f"{board.name}   {took_s:.3f} s of computing a diagnosis")
        for reading, total in sorted(totals.items(), key=lambda item: -item[1]):
            aim = BITS.get(reading) if board is population.BOARDS[0] else None
            print(f"    {reading:16} {total / n:.3f} / {aim if aim is not None else '-'}")


def main() -> None:
    """Print all tables."""
    n = int(sys.argv[1]) if len(sys.argv) > 1 else 5_000
    np.seterr(all="ignore")  # boards that two faults stop have no times
    show_ranking(n)
    show_groups_and_reliability(max(n, RELIABILITY_BOARDS))
    show_certain(n)
    show_healthy(n)
    show_two_faults(min(n, PAIR_BOARDS))
    show_next(min(n, NEXT_BOARDS))


if __name__ == "__main__":
    main()
