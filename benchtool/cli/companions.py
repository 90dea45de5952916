"""The further captures that a diagnosis takes, as options of the command line."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from functools import wraps
from typing import Any

import click

from benchtool.errors import UsageError

_OPTIONS = (
    click.option(
        "--power-up", multiple=True, metavar="FILE", help="A capture that begins before power-up."
    ),
    click.option(
        "--shunt",
        type=(str, str),
        multiple=True,
        metavar="OHM FILE",
        help="One with a known resistor across the capacitor.",
    ),
    click.option(
        "--added-capacitor",
        type=(str, str),
        multiple=True,
        metavar="FARAD FILE",
        help="One with a known capacitor added.",
    ),
    click.option("--probe-lifted", multiple=True, metavar="FILE", help="One without the probe."),
    click.option(
        "--supply",
        type=(str, str),
        multiple=True,
        metavar="VOLTS FILE",
        help="One at another supply.",
    ),
    click.option(
        "--heated",
        type=(str, str),
        multiple=True,
        metavar="PART FILE",
        help="One with a part warmed, C or C@60degC.",
    ),
    click.option("--baseline", multiple=True, metavar="FILE", help="An earlier one of this board."),
    click.option("--good-board", multiple=True, metavar="FILE", help="One of another, good board."),
)
_ADDED = {"shunt": "ohm", "added_capacitor": "F", "supply": "V"}
_U_ADDED = 0.005
"""Relative u of a resistor, capacitor or voltage that was measured before: common practice."""
_WARMED_C = 55.0
_U_WARMED_C = 10.0
"""A part under a hot-air pencil or a finger's heat: assumed where not stated."""
_LEAST_C, _MOST_C = 25.0, 200.0
_HEATABLE = ("C", "R", "RA", "RB", "IC")


def companion_options(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add the options of further captures; the function gets ``companions``."""

    @wraps(function)
    def gather(**given: Any) -> Any:
        names = [option.replace("-", "_") for option in _NAMES]
        taken = {name: given.pop(name) for name in names}
        return function(companions=tuple(_companions(taken)), **given)

    for option in reversed(_OPTIONS):
        gather = option(gather)
    return gather


_NAMES = (
    *("power-up", "shunt", "added-capacitor", "probe-lifted"),
    *("supply", "heated", "baseline", "good-board"),
)


def _companions(given: Mapping[str, tuple[Any, ...]]) -> Iterator[Any]:
    from benchtool.evidence import Companion

    for source in given["power_up"]:
        yield Companion(role="power-up", source=source)
    for source in given["probe_lifted"]:
        yield Companion(role="probe-lifted", source=source)
    for source in given["baseline"]:
        yield Companion(role="baseline", source=source)
    for source in given["good_board"]:
        yield Companion(role="baseline", source=source, same_board=False)
    for name, unit in _ADDED.items():
        for text, source in given[name]:
            yield _added(name.replace("_", "-"), unit, text, source)
    for text, source in given["heated"]:
        yield _heated(text, source)


def _added(role: Any, unit: str, text: str, source: str) -> Any:
    from benchtool.cli.options import positive
    from benchtool.evidence import Companion

    value = positive(f"--{role}", text, unit) or 0.0
    return Companion(role=role, source=source, value=value, u=_U_ADDED * value)


def _heated(text: str, source: str) -> Any:
    from benchtool.cli.options import value_of
    from benchtool.evidence import Companion

    part, _, at = text.partition("@")
    if part not in _HEATABLE:
        raise UsageError(
            f"--heated wants the part that was warmed, got {text!r}",
            hint=f"One of {', '.join(_HEATABLE)}, such as --heated C warm.csv or C@60degC.",
        )
    stated = value_of("--heated", at, "degC") if at else None
    if stated is not None and not _LEAST_C < stated <= _MOST_C:
        raise UsageError(
            f"--heated {text}: {_LEAST_C:g} to {_MOST_C:g} degC can be",
            hint="Give the temperature of the warmed part, such as C@60degC.",
        )
    return Companion(
        role="heated",
        source=source,
        value=_WARMED_C if stated is None else stated,
        u=_U_WARMED_C if stated is None else 3.0,
        part=part,
    )
