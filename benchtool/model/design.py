"""The design intent: stages, parts, limits and the rule they are judged by."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import field
from types import MappingProxyType
from typing import Literal

from benchtool.frozen import frozen_record

TopologyName = Literal["astable", "astable-diode", "output-fed", "one-shot", "schmitt", "power-on"]
Derivation = Literal["worst-case", "rss", "monte-carlo"]
RuleName = Literal["guarded", "simple", "nonbinary"]

REFERENCE_TEMPERATURE_C = 25.0
"""Temperature to which part values and temperature coefficients refer."""


@frozen_record
class Band:
    """A nominal value with the range it may lie in, SI units (or degrees Celsius)."""

    nominal: float
    lower: float
    upper: float

    def __post_init__(self) -> None:
        if not self.lower <= self.nominal <= self.upper:
            raise ValueError(f"a band needs lower <= nominal <= upper, got {self}")


@frozen_record
class Part:
    """A part of the timing network.

    Attributes:
        ref: Its reference: RA, RB, R or C.
        value: Nominal value in ohms or farads, greater than 0.
        lower_rel, upper_rel: Tolerance as relative deviations, lower_rel <= 0 <= upper_rel.
        tempco_per_k: Relative change a kelvin, from 25 degrees Celsius.
        kind: film, electrolytic, ceramic, ... as the design says.
        leakage_a: Greatest leakage current in amperes (capacitors).
        esr_ohm: Equivalent series resistance in ohms (capacitors).
    """

    ref: str
    value: float
    lower_rel: float = 0.0
    upper_rel: float = 0.0
    tempco_per_k: float = 0.0
    kind: str | None = None
    leakage_a: float = 0.0
    esr_ohm: float = 0.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and self.value > 0):
            raise ValueError(f"{self.ref} must be greater than 0, got {self.value}")
        if not -1 < self.lower_rel <= 0 <= self.upper_rel:
            raise ValueError(f"{self.ref} has an impossible tolerance")
        if self.leakage_a < 0 or self.esr_ohm < 0:
            raise ValueError(f"{self.ref} cannot have a negative leakage or ESR")


@frozen_record
class Threshold:
    """A switching level: a fraction of the supply, or volts."""

    value: float
    of_supply: bool = True


@frozen_record
class Ic:
    """The timing IC: a family, and the terms that the design states itself.

    Attributes:
        family: bipolar or cmos; None where every term that matters is stated.
        terms: Stated terms by their design-file name, SI units; thresholds apart.
        upper_threshold, lower_threshold: Stated switching levels.
    """

    family: str | None = "cmos"
    terms: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))
    upper_threshold: Threshold | None = None
    lower_threshold: Threshold | None = None


@frozen_record
class Limit:
    """A limit on one quantity.

    Attributes:
        quantity: Timing name: t_high, t_low, period, frequency, duty, first_high, delay,
            tau_charge, tau_discharge, jitter_period or jitter_cycle.
        lower, upper: In ``unit``; None where open.
        unit: SI unit; ``1`` with ``relative`` means a share of the measured mean period.
        source: Where the limit comes from.
        relative: Whether the limit is a share of the measured mean period (jitter only).
    """

    quantity: str
    lower: float | None
    upper: float | None
    unit: str
    source: str
    relative: bool = False

    def __post_init__(self) -> None:
        if self.lower is None and self.upper is None:
            raise ValueError(f"the limit on {self.quantity} needs a lower or an upper value")
        if self.lower is not None and self.upper is not None and self.lower > self.upper:
            raise ValueError(f"the limit on {self.quantity} has lower above upper")


@frozen_record
class Probe:
    """The probe's load, and where it sits."""

    r_ohm: float = math.inf
    c_f: float = 0.0
    at: Literal["output", "capacitor"] = "output"


@frozen_record
class Stage:
    """One timed circuit on the board.

    Attributes:
        name: As in the design file.
        topology: One of the six topologies.
        parts: RA, RB, C or R, C by reference.
        ic: The timing IC.
        channel, capacitor, trigger: Names of its traces, where the design says.
        active: State that begins a cycle.
        divide: The output counts this many cycles of the circuit.
        limits: Limits that the design states.
        derive: How limits of ``quantities`` without a line of their own are derived.
        quantities: What is judged by derived limits.
        control_v: Forced control pin in volts.
        diode_drop_v, series_diode_drop_v: Stated diode drops in volts.
        leak_ohm: Leak at the timing node in ohms, to ``leak_to_v``.
        leak_to_v: Rail of the leak in volts, 0 for ground.
    """

    name: str
    topology: TopologyName
    parts: Mapping[str, Part]
    ic: Ic = field(default_factory=Ic)
    channel: str | None = None
    capacitor: str | None = None
    trigger: str | None = None
    active: Literal["high", "low"] = "high"
    divide: int = 1
    limits: tuple[Limit, ...] = ()
    derive: Derivation | None = None
    quantities: tuple[str, ...] = ()
    control_v: float | None = None
    diode_drop_v: float | None = None
    series_diode_drop_v: float | None = None
    leak_ohm: float = math.inf
    leak_to_v: float = 0.0


@frozen_record
class Rule:
    """The decision rule: name, guard factor and coverage probability."""

    name: RuleName = "guarded"
    guard: float = 1.0
    coverage: float = 0.95


@frozen_record
class Instrument:
    """What the design says of the instrument; None leaves the default."""

    timebase_rel: float | None = None
    jitter_rel: float | None = None


@frozen_record
class DesignValue:
    """One value of a design, for showing.

    Attributes:
        section: Table of the file to which it belongs, ``stage.spacing``.
        key: Its key there.
        value: The value as people read it.
        origin: "stated", "default", or "default: " and where the default comes from.
    """

    section: str
    key: str
    value: str
    origin: str


@frozen_record
class Design:
    """A design file, validated.

    Attributes:
        name, assembly, revision, serial_pattern: As stated.
        supply: Supply in volts with its range.
        temperature: Board temperature range in degrees Celsius.
        stages: At least one.
        rule: Decision rule.
        instrument: Timebase and assumed jitter.
        probe: Probe load.
        source: File name.
        sha256: Of the file's bytes.
        stated: Keys that the file states, dotted as TOML writes them; whatever is not among them
            is a default.
    """

    name: str
    supply: Band
    stages: tuple[Stage, ...]
    temperature: Band = Band(nominal=25.0, lower=25.0, upper=25.0)
    assembly: str | None = None
    revision: str | None = None
    serial_pattern: str | None = None
    rule: Rule = Rule()
    instrument: Instrument = Instrument()
    probe: Probe = Probe()
    source: str = ""
    sha256: str = ""
    stated: frozenset[str] = field(default=frozenset(), compare=False, repr=False)
