"""Value changes by whole blocks and word by word: the same, whatever a dump holds."""

from __future__ import annotations

import io
import math
import random
from collections.abc import Iterator

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import Read
from vcd import VCDWriter

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.vcd import body as body_module
from benchtool.formats.vcd.blocks import BlockWalk
from benchtool.formats.vcd.changes import Body, Changes, NumberChanges
from benchtool.formats.vcd.digits import counts_of
from benchtool.formats.vcd.splitting import PAD, TAIL
from benchtool.model.capture import LogicTrace

CODES = ["!", "b", "#", "$", "0", "r", "1!", "#1", "$e", "b1", "s", "!!!", "xyz1", "nine_long"]
SPACES = ["\n", "\n", "\n", " ", "\r\n", "\t", "\n\n", " \v\n"]
WORDS = ["$end", "$dumpvars", "$dumpall", "$dumpon", "$dumpoff", "$comment #9 b 1! r $end"]
FAULTS = ["q", "$other", "#", "#1a", "2!", "b12 !", "b ", "r1.2.3 !", "#1", "0", "$comment b", "u!"]


def dump(rng: random.Random) -> tuple[list[str], str]:
    """Return declared codes, the first few of them wanted, and a body of value changes."""
    longest = rng.choice([1, 2, 4, 9])
    codes = [code for code in rng.sample(CODES, 14) if len(code) <= longest][:6]
    now, words = rng.choice([0, 0, 7, 10**9, 2**53 + 1, 2**62, 2**64]), []
    rare, wrong, step = (
        rng.choice([0, 0.1]),
        rng.choice([0, 0, 0.01]),
        rng.choice([2, 10**5, 10**9]),
    )
    for _ in range(rng.randrange(200)):
        kind, space = rng.random(), rng.choice(SPACES)
        if kind < wrong:
            words.append(rng.choice(FAULTS))
        elif kind < wrong + rare:
            words.append(rng.choice(WORDS))
        elif kind < 0.4:
            now += rng.randrange(step)
            words.append(f"#{now:0{rng.choice([1, 1, 1, 9, 12])}}")
        elif kind < 0.8:
            words.append(rng.choice("0101xzZh") + rng.choice(codes))
        elif kind < 0.9:
            digits = rng.choices(
                rng.choice(["01", "01", "01xzXZ"]), k=rng.choice([1, 1, 2, 5, 9, 9])
            )
            words.append(f"b{''.join(digits)}{space}{rng.choice(codes)}")
        else:
            words.append(f"r{rng.uniform(-9, 9):.3g} {rng.choice(codes)}")
    return codes, "".join(word + rng.choice(SPACES) for word in words)


def empty(codes: list[str]) -> Body:
    """Return a body that wants a scalar, a vector as a number, a real, and leaves out the rest."""
    first, *rest = [code.encode() for code in codes]
    body = Body(source="a.vcd", known=frozenset([first, *rest]), bits={first: [Changes()]})
    if rest[:1]:
        body.bits[rest[0]] = [Changes() for _ in range(9)]
        body.numbers[rest[0]] = NumberChanges()
    if rest[1:2]:
        body.reals[rest[1]] = NumberChanges()
    if rest[2:3]:
        body.bits[rest[2]] = [Changes()]
    return body


def settled(changes: Changes | NumberChanges) -> list[tuple[int, float | None]]:
    """Return what is taken on at each time, without what changes nothing; None for NaN."""
    at: dict[int, float | None] = {}
    for times, values in changes.hand_over()[::-1]:
        pairs = zip(times.tolist(), values.tolist(), strict=True)
        at |= {t: None if math.isnan(v) else v for t, v in pairs}
    steps = list(at.items())
    return [step for i, step in enumerate(steps) if i == 0 or step[1] != steps[i - 1][1]]


def outcome(codes: list[str], text: str) -> object:
    """Return all that is kept of a dump, or what it is refused for."""
    body, data = empty(codes), text.encode()
    content = Content(source="a.vcd", suffix=".vcd", sha256="", size=len(data), data=data)
    try:
        body_module.read_body(content, 0, body)
    except MalformedCaptureError as error:
        return error.code, error.message
    changes = [*(bit for bits in body.bits.values() for bit in bits), *body.reals.values()]
    kept = [settled(each) for each in (*changes, *body.numbers.values())]
    return body.start, body.time, body.cut, kept


@given(seed=st.integers(0, 2**32), block=st.sampled_from([5, 64, 999, 1 << 18]))
@settings(max_examples=600, derandomize=True, deadline=None)
def test_a_block_gives_what_its_words_give(seed: int, block: int) -> None:
    codes, text = dump(random.Random(seed))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(body_module, "_BLOCK", block)
        by_blocks = outcome(codes, text)
        patch.setattr(BlockWalk, "take", lambda *_: None)
        by_words = outcome(codes, text)
    assert by_blocks == by_words


@pytest.mark.parametrize(
    ("changes", "kept"),
    [
        (b"1!\nb0 !\n", [(0, 0)]),
        (b"b1 !\n0!\n", [(0, 0)]),
        (b"#3\nb0 !\n#4\n1!\n#9\nb0 !\n", [(0, 0), (1, 1), (6, 0)]),
    ],
)
def test_a_bit_written_both_ways_keeps_the_order(
    changes: bytes, kept: list[tuple[int, int]]
) -> None:
    body = empty(["!"])
    content = Content(source="a.vcd", suffix=".vcd", sha256="", size=len(changes), data=changes)
    body_module.read_body(content, 0, body)
    assert settled(body.bits[b"!"][0]) == kept


@pytest.mark.parametrize("digits", [b"102000000", b"120000000", b"3", b"1x2", b"1111111111", b""])
def test_vector_that_is_no_row_of_states_is_left_to_the_rules(digits: bytes) -> None:
    assert BlockWalk(empty(["!", "#"])).take(PAD + b"#1 b" + digits + b" #\n" + TAIL) is None


@pytest.mark.parametrize(
    "codes", [["!", "$", "b", "#"], ["!", "$$", "bb", "#"], ["a!cd", "$", "rrrrrrr", "#"]]
)
def test_common_kinds_of_words_are_taken_by_blocks(codes: list[str]) -> None:
    body = empty(codes)
    text = (
        "$dumpvars\n0{0}\nbx {1}\n$end\n#5\n1{0}\nb101 {1}\nr1.5 {2}\nr2 {2}\n"
        "#60\n0{0} 1{3} b111000111 {1}\n#100\n"
    ).format(*codes)
    assert BlockWalk(body).take(PAD + text.encode() + b"b1 " + TAIL) == len(text)
    scalar, vector, real, other = (code.encode() for code in codes)
    assert settled(body.bits[scalar][0]) == [(0, 1), (55, 0)]
    assert settled(body.numbers[vector]) == [(0, 5), (55, 455)]
    assert settled(body.reals[real]) == [(0, 2)]
    assert settled(body.bits[other][0]) == [(55, 1)]
    assert (body.start, body.time) == (5, 95)


@given(st.lists(st.integers(0, 10**18 - 1), min_size=1, max_size=50), st.integers(0, 12))
@settings(max_examples=200, derandomize=True, deadline=None)
def test_counts_are_exact_to_the_last_digit(numbers: list[int], width: int) -> None:
    words = [f"{number:0{width}}" for number in numbers]
    data = PAD + b"#" + "#".join(words).encode() + TAIL
    stops = np.cumsum([len(word) + 1 for word in words]) + len(PAD)
    lengths = np.array([len(word) for word in words])
    found = counts_of(np.frombuffer(data, np.uint8), stops - lengths, stops)
    assert found is not None
    assert found.tolist() == numbers


@pytest.mark.parametrize("odd", range(256))
def test_no_other_byte_passes_for_a_digit(odd: int) -> None:
    for place in range(11):
        word = bytearray(b"1234567890123")
        word[place] = odd
        data = np.frombuffer(PAD + bytes(word) + TAIL, np.uint8)
        ends = np.array([len(PAD) + len(word)])
        found = counts_of(data, ends - len(word), ends)
        assert (found is not None) == (48 <= odd < 58)


def changes_of(rng: np.random.Generator, n: int) -> Iterator[tuple[int, int, int]]:
    """Yield random times, which signal, and its new value."""
    times = np.cumsum(rng.integers(0, 3, n))
    yield from zip(
        times.tolist(),
        rng.integers(0, 12, n).tolist(),
        rng.integers(0, 16, n).tolist(),
        strict=True,
    )


def test_random_dump_of_another_writer_is_read_back(
    read: Read, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(body_module, "_BLOCK", 1000)
    file = io.StringIO()
    truth: dict[str, dict[int, int]] = {}
    with VCDWriter(file, timescale="1 us") as writer:
        kinds = [1] * 8 + [4] * 4
        signals = [writer.register_var("top", f"s{k}", "wire", w, 0) for k, w in enumerate(kinds)]
        for time, k, value in changes_of(np.random.default_rng(5), 6000):
            writer.change(signals[k], time, value % 2 if k < 8 else value)
            for bit in range(kinds[k]):
                name = f"s{k}" if k < 8 else f"s{k}[{bit}]"
                truth.setdefault(name, {0: 0})[time] = value >> bit & 1
    traces = {trace.channel: trace for trace in read(file.getvalue(), "a.vcd").traces}
    assert set(traces) == set(truth)
    for name, states in truth.items():
        trace = traces[name]
        assert isinstance(trace, LogicTrace)
        steps = list(states.items())
        edges = [(t, s) for (t, s), (_, old) in zip(steps[1:], steps, strict=False) if s != old]
        assert np.rint(trace.times_s * 1e6).astype(int).tolist() == [t for t, _ in edges]
        assert trace.states.tolist() == [s == 1 for _, s in edges]


@pytest.mark.parametrize("block", [8000, 9001, 10_003])
def test_a_state_said_again_where_a_block_begins_is_no_transition(
    read: Read, monkeypatch: pytest.MonkeyPatch, block: int
) -> None:
    """Times of changes share 10 counts; the same state is said again off that spacing."""
    monkeypatch.setattr(body_module, "_BLOCK", block)
    rows = [f"#{10 * k}\n{k % 2}!\n#{10 * k + 3}\n{k % 2}!\n" for k in range(1, 5000)]
    head = "$timescale 1 us $end\n$var wire 1 ! OUT $end\n$enddefinitions $end\n#0\n0!\n"
    trace = read(head + "".join(rows)).traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.tick_s == pytest.approx(10e-6)
