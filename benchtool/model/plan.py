"""What to expect of a measurement before it is made."""

from __future__ import annotations

from collections.abc import Mapping

from benchtool.frozen import frozen_record
from benchtool.model.design import Probe
from benchtool.model.options import JITTER_REL, TIMEBASE_REL
from benchtool.model.quantity import Measured, Notice


@frozen_record
class Means:
    """What there is to measure with; None leaves it to the plan.

    Attributes:
        rate_hz: Samples a second, or ticks of a logic capture.
        span_s: Length of the record.
        time_per_board_s: What a board may take.
        timebase_rel: Half-width of the timebase error, relative.
        jitter_rel: Half-width of the jitter assumed where one interval is all there is, relative.
        period_sd_rel: Standard deviation of the periods to expect, relative; None takes that of
            the assumed jitter.
        bits: Resolution of the converter over a range a quarter wider than the supply.
        noise_v: Standard deviation of the noise on a sample, volts.
        bandwidth_hz: One-pole bandwidth of all between output and samples; None for edges within
            one sample.
        probe: A probe that might hang at the capacitor.
        instrument: Name of the instrument in the user's kit.
    """

    rate_hz: float | None = None
    span_s: float | None = None
    time_per_board_s: float | None = None
    timebase_rel: float = TIMEBASE_REL
    jitter_rel: float = JITTER_REL
    period_sd_rel: float | None = None
    bits: int | None = None
    noise_v: float = 0.0
    bandwidth_hz: float | None = None
    probe: Probe | None = None
    instrument: str | None = None


@frozen_record
class Risks:
    """What a decision rule does to a lot of boards (JCGM 106:2012).

    Attributes:
        conforming: Share of the boards that lie inside the limits in truth.
        consumer: Probability that a board is accepted and does not conform: R_C.
        producer: Probability that a board conforms and is not accepted: R_P.
        passing, undecided, failing: Shares of the boards that get each verdict.
    """

    conforming: float
    consumer: float
    producer: float
    passing: float
    undecided: float
    failing: float

    @property
    def good_not_accepted(self) -> float | None:
        """Share of the conforming boards that are not accepted; None where there are none."""
        return self.producer / self.conforming if self.conforming > 0 else None

    @property
    def bad_accepted(self) -> float | None:
        """Share of the nonconforming boards that are accepted; None where there are none."""
        bad = 1 - self.conforming
        return self.consumer / bad if bad > 0 else None


@frozen_record
class PlannedQuantity:
    """What to expect of one judged quantity.

    Attributes:
        quantity: Timing name.
        nominal: What the typical circuit gives, in ``unit``.
        unit: SI unit.
        lower, upper: Its limits, None where open.
        n: Intervals that the record is sure to hold.
        expected: Value and uncertainty to expect; None where the record may hold no interval.
        U: Expanded uncertainty by the rule's coverage.
        w: Guard band.
        room: Least distance from the middle of the limits (the nominal value where one is open)
            to a limit over U.
        risks: What the rule does to boards with all parts inside their tolerances.
    """

    quantity: str
    nominal: float
    unit: str
    lower: float | None
    upper: float | None
    n: int
    expected: Measured | None
    U: float | None
    w: float | None
    room: float | None
    risks: Risks | None


@frozen_record
class Repetition:
    """How many periods are worth their time.

    Attributes:
        n: Periods.
        enough: Whether they leave the room that is asked for.
        dominant: What the largest part of U comes from with so many; None without limits.
        quantity: The quantity with the least room.
    """

    n: int
    enough: bool
    dominant: str | None
    quantity: str | None


@frozen_record
class ProbeShift:
    """What a probe at the capacitor does to the times.

    Attributes:
        probe: Its load.
        shifts: Quantity to its relative change; empty where the probe stops the circuit.
        stops: Whether it does.
    """

    probe: Probe
    shifts: Mapping[str, float]
    stops: bool


@frozen_record
class StagePlan:
    """How to capture one stage, and what to expect of it.

    Attributes:
        stage: Name of the stage.
        topology: Its topology.
        channel: Channel to record, None where the design names none.
        instrument: Name of the instrument, None where none was named.
        rate_hz: Rate, as given or recommended.
        rate_given, span_given: Whether it was given.
        span_s: Length of the record.
        unit_s: What one repetition takes, seconds: a period, a pulse, a delay.
        unit: Its name: period, pulse or delay.
        repetition: How many are worth their time.
        n: Repetitions that the record is sure to hold.
        n_in_time: How many the time per board allows; None where it is open.
        time_per_board_s: What a board may take.
        quantities: What is judged.
        board: Shares of all boards by their worst verdict; None where nothing is judged.
        n_boards: Boards behind the shares.
        probe: What a probe at the capacitor would do.
        warnings: What was assumed and what stands in the way.
    """

    stage: str
    topology: str
    channel: str | None
    instrument: str | None
    rate_hz: float
    rate_given: bool
    span_s: float
    span_given: bool
    unit_s: float
    unit: str
    repetition: Repetition
    n: int
    n_in_time: int | None
    time_per_board_s: float | None
    quantities: tuple[PlannedQuantity, ...]
    board: Risks | None
    n_boards: int
    probe: ProbeShift
    warnings: tuple[Notice, ...] = ()
