"""``benchtool design new``: a design file from options, or by asking."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Any, get_args

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output
from benchtool.errors import UsageError
from benchtool.model.design import TopologyName

if TYPE_CHECKING:
    from benchtool.designs import NewDesign

_QUESTIONS = {
    "RA": ("RA with its tolerance", "100k 1%"),
    "RB": ("RB with its tolerance", "330k 1%"),
    "R": ("R with its tolerance", "100k 1%"),
    "C": ("C with its tolerance", "47u 10%"),
}


@click.command("new")
@click.option("--name", metavar="TEXT", help="Name of the board.")
@click.option("--stage", metavar="NAME", help="Name of the stage (main).")
@click.option("--topology", type=click.Choice(get_args(TopologyName)), help="The circuit.")
@click.option("--RA", "RA", metavar="PART", help='Such as "100k 1%".')
@click.option("--RB", "RB", metavar="PART", help='Such as "330k 1%".')
@click.option("--R", "R", metavar="PART", help="The one resistor of the other topologies.")
@click.option("--C", "C", metavar="PART", help='Such as "47u 10%".')
@click.option("--supply", metavar="VOLTS", help='Such as "12 V 5%".')
@click.option("--ic", type=click.Choice(["cmos", "bipolar"]), help="IC family (cmos).")
@click.option(
    "--upper-threshold", metavar="LEVEL", help="For a Schmitt inverter: volts or a share."
)
@click.option(
    "--lower-threshold", metavar="LEVEL", help="For a Schmitt inverter: volts or a share."
)
@click.option("--u-threshold", metavar="REL", help="Relative u of the thresholds, such as 3%.")
@click.option("--channel", metavar="NAME", help="Name of the output's trace in the captures.")
@click.option(
    "--limit", "limits", multiple=True, metavar="NAME=LIMIT", help='Such as period="25 s 5%".'
)
@output_options
def command(output: Output, **given: Any) -> int:
    """Write a design file, from options; what is missing is asked for on a terminal.

    \b
    benchtool design new --name "Mist valve timer" --topology astable \\
        --RA "100k 1%" --RB "330k 1%" --C "47u 10%" --supply "12 V 5%" -o mist.toml
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.designs import write_design

    answers = _answers(_completed(given))
    output.print_text("design new", write_design(answers))
    if output.path not in (None, "-"):
        output.tell_written([output.path], "benchtool design check")
    return OK


def _completed(given: dict[str, Any]) -> dict[str, Any]:
    """Ask for what is missing where somebody can answer; else say what is missing."""
    from benchtool.designs.vocabulary import TOPOLOGY_PARTS

    complete = dict(given)
    for key, question, default in _missing(complete):
        if not sys.stdin.isatty():
            raise UsageError(
                f"design new needs --{key.replace('_', '-')}",
                hint=f"{question}, such as {default!r}.",
            )
        complete[key] = click.prompt(question, default=default, err=True)
    for ref in TOPOLOGY_PARTS[complete["topology"]]:
        if complete[ref] is None:
            complete |= _completed_part(complete, ref)
    return complete


def _missing(given: dict[str, Any]) -> list[tuple[str, str, str]]:
    asked = [
        ("name", "Name of the board", "Mist valve timer"),
        ("topology", f"Topology ({', '.join(get_args(TopologyName))})", "astable"),
        ("supply", "Supply with its tolerance", "12 V 5%"),
    ]
    if given["topology"] == "schmitt":
        asked += [
            ("upper_threshold", "Upper threshold", "60%"),
            ("lower_threshold", "Lower threshold", "40%"),
            ("u_threshold", "Relative standard uncertainty of the thresholds", "3%"),
        ]
    return [item for item in asked if given[item[0]] is None]


def _completed_part(given: dict[str, Any], ref: str) -> dict[str, str]:
    question, default = _QUESTIONS[ref]
    if not sys.stdin.isatty():
        raise UsageError(
            f"design new needs --{ref} for topology {given['topology']}",
            hint=f'{question}, such as "{default}".',
        )
    answer: str = click.prompt(question, default=default, err=True)
    return {ref: answer}


def _answers(given: dict[str, Any]) -> NewDesign:
    from benchtool.designs import NewDesign

    parts = {ref: given[ref] for ref in ("RA", "RB", "R", "C") if given[ref] is not None}
    return NewDesign(
        name=given["name"],
        topology=given["topology"],
        stage=given["stage"] or "main",
        parts=parts,
        supply=given["supply"],
        ic=_ic(given),
        channel=given["channel"],
        limits=_limits(given["limits"]),
    )


def _ic(given: dict[str, Any]) -> str | dict[str, str]:
    family = given["ic"] or "cmos"
    keys = ("upper_threshold", "lower_threshold", "u_threshold")
    stated = {key: given[key] for key in keys if given[key] is not None}
    return {"family": family, **stated} if stated else family


def _limits(texts: tuple[str, ...]) -> dict[str, str]:
    limits: dict[str, str] = {}
    for text in texts:
        name, _, limit = text.partition("=")
        if not limit:
            raise UsageError(
                f"--limit wants a quantity and its limit, got {text!r}",
                hint='Write it like --limit "period=25 s 5%".',
            )
        limits[name.strip()] = limit.strip()
    return limits
