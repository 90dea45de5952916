"""Delimited text, whole: from a file's content to a capture."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.clock import ClockScan, Steps, examine_steps
from benchtool.formats.content import Content
from benchtool.formats.text.cells import number
from benchtool.formats.text.columns import Column
from benchtool.formats.text.evidence import structure_points
from benchtool.formats.text.sampled import Sampled, is_logic, refuse_empty, value_unit
from benchtool.formats.text.scanning import Scan, scan_rows
from benchtool.formats.text.structure import Structure, epoch_ns, find_structure, states
from benchtool.formats.text.timebase import Timebase, settle_time
from benchtool.formats.text.transitions import (
    Listed,
    is_transition_list,
    names_edges,
    read_transitions,
)
from benchtool.formats.text.walking import DataRows
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, Origin, ReadOptions, Trace
from benchtool.model.quantity import Notice


def read_text(content: Content, options: ReadOptions) -> Capture:
    """Read a delimited text of any layout.

    Args:
        content: The file.
        options: What the user overrules.

    Raises:
        AmbiguousStructureError: If two readings are sound; the hint names the option.
        MalformedCaptureError: If it holds nothing to measure.
    """
    structure = find_structure(content, options)
    if _may_list_transitions(structure):
        capture = _read_list(structure, content)
        if capture is not None:
            return capture
    return _read_samples(structure, content)


def _head_stamps(structure: Structure, clock: int) -> FloatArray:
    """Return the first stamps of a clock, decoded."""
    wanted = structure.cells[clock].wanted
    rows = structure.layout.rows
    if wanted.convert is None:
        return structure.columns.clocks[clock].column.head
    cells = [
        row[wanted.field] if wanted.second is None else f"{row[wanted.second]} {row[wanted.field]}"
        for row in rows
    ]
    return wanted.convert(cells)


def _steps(structure: Structure, clock: int) -> Steps:
    return examine_steps(_head_stamps(structure, clock), structure.cells[clock].resolution)


def _head_values(structure: Structure, column: Column) -> FloatArray:
    cells = [row[column.field] for row in structure.layout.rows]
    if column.kind == "W":
        return states(cells)
    return np.array([number(cell, structure.layout.decimal) for cell in cells])


def _may_list_transitions(structure: Structure) -> bool:
    columns = structure.columns
    if len(columns.clocks) != 1 or columns.clocks[0].kind == "index":
        return False
    heads = [_head_values(structure, column) for column in columns.values]
    resolution = structure.cells[0].resolution
    return is_transition_list(_head_stamps(structure, 0), heads, resolution)


def _read_list(structure: Structure, content: Content) -> Capture | None:
    """Read a list of transitions; None if later rows show that it is none."""
    columns, cells = structure.columns, structure.cells[0]
    scan = scan_rows(
        structure.rows, (), len(columns.values) + 1, (None,) * (len(columns.values) + 1), keep=True
    )
    table = scan.table
    if table is None or not table.size:
        return None
    rows = structure.layout.rows
    channels = [
        Listed(
            title=column.title,
            values=table[:, 1 + k],
            worded=names_edges([row[column.field] for row in rows]),
        )
        for k, column in enumerate(columns.values)
    ]
    if not is_transition_list(table[:, 0], [c.values for c in channels], cells.resolution):
        return None
    traces, notices = read_transitions(
        table[:, 0],
        channels,
        cells.resolution,
        structure.units[0].unit,
        content.source,
        from_zero=not cells.relative,
    )
    return _capture(structure, content, scan, traces, notices, kind="transitions", interval=None)


def _read_samples(structure: Structure, content: Content) -> Capture:
    columns = structure.columns
    clocks = tuple(
        ClockScan(_steps(structure, k), content.source) for k in range(len(columns.clocks))
    )
    keep = structure.rows.content.data is not None
    scan = scan_rows(structure.rows, clocks, len(columns.values), columns.clock_of, keep=keep)
    refuse_empty(scan.ranges, content.source)
    _refuse_single_row(scan, content.source)
    scan.clocks = clocks = tuple(
        _without_false_grid(clock, k, structure.rows, content.source)
        for k, clock in enumerate(clocks)
    )
    timebases = tuple(
        settle_time(clock, found.unit, _stated_s(structure, k))
        for k, (clock, found) in enumerate(zip(clocks, structure.units, strict=True))
    )
    sampled = Sampled(
        rows=structure.rows,
        scan=scan,
        layout=structure.layout,
        timebases=timebases,
        units=tuple(found.unit for found in structure.units),
        interval_s=structure.stated.value if structure.stated else None,
        value_unit=structure.metadata.value_unit[0] if structure.metadata.value_unit else "",
    )
    traces, assumed = _waveforms(structure, sampled)
    notices = [*assumed, *(n for timebase in timebases[:1] for n in timebase.warnings)]
    interval = _interval_point(structure, timebases)
    return _capture(
        structure, content, scan, traces, tuple(notices), kind="samples", interval=interval
    )


def _without_false_grid(clock: ClockScan, place: int, rows: DataRows, source: str) -> ClockScan:
    """Scan anew stamps that repeat for lack of digits and yet lie on no even grid."""
    steps = clock.steps
    if not (steps.even and steps.coarse and clock.n_repeated) or clock.is_even():
        return clock
    uneven = ClockScan(replace(steps, even=False), source)
    for _, decoded in rows.decoded():
        uneven.feed(decoded.table[:, place])
    uneven.finish()
    return uneven


def _stated_s(structure: Structure, clock: int) -> float | None:
    if structure.stated is None or structure.columns.clocks[clock].kind == "stamp":
        return None
    return structure.stated.value


def _refuse_single_row(scan: Scan, source: str) -> None:
    sizes = [clock.pieces[-1].stop if clock.pieces else 0 for clock in scan.clocks]
    size = min(sizes, default=scan.n_rows)
    if size >= 2:
        return
    raise MalformedCaptureError(
        f"{source} holds {'one row' if size else 'no row'} that can be read; a wave needs more",
        hint="Save the capture again with its whole record.",
        path=source,
        code="one-row",
    )


def _waveforms(structure: Structure, sampled: Sampled) -> tuple[tuple[Trace, ...], list[Notice]]:
    """Return the waveforms that hold anything, and a notice of those whose volts are assumed."""
    traces: list[Trace] = []
    assumed: list[str] = []
    columns, ranges = structure.columns, sampled.scan.ranges
    logic = _logic(structure, sampled.scan)
    for k, column in enumerate(columns.values):
        if not ranges[k].n_told:
            continue
        traces.append(sampled.waveform(k, column, columns.clock_of[k], logic=logic[k]))
        if not logic[k] and value_unit(column, sampled.value_unit)[2]:
            assumed.append(column.title)
    if not assumed:
        return tuple(traces), []
    notice = Notice(
        code="assumed-volts",
        text=f"the file gives no unit for the values of {', '.join(assumed[:8])}: volts are "
        "assumed; only voltages depend on it, no time does",
    )
    return tuple(traces), [notice]


def _logic(structure: Structure, scan: Scan) -> list[bool]:
    pairs = list(zip(structure.columns.values, scan.ranges, strict=True))
    alone = [is_logic(c, r, structure.layout, others=False) for c, r in pairs]
    return [is_logic(c, r, structure.layout, others=any(alone)) for c, r in pairs]


def _interval_point(
    structure: Structure, timebases: tuple[Timebase, ...]
) -> tuple[str, str] | None:
    if not timebases:
        stated = structure.stated
        return (f"{stated.value:.9g} s", stated.evidence) if stated else None
    uniform = timebases[0].uniform
    shown = f"{uniform.dt_s:.9g} s" if uniform else "irregular"
    return shown, timebases[0].evidence


def _capture(
    structure: Structure,
    content: Content,
    scan: Scan,
    traces: tuple[Trace, ...],
    notices: tuple[Notice, ...],
    *,
    kind: str,
    interval: tuple[str, str] | None,
) -> Capture:
    damage = scan.damage(content.source, counts_rows=not structure.columns.clocks)
    return Capture(
        origin=Origin(
            source=content.source,
            format="text",
            sha256=content.sha256,
            start_ns=epoch_ns(structure),
            instrument=structure.metadata.instrument,
        ),
        traces=traces,
        structure=structure_points(structure, scan, kind=kind, interval=interval),
        warnings=(*structure.warnings, *notices, *damage),
    )
