"""Designs of the invented misting controller for the judge's tests."""

from collections.abc import Mapping
from types import MappingProxyType

from benchtool.model.design import Band, Design, Ic, Limit, Part, Stage

IDEAL = Ic(family=None)
"""No saturation, delay, bias or spread: the textbook formulas hold exactly."""


STEADY = Band(nominal=12.0, lower=12.0, upper=12.0)


def part(ref: str, value: float, half_width: float = 0.0, **more: object) -> Part:
    return Part(ref=ref, value=value, lower_rel=-half_width, upper_rel=half_width, **more)


def ideal_ic(**terms: float) -> Ic:
    return Ic(family=None, terms=MappingProxyType(dict(terms)))


def limit(quantity: str, lower: float | None, upper: float | None, **more: object) -> Limit:
    given = {"unit": "s", "source": "drawing GH-MV-07 sheet 4"} | more
    return Limit(quantity=quantity, lower=lower, upper=upper, **given)


def board(
    parts: Mapping[str, Part] | None = None,
    *,
    topology: str = "astable",
    ic: Ic = IDEAL,
    supply: Band = STEADY,
    design: Mapping[str, object] = MappingProxyType({}),
    **stage: object,
) -> tuple[Stage, Design]:
    """Return a stage and its design: 100k 1 %, 330k 1 %, 47u 10 % unless told otherwise."""
    mist = {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1),
    }
    made = Stage(name="spacing", topology=topology, parts=parts or mist, ic=ic, **stage)
    return made, Design(name="Mist valve timer", supply=supply, stages=(made,), **design)


def single(r: Part, c: Part) -> dict[str, Part]:
    return {"R": r, "C": c}
