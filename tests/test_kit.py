"""The user's kit: instruments and probes by name."""

from __future__ import annotations

from pathlib import Path

import pytest

from benchtool.errors import DesignError, UsageError
from benchtool.kit import find_instrument, find_probe, load_kit, parse_kit

GOOD = """
[instrument.left]
resource = "TCPIP::192.0.2.7::hislip0::INSTR"
timebase = "2.5 ppm"
calibration_due = 2031-03-02
channels = { OUT = "CH1" }
probe = "ten-to-one"

[probe.ten-to-one]
R = "10M"
C = "12p"
calibration_due = 2031-01-31
"""


def test_a_kit_gives_values_in_si() -> None:
    kit = parse_kit(GOOD)
    left = find_instrument(kit, "left", "2030-01-01")
    assert left.timebase_rel == pytest.approx(2.5e-6, rel=1e-12)
    assert left.probe is not None
    assert (left.probe.r_ohm, left.probe.c_f) == (10e6, pytest.approx(12e-12, rel=1e-12))
    assert dict(left.channels) == {"OUT": "CH1"}
    assert not left.is_overdue


@pytest.mark.parametrize(
    ("today", "overdue"),
    [("2031-01-31", False), ("2031-02-01", True), ("2031-03-03", True)],
)
def test_a_calibration_holds_to_the_end_of_its_day_of_instrument_and_probe(
    today: str, overdue: bool
) -> None:
    assert find_instrument(parse_kit(GOOD), "left", today).is_overdue is overdue


@pytest.mark.parametrize(
    ("line", "key", "near", "says"),
    [
        ('timbase = "1ppm"', "instrument.left.timbase", "timebase", "no key"),
        ('timebase = "60%"', "instrument.left.timebase", None, "0 to 50 %"),
        ("timebase = true", "instrument.left.timebase", None, "between quotes"),
        ('probe = "none such"', "instrument.left.probe", None, "names no probe"),
        ('calibration_due = "soon"', "instrument.left.calibration_due", None, "date"),
        ("channels = 3", "instrument.left.channels", None, "table of names"),
    ],
)
def test_a_fault_has_its_line_and_key(line: str, key: str, near: str | None, says: str) -> None:
    text = f'[probe.one]\nR = "10M"\nC = "12p"\n[instrument.left]\n{line}\n'
    with pytest.raises(DesignError) as caught:
        parse_kit(text, source="kit.toml")
    (fault,) = caught.value.faults
    assert (fault.key, fault.line, fault.near) == (key, 5, near)
    assert says in fault.message
    assert caught.value.code == "kit"


def test_a_probe_without_its_load_is_a_fault() -> None:
    with pytest.raises(DesignError) as caught:
        parse_kit('[probe.one]\nR = "10M"\n')
    assert "needs C" in caught.value.faults[0].message


def test_what_is_not_in_the_kit_is_named_beside_what_is() -> None:
    kit = parse_kit(GOOD, source="kit.toml")
    with pytest.raises(UsageError, match=r"kit\.toml has no probe 'x'") as caught:
        find_probe(kit, "x")
    assert "ten-to-one" in caught.value.hint


def test_a_kit_that_is_no_toml_is_refused_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "kit.toml"
    path.write_text("[instrument.left]\nresource = TCPIP\n")
    with pytest.raises(DesignError) as caught:
        load_kit(path)
    assert caught.value.faults[0].line == 2
