"""Reading options through all verbs, kept structures, windows, and names that would do harm."""

from __future__ import annotations

import json
import shlex
from pathlib import Path

import numpy as np
import pytest
from captures import T_HIGH_S, write_square
from running import Ran, run_here

Capsys = pytest.CaptureFixture[str]
VERBS = {
    "look": [],
    "measure": [],
    "solve": ["--topology", "astable"],
    "judge": ["--design", "DESIGN"],
}
ACTING = "\x1b\x07\x7f\x9b\u202e\u2028"
"""Characters that act on a terminal, or on the order of what is read."""


@pytest.fixture
def bare(tmp_path: Path) -> Path:
    """A capture whose time column has no unit; it counts milliseconds."""
    path = write_square(tmp_path / "mist_0012.csv")
    head, *rows = path.read_text().splitlines()
    cells = [row.split(",") for row in rows]
    path.write_text(
        head.replace("Time (s)", "Time")
        + "\n"
        + "".join(f"{float(t) * 1e3 + 0.5:.1f},{v}\n" for t, v in cells)
    )
    return path


def run(capsys: Capsys, verb: str, path: Path, design: Path, *more: str) -> Ran:
    arguments = [str(design) if word == "DESIGN" else word for word in VERBS[verb]]
    return run_here(capsys, verb, path, *arguments, *more)


@pytest.mark.parametrize("verb", ["measure", "solve", "judge"])
def test_a_window_reaches_every_verb(capsys: Capsys, good: Path, design: Path, verb: str) -> None:
    ran = run(capsys, verb, good, design, "--from", "30s", "--to", "95000ms", "--json")
    assert ran.document["sources"][0]["window"] == {"from_s": 30.0, "to_s": 95.0}
    result = ran.document["results"][0]
    assert result["trace"]["start_s"] == 30.0
    assert result["intervals"]["period"] == 1
    assert "window" in {notice["code"] for notice in ran.document["warnings"]}


def test_without_a_window_all_of_it_is_measured(capsys: Capsys, good: Path) -> None:
    ran = run_here(capsys, "measure", good, "--json")
    assert ran.document["sources"][0]["window"] is None
    assert ran.document["results"][0]["intervals"]["period"] > 2


def test_the_screen_says_the_window(capsys: Capsys, good: Path) -> None:
    words = " ".join(run_here(capsys, "measure", good, "--from", "30s", "--to", "95s").out.split())
    assert "only a part was measured: 30 s to 95 s of the record, which goes from 0 s" in words


@pytest.mark.parametrize(
    ("options", "says"),
    [
        (["--from", "1h"], "The record goes from 0 s to"),
        (["--from", "5s", "--to", "5s"], "Exchange them"),
        (["--from", "-1s"], "from 0 on"),
        (["--to", "0s"], "Correct --to"),
        (["--from", "2 V"], ""),
    ],
)
def test_a_window_that_cannot_be_is_refused(
    capsys: Capsys, good: Path, options: list[str], says: str
) -> None:
    ran = run_here(capsys, "measure", good, *options, "--json")
    assert ran.code in (2, 4)
    assert says in ran.document["error"]["hint"]


@pytest.mark.parametrize("verb", VERBS)
def test_what_is_kept_beside_a_file_reaches_every_verb_and_is_said(
    capsys: Capsys, bare: Path, design: Path, verb: str
) -> None:
    run_here(capsys, "look", bare, "--time-unit", "ms", "--keep", "mist")
    other = bare.rename(bare.with_name("mist_0013.csv"))
    ran = run(capsys, verb, other, design, "--json")
    source = ran.document["sources"][0]
    assert source["structure"]["kept"] == "mist"
    assert source["evidence"][0]["point"] == "kept"
    assert "benchtool-structures.toml" in source["evidence"][0]["from"]
    assert "kept-structure" in {notice["code"] for notice in ran.document["warnings"]}
    if verb != "look":
        t_high = ran.document["results"][0]["timing"]["t_high"]
        assert t_high["value"] == pytest.approx(T_HIGH_S, rel=1e-2)
    shown = "".join(run(capsys, verb, other, design).out.split())  # wherever the lines break
    assert f"{other}wasreadasmist,keptin{other.parent}" in shown


def test_keeping_writes_what_was_settled_and_says_it(capsys: Capsys, bare: Path) -> None:
    ran = run_here(capsys, "look", bare, "--time-unit", "ms", "--keep", "mist")
    kept = bare.parent / "benchtool-structures.toml"
    assert ran.code == 0
    assert kept.read_text() == (
        '[mist]\nmatch = { file = "mist_*.csv", header = "Time,OUT (V)" }\ntime_unit = "ms"\n'
    )
    assert f"kept in {kept}" in ran.err
    assert f"benchtool look {bare}" in ran.err


def test_a_kept_name_is_replaced_by_force_alone(capsys: Capsys, bare: Path) -> None:
    keeping = ("look", bare, "--keep", "mist", "--structure", "none", "--time-unit")
    kept = bare.parent / "benchtool-structures.toml"
    assert run_here(capsys, *keeping, "ms").code == 0
    ran = run_here(capsys, *keeping, "us", "--json")
    assert ran.document["error"]["code"] == "file-exists"
    assert '"ms"' in kept.read_text()
    assert run_here(capsys, *keeping, "us", "--force").code == 0
    assert '"us"' in kept.read_text()
    assert kept.read_text().count("[mist]") == 1


def test_keeping_takes_over_what_is_kept_already(capsys: Capsys, bare: Path) -> None:
    run_here(capsys, "look", bare, "--time-unit", "ms", "--keep", "mist")
    run_here(capsys, "look", bare, "--decimal", ".", "--keep", "both")
    text = (bare.parent / "benchtool-structures.toml").read_text()
    assert 'decimal = "."\ntime_unit = "ms"\n' in text.split("[both]")[1]


def test_keeping_everywhere_serves_other_folders(
    capsys: Capsys, bare: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    run_here(capsys, "look", bare, "--time-unit", "ms", "--keep", "mist", "--everywhere")
    assert (tmp_path / "config" / "benchtool" / "structures.toml").is_file()
    assert not (bare.parent / "benchtool-structures.toml").exists()
    (tmp_path / "other").mkdir()
    moved = bare.rename(tmp_path / "other" / "mist_1.csv")
    source = run_here(capsys, "look", moved, "--json").document["sources"][0]
    assert source["structure"]["kept"] == "mist"


@pytest.mark.parametrize(
    ("options", "code"),
    [
        (["--keep", "mist"], "nothing-to-keep"),
        (["--keep", "a b", "--time-unit", "ms"], "usage"),
        (["--everywhere"], "usage"),
        (["--keep", "mist", "--decimal", ","], None),
    ],
)
def test_nothing_is_kept_of_what_cannot_be(
    capsys: Capsys, bare: Path, options: list[str], code: str | None
) -> None:
    ran = run_here(capsys, "look", bare, *options, "--json")
    if code is not None:
        assert ran.document["error"]["code"] == code
    else:
        assert ran.code != 0  # read with a decimal comma it is no capture
    assert not (bare.parent / "benchtool-structures.toml").exists()


def test_keeping_is_settled_by_one_file(capsys: Capsys, bare: Path) -> None:
    ran = run_here(capsys, "look", bare, bare, "--time-unit", "ms", "--keep", "mist", "--json")
    assert "one file" in ran.document["error"]["message"]


def test_a_kept_channel_is_measured_unless_another_is_named(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    path = write_square(tmp_path / "two.csv")
    head, *rows = path.read_text().splitlines()
    path.write_text(
        f"{head},PUMP (V)\n" + "".join(f"{row},{row.rpartition(',')[2]}\n" for row in rows)
    )
    assert run_here(capsys, "measure", path, "--json").document["error"]["code"] == "choose-channel"
    run_here(capsys, "look", path, "--channel", "PUMP", "--keep", "two")

    def measured(*words: str | Path) -> str:
        document = run_here(capsys, *words, "--json").document
        return str(document["results"][0]["trace"]["channel"])

    assert measured("measure", path) == "PUMP"
    assert measured("look", path) == "PUMP"
    assert measured("measure", path, "--channel", "OUT") == "OUT"
    assert measured("judge", path, "--design", design) == "OUT"  # the design names it


def test_looking_at_one_channel_shows_that_alone(capsys: Capsys, good: Path) -> None:
    ran = run_here(capsys, "look", good, "--channel", "1", "--json")
    assert [result["trace"]["channel"] for result in ran.document["results"]] == ["OUT"]
    ran = run_here(capsys, "look", good, "--channel", "PUMP", "--json")
    assert ran.document["error"]["code"] == "no-such-channel"


@pytest.mark.parametrize("kind", ["html", "md", "txt"])
def test_periods_that_are_all_equal_make_a_report(
    capsys: Capsys, tmp_path: Path, kind: str
) -> None:
    """They have no histogram, and the other pictures are there."""
    report = tmp_path / f"report.{kind}"
    wave = np.where(np.arange(3000) % 100 < 50, 5.0, 0.0)
    np.savez(tmp_path / "even.npz", time_s=np.arange(3000) / 1e3, OUT=wave)
    assert run_here(capsys, "measure", tmp_path / "even.npz", "--report", report).code == 0
    assert "over time" in report.read_text(encoding="utf-8")


@pytest.mark.parametrize("verb", ["look", "measure", "solve", "judge"])
def test_the_next_command_reads_the_capture_the_same_way(
    capsys: Capsys, bare: Path, design: Path, verb: str
) -> None:
    options = ["--time-unit", "ms", "--rate", "100 Hz", "--from", "2s", "--to", "99s"]
    following = (
        run(capsys, verb, bare, design, *options).out.rpartition("Next:")[2].split(maxsplit=1)
    )
    words = shlex.split(following[1])
    again = ["--time-unit", "ms", "--interval", "0.01s", "--from", "2.0s", "--to", "99.0s"]
    assert words[2:10] == again
    words = [word for word in words if word not in ("--report", "board.html")]
    if "DESIGN.toml" not in words:
        assert run_here(capsys, *words).code in (0, 1, 3)


NAME = f"OUT {ACTING[0]}[31m{ACTING[1:]}<script>alert(1)</script> [bold]x[/bold]"


@pytest.fixture(params=["text", "vcd", "npz", "kept"])
def hostile(request: pytest.FixtureRequest, tmp_path: Path) -> Path:
    """A capture whose names, and whose file name, would do harm where they are shown as is."""
    stem = "mist \x1b[31m\x07\x7f<marquee>"
    if request.param == "vcd":
        path = tmp_path / f"{stem}.vcd"
        name = NAME.replace(" ", "_").replace("\u2028", "")
        changes = "".join(f"#{k * 100 + k % 3}\n{k % 2}!\n" for k in range(40))
        path.write_text(
            f"$timescale 1 ms $end\n$scope module {name} $end\n$var wire 1 ! {name} $end\n"
            f"$upscope $end\n$enddefinitions $end\n{changes}"
        )
        return path
    if request.param == "npz":
        path = tmp_path / f"{stem}.npz"
        wave = np.where(np.arange(3000) % 100 < 50, 5.0, 0.0)
        table = np.empty(3000, [("time_s", float), (NAME, float)])
        table["time_s"], table[NAME] = np.arange(3000) / 1e3, wave
        np.save(path.with_suffix(".npy"), table)
        return path.with_suffix(".npy")
    path = write_square(tmp_path / f"{stem}.csv")
    text = path.read_text().replace("OUT", NAME.replace("\u2028", ""))
    path.write_text(f"Instrument: {NAME}\n{text}", encoding="utf-8")
    if request.param == "kept":
        header = json.dumps(text.partition("\n")[0]).replace("\x7f", "\\u007f")
        name = '"mist \\u001b[31m\\u0007\\u007f<marquee>"'
        (tmp_path / "benchtool-structures.toml").write_text(
            f"[{name}]\nmatch = {{ header = {header} }}\ndecimal = '.'\n"
        )
    return path


@pytest.mark.parametrize("kind", [".html", ".md", ".txt"])
def test_names_that_would_act_are_shown_harmlessly_everywhere(
    capsys: Capsys, hostile: Path, tmp_path: Path, kind: str
) -> None:
    report = tmp_path / f"report{kind}"
    shown = [
        run_here(capsys, "look", hostile),
        run_here(capsys, "measure", hostile, "--report", report),
        run_here(capsys, "look", hostile, "--json"),
        run_here(capsys, "look", hostile, "-o", tmp_path / "screen.txt"),
        run_here(capsys, "measure", hostile, "--channel", NAME + "?"),
        run_here(capsys, "measure", hostile, "--channel", NAME + "?", "--json"),
        run_here(capsys, "look", hostile, "--time", NAME),
        run_here(capsys, "look", hostile, "--channel", "1", "--keep", "mist", "--force"),
    ]
    assert [(ran.code, ran.err) for ran in shown[:4]] == [(0, "")] * 4
    page = report.read_text(encoding="utf-8")
    texts = [*(ran.out + ran.err for ran in shown), page, (tmp_path / "screen.txt").read_text()]
    for text in texts:
        assert not set(text) & set(ACTING)
    if kind == ".html":
        assert "<script>alert" not in page
        assert "<marquee" not in page
