"""What to fit: parts with their spread, candidates for a target, and what a board would do."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Notice

Action = Literal["keep", "replace", "parallel", "series"]
PartKind = Literal["resistor", "capacitor", "electrolytic"]


@frozen_record
class Spread:
    """A part value and the range it lies in, rectangular, ohms or farads.

    Attributes:
        value: What is marked or was measured, greater than 0.
        lower, upper: Ends of the range.
    """

    value: float
    lower: float
    upper: float

    def __post_init__(self) -> None:
        if not 0 < self.lower <= self.value <= self.upper < math.inf:
            raise ValueError(f"a part needs 0 < lower <= value <= upper, got {self}")

    @property
    def half_width(self) -> float:
        """Half the length of the range."""
        return (self.upper - self.lower) / 2

    @property
    def u(self) -> float:
        """Standard uncertainty: half-width over the square root of 3 (JCGM 100, 4.3.7)."""
        return self.half_width / math.sqrt(3)


@frozen_record
class Candidate:
    """One way to come near a value.

    Attributes:
        action: ``keep`` what is there, ``replace`` it, add one in ``parallel`` or in ``series``.
        added: The part to fit; None for ``keep``.
        series: Its E-series.
        result: What comes of it, with its extremes.
        u: Standard uncertainty of the result.
        off_rel: Its distance from the value wanted, relative.
    """

    action: Action
    added: Spread | None
    series: str | None
    result: Spread
    u: float
    off_rel: float


@frozen_record
class Outlook:
    """What boards with a candidate would do, over the scatter of all other parts.

    Attributes:
        nominal: Quantity to its value with everything else nominal, SI units.
        p_pass: Share of the boards that pass every limit, guard band kept; None without limits.
    """

    nominal: Mapping[str, float | None]
    p_pass: float | None


@frozen_record
class Offer:
    """A candidate and, with a design, its outlook."""

    candidate: Candidate
    outlook: Outlook | None = None


@frozen_record
class Picked:
    """All that ``parts pick`` found.

    Attributes:
        ref: Reference of the part, empty without a design.
        kind: What it is.
        unit: ohm or F.
        have: What is there.
        how: How its value is known, in words.
        wanted: The value that gives the target.
        moved_rel: How far a measured part is off its marking, where that is more than its
            tolerance; else None.
        aim: Quantity and target, where a design gives the value.
        offers: Ranked, the best first.
        n_boards: Boards behind each share, 0 without a design.
        checks: What to check before fitting, sentences.
        warnings: What was assumed and what a trim could hide.
    """

    ref: str
    kind: PartKind
    unit: str
    have: Spread
    how: str
    wanted: float
    aim: tuple[str, float] | None
    offers: tuple[Offer, ...]
    n_boards: int
    checks: tuple[str, ...]
    warnings: tuple[Notice, ...]
    moved_rel: float | None = None


@frozen_record
class Combination:
    """One set of preferred values that fits.

    Attributes:
        parts: Reference to value, ohms and farads.
        off_charge, off_discharge: Products of these values over the measured ones, minus 1.
        cost: What the list is sorted by: half the misfit in standard deviations squared, ln 2
            for each step to a finer series, and half the square of the decades from 100 kΩ.
    """

    parts: dict[str, float]
    off_charge: float
    off_discharge: float
    cost: float


@frozen_record
class Combinations:
    """All that preferred values allow.

    Attributes:
        n_fitting: How many sets fit.
        best: The first of them, the likeliest first.
    """

    n_fitting: int
    best: tuple[Combination, ...]
