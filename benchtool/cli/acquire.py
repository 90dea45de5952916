"""``benchtool acquire``: captures from a live source into files, whole ones only."""

from __future__ import annotations

import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.live import live_options
from benchtool.cli.options import output_options, positive
from benchtool.cli.output import Output
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.instruments import Order
    from benchtool.jobs.acquiring import Enough
    from benchtool.jobs.sources import Wanted

_PERIODS = re.compile(r"(\d+)\s*periods?")
_POWER_UP_S = 600.0
"""How long a supply may stay off after arming: long enough to walk to the switch."""


@click.command("acquire")
@click.argument("source", metavar="SOURCE")
@click.option("--channel", "channels", multiple=True, metavar="NAME", help="Channel; repeatable.")
@click.option("--captures", type=click.IntRange(min=1), default=1, metavar="N", help="So many.")
@click.option("--until", metavar="LENGTH", help='Until "50 periods", or a time for a stream.')
@click.option(
    "--readings", type=click.IntRange(min=1), metavar="N", help="Of a counter: so many of each."
)
@click.option(
    "--function", "functions", multiple=True, metavar="NAME", help="Of a counter; repeatable."
)
@click.option("--power-up", is_flag=True, help="Arm first, then switch the supply on.")
@click.option("--from-memory", is_flag=True, help="Read what the instrument holds; do not arm.")
@click.option("--force-trigger", is_flag=True, help="Trigger by command.")
@click.option("--trigger-timeout", metavar="TIME", help="How long to wait for the trigger.")
@click.option("--set", "changes", multiple=True, metavar="CMD", help="Send first; repeatable.")
@live_options
@output_options
def command(wanted: Wanted, output: Output, power_up: bool, **given: Any) -> int:
    """Acquire captures from SOURCE into the file of -o, an .npz with a .json beside it.

    SOURCE is an instrument's resource, a name of your kit, or a serial port that sends edges.
    A counter gives readings of t_high, t_low, period, frequency, duty, or time stamps of edges.
    Settings of the instrument are read and recorded, and left as they are unless --set says so.

    \b
    benchtool acquire TCPIP::192.0.2.7::hislip0::INSTR -o board.npz
    benchtool acquire left --power-up -o first_pulse.npz
    benchtool acquire counter --readings 100 --function period -o readings.npz
    benchtool acquire /dev/ttyACM0 --until "50 periods" -o edges.npz
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.cli.acquiring import run_acquisition

    path = _target(output)
    enough = _enough(given.pop("captures"), given.pop("until"))
    order = _order(wanted, given, power_up=power_up)
    run_acquisition(wanted, order, enough, path, output, power_up=power_up)
    return OK


def _target(output: Output) -> Path:
    if output.path is None or output.path == "-" or Path(output.path).suffix != ".npz":
        raise UsageError("acquire writes an .npz file", hint="Name it: -o board.npz.")
    return Path(output.path)


def _enough(captures: int, until: str | None) -> Enough:
    from benchtool.jobs.acquiring import Enough

    periods = _PERIODS.fullmatch(until.strip()) if until else None
    if until is None or periods:
        return Enough(captures=captures, periods=int(periods[1]) if periods else None)
    return Enough(captures=captures, duration_s=positive("--until", until, "s"))


def _order(wanted: Wanted, given: dict[str, Any], *, power_up: bool) -> Order:
    from benchtool.instruments import Order
    from benchtool.jobs.sources import channels_of

    if power_up and given["from_memory"]:
        raise UsageError("--power-up arms and --from-memory does not", hint="Give one of the two.")
    timeout_s = positive("--trigger-timeout", given["trigger_timeout"], "s")
    return Order(
        channels=channels_of(wanted.kept, given["channels"]),
        arm=not given["from_memory"],
        force=given["force_trigger"],
        trigger_timeout_s=timeout_s or (_POWER_UP_S if power_up else None),
        settings=given["changes"],
        functions=given["functions"],
        readings=given["readings"],
    )
