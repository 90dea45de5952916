"""Lists of transitions: a time and the state taken on then."""

from __future__ import annotations

import math

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.grid import greatest_common_spacing
from benchtool.formats.logic import UNKNOWN, States, logic_trace
from benchtool.formats.text.cells import EDGE_WORDS
from benchtool.formats.text.rowkinds import same
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, NDArray, distinct, middle
from benchtool.model.capture import LogicTrace
from benchtool.model.quantity import Notice

_SAME = 5e-3  # of an interval: how near a repeated one lies where there are few to tell


@frozen_record(eq=False)
class Listed:
    """One channel of a list of transitions.

    Attributes:
        title: Its name.
        values: State of each row, NaN where unknown.
        worded: Whether the cells name edges (rising, falling) rather than states.
    """

    title: str
    values: FloatArray
    worded: bool


def read_transitions(
    stamps: FloatArray,
    channels: list[Listed],
    resolution: float,
    unit: TimeUnit,
    source: str,
    *,
    from_zero: bool,
) -> tuple[tuple[LogicTrace, ...], tuple[Notice, ...]]:
    """Make logic traces of all rows.

    Args:
        stamps: Times of the rows in the column's unit, NaN where a row has none.
        channels: The channels and their values.
        resolution: Last printed digit of the stamps.
        unit: Unit of the stamps.
        source: File name, for errors.
        from_zero: Whether the stamps count from the start of the record; dates do not.

    Raises:
        MalformedCaptureError: If the times run backwards.
    """
    rows = np.isfinite(stamps)
    stamps = stamps[rows]
    _refuse_backwards(stamps, source)
    resolution = max(resolution, math.ulp(float(np.abs(stamps).max())))
    counts = np.rint(stamps / resolution).astype(np.int64)
    counts -= counts[0]
    changed = _change_rows([channel.values[rows] for channel in channels])
    tick_s = float(_seconds(unit, greatest_common_spacing(counts[changed]), resolution))
    times_s = _seconds(unit, counts, resolution)
    first = float(stamps[0]) if from_zero else math.nan
    found = [_trace(channel, rows, first, times_s, tick_s) for channel in channels]
    return tuple(trace for trace, _ in found), tuple(n for _, notices in found for n in notices)


def _trace(
    channel: Listed, rows: NDArray[np.bool_], first: float, times_s: FloatArray, tick_s: float
) -> tuple[LogicTrace, list[Notice]]:
    """Make the trace of one channel, and say whether its first edge is assumed."""
    states = _states(channel.values[rows])
    edge, assumed = True, False
    if not channel.worded:
        edge, assumed = opens_with_edge(first, times_s, states, tick_s)
    trace = logic_trace(
        times_s,
        states,
        end_s=float(times_s[-1]),
        tick_s=tick_s,
        channel=channel.title,
        end_stated=False,
        opens_with_edge=edge,
    )
    return trace, [_first_edge_notice(channel.title)] if assumed else []


def _refuse_backwards(stamps: FloatArray, source: str) -> None:
    if np.any(np.diff(stamps) < 0):
        raise MalformedCaptureError(
            f"the times of the transitions in {source} run backwards",
            hint="Sort the rows by time.",
            path=source,
            code="time-disorder",
        )


def _seconds(unit: TimeUnit, counts: NDArray[np.int64] | int, resolution: float) -> FloatArray:
    """Return counts of the last printed digit in seconds, rounded once."""
    per_unit = 1 / resolution
    if resolution < 1 and abs(per_unit - round(per_unit)) < 1e-6 * per_unit:
        return np.asarray(counts, np.float64) * unit.times / (round(per_unit) * unit.over)
    return np.asarray(counts, np.float64) * (resolution * unit.times) / unit.over


def _change_rows(columns: list[FloatArray]) -> NDArray[np.bool_]:
    changed = np.zeros(columns[0].size, bool)
    for values in columns:
        changed[1:] |= ~same(values[1:], values[:-1])
    return changed


def _states(values: FloatArray) -> States:
    """Return states of a two-valued channel: its upper value is high."""
    told = distinct(values[np.isfinite(values)])
    high = told[-1] if told.size == 2 or (told.size and told[0] > 0) else np.inf
    states = np.where(values == high, 1, 0).astype(np.int8)
    states[~np.isfinite(values)] = UNKNOWN
    return states


def opens_with_edge(
    first: float, times_s: FloatArray, states: States, tick_s: float
) -> tuple[bool, bool]:
    """Say whether the first row is an edge rather than the state found, and if that is assumed.

    A row at time zero states what was found. Any other first row is an edge if the interval it
    opens is as long as the later ones of its kind; where there is none to compare with and
    times count from zero, it is taken as an edge.

    Args:
        first: First stamp; NaN where stamps do not count from the start of the record.
        times_s: Times of the rows.
        states: States of the rows.
        tick_s: Resolution of the times.
    """
    if first == 0:
        return False, False
    edges = np.flatnonzero(np.diff(states) != 0) + 1
    lengths = np.diff(times_s[np.concatenate([[0], edges])])
    others = lengths[2::2]
    if others.size:
        typical = middle(others)
        spread = max(3 * float(np.ptp(others)), _SAME * typical, 2 * tick_s)
        return abs(float(lengths[0]) - typical) <= spread, False
    return first > 0, first > 0


def names_edges(cells: list[str]) -> bool:
    """Say whether the states of a column are worded as edges."""
    told = [cell for cell in cells if cell]
    return bool(told) and all(cell.lower() in EDGE_WORDS for cell in told)


def _first_edge_notice(title: str) -> Notice:
    return Notice(
        code="assumed-first-edge",
        text=f"the first row of {title} is taken as an edge, not as the state found at the "
        "start; there is no like interval to check it against",
    )
