"""The entry point: finds the verb, and maps every end to an exit code."""

from __future__ import annotations

import errno
import gc
import json
import os
import sys
import traceback
from collections.abc import Collection, Sequence
from pathlib import Path
from typing import NoReturn, TextIO

import click

from benchtool import __version__
from benchtool.cli import exits
from benchtool.cli.commands import DESIGN, INSTRUMENTS, PARTS, SECTIONS
from benchtool.cli.verbs import VerbGroup
from benchtool.errors import BenchtoolError, DesignError, InputError, InstrumentError, UsageError

_FULL = InputError(
    "the output could not be written: no space left on device",
    hint="Free some space, or send the output elsewhere.",
    code="not-writable",
)
_QUIET = {
    "OPENBLAS_NUM_THREADS": "1",  # nothing here is that large, and a waiting thread burns a core
    "PYDANTIC_DISABLE_PLUGINS": "__all__",  # else each installed package is searched for some
}
"""What libraries are told before they load."""

_BELOW: dict[str | None, Collection[str]] = {
    "design": DESIGN["Verbs"],
    "parts": PARTS["Verbs"],
    "instruments": INSTRUMENTS["Verbs"],
}
_CONTEXT = {"help_option_names": ["-h", "--help"], "max_content_width": 100}


def _print_version(ctx: click.Context, _parameter: click.Parameter, wanted: bool) -> None:
    if not wanted or ctx.resilient_parsing:
        return
    from benchtool.cli.versions import library_versions

    click.echo(f"benchtool {__version__}")
    for name, version in library_versions().items():
        click.echo(f"  {name} {version}")
    ctx.exit()


@click.group(cls=VerbGroup, sections=SECTIONS, context_settings=_CONTEXT, no_args_is_help=True)
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_print_version,
    help="Show the version, with those of the libraries.",
)
def program() -> None:
    """Measure, solve, judge and diagnose boards timed by a resistor and a capacitor.

    Start with:  benchtool look FILE
    """


def run() -> NoReturn:
    """Run the command line and leave with its exit code."""
    gc.set_threshold(100_000)  # start-up makes many objects and no garbage: 15 ms less
    for name, value in _QUIET.items():
        os.environ.setdefault(name, value)
    for name in ("stdout", "stderr"):
        if getattr(sys, name) is None:  # closed by the shell: ``>&-``
            setattr(sys, name, Path(os.devnull).open("w", encoding="utf-8"))  # noqa: SIM115 - kept
    code = main(sys.argv[1:])
    gc.freeze()  # the end looks through all objects for garbage, which goes with the process anyway
    sys.exit(code)


def main(arguments: Sequence[str]) -> int:
    """Run the command line and return its exit code; never raises."""
    try:
        # click's own ``main`` ends differently from version to version; its two steps do not
        with program.make_context("benchtool", list(arguments)) as context:
            code = _invoke(context, arguments)
        sys.stdout.flush()
    except BaseException as error:
        return _end(error, list(arguments))
    return code if isinstance(code, int) else exits.OK


def _invoke(context: click.Context, arguments: Sequence[str]) -> object:
    """Run the verb; where a terminal listens, it is shown how far a long walk has come."""
    if "--quiet" in arguments or not sys.stderr.isatty():
        return program.invoke(context)
    from benchtool.cli.progress import progress_shown

    with progress_shown():
        return program.invoke(context)


def _end(error: BaseException, arguments: list[str]) -> int:
    """Report what ended the run and return its exit code."""
    code = exits.INTERNAL
    match error:
        case click.exceptions.Exit():
            code = error.exit_code
        case click.UsageError() if type(error).__name__ == "NoArgsIsHelpError":  # click 8.2
            click.echo(error.format_message())
            code = exits.USAGE
        case click.Abort() | KeyboardInterrupt():
            click.echo("\ninterrupted; nothing was left half written", err=True)
            code = exits.INTERRUPTED
        case BrokenPipeError():
            _silence(sys.stdout)
            code = exits.PIPE_CLOSED
        case SystemExit() if isinstance(error.__context__, BrokenPipeError):  # rich's own way
            code = exits.PIPE_CLOSED
        case OSError() if error.errno == errno.ENOSPC and error.filename is None:
            _silence(sys.stdout)
            _report(_FULL, arguments)
            code = exits.USAGE
        case BenchtoolError():
            _report(error, arguments)
            code = exits.exit_code(error)
        case click.ClickException():
            _report(_from_click(error), arguments)
            code = exits.USAGE
        case _:
            _report(_internal_fault(error), arguments)
    return code


def _from_click(error: click.ClickException) -> UsageError:
    context = getattr(error, "ctx", None)
    where = context.command_path if context is not None else "benchtool"
    message = error.format_message().rstrip(".")
    return UsageError(message[:1].lower() + message[1:], hint=f"See: {where} --help")


def _internal_fault(error: BaseException) -> BenchtoolError:
    if os.environ.get("BENCHTOOL_DEBUG") == "1":
        traceback.print_exception(error)
    return BenchtoolError(
        f"internal fault: {type(error).__name__}: {' '.join(str(error).split())}",
        hint="This is a fault of benchtool, not of your file. Set BENCHTOOL_DEBUG=1 to see where.",
        code="internal",
    )


def _silence(stream: TextIO) -> None:
    """Point a stream at nothing, so that the interpreter's own flush at exit stays quiet."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())


def _verb_of(arguments: list[str]) -> str | None:
    """Return the verb as documents name it, "design check" for one of a group."""
    verb = next((word for word in arguments if word in program.verbs), None)
    below = next((word for word in arguments if word in _BELOW.get(verb, ())), None)
    return f"{verb} {below}" if below else verb


def _report(error: BenchtoolError, arguments: list[str]) -> None:
    """Say what went wrong; where nobody listens any more, the exit code alone tells."""
    stream = sys.stdout if "--json" in arguments else sys.stderr
    try:
        _write_report(error, arguments)
        stream.flush()
    except OSError:
        _silence(stream)


def _write_report(error: BenchtoolError, arguments: list[str]) -> None:
    if "--json" in arguments:
        from benchtool.report.document import error_document

        click.echo(json.dumps(error_document(error, command=_verb_of(arguments))))
        return
    from benchtool.report.text import printable

    click.echo(f"benchtool: {printable(error.message)}", err=True)
    if isinstance(error, DesignError):
        for fault in error.faults:
            near = f" (nearest known key: {fault.near})" if fault.near else ""
            place = f"line {fault.line}: " if fault.line else ""
            click.echo(printable(f"  {place}{fault.key}: {fault.message}{near}"), err=True)
    if isinstance(error, InstrumentError):
        from dataclasses import asdict

        for name, value in asdict(error.step).items():
            if value:
                click.echo(printable(f"  {name.replace('_', ' ')}: {value}"), err=True)
    click.echo(f"  {printable(error.hint)}", err=True)
    click.echo(f"  More: benchtool explain {error.code}", err=True)
