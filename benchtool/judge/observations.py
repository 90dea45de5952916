"""What a capture says of each limited quantity: a value, a bound, or nothing."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.decision import StageLimit
from benchtool.model.judgement import Solution
from benchtool.model.quantity import Bound, Measured, Quantity
from benchtool.model.timing import Intervals, Jitter, Timing

FREE_RUNNING = frozenset({"astable", "astable-diode", "output-fed", "schmitt"})
"""Topologies whose output must keep changing."""

JITTER_FIELDS = {"jitter_period": "period_sd", "jitter_cycle": "cycle_rms"}
_SOLUTION_FIELDS = ("tau_charge", "tau_discharge")
_STATES: dict[str, Literal["high", "low"]] = {"t_high": "high", "t_low": "low"}


@frozen_record
class Observations:
    """All that was measured on a stage, and what is known where nothing could be.

    Attributes:
        topology: The stage's topology.
        timing, jitter, solution: What was measured; None where it could not be.
        intervals: For the intervals that the ends of the record cut.
        nominal_s: Longest time that the design means to see, seconds; None where it has none.
        flat_s: Length of a record without an edge, seconds.
        flat_state: The state in which it lies, None where it lies between the two.
    """

    topology: str
    timing: Timing | None = None
    jitter: Jitter | None = None
    solution: Solution | None = None
    intervals: Intervals | None = None
    nominal_s: float | None = None
    flat_s: float | None = None
    flat_state: Literal["high", "low"] | None = None

    @property
    def between_states(self) -> bool:
        """Whether the record is flat and neither high nor low: it says nothing of the board."""
        return self.flat_s is not None and self.flat_state is None

    @property
    def sound(self) -> bool:
        """Whether the record shows the output in a state, so that a longer one would show more."""
        if self.between_states:
            return False
        known = self.timing is not None and any(
            getattr(self.timing, name) is not None for name in ("t_high", "t_low", "delay")
        )
        cut = self.intervals is not None and bool(self.intervals.cut)
        return known or cut or self.flat_s is not None


def observe(name: str, seen: Observations) -> Quantity | None:
    """Return what was seen of a quantity: its value, else a bound, else None.

    Args:
        name: A limit's quantity.
        seen: All that was measured.
    """
    if seen.between_states:
        return None
    if name in JITTER_FIELDS:
        return _field(seen.jitter, JITTER_FIELDS[name])
    if name in _SOLUTION_FIELDS:
        return _field(seen.solution, name)
    found = _field(seen.timing, name)
    return found if found is not None else _bound(name, seen)


def _field(record: object, name: str) -> Quantity | None:
    found = getattr(record, name, None)
    return found if isinstance(found, Measured | Bound) else None


def _bound(name: str, seen: Observations) -> Bound | None:
    """Return what a record without one complete interval says of a time."""
    if name == "frequency":
        period = _bound("period", seen)
        if period is None or not period.at_least:
            return None
        return Bound(unit="Hz", at_most=1 / period.at_least)
    lengths = list(_unbroken(name, seen))
    return Bound(unit="s", at_least=max(lengths)) if lengths else None


def _unbroken(name: str, seen: Observations) -> Iterator[float]:
    """Yield the stretches that the quantity outlasts."""
    state = _STATES.get(name)
    if name == "period" and seen.topology not in FREE_RUNNING:
        return
    if state is None and name != "period":
        return
    if seen.intervals is not None:
        yield from (
            cut.at_least_s for cut in seen.intervals.cut if state is None or cut.kind == state
        )
    if seen.flat_s is not None and (state is None or state == seen.flat_state):
        yield seen.flat_s


def longest_nominal(limits: Iterable[StageLimit]) -> float | None:
    """Return the longest nominal time among the limits in seconds, None where there is none."""
    times_s = [limit.nominal for limit in limits if limit.unit == "s" and limit.nominal]
    times_s += [1 / limit.nominal for limit in limits if limit.unit == "Hz" and limit.nominal]
    return max(times_s, default=None)


def halt(seen: Observations) -> float | None:
    """Return how long an output that must keep changing stood still, None where it did not.

    An interval at the end counts that far outlasts all before it, and so does a record without an
    edge that lasts three times the longest nominal time: then no quantity can be as meant,
    whatever its limits.

    Args:
        seen: All that was measured.
    """
    if seen.topology not in FREE_RUNNING or seen.between_states:
        return None
    last = seen.intervals.standstill if seen.intervals else None
    if last is not None:
        return last.at_least_s
    is_long = seen.flat_s and seen.nominal_s and seen.flat_s > 3 * seen.nominal_s
    return seen.flat_s if is_long else None


def stretch_without_end(name: str, seen: Observations) -> float | None:
    """Return the longest interval in seconds that had begun and had not ended with the record.

    Those cut by the start are left out: the long first one after power-up may be among them.

    Args:
        name: ``t_high``, ``t_low`` or ``period``; any other has none.
        seen: All that was measured.
    """
    state = _STATES.get(name)
    if seen.intervals is None or (state is None and name != "period"):
        return None
    lengths = [
        cut.at_least_s
        for cut in seen.intervals.cut
        if cut.where == "end" and state in (None, cut.kind)
    ]
    return max(lengths, default=None) if seen.topology in FREE_RUNNING or state else None


def limit_on_flat(name: str, seen: Observations) -> str | None:
    """Return whose upper limit a record without an edge must outlast to fail a quantity.

    A record that is flat and high says nothing of a low time until it outlasts the longest
    permitted high time.

    Args:
        name: A limit's quantity.
        seen: All that was measured.

    Returns:
        Name of the quantity; None where a flat record says nothing of this one.
    """
    if seen.flat_state is None or name not in _STATES:
        return None
    if seen.topology not in FREE_RUNNING and seen.flat_state != _STATES[name]:
        return None
    return next(other for other, state in _STATES.items() if state == seen.flat_state)
