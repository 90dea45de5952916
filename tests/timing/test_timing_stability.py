from __future__ import annotations

import math
import tomllib
import warnings
from pathlib import Path

import numpy as np
import pytest

from benchtool.timing.stability import degrees_of_freedom, overlapping_adev

SETS = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "allan_deviations.toml").read_text(encoding="utf-8")
)


def digits(text: str) -> float:
    """Return half a unit of the last published digit."""
    mantissa, _, exponent = text.partition("e")
    places = len(mantissa.partition(".")[2])
    return 0.5 * 10.0 ** (int(exponent or 0) - places)


def generated() -> np.ndarray:
    known = SETS["generator_1000"]
    n, values = known["first"], []
    for _ in range(1000):
        values.append(n / known["modulus"])
        n = known["multiplier"] * n % known["modulus"]
    return np.concatenate([[0.0], np.cumsum(values)])


@pytest.mark.parametrize(("m", "published"), SETS["monograph_140"]["overlapping"].items())
def test_ten_phases_give_the_published_deviation(m: str, published: str) -> None:
    phase = np.array(SETS["monograph_140"]["phase"])
    assert abs(overlapping_adev(phase, 1.0, int(m)) - float(published)) <= digits(published)


@pytest.mark.parametrize(("m", "published"), SETS["generator_1000"]["overlapping"].items())
def test_a_thousand_frequencies_give_the_published_deviation(m: str, published: str) -> None:
    assert abs(overlapping_adev(generated(), 1.0, int(m)) - float(published)) <= digits(published)


def test_random_data_agree_with_a_general_library() -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import allantools
    phase = np.cumsum(np.random.default_rng(1).normal(0, 1e-3, 3000))
    taus = [0.4, 3.2, 51.2]
    _, expected, _, _ = allantools.oadev(phase, rate=1 / 0.4, data_type="phase", taus=taus)
    found = [overlapping_adev(phase, 0.4, m) for m in (1, 8, 128)]
    np.testing.assert_allclose(found, expected, rtol=1e-10)  # arithmetic of 3000 terms


@pytest.mark.parametrize("m", [1, 4, 16])
def test_the_interval_covers_the_deviation_of_white_frequency_noise(m: int) -> None:
    from benchtool.timing.stability import _point

    hits = 0
    for seed in range(600):
        phase = np.concatenate([[0.0], np.cumsum(np.random.default_rng(seed).normal(0, 1, 200))])
        point = _point(phase, 1.0, m)
        hits += point.lower <= 1 / math.sqrt(m) <= point.upper
    # 95 % of 600: the chance of leaving 92.5 to 98 % is below 1 %
    assert 0.925 < hits / 600 < 0.985


def test_degrees_of_freedom_fall_with_the_averaging_time() -> None:
    assert degrees_of_freedom(1001, 1) == pytest.approx((1500 - 2 * 999 / 1001) * 4 / 9)
    assert degrees_of_freedom(11, 5) >= 1
