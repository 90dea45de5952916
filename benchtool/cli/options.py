"""Options that several verbs share, gathered into the records the rooms take."""

from __future__ import annotations

from collections.abc import Callable
from functools import wraps
from typing import Any, Literal

import click

from benchtool.cli.output import Output
from benchtool.errors import UsageError

Function = Callable[..., Any]

_OUTPUT = (
    click.option("--json", "as_json", is_flag=True, help="One JSON document on stdout."),
    click.option("-o", "path", metavar="FILE", help="Write to FILE in place of the screen."),
    click.option("--quiet", is_flag=True, help="Print nothing; the exit code tells."),
    click.option("--no-color", is_flag=True, help="No colour (NO_COLOR does the same)."),
    click.option("--force", is_flag=True, help="Replace files that exist."),
)

report_option = click.option(
    "--report", metavar="OUT", help="Write a one-page report too: OUT.html, OUT.md or OUT.txt."
)

_READING = (
    click.option("--format", "format_", metavar="NAME", help="text, vcd, npz or wav."),
    click.option("--delimiter", metavar="CHAR", help="Column delimiter: , ; tab | space or none."),
    click.option("--decimal", type=click.Choice([".", ","]), help="Decimal mark of the numbers."),
    click.option(
        "--skip", type=click.IntRange(min=0), metavar="N", help="Pass over the first N lines."
    ),
    click.option(
        "--time", metavar="COLUMN", help="Column of time, by name or number; none counts the rows."
    ),
    click.option(
        "--time-unit",
        type=click.Choice(["s", "ms", "us", "ns", "ps", "fs"]),
        help="Unit of the time column.",
    ),
    click.option("--interval", metavar="TIME", help="Sample interval, such as 5us."),
    click.option("--rate", metavar="FREQ", help="Sample rate, such as 200kHz."),
    click.option("--channel", metavar="NAME", help="Trace to measure, by name or number."),
    click.option(
        "--structure", metavar="NAME", help="Read it as the structure kept as NAME, or as none."
    ),
)

_WINDOW = (
    click.option("--from", "from_", metavar="TIME", help="Measure from here, after the start."),
    click.option("--to", metavar="TIME", help="Measure up to here, after the start."),
)

_MEASURING = (
    click.option("--active", type=click.Choice(["high", "low"]), help="State that begins a cycle."),
    click.option("--level", metavar="VOLTS", help="Mid reference level for the edge times."),
    click.option("--timebase", metavar="REL", help="Timebase error, half-width, such as 50ppm."),
    click.option("--instrument", metavar="NAME", help="Instrument of your kit that recorded it."),
    click.option("--probe", metavar='"R C"', help='Probe load, such as "10M 12p", or its name.'),
    click.option("--temperature", metavar="TEMP", help="Board temperature, such as 23degC."),
)


def output_options(function: Function) -> Function:
    """Add the output options; the function gets an ``output`` record."""

    @wraps(function)
    def gather(**given: Any) -> Any:
        names = ("as_json", "path", "quiet", "no_color", "force")
        output = Output(**{name: given.pop(name) for name in names})
        return function(output=output, **given)

    return _decorate(gather, _OUTPUT)


def measuring_options(function: Function) -> Function:
    """Add reading and measuring options; the function gets an ``options`` record."""

    @wraps(function)
    def gather(**given: Any) -> Any:
        return function(options=_measure_options(given), **given)

    return _decorate(gather, (*_READING, *_WINDOW, *_MEASURING))


def _decorate(function: Function, options: tuple[Any, ...]) -> Function:
    for option in reversed(options):
        function = option(function)
    return function


def _measure_options(given: dict[str, Any]) -> Any:
    """Take the reading and measuring options out of ``given`` and make the record of them."""
    from benchtool.model.capture import ReadOptions
    from benchtool.model.options import MeasureOptions

    interval, rate = given.pop("interval"), given.pop("rate")
    read = ReadOptions(
        format=given.pop("format_"),
        delimiter=given.pop("delimiter"),
        decimal=given.pop("decimal"),
        time=given.pop("time"),
        time_unit=given.pop("time_unit"),
        interval_s=_interval(interval, rate),
        skip=given.pop("skip"),
        channel=given.pop("channel"),
        structure=given.pop("structure"),
    )
    active: Literal["high", "low"] | None = given.pop("active")
    instrument, probe = kit_of(given.pop("instrument"), given.pop("probe"))
    return MeasureOptions(
        read=read,
        window=_window(given.pop("from_"), given.pop("to")),
        active=active,
        level_v=value_of("--level", given.pop("level"), "V"),
        timebase_rel=share("--timebase", given.pop("timebase")),
        probe=probe,
        instrument=instrument,
        temperature_c=value_of("--temperature", given.pop("temperature"), "degC"),
    )


def value_of(option: str, text: str | None, unit: str) -> float | None:
    """Return the value of an option in an SI unit; None where it was not given.

    Raises:
        UsageError: If the text is no such value; the message names the option.
    """
    if text is None:
        return None
    from benchtool.errors import UnitError
    from benchtool.units import parse

    try:
        return parse(text, unit)
    except UnitError as error:
        raise UsageError(f"{option}: {error.message}", hint=error.hint, code="unit") from error


def positive(option: str, text: str | None, unit: str) -> float | None:
    """Return the value of an option that must be greater than 0."""
    value = value_of(option, text, unit)
    if value is not None and value <= 0:
        raise UsageError(f"{option} must be greater than 0, got {text}", hint=f"Correct {option}.")
    return value


def share(option: str, text: str | None) -> float | None:
    """Return the value of an option that is a share from 0 to 50 %."""
    value = value_of(option, text, "1")
    if value is not None and not 0 <= value < 0.5:
        raise UsageError(
            f"{option} must be a share from 0 to 50 %, got {text}", hint="Write 50ppm or 0.01%."
        )
    return value


def _interval(interval: str | None, rate: str | None) -> float | None:
    if interval is not None and rate is not None:
        raise UsageError("--interval and --rate say the same thing", hint="Give one of them.")
    if rate is not None:
        rate_hz = positive("--rate", rate, "Hz")
        return None if rate_hz is None else 1 / rate_hz
    return positive("--interval", interval, "s")


def _window(start: str | None, stop: str | None) -> Any:
    """Return the part of the record to measure; None for all of it."""
    if start is None and stop is None:
        return None
    import math

    from benchtool.model.window import Window

    from_s, to_s = value_of("--from", start, "s") or 0.0, positive("--to", stop, "s") or math.inf
    if from_s < 0:
        raise UsageError(
            f"--from counts from the first sample and cannot be negative, got {start}",
            hint="Give a time from 0 on.",
        )
    if from_s >= to_s:
        raise UsageError(
            f"--from {start} does not lie before --to {stop}", hint="Exchange them, or leave one."
        )
    return Window(from_s=from_s, to_s=to_s)


def kit_of(instrument: str | None, probe: str | None) -> Any:
    """Return the instrument of the user's kit, and the load of its probe or of the one named."""
    load = None if probe is None or _is_name(probe) else _probe(probe)
    if instrument is None and (probe is None or load is not None):
        return None, load
    from benchtool.cli.kit import named_in_kit

    return named_in_kit(instrument, None if load else probe, load)


def _is_name(probe: str) -> bool:
    """Tell the name of a probe from its load, which begins with a figure."""
    return len(probe.split()) == 1 and not probe.lstrip()[:1].isdigit()


def _probe(text: str) -> Any:
    from benchtool.model.design import Probe

    words = text.split()
    if len(words) != 2:
        raise UsageError(
            f"--probe wants resistance and capacitance, got {text!r}",
            hint='Write it like --probe "10M 12p", or name a probe of your kit.',
        )
    r_ohm, c_f = positive("--probe", words[0], "ohm"), value_of("--probe", words[1], "F")
    if r_ohm is None or c_f is None or c_f < 0:
        raise UsageError(f"--probe: {text!r} is no load", hint='Write it like "10M 12p".')
    return Probe(r_ohm=r_ohm, c_f=c_f)
