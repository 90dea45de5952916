from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchtool.circuits import Circuit


@pytest.fixture
def rng() -> np.random.Generator:
    return np.random.default_rng(20_310_302)


@pytest.fixture
def spacing() -> Circuit:
    """The spacing stage of the misting controller (invented), every term of its IC included."""
    return Circuit(
        topology="astable",
        RA=100e3,
        RB=330e3,
        C=47e-6,
        supply=12.0,
        v_upper=8.0,
        v_lower=4.0,
        r_on=8.7,
        i_leak=0.1e-6,
        delay_upper=0.14e-6,
        delay_lower=0.14e-6,
        family="cmos",
    )


@pytest.fixture
def boards(spacing: Circuit) -> dict[str, Circuit]:
    """One board of each topology, loaded so that no term is left out."""
    slow = replace(spacing, delay_upper=5e-3, delay_lower=3e-3, shunt_ohm=20e6, esr=500.0)
    single = replace(
        slow,
        R=220e3,
        output_high_drop=0.3,
        output_low=0.1,
        output_high_resistance=150.0,
        output_low_resistance=90.0,
    )
    return {
        "astable": slow,
        # its diode goes off at 7.6 V, before the upper threshold
        "astable-diode": replace(
            slow, topology="astable-diode", RA=330e3, RB=47e3, diode_drop=0.55
        ),
        "output-fed": replace(single, topology="output-fed"),
        "one-shot": replace(single, topology="one-shot"),
        "schmitt": replace(single, topology="schmitt"),
        "power-on": replace(single, topology="power-on"),
    }
