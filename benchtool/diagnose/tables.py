"""What each hypothesis would show: means and slopes of the scatter on its grid of sizes."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchtool.circuits.circuit import Circuit
from benchtool.diagnose.conditions import Condition, board_under
from benchtool.diagnose.hypotheses import Hypothesis
from benchtool.diagnose.layout import Layout
from benchtool.diagnose.observables import Observable, View
from benchtool.diagnose.scatter import Deviations
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray


@frozen_record(eq=False)
class Table:
    """What one hypothesis would show.

    Attributes:
        hypothesis: The hypothesis.
        means: Of every observable at every size, shape (n, m); NaN where a time does not exist.
        slopes: Change for one standard uncertainty of each axis, shape (n, m, a). The last axis
            is the width of the size's own cell, so that a grid that is coarse against what was
            measured leaves no gaps.
        figure: Logarithm of the moved figure, shape (n,); NaN where there is none.
        figure_slopes: Its changes, shape (n, a).
    """

    hypothesis: Hypothesis
    means: FloatArray
    slopes: FloatArray
    figure: FloatArray
    figure_slopes: FloatArray


@frozen_record(eq=False)
class Boards:
    """Healthy boards at all deviations under every condition, made once for all hypotheses."""

    layout: Layout
    deviations: Deviations
    circuits: Mapping[str, Circuit]

    @classmethod
    def of(cls, layout: Layout) -> Boards:
        """Return the healthy boards of a layout."""
        deviations = Deviations(axes=layout.axes)
        circuits = {
            condition.name: board_under(
                condition, layout.stage, layout.design, layout.board, deviations
            )
            for condition in layout.conditions
        }
        return cls(layout=layout, deviations=deviations, circuits=circuits)


def tabulate(
    boards: Boards,
    hypothesis: Hypothesis,
    observables: tuple[Observable, ...],
    sizes: FloatArray | None = None,
) -> Table:
    """Return what a hypothesis would show.

    Args:
        boards: The healthy boards.
        hypothesis: What happened to them.
        observables: What is looked at.
        sizes: Sizes to take in place of the hypothesis's grid; their cells have no width then.
    """
    values = hypothesis.sizes.values if sizes is None else sizes
    seen = _seen(boards, hypothesis, observables, values)
    means = seen[:, 0].T
    axes = np.moveaxis(boards.deviations.slopes(np.moveaxis(seen, 1, 0)), (0, 1, 2), (2, 1, 0))
    figure, figure_axes = _figure(boards, hypothesis, values)
    cells = np.zeros_like(means) if sizes is not None else _cells(hypothesis, means)
    figure_cells = _cells(hypothesis, figure[:, None])[:, 0] if sizes is None else 0 * figure
    return Table(
        hypothesis=hypothesis,
        means=means,
        slopes=np.concatenate([axes, cells[:, :, None]], axis=2),
        figure=figure,
        figure_slopes=np.concatenate([figure_axes, figure_cells[:, None]], axis=1),
    )


def _seen(
    boards: Boards, hypothesis: Hypothesis, observables: tuple[Observable, ...], sizes: FloatArray
) -> FloatArray:
    """Return every observable at every deviation and size, shape (m, rows, n)."""
    supply_v = boards.layout.design.supply.nominal
    shape = (boards.deviations.n_rows, sizes.size)
    views: dict[str, View] = {}
    seen = np.empty((len(observables), *shape))
    for index, item in enumerate(observables):
        condition = item.condition
        if condition.name not in views:
            circuit = _under(boards, hypothesis, condition, sizes)
            views[condition.name] = View(circuit, supply_v)
        seen[index] = item.sort.see(views[condition.name])
    return seen


def _under(
    boards: Boards, hypothesis: Hypothesis, condition: Condition, sizes: FloatArray
) -> Circuit:
    circuit = boards.circuits[condition.name]
    if condition.is_faulty:
        circuit = hypothesis.fault.move.act(circuit, sizes[None, :])
    return condition.change(circuit, boards.deviations)


def _figure(
    boards: Boards, hypothesis: Hypothesis, sizes: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return the logarithm of the moved figure and its slopes."""
    rows, n = boards.deviations.n_rows, sizes.size
    fields, unit = hypothesis.fault.move.fields, hypothesis.fault.unit
    if not fields or not unit:
        return np.full(n, np.nan), np.zeros((n, len(boards.deviations.axes)))
    circuit = next(iter(boards.circuits.values()))
    moved = getattr(hypothesis.fault.move.act(circuit, sizes[None, :]), fields[0])
    with np.errstate(all="ignore"):
        logs = np.log(np.broadcast_to(moved, (rows, n)))
    return logs[0], boards.deviations.slopes(logs).T


def _cells(hypothesis: Hypothesis, means: FloatArray) -> FloatArray:
    """Return the standard deviation of what is seen within each cell of the grid of sizes."""
    widths = np.zeros_like(means)
    for stretch in hypothesis.sizes.halves():
        if stretch.stop - stretch.start > 1:
            widths[stretch] = np.gradient(means[stretch], axis=0) / np.sqrt(12)
    return np.nan_to_num(widths)
