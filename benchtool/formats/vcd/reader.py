"""From a value change dump to a capture."""

from __future__ import annotations

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.vcd.body import read_body
from benchtool.formats.vcd.changes import Body, Changes, NumberChanges
from benchtool.formats.vcd.header import (
    PER_SECOND,
    REALS,
    WIDEST,
    Header,
    Variable,
    find_variable,
    read_header,
    shared_scope,
    trace_names,
)
from benchtool.formats.vcd.traces import bit_traces, number_traces
from benchtool.formats.zeros import without_zeros, zeros_notice
from benchtool.model.capture import (
    Capture,
    LogicTrace,
    Origin,
    ReadOptions,
    StructurePoint,
    Trace,
    Waveform,
)
from benchtool.model.quantity import Notice

_HEADER_BYTES = 1 << 20
_LONGEST_HEADER = 1 << 28
_WIDEST_NUMBER = 52  # bits that a float holds exactly
_NO_SIGNALS = frozenset({"event", "string"})


def read_vcd(content: Content, options: ReadOptions) -> Capture:
    """Read a value change dump: a logic trace for each scalar and each bit of small vectors.

    A vector that ``options.channel`` names is read as a number too.

    Raises:
        AmbiguousStructureError: If it states no timescale and none is given.
        MalformedCaptureError: If it is damaged or holds no signal.
    """
    header = _header(content)
    per_second, scale_point = _timescale(header, options, content.source)
    names = trace_names(header.variables)
    asked = find_variable(header.variables, names, options.channel) if options.channel else None
    wanted, skipped = _wanted(header.variables, asked)
    body = _empty_body(header, wanted, asked, content.source)
    read_body(content, header.body, body)
    points = _points(header, names, body, per_second)
    traces = _traces(wanted, names, body, per_second, options.channel or "")
    if not traces or body.start is None:
        raise _silent(header, body, content.source)
    return Capture(
        origin=Origin(
            source=content.source,
            format="vcd",
            sha256=content.sha256,
            instrument=header.version or None,
        ),
        traces=traces,
        structure=(scale_point, *_trace_points(traces), *points),
        warnings=(
            *_notices(header, traces, skipped, body),
            *zeros_notice(without_zeros(content)[1]),
        ),
    )


def _header(content: Content) -> Header:
    """Read the declarations, from as much of the file as they take."""
    n_bytes = _HEADER_BYTES
    while True:
        try:
            return read_header(content.head(n_bytes), content.source)
        except MalformedCaptureError:
            if n_bytes >= min(content.size, _LONGEST_HEADER):
                raise
            n_bytes *= 4


def _silent(header: Header, body: Body, source: str) -> MalformedCaptureError:
    lacks = "no time (#)" if body.start is None else "no change of any that can be measured"
    return MalformedCaptureError(
        f"{source} declares {len(header.variables)} signals and holds {lacks}",
        hint="Dump the signal while it runs, and save again.",
        path=source,
        code="no-values",
    )


def _timescale(header: Header, options: ReadOptions, source: str) -> tuple[float, StructurePoint]:
    """Return the counts a second."""
    if options.time_unit in PER_SECOND:
        multiple, unit = 1, str(options.time_unit)
        evidence = "--time-unit"
    elif header.timescale is not None:
        multiple, unit = header.timescale
        evidence = "$timescale"
    else:
        raise AmbiguousStructureError(
            f"{source} has no $timescale, so its times have no unit",
            hint="Name the unit of one count with --time-unit s, ms, us, ns, ps or fs.",
            code="no-timescale",
        )
    value = f"{multiple} {unit}"
    point = StructurePoint(name="time_unit", value=value, evidence=evidence, sure="stated")
    return PER_SECOND[unit] / multiple, point


def _wanted(
    variables: list[Variable], asked: Variable | None
) -> tuple[list[Variable], list[Variable]]:
    """Return one variable for each code, and those left out: no signals, and wide vectors.

    Of several names of one code the first is taken, or the one that is asked for.
    """
    wanted: dict[bytes, Variable] = {}
    skipped = []
    for variable in variables:
        wide = variable.kind not in REALS and not 0 < variable.width <= WIDEST
        if variable.kind in _NO_SIGNALS or wide:
            skipped.append(variable)
        elif variable is asked:
            wanted[variable.code] = variable
        else:
            wanted.setdefault(variable.code, variable)
    return list(wanted.values()), skipped


def _empty_body(
    header: Header, wanted: list[Variable], asked: Variable | None, source: str
) -> Body:
    body = Body(source=source, known=frozenset(v.code for v in header.variables))
    for variable in wanted:
        if variable.kind in REALS:
            body.reals[variable.code] = NumberChanges()
            continue
        body.bits[variable.code] = [Changes() for _ in range(variable.width)]
        if variable is asked and 1 < variable.width <= _WIDEST_NUMBER:
            body.numbers[variable.code] = NumberChanges()
    return body


def _traces(
    wanted: list[Variable],
    names: dict[Variable, str],
    body: Body,
    per_second: float,
    asked: str,
) -> tuple[Trace, ...]:
    traces: list[Trace] = []
    for variable in wanted:
        name, code = names[variable], variable.code
        if code in body.reals:
            traces += number_traces(body.reals.pop(code), name, body, per_second)
        else:
            traces += bit_traces(variable, name, body, per_second)
        if code in body.numbers:
            traces += number_traces(body.numbers.pop(code), asked, body, per_second)
    return tuple(traces)


def _trace_points(traces: tuple[Trace, ...]) -> list[StructurePoint]:
    channels = ", ".join(trace.channel for trace in traces[:64])
    points = [StructurePoint(name="channels", value=channels, evidence="$var", sure="stated")]
    timed = [t for t in traces if isinstance(t, LogicTrace) and t.tick_s > 0]
    if timed:
        value = f"{timed[0].tick_s:.9g} s ({timed[0].channel})"
        evidence = "greatest common spacing of its transitions"
        points.append(StructurePoint(name="tick", value=value, evidence=evidence))
    return points


def _points(
    header: Header, names: dict[Variable, str], body: Body, per_second: float
) -> list[StructurePoint]:
    start = body.start or 0
    end = start + body.time
    points = [
        ("start", f"{start / per_second:.9g} s", f"first time #{start}"),
        ("end", f"{end / per_second:.9g} s", f"last time #{end}"),
    ]
    scope = ".".join(shared_scope(header.variables))
    if scope:
        points.append(("scope", scope, "$scope around all variables"))
    first: dict[bytes, str] = {}
    for variable in header.variables:
        known = first.setdefault(variable.code, names[variable])
        if known != names[variable]:
            points.append(("alias", names[variable], f"same identifier code as {known}"))
    return [StructurePoint(name=n, value=v, evidence=e) for n, v, e in points]


def _notices(
    header: Header, traces: tuple[Trace, ...], skipped: list[Variable], body: Body
) -> list[Notice]:
    found = {
        "declarations-unended": header.unended
        and "the declarations end without $enddefinitions; "
        "the value changes were read from the first time or $dump keyword on",
        "assumed-volts": any(isinstance(trace, Waveform) for trace in traces)
        and "a dump states no unit for its numbers: volts are assumed; only voltages depend on "
        "it, no time does",
        "signals-skipped": skipped
        and f"{len(skipped)} variables were left out (events, strings, and vectors of more than "
        f"{WIDEST} bits), the first {skipped[0].name}",
        "file-cut": body.cut
        and f"the dump ends inside a value change ({body.cut[:30]!r}); "
        "it was read to the change before",
    }
    return [Notice(code=code, text=str(text)) for code, text in found.items() if text]
