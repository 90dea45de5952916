"""``benchtool watch``: the live reading while a trimmer is turned."""

from __future__ import annotations

import json
import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any, get_args

import click

from benchtool import __version__
from benchtool.cli.exits import BY_VERDICT, OK
from benchtool.cli.live import live_options
from benchtool.cli.options import output_options, share, value_of
from benchtool.cli.output import Output, made_at, refuse_existing, write_file
from benchtool.errors import InstrumentError, UnitError, UsageError
from benchtool.model.watch import WatchedName

if TYPE_CHECKING:
    from benchtool.cli.watch_audience import Silent
    from benchtool.jobs.sources import Wanted
    from benchtool.model.options import MeasureOptions
    from benchtool.model.watch import Reading


@click.command("watch")
@click.argument("source", metavar="SOURCE")
@click.option("--design", metavar="FILE", help="The design file (TOML): goal, limits, verdict.")
@click.option("--stage", metavar="NAME", help="Stage to watch, where the design has several.")
@click.option("--goal", metavar="VALUE", help="Where it is to go, such as 25s, 40Hz or 56%.")
@click.option(
    "--quantity", type=click.Choice(get_args(WatchedName)), help="What is watched: period."
)
@click.option("--tone", is_flag=True, help="Ring the terminal's bell: nearer is quicker.")
@click.option("--updates", type=click.IntRange(min=1), metavar="N", help="End after N captures.")
@click.option("--channel", metavar="NAME", help="Trace to watch, by name or number.")
@click.option("--active", type=click.Choice(["high", "low"]), help="State that begins a cycle.")
@click.option("--level", metavar="VOLTS", help="Mid reference level for the edge times.")
@click.option("--timebase", metavar="REL", help="Timebase error, half-width, such as 50ppm.")
@live_options
@output_options
def command(wanted: Wanted, output: Output, **given: Any) -> int:
    """Show the reading of SOURCE as it comes, large, while a trimmer is turned.

    SOURCE is an instrument's resource, a name of your kit, a serial port that sends edges, a file
    that grows, or - for standard input. Readings are averaged until one of them moves. Into a pipe,
    or with --json, each capture gives one JSON document on a line.

    Keys: m marks the reading, u takes the last mark back, a accepts it (-o FILE writes it as JSON),
    q leaves. Exit code of an accepted reading, and after --updates: that of its verdict.

    \b
    benchtool watch TCPIP::192.0.2.7::hislip0::INSTR --design board.toml
    benchtool watch /dev/ttyACM0 --goal 40Hz --tone
    """  # noqa: D301 - click's mark of lines to keep as they are
    if output.path is not None:
        refuse_existing(Path(output.path), force=output.force)
    reading, ending, now_s = _watch(wanted, output, given)
    if ending == "left":
        return OK
    if ending == "accepted":
        _keep(reading, now_s, wanted, output)
    return BY_VERDICT[reading.verdict]


def _watch(wanted: Wanted, output: Output, given: dict[str, Any]) -> tuple[Reading, str, float]:
    """Follow the source; return the last reading, what ended it, and when that was."""
    from benchtool.cli.cautions import tell_cautions
    from benchtool.jobs.sources import kind_of, open_stream
    from benchtool.jobs.watch import View, plan_watch, watch
    from benchtool.observation import settle

    options = _options(wanted, given)
    design = _design(given["design"], options)
    settings = settle(options, design)
    goal, stage = _goal(given["goal"]), given["stage"]
    plan = plan_watch(settings, design, stage=stage, goal=goal, quantity=given["quantity"])
    is_instrument = kind_of(wanted.resource) == "instrument"
    view = View(settings=settings, design=design, stage=stage, own_axis=is_instrument)
    tell_cautions(output)
    stream = open_stream(wanted)

    def follow(audience: Silent) -> tuple[Reading, str, float]:
        most = given["updates"]
        reading, ending = watch(stream, plan, view, audience, most_updates=most)
        return reading, ending, audience.now_s

    return _shown(follow, output, tone=given["tone"])


def _shown(follow: Any, output: Output, *, tone: bool) -> tuple[Reading, str, float]:
    """Run with the audience that stdout is; what is lost leaves its last reading behind."""
    from benchtool.cli.watch_audience import Documents, Lines, Screen, Silent, can_draw
    from benchtool.cli.watch_terminal import Canvas, Keyboard

    if output.as_json or not sys.stdout.isatty():
        return follow(Silent() if output.quiet and not output.as_json else Documents())  # type: ignore[no-any-return]
    if output.quiet or not can_draw():
        return follow(Silent() if output.quiet else Lines())  # type: ignore[no-any-return]
    no_color = output.no_color or bool(os.environ.get("NO_COLOR"))
    canvas, keyboard = Canvas(sys.stdout, no_color=no_color), Keyboard()
    screen = Screen(canvas, keyboard, tone=tone)
    try:
        with keyboard, canvas:
            return follow(screen)  # type: ignore[no-any-return]
    except InstrumentError:
        if screen.last is not None and screen.last.value is not None:
            _print_line("last reading", screen.last)
        raise


def _options(wanted: Wanted, given: dict[str, Any]) -> MeasureOptions:
    from benchtool.model.capture import ReadOptions
    from benchtool.model.options import MeasureOptions

    probe = None
    if wanted.kept is not None:
        from benchtool.cli.kit import named_in_kit

        _, probe = named_in_kit(wanted.kept.name, None, None)
    return MeasureOptions(
        read=ReadOptions(channel=given["channel"]),
        active=given["active"],
        level_v=value_of("--level", given["level"], "V"),
        timebase_rel=share("--timebase", given["timebase"]),
        instrument=wanted.kept,
        probe=probe,
    )


def _design(name: str | None, options: MeasureOptions) -> Any:
    if name is None:
        return None
    from benchtool.designs.settling import settled_design

    return settled_design(name, options)


def _goal(text: str | None) -> tuple[float, str] | None:
    """Return the goal with its unit, told by the unit that was written.

    Raises:
        UsageError: If it has none of them (``unit``), or is not above 0.
    """
    if text is None:
        return None
    from benchtool.units import parse

    bare = text.strip().rstrip("0123456789.") == ""
    for unit in ("s", "Hz", "1") if not bare else ():
        try:
            value = parse(text, unit)
        except UnitError:
            continue
        if value > 0:
            return value, unit
        break
    raise UsageError(
        f"--goal: {text!r} is no time, frequency or duty above 0",
        hint="Write it with its unit: --goal 25s, --goal 40Hz or --goal 56%.",
        code="unit",
    )


def _keep(reading: Reading, now_s: float, wanted: Wanted, output: Output) -> None:
    """Write the reading that was accepted, or print it."""
    if output.path is not None:
        from benchtool.report.watching import watch_document

        document = watch_document(reading, now_s, version=__version__, made_at=made_at())
        content = json.dumps(document, allow_nan=False) + "\n"
        write_file(Path(output.path), content.encode(), force=output.force)
    if output.quiet:
        return
    _print_line("accepted", reading)
    from benchtool.jobs.sources import kind_of
    from benchtool.report.commands import quoted

    name = quoted(wanted.name)
    verb = f"look {name}" if kind_of(wanted.resource) == "file" else f"acquire {name} -o board.npz"
    sys.stdout.write(f"\n  Next:  benchtool {verb}\n")


def _print_line(word: str, reading: Reading) -> None:
    from benchtool.report.screen.watch_words import reading_text
    from benchtool.report.text import spelled

    text = f"  {word}   {reading_text(reading)}\n"
    sys.stdout.write(spelled(text, sys.stdout.encoding or "ascii"))
