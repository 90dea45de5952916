"""``benchtool parts pick``: what to fit to reach a target."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options, share
from benchtool.cli.output import Output
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.cli.parts.picking import Wish
    from benchtool.model.picking import Offer, Picked, Spread

_SERIES = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")


@click.command("pick")
@click.argument("value", required=False, metavar="[VALUE]")
@click.option("--to", "wanted", metavar="VALUE", help="The value wanted, such as 330k.")
@click.option("--design", metavar="FILE", help="The design, for a target in time.")
@click.option("--stage", metavar="NAME", help="Its stage.")
@click.option("--part", metavar="REF", help="The part to change, such as RB.")
@click.option("--target", metavar="NAME=VALUE", help="What to reach, such as period=25s.")
@click.option(
    "--have",
    multiple=True,
    metavar="REF=VALUE",
    help='A part as measured, such as RB=346k or "RB=346k 0.5%"; repeatable.',
)
@click.option(
    "--series",
    multiple=True,
    type=click.Choice(_SERIES),
    help="E-series to choose from; repeatable.",
)
@click.option("--tolerance", metavar="REL", help="Tolerance of the parts to fit, such as 1%.")
@click.option(
    "--kind",
    type=click.Choice(["resistor", "capacitor", "electrolytic"]),
    help="What the part is, where its value or the design does not say.",
)
@click.option("--diagnosis", metavar="FILE", help="What diagnose --json said of this board.")
@output_options
def command(output: Output, **given: Any) -> int:
    """Pick what to fit: a replacement, a part across what is there, or one in series.

    \b
    benchtool parts pick 346k --to 330k
    benchtool parts pick --design mist_valve.toml --part RB --target period=25s \\
        --have RB=346k --series E24 --tolerance 1%
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.cli.parts.picking import pick_for_board, pick_plainly
    from benchtool.cli.parts.texts import read_diagnosis

    wish = _wish(given, read_diagnosis(given["diagnosis"]))
    if given["design"] is None:
        picked = pick_plainly(given["value"], given["wanted"], wish)
    else:
        picked = pick_for_board(given, wish)
    rows = [_row(rank, picked, offer) for rank, offer in enumerate(picked.offers, 1)]
    output.show_rows("parts pick", rows, "picked:draw_picked", picked, given["design"])
    return OK


def _wish(given: dict[str, Any], seen: Any) -> Wish:
    from benchtool.cli.parts.picking import Wish

    _refuse_mixtures(given)
    tolerance = given["tolerance"]
    return Wish(
        series=given["series"],
        tolerance_rel=None if tolerance is None else share("--tolerance", tolerance),
        kind=given["kind"],
        seen=seen,
    )


def _refuse_mixtures(given: dict[str, Any]) -> None:
    """Refuse half of one question with half of the other."""
    of_design = ("part", "target", "stage")
    if given["design"] is None:
        strangers = [f"--{name}" for name in (*of_design, "have") if given[name]]
        if strangers:
            raise UsageError(
                f"{strangers[0]} needs a design",
                hint="Add --design FILE, or give VALUE --to VALUE.",
            )
        if given["value"] is None or given["wanted"] is None:
            raise UsageError(
                "there is nothing to pick for",
                hint="Give VALUE and --to, such as 346k --to 330k; or --design, --part, --target.",
            )
        return
    if given["value"] is not None or given["wanted"] is not None:
        raise UsageError(
            "a design gives the value itself, so VALUE and --to have no place",
            hint="Give --part and --target, and --have REF=VALUE for a part as measured.",
        )
    missing = [f"--{name}" for name in ("part", "target") if given[name] is None]
    if missing:
        raise UsageError(f"{missing[0]} is missing", hint="Such as --part RB --target period=25s.")


def _row(rank: int, picked: Picked, offer: Offer) -> dict[str, Any]:
    candidate, outlook = offer.candidate, offer.outlook
    return {
        "rank": rank,
        "part": picked.ref or None,
        "kind": picked.kind,
        "unit": picked.unit,
        "wanted": picked.wanted,
        "have": _spread(picked.have),
        "action": candidate.action,
        "added": None if candidate.added is None else _spread(candidate.added),
        "series": candidate.series,
        "result": _spread(candidate.result),
        "u": candidate.u,
        "off_rel": candidate.off_rel,
        "expected": None if outlook is None else dict(outlook.nominal),
        "pass_share": None if outlook is None else outlook.p_pass,
        "boards_drawn": picked.n_boards,
        "checks": list(picked.checks),
        "warnings": [{"code": item.code, "text": item.text} for item in picked.warnings],
    }


def _spread(item: Spread) -> dict[str, float]:
    return {
        "value": item.value,
        "lower": item.lower,
        "upper": item.upper,
        "half_width": item.half_width,
    }
