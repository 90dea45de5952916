"""What a part's marking says: one record for one way to read it."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record

PartKind = Literal["capacitor", "resistor"]


@frozen_record
class Marking:
    """One way to read what is printed or painted on a part.

    Attributes:
        text: The marking as given.
        kind: What the part is in this reading.
        value: In ``unit``; None where the marking gives a class and no value.
        unit: ``F`` or ``ohm``.
        how: How the marking was read, a few words.
        tolerance_rel: Lower and upper relative tolerance; None where none is marked.
        tolerance_from: What the tolerance was read from; empty where none is marked.
        temperature_code: Temperature class of the dielectric, such as X7R.
        temperature_note: What the class says, with its figures.
        tempco_per_k: Temperature coefficient in 1/K, where the marking gives one.
        rated_voltage_v: Rated voltage in volts, where the marking gives one.
        preferred: Whether the value is of an E-series (True where there is no value).
        notes: What else to know, whole sentences.
    """

    text: str
    kind: PartKind
    value: float | None
    unit: Literal["F", "ohm"]
    how: str
    tolerance_rel: tuple[float, float] | None = None
    tolerance_from: str = ""
    temperature_code: str | None = None
    temperature_note: str = ""
    tempco_per_k: float | None = None
    rated_voltage_v: float | None = None
    preferred: bool = True
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if self.value is not None and self.value < 0:
            raise ValueError(f"a part's value is zero or more, got {self.value}")
