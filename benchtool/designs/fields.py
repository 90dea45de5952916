"""How single keys of the design file are read and described.

With ``schema`` the only modules that are pydantic; both are imported inside functions.
"""

from __future__ import annotations

import re
from functools import partial
from typing import Annotated, Any, Literal

from pydantic import (  # noqa: TID253 - imported by schema alone, itself imported inside functions
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    PlainValidator,
)

from benchtool.designs import values
from benchtool.model.design import Band, Threshold


def about(description: str, example: object, *, default: object = ..., **more: Any) -> Any:
    """Describe a key for editors and for the message when it is missing."""
    return Field(default, description=description, examples=[example], **more)


def number(read: Any, unit: str) -> BeforeValidator:
    """Read a text with its unit or a plain SI number."""
    return BeforeValidator(partial(read, unit=unit), json_schema_input_type=str | float)


def plain(read: Any) -> PlainValidator:
    """Read a text or a plain number into a record."""
    return PlainValidator(read, json_schema_input_type=str | float)


def short(read: Any, accepted: Any) -> BeforeValidator:
    """Read the short form of a table."""
    return BeforeValidator(read, json_schema_input_type=accepted)


def _whole(number: object) -> object:
    """Refuse 1.0 and true, which Python takes for equal to 1."""
    return number if type(number) is int else str(number).lower()


def _compiled(pattern: object) -> str:
    if not isinstance(pattern, str):
        raise ValueError("a pattern is a text such as '^MV7-[0-9]{6}$'")
    try:
        re.compile(pattern)
    except re.error as error:
        raise ValueError(
            f"{pattern!r} is no regular expression ({error}); write one such as '^MV7-[0-9]{{6}}$'"
        ) from None
    return pattern


Name = Annotated[str, Field(min_length=1)]
Ohm = Annotated[float, number(values.read_positive, "ohm")]
OhmOrZero = Annotated[float, number(values.read_zero_or_more, "ohm")]
Farad = Annotated[float, number(values.read_positive, "F")]
FaradOrZero = Annotated[float, number(values.read_zero_or_more, "F")]
Volt = Annotated[float, number(values.read_positive, "V")]
VoltOrZero = Annotated[float, number(values.read_zero_or_more, "V")]
SignedVolt = Annotated[float, number(values.read_value, "V")]
Ampere = Annotated[float, number(values.read_zero_or_more, "A")]
SignedAmpere = Annotated[float, number(values.read_value, "A")]
Second = Annotated[float, number(values.read_zero_or_more, "s")]
PerKelvin = Annotated[float, number(values.read_value, "1/K")]
Share = Annotated[float, BeforeValidator(values.read_share, json_schema_input_type=str | float)]
Coverage = Annotated[float, plain(values.read_coverage)]
Tolerance = Annotated[tuple[float, float], plain(values.read_tolerance)]
Level = Annotated[Threshold, plain(values.read_threshold)]
Supply = Annotated[Band, plain(values.read_supply)]
Temperature = Annotated[Band, plain(values.read_temperature)]
Pattern = Annotated[str, PlainValidator(_compiled, json_schema_input_type=str)]
TimeBound = Annotated[values.Bound, plain(partial(values.read_bound, kind="time"))]
FrequencyBound = Annotated[values.Bound, plain(partial(values.read_bound, kind="frequency"))]
DutyBound = Annotated[values.Bound, plain(partial(values.read_bound, kind="duty"))]
JitterBound = Annotated[values.Bound, plain(partial(values.read_bound, kind="jitter"))]
SchemaNumber = Annotated[Literal[1], BeforeValidator(_whole, json_schema_input_type=Literal[1])]


class Table(BaseModel):
    """A table that knows its keys and takes no others."""

    model_config = ConfigDict(
        extra="forbid", strict=True, frozen=True, defer_build=True, arbitrary_types_allowed=True
    )
