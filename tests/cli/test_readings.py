"""What a technician writes of his readings."""

from __future__ import annotations

import pytest

from benchtool.cli.readings import reading_of
from benchtool.errors import UsageError


@pytest.mark.parametrize(
    ("text", "kind", "value", "unit"),
    [
        ("control-pin=7.95V", "control-pin", 7.95, "V"),
        ("supply = 12.02 V", "supply", 12.02, "V"),
        ("discharge-pin=210mV", "discharge-pin", 0.21, "V"),
        ("RB=46.8k", "part", 46.8e3, "ohm"),
        ("C=8.1u", "part", 8.1e-6, "F"),
        ("temperature=31degC", "temperature", 31.0, "degC"),
    ],
)
def test_a_reading_has_its_value_in_si(text: str, kind: str, value: float, unit: str) -> None:
    reading = reading_of(text)
    assert (reading.kind, reading.unit, reading.way) == (kind, unit, "isolated")
    assert reading.value == pytest.approx(value, rel=1e-12)
    assert reading.u > 0


@pytest.mark.parametrize(
    ("sign", "way"), [("<=", "at-most"), ("≥", "at-least"), (">=", "at-least")]
)
def test_an_ohmmeter_in_the_circuit_gives_a_bound(sign: str, way: str) -> None:
    reading = reading_of(f"RB{sign}46.8k")
    assert (reading.part, reading.way) == ("RB", way)


def test_a_stated_uncertainty_wins() -> None:
    # U at 95 % of a normal distribution is 1.96 u: JCGM 100:2008, table G.2
    assert reading_of("control-pin=7.95V ± 20mV").u == pytest.approx(0.02 / 1.96, rel=1e-9)


@pytest.mark.parametrize(
    "text",
    [
        *("control-pin", "pin7=3V", "control-pin=3A", "RB<46k", "C=", "=3V"),
        *("control-pin<=3V", "RB=46.8k ± 0", "control-pin=1,234V"),
    ],
)
def test_what_is_no_reading_is_refused_with_an_example(text: str) -> None:
    with pytest.raises(UsageError) as caught:
        reading_of(text)
    assert caught.value.hint
