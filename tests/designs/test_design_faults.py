"""Each file in malformed/ says beside each fault what must be reported.

``#! key | near | part of the message``; a line number, or ``none``, stands before the key where the
fault belongs to another line than the comment's. ``-`` is no near key.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from benchtool.designs import load_design, parse_design
from benchtool.errors import DesignError, DesignFault

FOLDER = Path(__file__).parent / "malformed"
NOT_UTF8 = FOLDER / "not_utf8.toml"  # no text, so it can hold no mark
MALFORMED = sorted(set(FOLDER.glob("*.toml")) - {NOT_UTF8})
MARK = re.compile(r"#! (?:(\d+|none) )?(.+?) \| (.+?) \| (.+?)(?= #!|\s*$)")

SOUND = """schema = 1
[board]
name = "Mist valve timer"
supply = "12 V 5%"
[stage.spacing]
topology = "astable"
RA = "100k 1%"
RB = "330k 1%"
C = "47u 10%"
limits.derive = "worst-case"
"""


def expected_faults(text: str) -> list[tuple[int | None, str, str | None, str]]:
    found = []
    for number, row in enumerate(text.split("\n"), start=1):
        for place, key, near, fragment in MARK.findall(row):
            line = None if place == "none" else int(place or number)
            found.append((line, key, None if near == "-" else near, fragment))
    return found


def faults_of(text: str, source: str = "") -> tuple[DesignFault, ...]:
    with pytest.raises(DesignError) as caught:
        parse_design(text, source=source)
    return caught.value.faults


@pytest.mark.parametrize("path", MALFORMED, ids=lambda path: path.stem)
def test_each_fault_is_reported_with_key_line_and_near(path: Path) -> None:
    expected = expected_faults(path.read_text(encoding="utf-8"))
    assert expected, "a malformed file must say what is wrong with it"
    with pytest.raises(DesignError) as caught:
        load_design(path)
    faults = caught.value.faults
    assert {(fault.line, fault.key, fault.near) for fault in faults} == {
        (line, key, near) for line, key, near, _ in expected
    }
    assert len(faults) == len(expected)
    by_place = {(fault.line, fault.key): fault for fault in faults}
    for line, key, _, fragment in expected:
        assert fragment in by_place[line, key].message
    assert {fault.file for fault in faults} == {str(path)}


def test_faults_stand_in_the_order_of_the_file() -> None:
    path = FOLDER / "many_faults_at_once.toml"
    with pytest.raises(DesignError) as caught:
        load_design(path)
    lines = [fault.line or 0 for fault in caught.value.faults]
    assert len(lines) == 7
    assert lines == sorted(lines)
    assert caught.value.message == f"{path} has 7 faults"
    assert caught.value.hint


def test_one_fault_is_the_whole_message() -> None:
    with pytest.raises(DesignError) as caught:
        parse_design(SOUND.replace("12 V 5%", "0 V"), source="mist.toml")
    assert str(caught.value).startswith("mist.toml, line 4: board.supply: '0 V' must be greater")


def test_text_in_another_encoding_names_its_line() -> None:
    with pytest.raises(DesignError) as caught:
        load_design(NOT_UTF8)
    (fault,) = caught.value.faults
    assert (fault.line, fault.key) == (3, "")
    assert "UTF-8" in fault.message


def test_sound_text_has_no_fault() -> None:
    assert parse_design(SOUND).name == "Mist valve timer"


def test_keys_with_spaces_are_quoted_as_in_toml() -> None:
    (fault,) = faults_of(SOUND.replace("stage.spacing", 'stage."mist spacing"').replace("RA", "ra"))
    assert (fault.key, fault.near) == ('stage."mist spacing".ra', "RA")


def test_a_misspelt_table_hides_no_fault_elsewhere() -> None:
    keys = {fault.key for fault in faults_of(SOUND.replace("[board]", "[bord]") + 'ic = "x"\n')}
    assert keys == {"bord", "stage.spacing.ic"}


@pytest.mark.parametrize(
    "value", ['"{}"', '{{ value = "{}" }}', '{{ value = 1, tolerance = "{}" }}', "{{ kind = {} }}"]
)
def test_a_long_value_is_not_repeated_at_length(value: str) -> None:
    for fault in faults_of(SOUND.replace('"100k 1%"', value.format("7" * 3000))):
        assert len(fault.message) < 400


@pytest.mark.parametrize(
    ("value", "fragment"),
    [
        (f"1{'0' * 400}", "too large"),
        ("nan", "not a finite value"),
        ("2031-03-02", "2031-03-02 is no part"),
        (f"1{'0' * 5000}", "Exceeds the limit"),
    ],
)
def test_numbers_that_no_part_has_are_faults(value: str, fragment: str) -> None:
    (fault,) = faults_of(SOUND.replace('"100k 1%"', value))
    assert fragment.casefold() in fault.message.casefold()


def test_nested_lists_without_end_are_a_fault() -> None:
    (fault,) = faults_of(f"x = {'[' * 100_000}")
    assert fault.message


def test_an_empty_text_lacks_all_three_tables() -> None:
    assert [fault.key for fault in faults_of("")] == ["schema", "board", "stage"]


def test_the_same_trigger_may_serve_two_stages() -> None:
    second = SOUND[SOUND.index("[stage") :].replace("spacing", "pulse")
    text = SOUND + 'trigger = "TRIG"\n' + second + 'trigger = "TRIG"\n'
    assert len(parse_design(text).stages) == 2
