"""What one capture of a watch shows: its edges, found with what the captures before it taught."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from benchtool.counts import observe_counted
from benchtool.errors import MeasurementError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, Trace, Waveform
from benchtool.model.counted import Counted
from benchtool.model.quantity import Notice
from benchtool.model.result import Source, StageResult
from benchtool.model.timing import Edges
from benchtool.observation import Settings, glance, observe
from benchtool.provenance import source_of
from benchtool.targets import Target, choose_targets, line_up
from benchtool.timing import Shape, find_edges, require_states

if TYPE_CHECKING:
    from benchtool.model.design import Design

FRESH_S = 1.0
"""How long levels are taken for known; finding them takes ten times as long as finding edges."""


@frozen_record(eq=False)
class View:
    """How captures are looked at.

    Attributes:
        settings: As settled for this run.
        design: The design, where there is one.
        stage: Name of the stage that is watched.
        own_axis: Whether each capture is a record of its own; those of a stream share an axis.
        start_ns: Absolute start of the first capture, where it is stated.
        begun: What the source says of having begun anew; nothing where it did not.
        target: What was measured in a capture before.
        at_s: When its levels were found.
    """

    settings: Settings
    design: Design | None = None
    stage: str | None = None
    own_axis: bool = False
    start_ns: int | None = None
    begun: str = ""
    target: Target | None = None
    at_s: float = 0.0


@frozen_record(eq=False)
class Sight:
    """What a capture shows.

    Attributes:
        at_s: When it came, on the clock of the watcher.
        offset_s: Where it begins on the common axis; None for a record of its own.
        source: Where it came from.
        result: The trace as far as its intervals; its bounds too, where it has no edge.
        is_anew: Whether its source has begun anew, so that its axis is another.
        trouble: Why it shows nothing, where it does not.
    """

    at_s: float
    offset_s: float | None
    source: Source
    result: StageResult | None = None
    is_anew: bool = False
    trouble: Notice | None = None

    @property
    def edges(self) -> Edges | None:
        """Its edges."""
        return self.result.edges if self.result else None


def look_at(capture: Capture | Counted, view: View, at_s: float) -> tuple[Sight, View]:
    """Take a capture as far as its intervals, or a counter's readings as they are.

    Args:
        capture: The capture, or the readings.
        view: How to look, with what was learnt before.
        at_s: When it came.

    Returns:
        What it shows, and how to look at the next.

    Raises:
        UsageError: If several traces could be meant, or one that was named is not there.
    """
    if isinstance(capture, Counted):
        return _look_at_counted(capture, view, at_s), view
    view = replace(view, start_ns=view.start_ns or capture.origin.start_ns)
    begun = next((x.text for x in capture.warnings if x.code == "file-begun-anew"), "")
    sight = Sight(
        at_s=at_s,
        offset_s=_offset(capture, view),
        source=source_of(capture, view.settings.options),
        is_anew=begun != view.begun,
    )
    view = replace(view, begun=begun)
    try:
        target, view = _target(capture, view, at_s)
        result = glance(target, view.settings)
        if result.levels is not None and result.levels.kind == "noise":
            require_states(result.levels)
        if result.edges is not None and not result.edges.times_s.size:
            result = observe(target, view.settings, view.design)
    except MeasurementError as error:
        trouble = Notice(code=error.code, text=error.message)
        return replace(sight, trouble=trouble), replace(view, target=None)
    notices = tuple(dict.fromkeys((*capture.warnings, *result.warnings)))
    return replace(sight, result=replace(result, warnings=notices)), view


def _look_at_counted(counted: Counted, view: View, at_s: float) -> Sight:
    seen = observe_counted(counted, view.design, view.stage, view.settings.options, "watch")
    result = replace(seen.results[0], warnings=(*seen.warnings, *seen.results[0].warnings))
    return Sight(at_s=at_s, offset_s=None, source=seen.sources[0], result=result)


def _offset(capture: Capture, view: View) -> float | None:
    if view.own_axis:
        return None
    if capture.origin.start_ns is None or view.start_ns is None:
        return 0.0
    return (capture.origin.start_ns - view.start_ns) * 1e-9


def _target(capture: Capture, view: View, at_s: float) -> tuple[Target, View]:
    known = view.target
    if known is not None and at_s - view.at_s < FRESH_S:
        trace = _same_trace(capture, known.shape.trace)
        if trace is not None:
            edges = find_edges(trace, known.shape.levels)
            if edges.times_s.size:
                shape = Shape(trace=trace, levels=known.shape.levels, edges=edges)
                return replace(known, shape=shape, trigger=None, supply=None), view
    channel = view.settings.options.read.channel
    lineup = line_up(capture)
    target = choose_targets(lineup, channel=channel, design=view.design, stage=view.stage)[0]
    again = target.role == "output" and view.settings.options.level_v is None
    return target, replace(view, target=target if again else None, at_s=at_s)


def _same_trace(capture: Capture, known: Trace) -> Trace | None:
    """Return the trace that was measured before, where it is still taken in the same way."""
    for trace in capture.traces:
        if trace.channel == known.channel and isinstance(trace, Waveform):
            alike = isinstance(known, Waveform) and (
                trace.scale == known.scale
                and trace.unit == known.unit
                and trace.samples.dtype == known.samples.dtype
            )
            return trace if alike else None
    return None
