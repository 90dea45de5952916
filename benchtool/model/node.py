"""What a record of the capacitor node says."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Measured, Notice


@frozen_record
class SlopeFit:
    """The exponential of one state of the node.

    Attributes:
        end: Voltage to which the slope would settle, volts.
        tau: Its time constant, seconds.
        correlation: Of the errors of ``end`` and ln ``tau``; near 1 on short slopes.
        n_slopes: Slopes behind it.
        n_points: Samples behind it.
    """

    end: Measured
    tau: Measured
    correlation: float
    n_slopes: int
    n_points: int


@frozen_record
class Effect:
    """Something that a node has beside its exponentials.

    Attributes:
        seen: Whether it stands out of the noise and matters.
        size: How much of it, with its sign; what of, ``NodeFit`` says.
        p_value: Chance of so large a size where there is none.
    """

    seen: bool
    size: Measured
    p_value: float


@frozen_record
class NodeFit:
    """Exponentials fitted to the slopes of a capacitor node; None where it shows nothing of one.

    Attributes:
        charge, discharge: The rise and the fall.
        turn_upper, turn_lower: Where the node turns, volts.
        overshoot_upper, overshoot_lower: How far it runs beyond the threshold in the IC's delay,
            volts, zero or more; None where no delay was given.
        upper, lower: The thresholds: the turns less the overshoots, volts.
        step_upper, step_lower: Jumps of the node at the turns, volts, positive as a series
            resistance makes them.
        esr: Series resistance over the resistance of the discharge, unit 1.
        bow: Relative change of the capacitance a volt, unit 1/V.
        memory: Part of the swing that creeps after a turn (dielectric absorption), unit 1.
        memory_s: Time constant of that creeping, seconds; None where it is not seen.
        noise_v: Standard deviation of a sample.
        correlation_s: How long the noise remembers itself, 0 where it does not.
        inflation: Variance of the asymptote over what independent samples would give.
        n_cycles: Whole cycles.
        warnings: What was seen or assumed.
    """

    charge: SlopeFit | None = None
    discharge: SlopeFit | None = None
    turn_upper: Measured | None = None
    turn_lower: Measured | None = None
    overshoot_upper: Measured | None = None
    overshoot_lower: Measured | None = None
    upper: Measured | None = None
    lower: Measured | None = None
    step_upper: Measured | None = None
    step_lower: Measured | None = None
    esr: Effect | None = None
    bow: Effect | None = None
    memory: Effect | None = None
    memory_s: float | None = None
    noise_v: float
    correlation_s: float = 0.0
    inflation: float = 1.0
    n_cycles: int
    warnings: tuple[Notice, ...] = ()


@frozen_record
class EarlyTau:
    """A time constant from a part of one slope, its asymptote being known.

    Attributes:
        tau: Time constant, seconds.
        end: The asymptote as used, after the slope has had its say, volts.
        rises: Whether the slope rises.
        covered: Part of a time constant that the slope covers.
        arrives: When the node will be at the threshold, seconds after the first sample; None
            where no threshold was given, or it lies behind or out of reach.
        length: From one threshold to the other at this time constant, seconds; likewise.
        warnings: What was assumed.
    """

    tau: Measured
    end: Measured
    rises: bool
    covered: float
    arrives: Measured | None = None
    length: Measured | None = None
    warnings: tuple[Notice, ...] = ()


@frozen_record
class RatioCause:
    """One thing that moves the ratio of the first high to the others.

    Attributes:
        name, text: What it is.
        unit: Of its sizes; 1 for a relative change.
        size: A size to show what it does.
        shift: By how much that moves the ratio, with its sign.
        needed: The size that alone would explain the ratio; None where none believable does.
    """

    name: str
    text: str
    unit: str
    size: float
    shift: float
    needed: float | None


@frozen_record
class FirstPulse:
    """The first high after power-up against the steady ones.

    Attributes:
        ratio: First over steady.
        ideal: ln 3/ln 2.
        expected: On the board as designed.
        stands_out: Whether the ratio differs from that beyond its U.
        causes: What would move it.
    """

    ratio: Measured
    ideal: float
    expected: float
    stands_out: bool
    causes: tuple[RatioCause, ...]


@frozen_record
class SchmittSolution:
    """A Schmitt oscillator: R·C, and its thresholds over the output's high level."""

    tau: Measured
    upper: Measured
    lower: Measured


NodeZone = Literal["zero", "low", "between", "high", "rail"]
"""Where a node rests: at 0 V, below, between or above the thresholds, or at the supply."""


@frozen_record
class Resting:
    """A board that stands still, by the level of its node.

    Attributes:
        state: Where its output stays.
        zone: Where the node rests.
        zones: That, and what lies within the uncertainty of the level.
        level: The level, volts.
        why: What that means, half a sentence.
        faults: What can hold it there, likeliest first.
        holding_ohm: Resistance to the other rail that would hold the node there, ohms; None where
            the drive is not known or nothing needs to hold it.
    """

    state: Literal["high", "low"]
    zone: NodeZone
    zones: tuple[NodeZone, ...]
    level: Measured
    why: str
    faults: tuple[str, ...]
    holding_ohm: float | None = None
