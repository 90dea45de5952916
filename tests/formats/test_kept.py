"""Structures that a user keeps: which apply, what they settle, and every fault of their file."""

from __future__ import annotations

import gzip
import os
from pathlib import Path

import pytest

from benchtool.errors import AmbiguousStructureError, BenchtoolError, UsageError
from benchtool.formats import read_capture
from benchtool.formats.keeping import added, check_name, name_pattern, table_of
from benchtool.formats.kept import Match, applies, merged, read_kept
from benchtool.formats.keptplaces import BESIDE
from benchtool.model.capture import Capture, ReadOptions, UniformTime, Waveform

ROWS = "t;OUT\n" + "".join(f"{i}.5;{i % 3}.5\n" for i in range(40))
UNIT = '[logger]\nmatch = { file = "mist_*.csv" }\ntime_unit = "ms"\n'


@pytest.fixture
def own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The user's own file of structures, still to be written."""
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    folder = tmp_path / "config" / "benchtool"
    folder.mkdir(parents=True)
    return folder / "structures.toml"


@pytest.fixture
def mist(tmp_path: Path) -> Path:
    path = tmp_path / "mist_0012.csv"
    path.write_text(ROWS)
    return path


def keep(mist: Path, text: str) -> Path:
    path = mist.parent / BESIDE
    path.write_text(text)
    return path


def step_s(capture: Capture) -> float:
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    return trace.time.dt_s


def test_a_structure_beside_the_capture_applies_by_itself_and_is_said(mist: Path) -> None:
    path = keep(mist, UNIT)
    capture = read_capture(mist)
    assert step_s(capture) == pytest.approx(1e-3)
    point = capture.structure[0]
    assert (point.name, point.value, point.sure) == ("kept", "logger", "stated")
    assert str(path) in point.evidence
    assert "mist_*.csv" in point.evidence
    notice = capture.warnings[0]
    assert notice.code == "kept-structure"
    assert "logger" in notice.text
    assert str(path) in notice.text
    assert "--time-unit ms" in notice.text


def test_what_a_structure_settles_is_evidence_of_its_own(mist: Path) -> None:
    keep(mist, UNIT)
    unit = next(p for p in read_capture(mist).structure if p.name == "time_unit")
    assert unit.evidence == "kept as logger"
    assert unit.sure == "stated"


def test_options_win_over_what_is_kept(mist: Path) -> None:
    keep(mist, UNIT + 'decimal = "."\n')
    capture = read_capture(mist, ReadOptions(time_unit="us"))
    assert step_s(capture) == pytest.approx(1e-6)
    assert "--decimal ." in capture.warnings[0].text
    assert "--time-unit" not in capture.warnings[0].text
    unit = next(p for p in capture.structure if p.name == "time_unit")
    assert unit.evidence == "--time-unit"


def test_none_reads_without_any(mist: Path) -> None:
    keep(mist, UNIT)
    capture = read_capture(mist, ReadOptions(structure="none"))
    assert step_s(capture) == pytest.approx(1.0)
    assert "kept-structure" not in {n.code for n in capture.warnings}


def test_the_users_own_structures_apply_everywhere(mist: Path, own: Path) -> None:
    own.write_text(UNIT)
    assert step_s(read_capture(mist)) == pytest.approx(1e-3)


def test_one_beside_the_capture_hides_the_users_own_of_its_name(mist: Path, own: Path) -> None:
    own.write_text(UNIT)
    keep(mist, UNIT.replace('"ms"', '"us"'))
    assert step_s(read_capture(mist)) == pytest.approx(1e-6)


def test_two_that_match_ask_which(mist: Path, own: Path) -> None:
    own.write_text(UNIT.replace("logger", "other"))
    keep(mist, UNIT.replace('"ms"', '"us"'))
    with pytest.raises(AmbiguousStructureError) as caught:
        read_capture(mist)
    assert caught.value.code == "several-structures"
    assert "--structure other or --structure logger" in caught.value.hint
    assert step_s(read_capture(mist, ReadOptions(structure="other"))) == pytest.approx(1e-3)


def test_one_is_chosen_by_name_though_it_matches_nothing(mist: Path) -> None:
    keep(mist, '[waits]\ntime_unit = "ms"\n')
    assert step_s(read_capture(mist)) == pytest.approx(1.0)
    assert step_s(read_capture(mist, ReadOptions(structure="waits"))) == pytest.approx(1e-3)


def test_a_name_that_is_not_kept_lists_those_that_are(mist: Path) -> None:
    keep(mist, UNIT)
    with pytest.raises(UsageError, match="'loger'") as caught:
        read_capture(mist, ReadOptions(structure="loger"))
    assert caught.value.code == "no-such-structure"
    assert "Kept are: logger." in caught.value.hint


def test_a_refusal_under_a_kept_structure_names_it(mist: Path) -> None:
    keep(mist, '[logger]\nmatch = { file = "mist_*" }\ntime = "zeit"\n')
    with pytest.raises(UsageError, match="no column 'zeit'") as caught:
        read_capture(mist)
    assert "kept as logger in" in caught.value.hint
    assert "--structure none" in caught.value.hint


def test_every_setting_reaches_the_reader(tmp_path: Path) -> None:
    path = tmp_path / "mist.txt"
    text = "Ventil 2\n9;9\nZeit;Lauf;OUT\n" + "".join(
        f"{3 * i};{i},25;{i % 3},5\n" for i in range(40)
    )
    path.write_text(text)
    keep(
        path,
        '[logger]\nmatch = { header = "Zeit;Lauf;OUT" }\nformat = "text"\ndelimiter = ";"\n'
        'decimal = ","\nskip = 2\ntime = "Lauf"\ntime_unit = "us"\nchannel = "OUT"\n',
    )
    capture = read_capture(path)
    assert step_s(capture) == pytest.approx(1e-6)
    assert capture.channel == "OUT"
    settled = {p.name for p in capture.structure if p.evidence.startswith("kept as logger")}
    assert settled == {"skip", "delimiter", "decimal", "time", "time_unit"}


@pytest.mark.parametrize(
    ("setting", "expected"), [('interval = "5us"', 5e-6), ('rate = "200kHz"', 5e-6)]
)
def test_interval_and_rate_are_values_with_units(
    tmp_path: Path, setting: str, expected: float
) -> None:
    path = tmp_path / "mist.csv"
    path.write_text("OUT (V)\n" + "4.75\n0.25\n" * 20)
    keep(path, f'[logger]\nmatch = {{ file = "*.csv" }}\n{setting}\n')
    assert step_s(read_capture(path)) == pytest.approx(expected)


def test_time_may_be_the_number_of_a_column() -> None:
    assert dict(read_kept("[a]\ntime = 2\n", "f")[0].settles) == {"time": "2"}


@pytest.mark.parametrize(
    ("match", "fits"),
    [
        ('file = "mist_*.csv"', True),
        ('file = "mist_0012.csv"', True),
        ('file = "*.txt"', False),
        ('file = "MIST_*"', False),
        ('header = "t;OUT"', True),
        ('header = " t;OUT "', True),
        ('header = "t;OUT;CAP"', False),
        ("columns = 2", True),
        ("columns = 3", False),
        ('file = "mist_*", header = "t;OUT", columns = 2', True),
        ('file = "mist_*", header = "t;OUT", columns = 4', False),
        ("", False),
    ],
)
def test_all_conditions_must_hold(match: str, fits: bool) -> None:
    kept = read_kept(f'[a]\nmatch = {{ {match} }}\ntime_unit = "ms"\n', "f")[0]
    assert applies(kept, "mist_0012.csv", ROWS.split("\n")) is fits


def test_a_compressed_or_wide_file_matches_as_its_content_does(tmp_path: Path) -> None:
    packed, wide = tmp_path / "mist_1.csv.gz", tmp_path / "mist_2.csv"
    packed.write_bytes(gzip.compress(ROWS.encode()))
    wide.write_bytes(ROWS.encode("utf-16"))
    keep(packed, UNIT.replace("{ file", '{ header = "t;OUT", file'))
    for path in (packed, wide):
        assert step_s(read_capture(path)) == pytest.approx(1e-3)


FAULTS = {
    "an unknown key": ('[a]\n\ndecimall = ","\n', "line 3: a.decimall: unknown key", "decimal."),
    "a key with a dash": ('[a]\ntime-unit = "ms"\n', "line 2: a.time-unit: unknown", "time_unit."),
    "an unknown condition": (
        '[a]\nskip = 1\nmatch = { files = "x" }\n',
        "line 3: a.match.files: unknown key",
        "file.",
    ),
    "a key outside": ("skip = 1\n[a]\nskip = 2\n", "line 1: skip: stands outside", "none"),
    "no setting": ('[a]\nmatch = { file = "x" }\n', "line 1: a: settles nothing", "delimiter"),
    "a wrong choice": ('[a]\ndecimal = ";"\n', "line 2: a.decimal: wants one of . ,", "none"),
    "a wrong unit": ('[a]\ntime_unit = "min"\n', "line 2: a.time_unit: wants one of s ms", "none"),
    "a number for a text": ("[a]\nchannel = 2\n", "line 2: a.channel: wants a text", "none"),
    "an empty text": ('[a]\ntime = ""\n', "line 2: a.time: wants a text", "none"),
    "a text for a number": ('[a]\nskip = "3"\n', "line 2: a.skip: wants a whole number", "none"),
    "a negative number": ("[a]\nskip = -1\n", "line 2: a.skip: wants a whole number", "none"),
    "true for a number": ("[a]\nskip = true\n", "line 2: a.skip: wants a whole number", "none"),
    "no columns": (
        "[a]\nskip = 1\nmatch = { columns = 0 }\n",
        "line 3: a.match.columns: wants",
        "none",
    ),
    "a condition of the wrong kind": (
        "[a]\nskip = 1\nmatch = { header = 3 }\n",
        "line 3: a.match.header: wants a text",
        "none",
    ),
    "no table of conditions": ('[a]\nskip = 1\nmatch = "x"\n', "line 3: a.match: wants", "none"),
    "an interval of volts": ('[a]\ninterval = "5 V"\n', "line 2: a.interval:", "none"),
    "no interval": ('[a]\ninterval = "0s"\n', "line 2: a.interval: must be greater", "none"),
    "two intervals": (
        '[a]\nrate = "1kHz"\ninterval = "1ms"\n',
        "line 2: a.rate: says the same",
        "none",
    ),
    "a reserved name": ("[none]\nskip = 1\n", "line 1: none: no structure can", "none"),
    "no TOML": ("[a]\nskip =\n", "is no TOML: .*line 2", "none"),
    "nested without end": ("a = " + "[" * 5000, "is no TOML: ", "none"),
}


@pytest.mark.parametrize("name", FAULTS)
def test_a_fault_is_told_with_file_line_key_and_nearest_key(mist: Path, name: str) -> None:
    text, says, hint = FAULTS[name]
    path = keep(mist, text)
    with pytest.raises(UsageError, match=says) as caught:
        read_capture(mist)
    assert caught.value.code == "bad-kept-structure"
    assert str(path) in caught.value.message
    assert hint in caught.value.hint


@pytest.mark.parametrize("content", [b"\xff\xfe[a]", b"#" * 70_000], ids=["no UTF-8", "too large"])
def test_a_file_that_keeps_nothing_is_refused(mist: Path, content: bytes) -> None:
    (mist.parent / BESIDE).write_bytes(content)
    with pytest.raises(UsageError, match="keeps no structures"):
        read_capture(mist)
    assert read_capture(mist, ReadOptions(structure="none")).traces


def test_a_pipe_of_that_name_is_left_alone(mist: Path) -> None:
    os.mkfifo(mist.parent / BESIDE)
    assert read_capture(mist).traces


def test_a_folder_of_that_name_is_left_alone(mist: Path) -> None:
    (mist.parent / BESIDE).mkdir()
    assert read_capture(mist).traces


def test_a_folder_of_the_user_that_is_no_path_is_ignored(
    mist: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """A relative one would be read from wherever the program runs."""
    (tmp_path / "here" / "benchtool").mkdir(parents=True)
    (tmp_path / "here" / "benchtool" / "structures.toml").write_text(UNIT)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("XDG_CONFIG_HOME", "here")
    monkeypatch.setenv("HOME", str(tmp_path / "nobody"))
    assert step_s(read_capture(mist)) == pytest.approx(1.0)


def test_only_what_the_user_left_open_is_taken() -> None:
    kept = read_kept('[a]\nskip = 3\ntime_unit = "ms"\n', "f")[0]
    options, words = merged(ReadOptions(skip=0), kept)
    assert (options.skip, options.time_unit) == (0, "ms")
    assert words == {"time_unit": "kept as a"}


@pytest.mark.parametrize(
    ("name", "pattern"),
    [
        ("mist_0012.csv", "mist_*.csv"),
        ("2026-05-01 mist.csv.gz", "*-*-* mist.csv"),
        ("mist[1].csv", "mist[[]*].csv"),
        ("capture", "capture"),
        (".csv", ".csv"),
        ("mist.v2.csv", "mist.v*.csv"),
    ],
)
def test_names_that_differ_in_numbers_alone_have_one_pattern(name: str, pattern: str) -> None:
    assert name_pattern(name) == pattern
    kept = read_kept(table_of("a", Match(file=pattern), {"skip": 1}), "f")[0]
    assert applies(kept, name, [])


@pytest.mark.parametrize("name", ["a b", "", "none", "None", "-a", "a.b", "ä"])
def test_a_name_that_cannot_be_typed_is_refused(name: str) -> None:
    with pytest.raises(UsageError, match="cannot name"):
        check_name(name)


def test_a_table_is_read_back_as_it_was_meant() -> None:
    match = Match(file='mi"st\\_*.csv', header="t;\x1b[31mOUT\x7f µ", columns=2)
    settles = {"delimiter": "\t", "interval_s": 1 / 3e6, "skip": 3, "time": 'a "b"'}
    kept = read_kept(table_of("a", match, settles), "f")[0]
    assert kept.match == match
    assert dict(kept.settles) == settles


def test_a_table_is_added_and_all_else_stays() -> None:
    text = '# mine\n[a]\nskip = 1\n\n[b]\nskip = 2 # two\n[b.match]\nfile = "x"\n[c]\nskip = 3\n'
    assert added(text, "d", "[d]\nskip = 4\n") == text + "\n[d]\nskip = 4\n"
    replaced = added(text, "b", "[b]\nskip = 4\n")
    assert replaced == "# mine\n[a]\nskip = 1\n\n[c]\nskip = 3\n\n[b]\nskip = 4\n"
    assert added("", "a", "[a]\nskip = 1\n") == "[a]\nskip = 1\n"


def test_a_capture_that_cannot_be_read_at_all_says_what_applied(tmp_path: Path) -> None:
    path = tmp_path / "mist.csv"
    path.write_text("nothing here\n")
    keep(path, '[a]\nmatch = { file = "*.csv" }\nskip = 0\ndecimal = "."\n')
    with pytest.raises(BenchtoolError) as caught:
        read_capture(path)
    assert "kept as a" in caught.value.hint
