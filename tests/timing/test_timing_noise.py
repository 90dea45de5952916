"""The sine transform by which two kinds of noise are told apart."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import fft

from benchtool.timing.noise import sine_transform


@pytest.mark.parametrize("n", [2, 30, 256, 257, 1000])
def test_thesine_transform_is_the_orthonormal_one(n: int) -> None:
    """Against scipy's DST-I, on both sides of the length up to which it is a plain sum."""
    values = np.random.default_rng(n).normal(size=n)
    expected = fft.dst(values, type=1, norm="ortho")
    assert sine_transform(values) == pytest.approx(expected, abs=1e-12)  # arithmetic
