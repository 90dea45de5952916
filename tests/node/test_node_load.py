from __future__ import annotations

import pytest
from node_boards import FAST, RA, RB, C, board, ohms, recorded, volts

from benchtool.errors import UsageError
from benchtool.model.quantity import Measured
from benchtool.node import Load, fit_node, remove_probe
from benchtool.uncertainty import expanded

PROBE_OHM = ohms(10e6, 100e3)
FARAD = Measured(value=100e-12, u=10e-12, unit="F")
LOADED = fit_node(recorded(board(FAST, probe_r=10e6, probe_c=100e-12), 25, seed=3))
KNOWN = {
    "both resistors": {"charge_ohm": ohms(RA + RB, 4e3), "discharge_ohm": ohms(RB, 3e3)},
    "one of them": {"charge_ohm": ohms(RA + RB, 4e3)},
    "the other": {"discharge_ohm": ohms(RB, 3e3)},
    "the supply": {"supply": volts(12.0, 0.01)},
}


@pytest.mark.parametrize("known", KNOWN)
def test_the_load_of_the_probe_is_taken_off(known: str) -> None:
    """A 10 Mohm probe lowers the asymptote by 4 % and the time constants by 4 and 3 %."""
    assert LOADED.charge
    assert LOADED.discharge
    assert LOADED.charge.end.value == pytest.approx(12 / 1.043, rel=2e-3)
    freed = remove_probe(LOADED, Load(ohm=PROBE_OHM, farad=FARAD, **KNOWN[known]))
    assert freed.charge
    assert freed.discharge
    rise_s, fall_s = (RA + RB) * C * FAST, RB * C * FAST
    for found, true in (
        (freed.charge.end, 12.0),
        (freed.charge.tau, rise_s),
        (freed.discharge.tau, fall_s),
    ):
        assert abs(found.value - true) < 1.5 * expanded(found)
        assert found.u < 0.005 * true
    assert freed.upper == LOADED.upper


def test_the_error_of_the_probe_is_in_the_uncertainty() -> None:
    known = KNOWN["both resistors"]
    sharp = remove_probe(LOADED, Load(ohm=ohms(10e6, 1.0), farad=FARAD, **known))
    rough = remove_probe(LOADED, Load(ohm=ohms(10e6, 1e6), farad=FARAD, **known))
    assert sharp.charge
    assert rough.charge
    extra = (rough.charge.end.u**2 - sharp.charge.end.u**2) ** 0.5
    assert extra == pytest.approx(12 / 1.043 * 0.043 * 0.1, rel=0.05)


def test_without_a_resistance_the_load_is_refused() -> None:
    with pytest.raises(UsageError, match="depends on the resistance"):
        remove_probe(LOADED, Load(ohm=PROBE_OHM, farad=FARAD))
