"""The rules of the fuzzing run hold for every malformed file and every seed, and can be broken."""

from __future__ import annotations

import gzip
import random
import zlib
from pathlib import Path

import numpy as np
import pytest
from mutations import mutate
from oracle import RuleBrokenError, attempt, check_error, check_trace, compare
from seeds import TESTS, write_seeds

from benchtool import pipeline
from benchtool.errors import BenchtoolError
from benchtool.formats import read_capture
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    LogicTrace,
    Span,
    StampedTime,
    TimeSpan,
    Waveform,
)

MALFORMED = sorted(path.name for path in (TESTS / "malformed").iterdir())
GOOD = "flat_line.csv"


@pytest.mark.parametrize("name", MALFORMED)
def test_every_malformed_file_keeps_the_rules(name: str) -> None:
    assert attempt(TESTS / "malformed" / name)


def test_changed_seeds_keep_the_rules(tmp_path: Path) -> None:
    assert write_seeds(tmp_path) > 60
    chance = random.Random(5)
    for path in sorted(tmp_path.iterdir())[::3]:
        path.write_bytes(mutate(path.read_bytes(), 6000, chance.randrange(1 << 30), plain))
        attempt(path)


def plain(data: bytes, most: int) -> bytes:
    """Drop the middle byte, in place of the fuzzer's own changes."""
    at = len(data) // 2
    return (data[:at] + data[at + 1 :])[:most]


def test_changes_repeat_with_their_seed_and_stay_inside_a_shell() -> None:
    whole = gzip.compress(b"time_s,OUT\n0,1\n1,0\n", mtime=0)
    made = [mutate(whole, 6000, seed, plain) for seed in range(60)]
    assert made == [mutate(whole, 6000, seed, plain) for seed in range(60)]
    assert len(set(made)) > 20
    readable = sum(_inflates(data) for data in made)
    assert readable > 40


def _inflates(data: bytes) -> bool:
    try:
        gzip.decompress(data)
    except (OSError, EOFError, zlib.error):
        return False
    return True


def test_an_internal_fault_comes_through(monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr(pipeline, "measure", fail)
    with pytest.raises(ZeroDivisionError):
        attempt(TESTS / "malformed" / GOOD)


def stamped(stamps: list[float], *, spans: tuple[Span, ...] = (), volts: float = 5.0) -> Waveform:
    return Waveform(
        samples=ArraySamples(np.full(4, volts)),
        time=StampedTime(stamps=ArraySamples(np.array(stamps))),
        spans=spans or (Span(start=0, stop=4, start_s=0.0),),
        channel="OUT",
    )


OVERLAPPING = (Span(start=0, stop=3, start_s=0.0), Span(start=2, stop=4, start_s=1.0))
BACKWARDS = (Span(start=0, stop=2, start_s=1.0), Span(start=2, stop=4, start_s=0.0))


@pytest.mark.parametrize(
    ("trace", "says"),
    [
        (stamped([0, 2, 1, 3]), "stamps out of order"),
        (stamped([0, 1, np.nan, 3]), "without a time"),
        (stamped([0, 1, 2]), "not one stamp"),
        (stamped([0, 1, 2, 3], spans=OVERLAPPING), "overlap"),
        (stamped([0, 1, 2, 3], spans=BACKWARDS), "out of order"),
        (
            LogicTrace(
                times_s=np.array([2.0, 1.0]),
                states=np.array([True, False]),
                spans=(TimeSpan(start_s=0.0, end_s=3.0, starts_high=False),),
                tick_s=0.0,
                channel="OUT",
            ),
            "transitions out of order",
        ),
    ],
)
def test_an_impossible_trace_is_found(trace: Waveform | LogicTrace, says: str) -> None:
    with pytest.raises(RuleBrokenError, match=says):
        check_trace(trace)


def test_two_readings_are_told_apart() -> None:
    origin = read_capture(TESTS / "malformed" / GOOD).origin
    one, other = (
        Capture(origin=origin, traces=(stamped([0, 1, 2, 3], volts=v),)) for v in (5.0, 4.0)
    )
    compare(one, one)
    with pytest.raises(RuleBrokenError, match="other samples"):
        compare(one, other)


def test_a_message_of_several_lines_is_found() -> None:
    with pytest.raises(RuleBrokenError):
        check_error(BenchtoolError("two\nlines", hint="None."))
