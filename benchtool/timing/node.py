"""Turning points of a capacitor node: where charging gives way to discharging and back."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.capture import BLOCK, Waveform
from benchtool.model.timing import EdgeRun, Edges, Levels
from benchtool.timing.crossings import Crossings, find_crossings
from benchtool.timing.edges import find_edges
from benchtool.timing.pieces import cut_pieces, piece_times, walk_pieces
from benchtool.timing.thresholds import thresholds
from benchtool.timing.turns import Turn, locate_turn

_SHAPE = 0.3
"""What polynomials in place of exponentials shift all turns alike, over the noise of one."""


@frozen_record(eq=False)
class _Stretch:
    """The samples from one crossing of the mid level to the next, or to an end of the run."""

    run: int
    volts: FloatArray
    times_s: FloatArray
    is_peak: bool
    is_whole: bool

    @property
    def extreme_s(self) -> float:
        """When the node is farthest from the mid level."""
        away = self.volts if self.is_peak else -self.volts
        return float(self.times_s[int(np.argmax(away))])


def find_turning_points(trace: Waveform, levels: Levels) -> Edges:
    """Find the turning points of a capacitor node.

    Args:
        trace: The waveform of the node.
        levels: Its levels, of kind node (or two-state, where the node rests in between).

    Returns:
        Turning points as edges: a trough begins a rise (charging, high), a peak a fall.
    """
    if levels.kind in ("flat", "noise"):
        return find_edges(trace, levels)
    runs = find_crossings(trace, thresholds(trace, levels)).runs
    noise_v = max(levels.noise_v, levels.step_v / math.sqrt(12))
    swing_v = levels.high_v - levels.low_v
    turns: list[list[Turn]] = [[] for _ in runs]
    ends = [[run.start_s, run.end_s] for run in runs]
    for stretch in _stretches(trace, runs):
        turn = locate_turn(
            stretch.times_s,
            stretch.volts if stretch.is_peak else -stretch.volts,
            swing_v,
            noise_v,
            whole=stretch.is_whole,
        )
        if turn is not None:
            turns[stretch.run].append(turn if stretch.is_peak else turn.as_trough())
        elif not stretch.is_whole and stretch.volts.size:
            # It may have turned unseen: what is cut there lasts to the extreme and no longer.
            ends[stretch.run][1 if turns[stretch.run] else 0] = stretch.extreme_s
    return _edges(trace, levels, runs, turns, ends)


def _edges(
    trace: Waveform,
    levels: Levels,
    runs: tuple[Crossings, ...],
    turns: list[list[Turn]],
    ends: list[list[float]],
) -> Edges:
    found = [turn for of_run in turns for turn in of_run]
    edge_runs: list[EdgeRun] = []
    first = 0
    for run, of_run, (start_s, end_s) in zip(runs, turns, ends, strict=True):
        starts_high = of_run[0].is_peak if of_run else run.starts_high
        edge_runs.append(
            EdgeRun(
                first=first,
                stop=first + len(of_run),
                start_s=start_s,
                end_s=end_s,
                starts_high=starts_high,
            )
        )
        first += len(of_run)
    step_s = _usual_step(trace, runs)
    rough = sum(not turn.is_fitted for turn in found)
    return Edges(
        times_s=np.array([turn.time_s for turn in found]),
        rising=np.array([not turn.is_peak for turn in found], dtype=np.bool_),
        u_s=np.array([turn.u_s for turn in found]),
        runs=tuple(edge_runs),
        step_s=step_s,
        resolved=True,
        level_u_s=_SHAPE * float(np.sqrt(np.mean([turn.u_s**2 for turn in found])))
        if found
        else 0.0,
        grid_s=step_s * math.sqrt(rough / len(found)) if found else 0.0,
        warnings=levels.warnings,
    )


def _usual_step(trace: Waveform, runs: tuple[Crossings, ...]) -> float:
    steps = np.concatenate([run.after_s - run.before_s for run in runs]) if runs else np.empty(0)
    if steps.size:
        return middle(steps)
    length_s = runs[-1].end_s - runs[0].start_s if runs else 0.0
    return length_s / max(1, trace.samples.size - 1)


def _stretches(trace: Waveform, runs: tuple[Crossings, ...]) -> Iterator[_Stretch]:
    """Cut the runs at their crossings; at most two half cycles are held at a time."""
    gain, offset = trace.scale.gain, trace.scale.offset
    number, position = -1, 0
    held_v: list[FloatArray] = []
    held_s: list[FloatArray] = []
    for piece in cut_pieces(walk_pieces(trace), BLOCK):
        if piece.begins_run:
            yield from _rest(runs, number, position, held_v, held_s)
            number, position, held_v, held_s = number + 1, 0, [], []
        run = runs[number]
        volts = piece.values.astype(np.float64) * gain + offset
        times_s = piece_times(trace, piece)
        done = 0
        while position < run.index.size and run.index[position] < piece.first + volts.size:
            stop = int(run.index[position]) - piece.first
            held_v.append(volts[done:stop])
            held_s.append(times_s[done:stop])
            yield _stretch(runs, number, position, held_v, held_s, whole=position > 0)
            held_v, held_s, done = [], [], stop
            position += 1
        held_v.append(volts[done:])
        held_s.append(times_s[done:])
    yield from _rest(runs, number, position, held_v, held_s)


def _rest(
    runs: tuple[Crossings, ...],
    number: int,
    position: int,
    held_v: list[FloatArray],
    held_s: list[FloatArray],
) -> Iterator[_Stretch]:
    if number >= 0 and held_v:
        yield _stretch(runs, number, position, held_v, held_s, whole=False)


def _stretch(
    runs: tuple[Crossings, ...],
    number: int,
    position: int,
    held_v: list[FloatArray],
    held_s: list[FloatArray],
    *,
    whole: bool,
) -> _Stretch:
    """Make a stretch that ends at crossing ``position``: a peak where that crossing falls."""
    rising = runs[number].rising
    is_peak = not rising[position] if position < rising.size else bool(rising.size and rising[-1])
    return _Stretch(
        run=number,
        volts=np.concatenate(held_v),
        times_s=np.concatenate(held_s),
        is_peak=bool(is_peak),
        is_whole=whole,
    )
