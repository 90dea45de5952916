"""Each file in malformed_dialects/ says beside each fault what must be reported.

``#! key | near | part of the message``; ``-`` is no near key.
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from benchtool.errors import DesignError, InputError
from benchtool_drivers.dialect import load_dialect, parse_dialect
from benchtool_drivers.dialect.acquisitions import ACQUIRE
from benchtool_drivers.dialect.bodies import BODY, CHUNK, DATA, SCALE
from benchtool_drivers.dialect.keys import CHANNELS, LINK, SETUP, TOP

FOLDER = Path(__file__).parent / "malformed_dialects"
MALFORMED = sorted(FOLDER.glob("*.toml"))
SOUND = (Path(__file__).parent / "sound.toml").read_text("utf-8")
MARK = re.compile(r"#! (.+?) \| (.+?) \| (.+?)(?= #!|\s*$)")


def expected_faults(text: str) -> list[tuple[int, str, str | None, str]]:
    return [
        (number, key, None if near == "-" else near, fragment)
        for number, row in enumerate(text.split("\n"), start=1)
        for key, near, fragment in MARK.findall(row)
    ]


@pytest.mark.parametrize("path", MALFORMED, ids=lambda path: path.stem)
def test_each_fault_is_reported_with_key_line_and_near(path: Path) -> None:
    expected = expected_faults(path.read_text("utf-8"))
    with pytest.raises(DesignError) as caught:
        load_dialect(path)
    faults = list(caught.value.faults)
    assert caught.value.code == "dialect"
    assert sorted((fault.line, fault.key, str(fault.near)) for fault in faults) == sorted(
        (line, key, str(near)) for line, key, near, _ in expected
    )
    for line, key, _, fragment in expected:
        messages = [fault.message for fault in faults if (fault.line, fault.key) == (line, key)]
        assert any(fragment in message for message in messages), (key, messages)
    assert all(fault.file == str(path) for fault in faults)


@pytest.mark.parametrize(
    ("table", "keys"),
    [
        ("", {**TOP, **BODY}),
        ("link", LINK.keys),
        ("channel", CHANNELS.keys),
        ("setup", SETUP.keys),
        ("acquire", ACQUIRE.keys),
        ("data", DATA.keys),
        ("chunk", CHUNK.forms["start-stop"].keys),
        ("scale", SCALE.keys),
    ],
)
def test_a_wrong_value_of_any_key_is_told_with_its_line(
    table: str, keys: dict[str, object]
) -> None:
    """No key takes a date: each must refuse it where it stands."""
    for key in keys:
        rows = [row for row in SOUND.split("\n") if not re.match(rf"{key}\b", row)]
        head = f"[{table}]" if table else "schema = 1"
        own = [n for n, row in enumerate(rows) if row.split("#")[0].strip() == head]
        by = ['by = "start-stop"'] if table == "chunk" else []
        at = own[0] + 1 if own else len(rows)
        inserted = ([] if own else [head]) + by + [f"{key} = 1979-05-27"]
        if not table and key == "schema":
            rows = [row for row in rows if row != head]
            at, inserted = 0, ["schema = 1979-05-27"]
        if f"[{key}]" in rows and not table:
            n = rows.index(f"[{key}]")
            n_end = next((m for m in range(n + 1, len(rows)) if rows[m][:1] == "["), len(rows))
            rows = rows[:n] + rows[n_end:]
        text = "\n".join([*rows[:at], *inserted, *rows[at:]])
        line = text.split("\n").index(f"{key} = 1979-05-27") + 1
        with pytest.raises(DesignError) as caught:
            parse_dialect(text)
        name = f"{table}.{key}" if table else key
        assert (line, name) in {(fault.line, fault.key) for fault in caught.value.faults}, name


def test_a_dialect_without_faults_is_taken_as_it_says() -> None:
    dialect = parse_dialect(SOUND, source="sound.toml")
    assert (dialect.name, dialect.kind, dialect.source) == ("sound", "digitiser", "sound.toml")
    assert dialect.body.preamble.ask == {"points": "LEN?", "dt": "STEP?"}
    assert dialect.body.scale.x == "index-dt"


def test_a_misspelt_needed_key_is_one_fault_and_not_two() -> None:
    with pytest.raises(DesignError) as caught:
        parse_dialect(SOUND.replace('query = "DATA?"', 'qeury = "DATA?"'))
    assert [(fault.key, fault.near) for fault in caught.value.faults] == [("data.qeury", "query")]


def test_a_file_that_is_not_there_is_an_input_error() -> None:
    with pytest.raises(InputError) as caught:
        load_dialect(FOLDER / "none.toml")
    assert caught.value.code == "no-such-file"


def test_text_that_is_not_utf8_is_told_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "latin.toml"
    path.write_bytes(b'schema = 1\nname = "\xb5"\n')
    with pytest.raises(DesignError) as caught:
        load_dialect(path)
    assert (caught.value.code, caught.value.faults[0].line) == ("dialect", 2)
