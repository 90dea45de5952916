"""Loggers told by a description file: each form of line is read, each fault is named."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import pytest
from stream_lines import codes_of, interval_set, read_lines, trace_of

from benchtool.errors import DesignError, InputError, ReplyError
from benchtool_drivers.streams.description import load_description, parse_description

TRUE_INTERVALS = {(700, True), (300, False)}
N = 200
TIMES_US = [sum(700 if k % 2 == 0 else 300 for k in range(n)) for n in range(N)]
LEVELS = [n % 2 == 0 for n in range(N)]


def described(line: str, time: str, rest: str) -> str:
    return f'schema = 1\nname = "logger"\n[line]\n{line}\n[time]\n{time}\n{rest}\n'


LEVEL = '[level]\nhigh = "1"\nlow = "0"'
RISING = '[edges]\nfirst = "rising"'
LENGTHS = [300, *[b - a for a, b in pairwise(TIMES_US)]]

FORMS = {
    "ticks that start again": (
        described(
            'columns = ["time", "level"]', 'unit = "ticks"\ntick_hz = 1e6\nwrap_bits = 12', LEVEL
        ),
        [f"{t % 4096},{int(level)}" for t, level in zip(TIMES_US, LEVELS, strict=True)],
    ),
    "seconds with decimals": (
        described(
            'columns = ["time", "level"]\ndelimiter = ";"', 'unit = "s"\ndecimal = ","', LEVEL
        ),
        [
            f"{t / 1e6:.6f}".replace(".", ",") + f";{int(v)}"
            for t, v in zip(TIMES_US, LEVELS, strict=True)
        ],
    ),
    "decimals as they come": (
        described('columns = ["time", "level"]', 'unit = "ms"', LEVEL),
        [f"{t / 1e3:g},{int(v)}" for t, v in zip(TIMES_US, LEVELS, strict=True)],
    ),
    "words, blanks, other columns first": (
        described(
            'columns = ["skip", "level", "time"]\ndelimiter = "space"\n'
            'comment = "%"\nheader_lines = 2',
            'unit = "us"',
            '[level]\nhigh = "HIGH"\nlow = "LOW"',
        ),
        [
            *("logger of pulses", "id level us"),
            *(f"x  {'HIGH' if v else 'LOW'}   {t}" for t, v in zip(TIMES_US, LEVELS, strict=True)),
            "% end",
        ],
    ),
    "no level": (
        described('columns = ["time"]', 'unit = "us"', RISING),
        [str(t) for t in TIMES_US],
    ),
    "interval lengths with the level that lasted": (
        described(
            'columns = ["level", "interval"]\ndelimiter = "tab"',
            'unit = "us"',
            '[level]\nhigh = "H"\nlow = "L"\nof = "before"',
        ),
        [f"{'L' if v else 'H'}\t{t}" for t, v in zip(LENGTHS, LEVELS, strict=True)],
    ),
    "interval lengths alone": (
        described('columns = ["interval"]', 'unit = "us"', RISING),
        [str(t) for t in LENGTHS],
    ),
    "numbered lines without a level": (
        described('columns = ["seq", "time"]\nseq_bits = 8', 'unit = "us"', RISING),
        [f"{n % 256},{t}" for n, t in enumerate(TIMES_US)],
    ),
}


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_each_form_of_line_gives_the_same_edges(form: str, line_end: str) -> None:
    text, lines = FORMS[form]
    content = "".join(line + line_end for line in lines).encode()
    capture = read_lines(content, parse_description(text), cuts=[7, 100, 101])
    trace = trace_of(capture)
    assert interval_set(capture) == TRUE_INTERVALS
    assert trace.states.tolist() == LEVELS
    last_digit_s = 1e-4 if form == "decimals as they come" else 1e-6
    assert trace.tick_s == pytest.approx(last_digit_s, rel=1e-12)  # arithmetic
    assert len(trace.spans) == 1
    assert codes_of(capture) == (["assumed-first-level"] if "[edges]" in text else [])


def test_a_line_that_cannot_be_read_parts_a_record_without_numbers() -> None:
    text, lines = FORMS["seconds with decimals"]
    lines = [*lines[:50], "??", *lines[52:]]  # two are lost, so that the levels still alternate
    capture = read_lines("\n".join([*lines, ""]).encode(), parse_description(text))
    assert codes_of(capture) == ["stream-garbage"]
    assert len(trace_of(capture).spans) == 2
    assert interval_set(capture) == TRUE_INTERVALS


def test_a_lost_line_without_level_or_number_ends_the_reading() -> None:
    text, lines = FORMS["no level"]
    content = "\n".join([*lines[:50], "??", *lines[51:], ""]).encode()
    with pytest.raises(ReplyError) as raised:
        read_lines(content, parse_description(text))
    assert raised.value.code == "stream-level-lost"


def test_numbered_lines_keep_the_level_over_a_loss() -> None:
    text, lines = FORMS["numbered lines without a level"]
    capture = read_lines(
        "\n".join([*lines[:50], *lines[53:], ""]).encode(), parse_description(text)
    )
    assert interval_set(capture) == TRUE_INTERVALS
    assert "stream-lost" in codes_of(capture)
    assert len(trace_of(capture).spans) == 2


GOOD = described('columns = ["time", "level"]', 'unit = "us"', LEVEL)


@pytest.mark.parametrize(
    ("change", "key", "line", "says"),
    [
        (("[line]", "colour = 1\n[line]"), "colour", 3, "is no key known here"),
        (('unit = "us"', 'unit = "us"\nwrap_bit = 3'), "time.wrap_bit", 7, "is no key known"),
        (('unit = "us"', 'unit = "h"'), "time.unit", 6, "'h' is not known"),
        (('unit = "us"', 'unit = "us"\nwrap_bits = 16'), "time.wrap_bits", 7, 'unit = "ticks"'),
        (('unit = "us"', 'unit = "ticks"'), "time.tick_hz", 5, "is missing"),
        (('"level"]', '"levl"]'), "line.columns", 4, "'levl' is no column"),
        (('["time", "level"]', '["level"]'), "line.columns", 4, '"time" or "interval"'),
        (('["time", "level"]', '["time"]'), "level", 7, "does not belong here"),
        ((LEVEL, ""), "level", None, "is missing"),
        (('low = "0"', 'low = "1"'), "level.low", 9, "the same as high"),
        (("schema = 1", "schema = 2"), "schema", 1, "2 is not known"),
        (('["time", "level"]', '["interval", "level"]'), "level.of", 7, "before"),
    ],
)
def test_a_fault_is_named_with_its_key_and_line(
    change: tuple[str, str], key: str, line: int | None, says: str
) -> None:
    with pytest.raises(DesignError) as raised:
        parse_description(GOOD.replace(*change), source="logger.toml")
    error = raised.value
    assert error.code == "stream-description"
    found = {fault.key: fault for fault in error.faults}
    assert found[key].line == line
    assert says in found[key].message
    assert "logger.toml" in error.message


def test_the_nearest_known_key_is_named() -> None:
    with pytest.raises(DesignError) as raised:
        parse_description(GOOD.replace("columns", "colums"))
    assert raised.value.faults[-1].near == "columns" or raised.value.faults[0].near == "columns"


def test_what_is_no_toml_is_refused_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "logger.toml"
    path.write_text(GOOD.replace('"us"', "us"))
    with pytest.raises(DesignError) as raised:
        load_description(path)
    assert raised.value.code == "stream-description"
    assert raised.value.faults[0].line == 6


def test_a_description_that_is_not_there_says_so(tmp_path: Path) -> None:
    with pytest.raises(InputError) as raised:
        load_description(tmp_path / "none.toml")
    assert raised.value.code == "no-such-file"
