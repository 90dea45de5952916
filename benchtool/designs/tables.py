"""The tables inside a stage of the design file: parts, IC and limits."""

from __future__ import annotations

from functools import partial
from typing import Annotated, Any, Literal, Self

from pydantic import BeforeValidator, model_validator  # noqa: TID253 - by schema alone, see fields

from benchtool.designs import fields as f
from benchtool.designs import values
from benchtool.designs.fields import Table, about
from benchtool.designs.vocabulary import IC_TERMS, QUANTITIES
from benchtool.model.design import Derivation

Family = Literal["bipolar", "cmos"]
QuantityName = Literal[
    "t_high",
    "t_low",
    "period",
    "frequency",
    "duty",
    "first_high",
    "delay",
    "tau_charge",
    "tau_discharge",
    "jitter_period",
    "jitter_cycle",
]


def _term(name: str, *, required: bool = False) -> Any:
    term = IC_TERMS[name]
    return about(term.meaning, term.example, default=... if required else None)


def _limit(name: str) -> Any:
    quantity = QUANTITIES[name]
    return about(f"limits on {quantity.meaning}", quantity.example, default=None)


class PartTable(Table):
    """What every part takes."""

    tolerance: f.Tolerance = about("half-width, or both sides", "-20% 50%", default=(0.0, 0.0))
    tempco: f.PerKelvin = about("relative change a kelvin, from 25 degC", "50 ppm/K", default=0.0)
    kind: f.Name | None = about("kind of part", "film", default=None)


class ResistorTable(PartTable):
    """A resistor: a text such as "100k 1%", or a table."""

    value: f.Ohm = about("nominal value in ohms", "100k")


class CapacitorTable(PartTable):
    """A capacitor: a text such as "47u 10%", or a table."""

    value: f.Farad = about("nominal value in farads", "47u")
    leakage: f.Ampere = about("greatest leakage current", "0.5 uA", default=0.0)
    esr: f.OhmOrZero = about("equivalent series resistance", "2 ohm", default=0.0)


class IcTable(Table):
    """The timing IC: a family, and the terms that the design states itself."""

    family: Family | None = about("family whose typical terms apply", "cmos", default=None)
    upper_threshold: f.Level | None = about("share of the supply or volts", "66.7%", default=None)
    lower_threshold: f.Level | None = about("share of the supply or volts", "33.3%", default=None)
    u_threshold: f.Share | None = _term("u_threshold")
    u_split: f.Share | None = _term("u_split")
    discharge_saturation: f.VoltOrZero | None = _term("discharge_saturation")
    discharge_resistance: f.OhmOrZero | None = _term("discharge_resistance")
    discharge_leakage: f.Ampere | None = _term("discharge_leakage")
    bias_current: f.SignedAmpere | None = _term("bias_current")
    delay_upper: f.Second | None = _term("delay_upper")
    delay_lower: f.Second | None = _term("delay_lower")
    output_high_drop: f.VoltOrZero | None = _term("output_high_drop")
    output_high_resistance: f.OhmOrZero | None = _term("output_high_resistance")
    output_low: f.VoltOrZero | None = _term("output_low")
    output_low_resistance: f.OhmOrZero | None = _term("output_low_resistance")

    @model_validator(mode="after")
    def _check_order(self) -> Self:
        lower, upper = self.lower_threshold, self.upper_threshold
        if lower and upper and lower.of_supply == upper.of_supply and lower.value >= upper.value:
            raise ValueError("lower_threshold must lie below upper_threshold")
        return self


class SchmittIcTable(IcTable):
    """The Schmitt inverter: its thresholds differ from maker to maker and must be stated."""

    upper_threshold: f.Level = about("switching level of a rising input", "60%")
    lower_threshold: f.Level = about("switching level of a falling input", "40%")
    u_threshold: f.Share = _term("u_threshold", required=True)


class LimitTable(Table):
    """A lower and an upper limit, and where they come from."""

    lower: Any = None
    upper: Any = None
    source: f.Name = about("drawing, sheet or norm", "drawing", default=values.LIMIT_SOURCE)

    @model_validator(mode="after")
    def _check_order(self) -> Self:
        values.check_limit(self.lower, self.upper)
        return self


class TimeLimit(LimitTable):
    """Limits on a time."""

    lower: f.TimeBound | None = about("least value", "22 s", default=None)
    upper: f.TimeBound | None = about("greatest value", "28 s", default=None)


class FrequencyLimit(LimitTable):
    """Limits on the frequency."""

    lower: f.FrequencyBound | None = about("least value", "38 mHz", default=None)
    upper: f.FrequencyBound | None = about("greatest value", "42 mHz", default=None)


class DutyLimit(LimitTable):
    """Limits on the duty: high time over period."""

    lower: f.DutyBound | None = about("least value", "53%", default=None)
    upper: f.DutyBound | None = about("greatest value", "57%", default=None)


class JitterLimit(LimitTable):
    """Limits on a jitter: a time, or a share of the measured mean period."""

    lower: f.JitterBound | None = about("least value", "0.01%", default=None)
    upper: f.JitterBound | None = about("greatest value", "0.2%", default=None)


TimeLimits = Annotated[
    TimeLimit, f.short(partial(values.tabulate_limit, kind="time"), str | TimeLimit)
]
FrequencyLimits = Annotated[
    FrequencyLimit, f.short(partial(values.tabulate_limit, kind="frequency"), str | FrequencyLimit)
]
DutyLimits = Annotated[
    DutyLimit, f.short(partial(values.tabulate_limit, kind="duty"), str | DutyLimit)
]
JitterLimits = Annotated[
    JitterLimit, BeforeValidator(partial(values.tabulate_limit, kind="jitter"))
]


class LimitsTable(Table):
    """What the stage is judged on."""

    derive: Derivation | None = about(
        "how limits follow from the tolerances, for quantities without a line of their own",
        "worst-case",
        default=None,
    )
    quantities: list[QuantityName] | None = about(
        "what is judged by derived limits", ["t_high", "period"], default=None, min_length=1
    )
    t_high: TimeLimits | None = _limit("t_high")
    t_low: TimeLimits | None = _limit("t_low")
    period: TimeLimits | None = _limit("period")
    frequency: FrequencyLimits | None = _limit("frequency")
    duty: DutyLimits | None = _limit("duty")
    first_high: TimeLimits | None = _limit("first_high")
    delay: TimeLimits | None = _limit("delay")
    tau_charge: TimeLimits | None = _limit("tau_charge")
    tau_discharge: TimeLimits | None = _limit("tau_discharge")
    jitter_period: JitterLimits | None = _limit("jitter_period")
    jitter_cycle: JitterLimits | None = _limit("jitter_cycle")


Resistor = Annotated[ResistorTable, f.short(values.tabulate_part, str | float | ResistorTable)]
Capacitor = Annotated[CapacitorTable, f.short(values.tabulate_part, str | float | CapacitorTable)]
Ic = Annotated[IcTable, f.short(values.tabulate_ic, Family | IcTable)]
SchmittIc = Annotated[SchmittIcTable, BeforeValidator(values.tabulate_ic)]
