"""``benchtool solve``: the products that the times give."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, get_args

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import (
    measuring_options,
    output_options,
    positive,
    report_option,
    value_of,
)
from benchtool.cli.output import Output
from benchtool.errors import SolveError, UsageError
from benchtool.model.design import TopologyName
from benchtool.model.options import MeasureOptions

if TYPE_CHECKING:
    from benchtool.model.design import Ic, Threshold
    from benchtool.model.quantity import Measured
    from benchtool.model.result import Analysis
    from benchtool.model.timing import Timing

_PART_UNITS = {"RA": "ohm", "RB": "ohm", "R": "ohm", "C": "F"}
_CIRCUIT = ("ic", "supply", "upper_threshold", "lower_threshold")
_FIGURES = {
    "high": "t_high",
    "low": "t_low",
    "period": "period",
    "duty": "duty",
    "first": "first_high",
    "delay": "delay",
}


@click.command("solve")
@click.argument("file", required=False, metavar="[FILE]")
@click.option("--design", metavar="FILE", help="The design file (TOML).")
@click.option("--stage", metavar="NAME", help="Solve this stage alone.")
@click.option(
    "--topology",
    type=click.Choice(get_args(TopologyName)),
    help="The circuit, without a design.",
)
@click.option("--ic", type=click.Choice(["bipolar", "cmos"]), help="IC family, without a design.")
@click.option("--supply", metavar="VOLTS", help="Supply, without a design.")
@click.option(
    "--upper-threshold", metavar="LEVEL", help="Volts, or a share of the supply such as 66.7%."
)
@click.option(
    "--lower-threshold", metavar="LEVEL", help="Volts, or a share of the supply such as 33.3%."
)
@click.option("--known", multiple=True, metavar="REF=VALUE", help="A part value that is known.")
@click.option("--high", metavar="TIME", help="High time, in place of FILE.")
@click.option("--low", metavar="TIME", help="Low time, in place of FILE.")
@click.option("--period", metavar="TIME", help="Period, in place of FILE.")
@click.option("--duty", metavar="SHARE", help="Duty, in place of FILE.")
@click.option("--first", metavar="TIME", help="First high time after power-up.")
@click.option("--delay", metavar="TIME", help="Delay of a power-on circuit, in place of FILE.")
@click.option(
    "--asymptote", metavar="VOLTS", help="Early answer from a part of one slope that ends there."
)
@report_option
@measuring_options
@output_options
def command(
    file: str | None,
    design: str | None,
    report: str | None,
    options: MeasureOptions,
    output: Output,
    **given: Any,
) -> int:
    """Solve the times of FILE, or plain figures, for the R·C products of the parts.

    From the output alone only products can be known. A part value is printed under a stated
    assumption, or with --known RB=330k.

    \b
    benchtool solve capture.csv --design board.toml
    benchtool solve --topology astable --high 14.01s --low 10.75s --first 22.20s
    benchtool solve slow_node.csv --asymptote "12V ± 50mV" --design board.toml
    """  # noqa: D301 - click's mark of lines to keep as they are
    if given["asymptote"] is not None:
        output.show(_early(file, design, options, given), report=report)
        return OK
    if (design is None) == (given["topology"] is None):
        raise UsageError(
            "solve needs to know the circuit", hint="Give either --design FILE or --topology NAME."
        )
    _refuse_unused(design, options, given)
    source = _source(file, given)
    try:
        if design is not None:
            analysis = _with_design(source, design, options, given)
        else:
            analysis = _without_design(source, options, given)
    except SolveError as error:
        if file is None and error.code == "too-few-times":  # an option is wanting, not data
            hint = "Give --high and --low, or --period and --duty; --delay for power-on."
            raise UsageError(error.message, hint=hint, code=error.code) from error
        raise
    output.show(analysis, report=report)
    return OK


def _early(
    file: str | None, design: str | None, options: MeasureOptions, given: dict[str, Any]
) -> Analysis:
    """Return the early answer from a part of one slope of the node."""
    from benchtool.pipeline import solve_early

    if file is None:
        raise UsageError("--asymptote needs a capture of the node", hint="Name its file.")
    return solve_early(
        file, _asymptote(given["asymptote"]), design, stage=given["stage"], options=options
    )


def _asymptote(text: str) -> Measured:
    """Return the end of a slope; its U is what is stated after ``±``, or 1 % (assumed)."""
    from benchtool.model.quantity import Measured

    typed, _, stated = text.partition("±")
    value = value_of("--asymptote", typed.strip(), "V") or 0.0
    U = positive("--asymptote", stated.strip(), "V") if stated else 0.01 * abs(value) + 0.01
    return Measured(value=value, u=(U or 0.0) / 1.96, unit="V")


def _refuse_unused(design: str | None, options: MeasureOptions, given: dict[str, Any]) -> None:
    """Refuse what would be silently left out: each option belongs to one of the two ways."""
    if design is not None:
        unused = [name for name in _CIRCUIT if given[name] is not None]
        reason = "the design says that already"
    else:
        of_design = {
            "stage": given["stage"],
            "probe": options.probe,
            "temperature": options.temperature_c,
        }
        unused = [name for name, value in of_design.items() if value is not None]
        reason = "without a design there is nothing that it could change"
    if unused:
        option = unused[0].replace("_", "-")
        raise UsageError(f"--{option} is of no use here: {reason}", hint=f"Leave out --{option}.")


def _source(file: str | None, given: dict[str, Any]) -> str | Timing:
    """Return the capture's name, or the timing made of plain figures."""
    figures = {name: given[option] for option, name in _FIGURES.items()}
    stated = [option for option in _FIGURES if given[option] is not None]
    if file is not None and stated:
        raise UsageError(
            f"a capture and --{stated[0]} cannot both give the times",
            hint="Leave out one of them.",
        )
    if file is not None:
        return file
    from benchtool.cli.figures import timing_from_figures

    return timing_from_figures(**figures)


def _with_design(
    source: str | Timing, design: str, options: MeasureOptions, given: dict[str, Any]
) -> Analysis:
    from benchtool.pipeline import solve

    known = _known_parts(given["known"])
    return solve(source, design, stage=given["stage"], known=known, options=options)


def _without_design(
    source: str | Timing, options: MeasureOptions, given: dict[str, Any]
) -> Analysis:
    from benchtool.pipeline import solve_topology

    return solve_topology(
        source,
        given["topology"],
        ic=_ic(given),
        supply_v=positive("--supply", given["supply"], "V"),
        known=_known_parts(given["known"]),
        options=options,
    )


def _ic(given: dict[str, Any]) -> Ic | None:
    from benchtool.model.design import Ic

    upper = _threshold("--upper-threshold", given["upper_threshold"])
    lower = _threshold("--lower-threshold", given["lower_threshold"])
    if given["ic"] is None and upper is None and lower is None:
        return None
    family = given["ic"] or "cmos"
    return Ic(family=family, upper_threshold=upper, lower_threshold=lower)


def _threshold(option: str, text: str | None) -> Threshold | None:
    from benchtool.model.design import Threshold

    if text is None:
        return None
    of_supply = "%" in text
    value = positive(option, text, "1" if of_supply else "V")
    return None if value is None else Threshold(value=value, of_supply=of_supply)


def _known_parts(texts: tuple[str, ...]) -> dict[str, float]:
    """Return reference to value of texts such as ``RB=330k``.

    Raises:
        UsageError: If a text is no such pair, or names no part.
    """
    known: dict[str, float] = {}
    for text in texts:
        ref, _, written = text.partition("=")
        unit = _PART_UNITS.get(ref.strip())
        if unit is None or not written:
            raise UsageError(
                f"--known wants a part and its value, got {text!r}",
                hint="Write it like --known RB=330k; parts are RA, RB, R and C.",
            )
        value = value_of(f"--known {ref}", written, unit)
        if value is not None:
            known[ref.strip()] = value
    return known
