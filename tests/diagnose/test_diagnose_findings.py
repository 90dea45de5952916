from __future__ import annotations

import numpy as np
import pytest

from benchtool.diagnose.findings import find_findings
from benchtool.manual import lookup
from benchtool.model.quantity import Measured
from benchtool.model.regularity import Jumps, Line, Lock, Regularity, Skip
from benchtool.model.result import Finding
from benchtool.model.timing import Dropped, Edges, Intervals, Timing

NONE = np.empty(0)
EDGES = Edges(
    times_s=NONE, rising=np.empty(0, np.bool_), u_s=NONE, runs=(), step_s=1e-3, resolved=False
)
MISSING = Dropped(reason="missing pulse", count=1)


def intervals(*dropped: Dropped) -> Intervals:
    names = ("high_s", "low_s", "period_s", "high_starts_s", "low_starts_s", "period_starts_s")
    arrays = dict.fromkeys((*names, "cycle_high_s", "cycle_low_s", "other_period_s"), NONE)
    return Intervals(**arrays, chains=(), active="high", dropped=dropped)


def found(regularity: Regularity | None, *dropped: Dropped, topology=None) -> list[Finding]:  # type: ignore[no-untyped-def]
    return list(
        find_findings(
            None, EDGES, intervals(*dropped), Timing(), topology=topology, regularity=regularity
        )
    )


def skip(kind: str, shift: float) -> Skip:
    measured = Measured(value=shift, u=0.001, unit="1")
    return Skip(at_s=120.0, length_s=49.4, shift=measured, kind=kind)  # type: ignore[arg-type]


LOCK = Lock(
    ripple_hz=100.0,
    cycles=20,
    off=Measured(value=0.001, u=0.01, unit="1"),
    scatter_rel=1e-5,
    floor_rel=1e-4,
    chance=0.02,
)
LINE = Line(
    frequency=Measured(value=100.003, u=0.002, unit="Hz"),
    amplitude_s=0.02,
    false_alarm=1e-9,
    source="mains",
    of_hz=50.0,
    n_others=3,
)
JUMPS = Jumps(lower_s=24.7, upper_s=25.0, n_lower=30, n_upper=30, n_jumps=9, separation=30.0)


@pytest.mark.parametrize(
    ("regularity", "code", "words"),
    [
        (Regularity(lock=LOCK), "ripple-lock", "20 periods of 100 Hz"),
        (Regularity(lines=(LINE,)), "ripple-line", "a multiple of the mains' 50 Hz (3 other"),
        (Regularity(jumps=JUMPS), "two-level", "1.2 % apart"),
        (Regularity(skips=(skip("missed", 0.001),)), "missed-edge", "keep the phase"),
        (Regularity(skips=(skip("unclear", 0.001),)), "missed-edge", "cannot be told"),
        (Regularity(skips=(skip("paused", -0.37),)), "paused", "-37.0 % of a period"),
    ],
)
def test_what_the_order_of_the_edges_says_becomes_a_finding(
    regularity: Regularity, code: str, words: str
) -> None:
    (finding,) = found(regularity)
    assert finding.code == code
    assert words in finding.text
    assert finding.may_be
    assert lookup(code) is not None


def test_a_skip_that_is_explained_is_not_told_twice() -> None:
    assert [f.code for f in found(None, MISSING)] == ["missed-edge"]
    assert [f.code for f in found(Regularity(), MISSING)] == ["missed-edge"]
    paused = Regularity(skips=(skip("paused", 0.3),))
    assert [f.code for f in found(paused, MISSING)] == ["paused"]


def test_causes_that_the_circuit_cannot_have_are_left_out() -> None:
    (finding,) = found(Regularity(jumps=JUMPS), topology="astable")
    assert finding.may_be == ("RA-high", "RB-high", "C-low")
