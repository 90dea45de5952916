"""``benchtool design plan``: before measuring, how to record and what to expect."""

from __future__ import annotations

import math
from dataclasses import asdict, replace
from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import kit_of, output_options, positive, share, value_of
from benchtool.cli.output import Output
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.model.design import Design
    from benchtool.model.plan import Means, PlannedQuantity, Risks, StagePlan


@click.command("plan")
@click.argument("design", metavar="DESIGN")
@click.option("--stage", metavar="NAME", help="Plan this stage alone.")
@click.option("--rate", metavar="FREQ", help="Samples a second; recommended where not given.")
@click.option("--span", metavar="TIME", help="Length of the record; likewise.")
@click.option("--time-per-board", metavar="TIME", help="What a board may take, such as 60s.")
@click.option("--timebase", metavar="REL", help="Timebase error, half-width, such as 50ppm.")
@click.option("--jitter", metavar="REL", help="Standard deviation of a period, such as 0.05%.")
@click.option("--bits", type=click.IntRange(2, 24), metavar="COUNT", help="Converter resolution.")
@click.option("--noise", metavar="VOLTS", help="Standard deviation of the noise, such as 20mV.")
@click.option("--bandwidth", metavar="FREQ", help="Of output and input; none: sharp edges.")
@click.option("--instrument", metavar="NAME", help="Instrument of your kit.")
@click.option("--probe", metavar='"R C"', help='Probe to think of, such as "10M 12p".')
@output_options
def command(design: str, stage: str | None, output: Output, **given: Any) -> int:
    """Plan a capture: rate, span and periods, the U to expect, and what the guard band costs.

    \b
    benchtool design plan mist_valve.toml --stage spacing --time-per-board 60s
    benchtool design plan mist_valve.toml --rate 1kHz --bits 8 --noise 50mV --bandwidth 20kHz
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.designs import load_design
    from benchtool.judge.plan import plan_stage
    from benchtool.targets import choose_stages

    loaded = load_design(design)
    means = _means(loaded, given)
    plans = [plan_stage(item, loaded, means) for item in choose_stages(loaded, stage)]
    output.show_rows(
        "design plan", [_row(item) for item in plans], "planned:draw_plans", loaded, plans
    )
    return OK


def _means(design: Design, given: dict[str, Any]) -> Means:
    from benchtool.judge.plan import means_of

    means = means_of(design)
    kept, probe = kit_of(given["instrument"], given["probe"])
    timebase_rel = share("--timebase", given["timebase"])
    if timebase_rel is None and kept is not None:
        timebase_rel = kept.timebase_rel
    noise_v = value_of("--noise", given["noise"], "V") or 0.0
    if noise_v < 0:
        raise UsageError("--noise cannot be below 0", hint="Correct --noise.")
    return replace(
        means,
        rate_hz=positive("--rate", given["rate"], "Hz"),
        span_s=positive("--span", given["span"], "s"),
        time_per_board_s=positive("--time-per-board", given["time_per_board"], "s"),
        timebase_rel=means.timebase_rel if timebase_rel is None else timebase_rel,
        period_sd_rel=share("--jitter", given["jitter"]),
        bits=given["bits"],
        noise_v=noise_v,
        bandwidth_hz=positive("--bandwidth", given["bandwidth"], "Hz"),
        probe=probe,
        instrument=given["instrument"],
    )


def _row(plan: StagePlan) -> dict[str, Any]:
    repetition = plan.repetition
    return {
        "stage": plan.stage,
        "topology": plan.topology,
        "channel": plan.channel,
        "instrument": plan.instrument,
        "rate_hz": plan.rate_hz,
        "rate_given": plan.rate_given,
        "span_s": plan.span_s,
        "span_given": plan.span_given,
        "unit": plan.unit,
        "unit_s": plan.unit_s,
        "intervals": plan.n,
        "needed": {
            "intervals": repetition.n,
            "four_to_one": repetition.enough,
            "quantity": repetition.quantity,
            "dominant": repetition.dominant,
        },
        "time_per_board_s": plan.time_per_board_s,
        "intervals_in_time": plan.n_in_time,
        "quantities": [_quantity(item) for item in plan.quantities],
        "board": _risks(plan.board),
        "boards_drawn": plan.n_boards,
        "probe_at_capacitor": {
            "r_ohm": _finite(plan.probe.probe.r_ohm),
            "c_f": plan.probe.probe.c_f,
            "stops": plan.probe.stops,
            "shifts": dict(plan.probe.shifts),
        },
        "warnings": [{"code": item.code, "text": item.text} for item in plan.warnings],
    }


def _quantity(item: PlannedQuantity) -> dict[str, Any]:
    expected = item.expected
    return {
        "quantity": item.quantity,
        "unit": item.unit,
        "nominal": item.nominal,
        "lower": item.lower,
        "upper": item.upper,
        "n": item.n,
        "u": expected.u if expected else None,
        "U": item.U,
        "guard_band": item.w,
        "room": None if item.room is None else _finite(item.room),
        "budget": [
            {"source": term.source, "u": abs(term.u)}
            for term in (expected.budget if expected else ())
        ],
        "risks": _risks(item.risks),
    }


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _risks(risks: Risks | None) -> dict[str, float | None] | None:
    if risks is None:
        return None
    shares = {"good_not_accepted": risks.good_not_accepted, "bad_accepted": risks.bad_accepted}
    return {**asdict(risks), **shares}
