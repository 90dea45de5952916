"""What is known while a board is watched: a goal, the readings, and where they moved."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.decision import StageLimit
from benchtool.model.design import Design, Rule, Stage
from benchtool.model.judgement import Check, VerdictName
from benchtool.model.kit import KitInstrument
from benchtool.model.quantity import Measured, Notice, Quantity
from benchtool.model.result import Source, StageResult

WatchedName = Literal["period", "frequency", "t_high", "t_low", "duty"]

WATCHED_UNITS: dict[WatchedName, str] = {
    "period": "s",
    "frequency": "Hz",
    "t_high": "s",
    "t_low": "s",
    "duty": "1",
}

Heading = Literal["unmoved", "unclear", "towards", "past", "away", "there"]
"""Where the last movement went, seen from the goal; ``unclear`` where it stays below its U."""

MOST_POINTS = 240
"""Readings that are kept to be drawn."""


@frozen_record
class Goal:
    """What the trimmer is turned for.

    Attributes:
        value: In the unit of the quantity.
        source: Where it comes from, in a word or two.
    """

    value: float
    source: str


@frozen_record
class WatchPlan:
    """What is watched, settled once before the first reading.

    Attributes:
        quantity: What is watched.
        goal: Where it is to go; None where nobody said.
        design: The design, where there is one.
        stage: Its stage.
        limits: The limits of that stage.
        rule: The decision rule.
        timebase_rel: Half-width of the timebase error, relative.
        jitter_rel: Jitter that is assumed until enough was seen, relative half-width.
        instrument: What the user's kit says of the instrument.
    """

    quantity: WatchedName
    timebase_rel: float
    jitter_rel: float
    goal: Goal | None = None
    design: Design | None = None
    stage: Stage | None = None
    limits: tuple[StageLimit, ...] = ()
    rule: Rule = Rule()
    instrument: KitInstrument | None = None


@frozen_record
class Point:
    """A reading as it came, and whether it lies elsewhere than those before it."""

    value: float
    moved: bool = False


@frozen_record
class Mark:
    """A reading that the user marked, counted from 1."""

    number: int
    value: Measured


@frozen_record(eq=False)
class Reading:
    """What is known now: the average since the last movement, and where it stands.

    Attributes:
        plan: What is watched.
        n_updates: Captures so far.
        came_at_s: When the last new interval came, on the clock of the watcher; None before.
        every_s: How long the next is expected to take after the last; None before.
        moved: Whether the newest capture moved it.
        value: The average since the last movement, or a bound where nothing is whole.
        n_averaged: Intervals behind it.
        distance: From the goal, in the unit of the quantity.
        change: What the last movement was, the errors that both sides share left out.
        heading: Where it went.
        points: The last readings, oldest first.
        marks: Readings that the user marked.
        check: The check of the watched quantity, where it has a limit.
        verdict: That of the stage.
        result: The average as all reports take it.
        source: What it was read from.
        trouble: Why the newest capture gave nothing, where it did not.
    """

    plan: WatchPlan
    n_updates: int = 0
    came_at_s: float | None = None
    every_s: float | None = None
    moved: bool = False
    value: Quantity | None = None
    n_averaged: int = 0
    distance: float | None = None
    change: Measured | None = None
    heading: Heading = "unmoved"
    points: tuple[Point, ...] = ()
    marks: tuple[Mark, ...] = ()
    check: Check | None = None
    verdict: VerdictName | None = None
    result: StageResult | None = None
    source: Source | None = None
    trouble: Notice | None = None
