"""Acquiring from simulated instruments over real wires, from the command line."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from running import run_here

from benchtool.cli import acquiring, cautions
from benchtool.cli.output import write_file
from benchtool.errors import InputError
from benchtool.formats import read_capture
from benchtool.model.capture import Waveform
from benchtool_drivers.loopback.edge_printer import DeviceForm, Printer
from benchtool_drivers.loopback.edge_stream import EdgeDevice
from benchtool_drivers.loopback.families import make_family
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument
from benchtool_drivers.loopback.serving import serve

Capsys = pytest.CaptureFixture[str]
DT_S = 1e-3
VOLTS = np.where(np.arange(4000) % 250 < 143, 12.0, 0.1)  # 16 cycles of 0.25 s, from a high on


@pytest.fixture(autouse=True)
def nobody_cautioned_yet(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let each test be the first live connection of its run."""
    monkeypatch.setattr(cautions, "_TOLD", [])


@pytest.fixture
def subject() -> SimulatedInstrument:
    return make_family("positional", volts=[VOLTS], dt_s=DT_S)


@pytest.fixture
def resource(subject: SimulatedInstrument) -> Iterator[str]:
    with serve(subject, "socket") as name:
        yield name


def test_a_record_comes_whole_with_what_was_read_of_the_instrument_beside_it(
    resource: str, subject: SimulatedInstrument, tmp_path: Path, capsys: Capsys
) -> None:
    target = tmp_path / "board.npz"
    ran = run_here(capsys, "acquire", resource, "-o", target)
    assert ran.code == 0
    assert "Caution" in ran.err
    trace = read_capture(target).traces[0]
    assert isinstance(trace, Waveform)
    codes = np.concatenate(list(trace.samples.blocks()))
    volts = codes * trace.scale.gain + trace.scale.offset
    step_v = float(trace.scale.step_v or trace.scale.gain)
    np.testing.assert_allclose(volts, VOLTS, atol=step_v / 2 + 1e-9)  # half a code
    beside = json.loads((tmp_path / "board.npz.json").read_text())
    assert beside["sha256"] == hashlib.sha256(target.read_bytes()).hexdigest()
    assert beside["identity"] == subject.identity
    assert {item["query"] for item in beside["settings"]} >= {"TRIG:LEV?"}
    assert beside["periods"] == 14  # between 15 rising edges
    assert subject.n_resets == 0


def test_several_are_numbered_and_go_on_until_there_are_enough_periods(
    resource: str, tmp_path: Path, capsys: Capsys
) -> None:
    ran = run_here(
        capsys, "acquire", resource, "--until", "40 periods", "-o", tmp_path / "b.npz", "--json"
    )
    rows = ran.document["rows"]
    assert [Path(row["file"]).name for row in rows] == ["b-001.npz", "b-002.npz", "b-003.npz"]
    assert all((tmp_path / Path(row["file"]).name).is_file() for row in rows)


def test_a_trigger_that_never_comes_leaves_no_file(
    resource: str, subject: SimulatedInstrument, tmp_path: Path, capsys: Capsys
) -> None:
    subject.set_fault("trigger_never")
    given = ("acquire", resource, "--trigger-timeout", "300ms", "-o", tmp_path / "b.npz")
    ran = run_here(capsys, *given)
    assert ran.code == 5
    assert "benchtool explain no-trigger" in ran.err
    assert not list(tmp_path.iterdir())


def test_an_existing_file_is_refused_before_anything_is_armed(
    resource: str, subject: SimulatedInstrument, tmp_path: Path, capsys: Capsys
) -> None:
    target = tmp_path / "board.npz"
    target.write_bytes(b"mine")
    before = subject.record
    ran = run_here(capsys, "acquire", resource, "-o", target)
    assert ran.code == 2
    assert target.read_bytes() == b"mine"
    assert subject.record is before


def test_a_command_that_is_refused_ends_the_run_with_the_instruments_own_words(
    resource: str, tmp_path: Path, capsys: Capsys
) -> None:
    ran = run_here(capsys, "acquire", resource, "--set", "NO:SUCH 1", "-o", tmp_path / "b.npz")
    assert ran.code == 5
    assert "-113" in ran.err


def test_edges_of_a_serial_line_become_a_logic_trace(tmp_path: Path, capsys: Capsys) -> None:
    times_s = np.cumsum(np.tile([0.0143, 0.0107], 200)).tolist()
    printer = Printer(DeviceForm(tick_hz=1_000_000, header_every=20))
    target = tmp_path / "edges.npz"
    with EdgeDevice(times_s, printer, pace=1.0) as port:
        ran = run_here(capsys, "acquire", port, "--until", "20 periods", "-o", target)
    assert ran.code == 0, ran.err
    timing = run_here(capsys, "measure", target, "--json").document["results"][0]["timing"]
    # ticks of 1 µs: the mean over 20 periods lies within a tick
    assert timing["period"]["value"] == pytest.approx(0.025, abs=1e-6)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("nothing-here", "-o", "x.npz"), "nothing live called"),
        (("", "-o", "x.npz"), "nothing live called"),
        (("/", "-o", "x.npz"), "is a folder"),
        (("TCPIP::127.0.0.1::1::SOCKET", "-o", "no-such-folder/x.npz"), "no such folder"),
        (("TCPIP::127.0.0.1::1::SOCKET", "-o", "x.csv"), "writes an .npz"),
        (("TCPIP::127.0.0.1::1::SOCKET",), "writes an .npz"),
        (("/dev/ttyACM0", "-o", "x.npz", "--until", "forever"), "--until"),
        (("left", "-o", "x.npz", "--power-up", "--from-memory"), "--from-memory"),
    ],
)
def test_what_cannot_be_is_said_before_anything_is_opened(
    arguments: tuple[str, ...], says: str, capsys: Capsys
) -> None:
    ran = run_here(capsys, "acquire", *arguments)
    assert ran.code == 2
    assert says in ran.err
    assert "Caution" not in ran.err


def test_a_capture_whose_sidecar_cannot_be_written_is_taken_away(
    resource: str, tmp_path: Path, capsys: Capsys, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(path: Path, content: bytes, *, force: bool) -> None:
        if path.suffix == ".json":
            raise InputError("no space", hint="", code="not-writable")
        write_file(path, content, force=force)

    monkeypatch.setattr(acquiring, "write_file", full)
    ran = run_here(capsys, "acquire", resource, "-o", tmp_path / "b.npz")
    assert ran.code == 2
    assert not list(tmp_path.iterdir())


def test_an_instrument_of_the_kit_without_a_resource_is_told_as_one(
    tmp_path: Path, capsys: Capsys, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    (tmp_path / "benchtool").mkdir()
    (tmp_path / "benchtool" / "kit.toml").write_text('[instrument.left]\ntimebase = "2 ppm"\n')
    ran = run_here(capsys, "acquire", "left", "-o", "x.npz")
    assert ran.code == 2
    assert "no resource for 'left'" in ran.err


def test_a_port_where_nobody_listens_is_an_instrument_error(tmp_path: Path, capsys: Capsys) -> None:
    ran = run_here(capsys, "acquire", "TCPIP::127.0.0.1::1::SOCKET", "-o", tmp_path / "x.npz")
    assert ran.code == 5
    assert "resource: TCPIP::127.0.0.1::1::SOCKET" in ran.err
    assert not list(tmp_path.iterdir())
