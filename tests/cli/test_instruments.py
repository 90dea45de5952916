"""``benchtool instruments``: what is connected, who answers, and a dialect tried step by step."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from running import Ran, run_here

import benchtool.report
from benchtool.cli import cautions
from benchtool.cli.commands import INSTRUMENTS
from benchtool_drivers.loopback.families import make_family
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument
from benchtool_drivers.loopback.serving import serve

SCHEMA = json.loads((Path(benchtool.report.__file__).parent / "document.schema.json").read_text())


@pytest.fixture(autouse=True)
def own_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Give each test a config folder of its own, 80 columns, and cautions not yet told."""
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.setattr(cautions, "_TOLD", [])
    return tmp_path / "benchtool"


def instrument(family: str = "keyed") -> SimulatedInstrument:
    wave = np.where(np.arange(1000) % 100 < 40, 5.0, 0.1)
    wave = wave + np.random.default_rng(1).normal(0, 0.02, 1000)
    return make_family(family, volts=[wave], dt_s=1e-5)


@pytest.fixture
def subject() -> SimulatedInstrument:
    return instrument()


@pytest.fixture
def resource(subject: SimulatedInstrument) -> Iterator[str]:
    with serve(subject, "socket") as resource:
        yield resource


def rows(ran: Ran) -> list[dict[str, object]]:
    jsonschema.validate(ran.document, SCHEMA)
    found: list[dict[str, object]] = ran.document["rows"]
    return found


def fits_80_columns(text: str) -> bool:
    return all(len(row) <= 80 for row in text.splitlines() if "Next:" not in row)


def test_list_says_where_it_looked_and_leaves_the_network_alone(
    capsys: pytest.CaptureFixture[str],
) -> None:
    ran = run_here(capsys, "instruments", "list")
    assert ran.code == 0
    assert "serial ports:" in ran.out
    assert "network: not looked at" in ran.out
    assert "Caution" not in ran.err
    assert fits_80_columns(ran.out)
    assert all(item["resource"] for item in rows(run_here(capsys, "instruments", "list", "--json")))


def test_identify_tells_the_identity_and_why_each_dialect_fits_or_not(
    capsys: pytest.CaptureFixture[str], resource: str, own_folder: Path
) -> None:
    ran = run_here(capsys, "instruments", "identify", resource)
    assert ran.code == 0
    assert "Invented,Simulated digitiser" in ran.out
    assert "It speaks keyvalue-offset-count" in ran.out
    assert "-113" in ran.out
    assert ran.err.startswith("Caution: An earth-referenced probe clip")
    assert fits_80_columns(ran.out)
    assert "keyvalue-offset-count" in (own_folder / "dialects.toml").read_text()
    again = run_here(capsys, "instruments", "identify", resource, "--json")
    assert "Caution" not in again.err
    (row,) = rows(again)
    assert row["dialect"] == "keyvalue-offset-count"
    assert row["fitting"] == ["keyvalue-offset-count"]


def test_identify_exits_5_where_no_dialect_fits_and_2_where_several_do(
    capsys: pytest.CaptureFixture[str], own_folder: Path
) -> None:
    with serve(instrument("listed"), "socket") as resource:
        text = run_here(capsys, "instruments", "dialects", "list-of-volts").out
        folder = own_folder / "dialects"
        folder.mkdir(parents=True)
        (folder / "other.toml").write_text(text.replace('"list-of-volts"', '"other"'))
        ran = run_here(capsys, "instruments", "identify", resource)
        assert (ran.code, "Several dialects fit" in ran.out) == (2, True)
    subject = instrument("keyed")
    subject.set_fault("nan")
    with serve(subject, "socket") as resource:
        ran = run_here(capsys, "instruments", "identify", resource)
        assert (ran.code, "No dialect fits" in ran.out) == (5, True)
        assert "instruments dialects list-of-volts -o mine.toml" in ran.out


def test_identify_of_nothing_is_an_error_with_its_step(capsys: pytest.CaptureFixture[str]) -> None:
    ran = run_here(capsys, "instruments", "identify", "TCPIP::127.0.0.1::9::SOCKET", "--json")
    assert ran.code == 5
    assert ran.document["command"] == "instruments identify"
    assert ran.document["error"]["code"] == "not-connected"
    ran = run_here(capsys, "instruments", "identify", "bench")
    assert ran.code == 2
    assert "neither a resource nor an instrument of your kit" in ran.err


def test_dialects_lists_them_and_prints_the_file_of_one(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    ran = run_here(capsys, "instruments", "dialects")
    assert ran.code == 0
    assert "scpi99-trace" in ran.out
    assert fits_80_columns(ran.out)
    names = {item["name"] for item in rows(run_here(capsys, "instruments", "dialects", "--json"))}
    assert {"list-of-volts", "descriptor-block"} <= names
    mine = tmp_path / "mine.toml"
    ran = run_here(capsys, "instruments", "dialects", "list-of-volts", "-o", mine)
    assert ran.code == 0
    assert f"Next:  benchtool instruments check {mine}" in ran.err
    document = run_here(capsys, "instruments", "dialects", "list-of-volts", "--json").document
    assert document["rows"][0]["text"] == mine.read_text("utf-8")
    assert run_here(capsys, "instruments", "check", tmp_path / "none.toml").code == 2
    assert run_here(capsys, "instruments", "check", mine).code == 0
    assert run_here(capsys, "instruments", "dialects", "none-such").code == 2


def test_all_keys_are_told_with_their_meaning(capsys: pytest.CaptureFixture[str]) -> None:
    ran = run_here(capsys, "instruments", "dialects", "--keys")
    assert ran.code == 0
    assert fits_80_columns(ran.out)
    for word in (
        "ref-inc-origin",
        "(code - ref) * inc + origin",
        "error_bits",
        "codes_per_division",
    ):
        assert word in ran.out
    keys = rows(run_here(capsys, "instruments", "dialects", "--keys", "--json"))
    assert all(item["meaning"] for item in keys)
    assert {"table": "", "key": "name", "default": "needed"}.items() <= keys[1].items()


def test_check_tells_what_a_sound_dialect_does(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    text = run_here(capsys, "instruments", "dialects", "positional-start-stop").out
    path = tmp_path / "mine.toml"
    path.write_text(text)
    ran = run_here(capsys, "instruments", "check", path)
    assert ran.code == 0
    assert "(code - ref) * inc + origin" in ran.out
    assert fits_80_columns(ran.out.replace(str(path), "mine.toml"))


def test_check_tells_every_fault_with_its_line(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    text = run_here(capsys, "instruments", "dialects", "list-of-volts").out
    path = tmp_path / "mine.toml"
    path.write_text(text.replace("wrap  =", "warp  =").replace('"INIT"', '"INIT {time}"'))
    ran = run_here(capsys, "instruments", "check", path)
    assert ran.code == 6
    lines = text.split("\n")
    wrap = next(n for n, row in enumerate(lines, 1) if row.startswith("wrap"))
    arm = next(n for n, row in enumerate(lines, 1) if row.startswith("arm"))
    assert f"line {wrap}: data.warp" in ran.err
    assert "nearest known key: wrap" in ran.err
    assert f"line {arm}: acquire.arm" in ran.err
    document = run_here(capsys, "instruments", "check", path, "--json").document
    assert document["error"]["code"] == "dialect"
    assert [fault["line"] for fault in document["error"]["faults"]] == sorted([arm, wrap])


def test_try_prints_each_command_answer_and_field_and_what_came(
    capsys: pytest.CaptureFixture[str], resource: str, tmp_path: Path
) -> None:
    log = tmp_path / "said.jsonl"
    ran = run_here(capsys, "instruments", "try", "keyvalue-offset-count", resource, "--log", log)
    assert ran.code == 0
    for piece in (
        "> INIT   take one record",
        "? HOR:LENG?  ->  1000",
        "= dt = +1.000000000E-05   seconds from one sample to the next",
        "CH1: 1000 samples, 10 µs apart, 10 ms",
        "benchtool acquire",
    ):
        assert piece in ran.out, piece
    assert fits_80_columns(ran.out)
    assert "Caution" in ran.err
    assert '"command": "DATA:PRE?"' in log.read_text()
    (row,) = rows(
        run_here(capsys, "instruments", "try", "keyvalue-offset-count", resource, "--json")
    )
    assert {"kind": "sent", "command": "INIT"}.items() <= row["steps"][8].items()  # type: ignore[index]
    assert row["traces"][0]["samples"] == 1000  # type: ignore[index]


def test_try_writes_the_same_into_a_file(
    capsys: pytest.CaptureFixture[str], resource: str, tmp_path: Path
) -> None:
    path = tmp_path / "trial.txt"
    given = ("instruments", "try", "keyvalue-offset-count", resource)
    ran = run_here(capsys, *given, "-o", path)
    assert (ran.code, ran.out) == (0, "")
    written = path.read_text("utf-8").split("\n")
    assert "  > INIT   take one record" in written
    shown = [row for row in run_here(capsys, *given).out.split("\n") if row.startswith("  > ")]
    assert [row for row in written if row.startswith("  > ")] == shown


def test_try_shows_how_far_it_came_before_it_failed(
    capsys: pytest.CaptureFixture[str], resource: str, tmp_path: Path
) -> None:
    text = run_here(capsys, "instruments", "dialects", "list-of-volts").out
    path = tmp_path / "mine.toml"
    path.write_text(text.replace("[probe]", "[link]\ntimeout_s = 0.2\n[probe]"))
    ran = run_here(capsys, "instruments", "try", path, resource, "--from-memory")
    assert ran.code == 5
    assert "DATA:POIN?" in ran.out
    assert "-113" in ran.out
    assert "command: DATA:POIN?" in ran.err


def test_try_waits_for_the_trigger_as_told(
    capsys: pytest.CaptureFixture[str], subject: SimulatedInstrument, resource: str
) -> None:
    subject.set_fault("trigger_never")
    given = ("instruments", "try", "keyvalue-offset-count", resource, "--trigger-timeout", "0.2 s")
    ran = run_here(capsys, *given)
    assert ran.code == 5
    assert "no record came within 0.2 s" in ran.err
    assert run_here(capsys, *given, "--force-trigger").code == 0


@pytest.mark.parametrize("verb", INSTRUMENTS["Verbs"])
def test_every_verb_has_its_help(capsys: pytest.CaptureFixture[str], verb: str) -> None:
    ran = run_here(capsys, "instruments", verb, "--help")
    assert ran.code == 0
    assert "--json" in ran.out


def test_a_serial_port_is_told_how_it_is_named_as_a_resource(
    capsys: pytest.CaptureFixture[str],
) -> None:
    ran = run_here(capsys, "instruments", "identify", "/dev/ttyUSB0")
    assert ran.code == 2
    assert "ASRL/dev/ttyUSB0::INSTR" in ran.err
