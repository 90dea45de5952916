"""Diagnosis: what was brought to it, whom it suspects, and what to measure next."""

from __future__ import annotations

import math
from dataclasses import field
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Measured, Notice
from benchtool.model.timing import Timing

ReadingKind = Literal[
    "control-pin",
    "supply",
    "discharge-pin",
    "part",
    "temperature",
    "output-high",
    "output-low",
    "node-upper",
    "node-lower",
    "node-charge-end",
    "node-discharge-end",
    "node-tau-charge",
    "node-tau-discharge",
    "node-level",
]
"""What a reading is of.

``control-pin``, ``supply``, ``discharge-pin`` (while the output is low), ``output-high`` and
``output-low`` are voltages at pins; ``part`` is a part's own value; ``temperature`` that of the
board. The ``node-`` kinds come from a record of the capacitor node: ``node-upper`` and
``node-lower`` its thresholds, ``node-charge-end`` and ``node-discharge-end`` the voltages to which
its slopes would settle, ``node-tau-charge`` and ``node-tau-discharge`` their time constants, and
``node-level`` where it rests on a board that stands still.
"""

ObservationRole = Literal[
    "main",
    "power-up",
    "shunt",
    "added-capacitor",
    "probe-lifted",
    "supply",
    "heated",
    "baseline",
]
"""Under what condition a capture was made."""

State = Literal["high", "low"]
PartWay = Literal["isolated", "at-most", "at-least"]


@frozen_record
class Reading:
    """One figure that the technician brings.

    Attributes:
        kind: What it is of.
        value: In ``unit``.
        u: Standard uncertainty, in ``unit``, greater than 0.
        unit: SI unit symbol; degC for a temperature.
        part: Reference of the part, for ``part`` alone.
        way: For a part: ``isolated`` (one leg lifted: its own value), ``at-most`` or ``at-least``
            for a bound, as an ohmmeter in the circuit gives.
        is_freed: For a figure of the node: whether the load of its own probe was taken off it.
    """

    kind: ReadingKind
    value: float
    u: float
    unit: str
    part: str | None = None
    way: PartWay = "isolated"
    is_freed: bool = False

    def __post_init__(self) -> None:
        if not math.isfinite(self.value):
            raise ValueError(f"a reading must be finite, got {self.value}")
        if not (math.isfinite(self.u) and self.u > 0):
            raise ValueError(f"a reading needs a standard uncertainty above 0, got {self.u}")
        if (self.part is None) is (self.kind == "part"):
            raise ValueError("a reading names a part where it is of a part, and only there")

    @property
    def name(self) -> str:
        """Its name as a person writes it: ``control-pin``, ``RB``, ``RB at-most``."""
        if self.part is None:
            return self.kind
        return self.part if self.way == "isolated" else f"{self.part} {self.way}"


@frozen_record
class Observation:
    """What one capture of the board says.

    Attributes:
        role: Under what condition it was made; ``main`` as the board is.
        timing: Its times; contributions that are common to several captures (timebase) are told
            by their source.
        state: State in which the output stays, where it never turns.
        value: Ohms of a shunt, farads added, volts of another supply, degrees Celsius of a heated
            part; None for the other roles.
        u: Standard uncertainty of ``value``.
        part: What was heated: C, R, RA, RB or IC.
        same_board: For a baseline: the same board earlier; False for another, good one.
    """

    role: ObservationRole = "main"
    timing: Timing = field(default_factory=Timing)
    state: State | None = None
    value: float | None = None
    u: float = 0.0
    part: str | None = None
    same_board: bool = True

    def __post_init__(self) -> None:
        needs_value = self.role in ("shunt", "added-capacitor", "supply", "heated")
        if needs_value is (self.value is None):
            raise ValueError(
                f"the capture {self.role} {'needs' if needs_value else 'has no'} value"
            )
        if self.role == "heated" and self.part is None:
            raise ValueError("a capture with something heated names what")


@frozen_record
class Evidence:
    """All that is known of one board.

    Attributes:
        observations: Captures by role, the main one among them unless there is none.
        readings: Figures that were brought.
    """

    observations: tuple[Observation, ...] = ()
    readings: tuple[Reading, ...] = ()

    @property
    def main(self) -> Observation | None:
        """The capture of the board as it is, None where there is none."""
        return next((item for item in self.observations if item.role == "main"), None)

    @property
    def state(self) -> State | None:
        """The state in which the output stays, None where it turns."""
        return self.main.state if self.main else None


@frozen_record
class Suspect:
    """One hypothesis with its probability.

    Attributes:
        fault: As in the list of faults; ``healthy``, ``unexplained`` and ``two-faults`` too.
        faults: The two faults of ``two-faults``, else empty.
        part: Where it sits: C, RA, RB, R, IC, diode, board, probe; None where nowhere.
        probability: Given everything measured; those of all suspects sum to 1.
        estimate: The moved figure in its own unit, None where it has none.
        lower, upper: 95 % interval of that figure, same unit.
        nominal: The same figure on the healthy board; None where nothing is to be compared.
        likelihood_ratio: Evidence for it over that for the best suspect.
        group: Number of its group, from 1 as they rank; None outside any.
        why: One sentence.
    """

    fault: str
    probability: float
    faults: tuple[str, ...] = ()
    part: str | None = None
    estimate: Measured | None = None
    lower: float | None = None
    upper: float | None = None
    nominal: float | None = None
    likelihood_ratio: float = 0.0
    group: int | None = None
    why: str = ""


@frozen_record
class Group:
    """Suspects that what was measured cannot tell apart.

    Attributes:
        number: From 1; the first holds the best suspect.
        members: Names of the faults, likeliest first.
        probability: Of all members together.
        why: Why they cannot be told apart, one sentence; empty for a single member.
    """

    number: int
    members: tuple[str, ...]
    probability: float
    why: str = ""


@frozen_record
class Showing:
    """What a proposed reading would show if a suspect is the cause."""

    fault: str
    quantity: str
    value: float
    u: float
    unit: str


@frozen_record
class NextReading:
    """A reading worth taking.

    Attributes:
        reading: Its name in the table of costs: control-pin, node, power-up, shunt, supply, RB, ...
        why: One sentence: what it tells apart, and how.
        gain_bits: Expected information on which fault it is.
        minutes: What it costs.
        caution: What to beware of.
        value: What to clip on or set: ohms, farads, volts; None where nothing is chosen.
        unit: Unit of ``value``.
        shows: What it would show for each live suspect.
    """

    reading: str
    why: str
    gain_bits: float
    minutes: float
    caution: str = ""
    value: float | None = None
    unit: str = ""
    shows: tuple[Showing, ...] = ()

    @property
    def bits_per_minute(self) -> float:
        """Expected information per minute."""
        return self.gain_bits / self.minutes


@frozen_record
class SingleTest:
    """Whether one fault, or none, explains everything.

    Attributes:
        p_value: Share of single-fault boards that would look at least as strange.
        false_alarm: Share below which the answer is no.
    """

    p_value: float
    false_alarm: float

    @property
    def passes(self) -> bool:
        """Whether a single fault explains it."""
        return self.p_value >= self.false_alarm


@frozen_record
class Direction:
    """A direction in the plane of ln t_high and ln t_low.

    Attributes:
        fault: Whose; ``this board`` for the measured point.
        dln_high, dln_low: Change against the nominal board; of a usual size for a fault.
    """

    fault: str
    dln_high: float
    dln_low: float


@frozen_record
class Diagnosis:
    """The answer.

    Attributes:
        suspects: Likeliest first; healthy and unexplained among them. Sum of probabilities is 1.
        groups: Suspects that cannot be told apart, the best group first.
        next: Readings worth taking, the most information per minute first.
        is_certain: Whether the first suspect has at least 0.95 and a single fault explains all.
        single: The test of that; None where there is nothing to test.
        stuck: State in which the board stands still, None where it runs.
        stop: Why nothing more is proposed, one sentence; empty where ``next`` holds something.
        sentence: One sentence that a tired technician can act on.
        used: Names of what was taken into account.
        directions: This board's point and the directions of the faults, for the compass.
        warnings: What was assumed or left out.
    """

    suspects: tuple[Suspect, ...]
    groups: tuple[Group, ...] = ()
    next: tuple[NextReading, ...] = ()
    is_certain: bool = False
    single: SingleTest | None = None
    stuck: State | None = None
    stop: str = ""
    sentence: str = ""
    used: tuple[str, ...] = ()
    directions: tuple[Direction, ...] = ()
    warnings: tuple[Notice, ...] = ()

    @property
    def best(self) -> Suspect:
        """The likeliest suspect."""
        return self.suspects[0]
