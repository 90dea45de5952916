from __future__ import annotations

import pytest

from benchtool.designs import values
from benchtool.model.design import Band, Threshold


@pytest.mark.parametrize(
    ("text", "table"),
    [
        ("100k 1%", {"value": "100k", "tolerance": "1%"}),
        ("47 uF 10 %", {"value": "47 uF", "tolerance": "10 %"}),
        ("47u -20% 50%", {"value": "47u", "tolerance": "-20% 50%"}),
        ("47u -20/+50 %", {"value": "47u", "tolerance": "-20/+50 %"}),
        ("4k7 ± 1 %", {"value": "4k7", "tolerance": "± 1 %"}),
        ("10 kohm +-50ppm", {"value": "10 kohm", "tolerance": "+-50ppm"}),
        ("1 000 000 1%", {"value": "1 000 000", "tolerance": "1%"}),
        ("330k", {"value": "330k"}),
        (330e3, {"value": 330e3}),
        ({"value": 1}, {"value": 1}),
    ],
)
def test_short_parts_become_tables(text: object, table: object) -> None:
    assert values.tabulate_part(text) == table


@pytest.mark.parametrize(
    ("raw", "band"),
    [
        ("12 V 5%", (12, 11.4, 12.6)),
        ("12 V", (12, 12, 12)),
        (12, (12, 12, 12)),
        ("11 V .. 13 V", (12, 11, 13)),
        ("11..13V", (12, 11, 13)),
        ("900 .. 1100 mV", (1.0, 0.9, 1.1)),
        ("900 mV .. 1.1 V", (1.0, 0.9, 1.1)),
        ("12 V -10% 5%", (12, 10.8, 12.6)),
    ],
)
def test_supply_takes_half_widths_and_ranges(raw: object, band: tuple[float, ...]) -> None:
    found = values.read_supply(raw)
    # 1e-12: arithmetic only
    assert (found.nominal, found.lower, found.upper) == pytest.approx(band, rel=1e-12)


@pytest.mark.parametrize(
    ("raw", "band"),
    [
        ("25 degC", (25, 25, 25)),
        (-10, (-10, -10, -10)),
        ("10 .. 40 degC", (25, 10, 40)),
        ("-10 °C .. 60 °C", (25, -10, 60)),
    ],
)
def test_temperature_is_a_point_or_a_range(raw: object, band: tuple[float, ...]) -> None:
    nominal, lower, upper = band
    assert values.read_temperature(raw) == Band(nominal=nominal, lower=lower, upper=upper)


def test_threshold_is_a_share_or_volts() -> None:
    assert values.read_threshold("66.7%") == Threshold(value=0.667, of_supply=True)
    assert values.read_threshold("8 V") == Threshold(value=8.0, of_supply=False)
    assert values.read_threshold("0.9 V") == Threshold(value=0.9, of_supply=False)
    assert values.read_threshold(8) == Threshold(value=8.0, of_supply=False)


@pytest.mark.parametrize("raw", [0.667, "0.667", 1])
def test_a_bare_threshold_that_could_be_either_is_refused(raw: object) -> None:
    with pytest.raises(ValueError, match="could be a share or volts"):
        values.read_threshold(raw)


@pytest.mark.parametrize("raw", ["100%", "0%", "-5 V", 0])
def test_a_threshold_outside_the_supply_is_refused(raw: object) -> None:
    with pytest.raises(ValueError, match="must be"):
        values.read_threshold(raw)


@pytest.mark.parametrize(
    ("raw", "kind", "bound"),
    [
        ("22 s", "time", (22.0, False)),
        (0.5, "time", (0.5, False)),
        ("40 mHz", "frequency", (0.04, False)),
        ("55%", "duty", (0.55, False)),
        (0.55, "duty", (0.55, False)),
        ("0.2%", "jitter", (0.002, True)),
        ("50 ppm", "jitter", (50e-6, True)),
        ("2 ms", "jitter", (0.002, False)),
        (0.002, "jitter", (0.002, False)),
    ],
)
def test_a_share_is_of_the_period_in_jitters_and_the_duty_itself_in_duty(
    raw: object, kind: values.BoundKind, bound: values.Bound
) -> None:
    assert values.read_bound(raw, kind) == bound


def test_short_limits_become_their_ends() -> None:
    assert values.tabulate_limit("25 s 5%", "time") == {"lower": 23.75, "upper": 26.25}
    assert values.tabulate_limit("22 .. 28 ms", "time") == {"lower": "22 ms", "upper": "28 ms"}
    assert values.tabulate_limit("53% .. 57%", "duty") == {"lower": "53%", "upper": "57%"}


@pytest.mark.parametrize(("raw", "kind"), [("55% 2%", "duty"), ("0.2%", "jitter"), (7, "time")])
def test_limits_that_do_not_say_which_end_are_refused(raw: object, kind: values.BoundKind) -> None:
    with pytest.raises(ValueError, match="is no limit; write"):
        values.tabulate_limit(raw, kind)
