"""Delimited text, whole: from a file's content to a capture."""

from __future__ import annotations

from dataclasses import replace

from benchtool.errors import MalformedCaptureError
from benchtool.formats.clock import ClockScan
from benchtool.formats.content import Content
from benchtool.formats.steps import Steps, examine_steps
from benchtool.formats.text.envelope import envelope_notice, is_envelope, without_twins
from benchtool.formats.text.evidence import structure_points
from benchtool.formats.text.refusals import refuse_repeats, refuse_rows_of_channels
from benchtool.formats.text.rowkinds import head_stamps, may_be_lists
from benchtool.formats.text.sampled import Sampled, is_logic, refuse_empty, value_unit
from benchtool.formats.text.scanning import Scan, scan_rows
from benchtool.formats.text.structure import Structure, epoch_ns, find_structure
from benchtool.formats.text.timebase import StatedInterval, Timebase, settle_time
from benchtool.formats.text.walking import DataRows
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
    return _read(find_structure(content, options), content, options)


def _read(structure: Structure, content: Content, options: ReadOptions) -> Capture:
    if may_be_lists(structure) and not _says_samples(structure, options):
        capture = _read_list(structure, content, options)
        if capture is not None:
            return capture
    return _read_samples(structure, content, options)


def _read_above(
    structure: Structure, scan: Scan | None, content: Content, options: ReadOptions
) -> Capture | None:
    """Read what stands above another table as if the file ended there; None without one."""
    from benchtool.formats.text.stacked import other_table

    other = other_table(structure, scan)
    if other is None:
        return None
    found = find_structure(replace(structure.rows.content, size=other.offset), options)
    warnings = (*found.warnings, other.notice)
    whole = replace(found, encoding=structure.encoding, warnings=warnings)
    return _read(whole, content, options)


def _may_hold_others(scan: Scan) -> bool:
    """Say whether text stands among the rows, or the times do not run through."""
    first = min((line for _, line, is_text in scan.skipped if is_text), default=None)
    below = first is not None and any(
        line > first and (not is_text or row < scan.n_rows) for row, line, is_text in scan.skipped
    )
    inside = any(is_text and row < scan.n_rows for row, _, is_text in scan.skipped)
    return (
        inside or below or any(len(clock.pieces) > 1 or clock.n_backwards for clock in scan.clocks)
    )


def _says_samples(structure: Structure, options: ReadOptions) -> bool:
    """Say whether rows are samples since the user gives their interval, and they are even."""
    columns = structure.columns
    listed = columns.edges or columns.lasting or columns.key is not None
    return options.interval_s is not None and not listed and _steps(structure, 0).even


def _steps(structure: Structure, clock: int) -> Steps:
    """Look at the first stamps of a clock; a count of rows is not rounded."""
    counts = structure.columns.clocks[clock].kind == "index"
    resolution = 0.0 if counts else structure.cells[clock].resolution
    return examine_steps(without_twins(head_stamps(structure, clock)), resolution)


def _read_list(structure: Structure, content: Content, options: ReadOptions) -> Capture | None:
    """Read lists of transitions; None if later rows show that they are none."""
    from benchtool.formats.text.lists import read_lists

    found = read_lists(structure, content.source)
    if found is None:
        return None
    if _may_hold_others(found.scan):
        above = _read_above(structure, found.scan, content, options)
        if above is not None:
            return above
    return _capture(
        structure,
        content,
        found.scan,
        found.traces,
        found.notices,
        kind="transitions",
        interval=None,
    )


def _read_samples(structure: Structure, content: Content, options: ReadOptions) -> Capture:
    try:
        scan = _scan(structure, content)
    except MalformedCaptureError:
        above = _read_above(structure, None, content, options)
        if above is None:
            raise
        return above
    if _may_hold_others(scan):
        above = _read_above(structure, scan, content, options)
        if above is not None:
            return above
    _refuse_what_is_no_record(structure, scan, content.source)
    scan.clocks = tuple(
        _without_false_grid(clock, k, structure.rows, content.source)
        for k, clock in enumerate(scan.clocks)
    )
    sampled = _sampled(structure, scan)
    traces, notices = _waveforms(structure, sampled)
    notices += [n for timebase in sampled.timebases[:1] for n in timebase.warnings]
    if sampled.twins:
        notices = [n for n in notices if n.code != "repeated-stamps"]
        notices.append(envelope_notice(sampled.timebases[0].size))
    interval = _interval_point(structure, sampled.timebases)
    return _capture(
        structure, content, scan, traces, tuple(notices), kind="samples", interval=interval
    )


def _scan(structure: Structure, content: Content) -> Scan:
    """Walk all rows once; the column that tells channels apart comes last."""
    columns = structure.columns
    clocks = tuple(
        ClockScan(_steps(structure, k), content.source) for k in range(len(columns.clocks))
    )
    clock_of = (*columns.clock_of, *((None,) if columns.key is not None else ()))
    keep = structure.rows.content.data is not None
    return scan_rows(structure.rows, clocks, len(clock_of), clock_of, keep=keep)


def _refuse_what_is_no_record(structure: Structure, scan: Scan, source: str) -> None:
    """Refuse rows that are no samples of channels one after the other."""
    columns = structure.columns
    refuse_empty(scan.ranges[: len(columns.values)], source)
    if columns.key is not None and scan.ranges[-1].low != scan.ranges[-1].high:
        refuse_rows_of_channels(columns, source)
    _refuse_single_row(scan, source)
    if not is_envelope(scan.clocks, scan.n_rows):
        refuse_repeats(scan.clocks, scan.n_rows, source)
    if not scan.clocks:
        from benchtool.formats.text.stacked import refuse_frames

        refuse_frames(structure, source)


def _sampled(structure: Structure, scan: Scan) -> Sampled:
    stated, value_unit = structure.stated, structure.metadata.value_unit
    return Sampled(
        rows=structure.rows,
        scan=scan,
        layout=structure.layout,
        timebases=tuple(
            settle_time(clock, found.unit, _stated(structure, k))
            for k, (clock, found) in enumerate(zip(scan.clocks, structure.units, strict=True))
        ),
        units=tuple(found.unit for found in structure.units),
        interval_s=stated.value if stated else None,
        value_unit=value_unit[0] if value_unit else "",
        twins=is_envelope(scan.clocks, scan.n_rows),
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


def _stated(structure: Structure, clock: int) -> StatedInterval | None:
    if structure.stated is None:
        return None
    nominal = structure.columns.clocks[clock].kind == "stamp"
    return StatedInterval(
        value_s=structure.stated.value, rounding=structure.stated.rounding, nominal=nominal
    )


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
    pairs = list(zip(structure.columns.values, scan.ranges, strict=False))
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
