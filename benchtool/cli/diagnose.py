"""``benchtool diagnose``: which part moved, how sure, and what to measure next."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any, get_args

import click

from benchtool.cli.companions import companion_options
from benchtool.cli.exits import OK
from benchtool.cli.options import measuring_options, output_options, report_option
from benchtool.cli.output import Output
from benchtool.errors import UsageError
from benchtool.model.design import TopologyName
from benchtool.model.options import MeasureOptions

if TYPE_CHECKING:
    from benchtool.evidence import Companion
    from benchtool.model.design import Design
    from benchtool.model.quantity import Notice
    from benchtool.model.result import Analysis


_PARTS = ("RA", "RB", "R", "C")


@click.command("diagnose")
@click.argument("file", metavar="FILE")
@click.option("--design", metavar="FILE", help="The design file (TOML).")
@click.option("--stage", metavar="NAME", help="Diagnose this stage alone.")
@click.option(
    "--reading",
    "readings",
    multiple=True,
    metavar="NAME=VALUE",
    help="A meter's reading: control-pin=7.95V, RB<=46.8k, C=8.1u.",
)
@companion_options
@click.option("--node", metavar="FILE", help="A capture of the capacitor node.")
@click.option(
    "--topology", type=click.Choice(get_args(TopologyName)), help="The circuit, without a design."
)
@click.option("--RA", "RA", metavar="PART", help="As marked, without a design.")
@click.option("--RB", "RB", metavar="PART", help="As marked, without a design.")
@click.option("--R", "R", metavar="PART", help="As marked, without a design.")
@click.option("--C", "C", metavar="PART", help="As marked, without a design.")
@click.option("--ic", type=click.Choice(["bipolar", "cmos"]), help="IC family, without a design.")
@click.option("--supply-nominal", metavar="VOLTS", help="Supply, without a design.")
@report_option
@measuring_options
@output_options
def command(
    file: str,
    readings: tuple[str, ...],
    companions: tuple[Companion, ...],
    report: str | None,
    options: MeasureOptions,
    output: Output,
    **given: Any,
) -> int:
    """Say which part of the board of FILE has moved, how sure that is, and what to measure next.

    Every reading and every further capture makes the answer sharper.

    \b
    benchtool diagnose slow.csv --design mist_valve.toml
    benchtool diagnose slow.csv --design mist_valve.toml --reading control-pin=7.95V
    benchtool diagnose slow.csv --design mist_valve.toml --shunt 2M2 shunted.csv
    benchtool diagnose slow.csv --topology astable --RA 100k --RB 330k --C 47u
    benchtool diagnose slow.csv --topology astable
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.cli.again import again
    from benchtool.cli.readings import reading_of
    from benchtool.pipeline import diagnose

    undrawn = given["design"] is None and given["topology"] is not None
    if undrawn and not any(given[ref] for ref in _PARTS):
        output.show(_unmarked(file, given, options), report=report)
        return OK
    design, assumed = _design(given)
    analysis = diagnose(
        file,
        design,
        stage=given["stage"],
        companions=companions,
        node=given["node"],
        readings=tuple(reading_of(text) for text in readings),
        options=options,
    )
    first, *others = analysis.sources
    first = replace(first, options=(*first.options, *again(click.get_current_context().params)))
    output.show(
        replace(analysis, sources=(first, *others), warnings=(*analysis.warnings, *assumed)),
        report=report,
    )
    return OK


def _unmarked(file: str, given: dict[str, Any], options: MeasureOptions) -> Analysis:
    """Return what can be said where neither a drawing nor a marking tells the parts."""
    from benchtool.model.design import Ic
    from benchtool.pipeline import diagnose_unmarked

    ic = Ic(family=given["ic"]) if given["ic"] else None
    return diagnose_unmarked(file, given["topology"], ic=ic, options=options)


def _design(given: dict[str, Any]) -> tuple[str | Design, tuple[Notice, ...]]:
    """Return the design, or its file, and what was assumed of it."""
    if (given["design"] is None) == (given["topology"] is None):
        raise UsageError(
            "diagnose needs to know the circuit",
            hint="Give either --design FILE, or --topology with the parts as marked.",
        )
    if given["design"] is not None:
        return given["design"], ()
    from benchtool.cli.undrawn import undrawn_design

    return undrawn_design(given)
