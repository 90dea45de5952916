"""The simulated instruments behave as their structure says, and share nothing with the readers."""

from __future__ import annotations

import ast
from pathlib import Path

import numpy as np
import pytest
from simulated import simulated, square

from benchtool_drivers.loopback import families
from benchtool_drivers.loopback.families import FAMILIES, make_family
from benchtool_drivers.loopback.families.headers import spellings, split_message
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument


def ask(subject: SimulatedInstrument, message: str) -> bytes | None:
    subject.receive(message.encode())
    return subject.output()


def test_nothing_is_shared_with_dialects_and_their_readers() -> None:
    files = list(Path(families.__file__).parent.glob("*.py"))
    assert len(files) > 5
    for path in files:
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            for name in names:
                assert not name.startswith("benchtool_drivers") or ".loopback." in name, path
        assert ".toml" not in path.read_text("utf-8")


@pytest.mark.parametrize(
    ("message", "units"),
    [
        ("*IDN?", [("*IDN?", "")]),
        ("DATA:OFFS 5;COUN 3", [("DATA:OFFS", "5"), ("DATA:COUN", "3")]),
        ("DATA:OFFS 5;:INIT", [("DATA:OFFS", "5"), ("INIT", "")]),
        ("a:b:c 1;d?;*OPC?;e", [("A:B:C", "1"), ("A:B:D?", ""), ("*OPC?", ""), ("A:B:E", "")]),
        ('DISP "a;b";X', [("DISP", '"a;b"'), ("X", "")]),
        (";;", []),
    ],
)
def test_messages_are_split_into_units_with_their_path(
    message: str, units: list[tuple[str, str]]
) -> None:
    assert list(split_message(message)) == units


def test_headers_are_known_in_short_and_long_form_with_optional_nodes() -> None:
    assert set(spellings("FORMat[:DATA]?")) == {"FORM?", "FORMAT?", "FORM:DATA?", "FORMAT:DATA?"}
    assert "WAV:PREAMBLE?" in set(spellings("WAVeform:PREamble?"))
    assert "WAVE:PRE?" not in set(spellings("WAVeform:PREamble?"))


def test_answers_of_one_message_come_together() -> None:
    assert ask(simulated("keyed"), "HEAD OFF;:DATA:WID?;:HOR:LENG?") == b"2;2000\n"


def test_what_is_unknown_ends_the_message_and_goes_to_the_queue() -> None:
    subject = simulated("listed")
    assert ask(subject, "NO:SUCH?;:DATA:POIN?") is None
    assert ask(subject, "SYST:ERR?") == b'-113,"Undefined header;NO:SUCH?"\n'
    assert ask(subject, "SYST:ERR?") == b'0,"No error"\n'
    assert ask(subject, "DATA:CHAN CH9") is None
    assert ask(subject, "SYST:ERR?") == b'-224,"Illegal parameter value;DATA:CHAN"\n'


def test_a_full_queue_says_so() -> None:
    subject = simulated("listed")
    for _ in range(40):
        subject.push_error('-100,"Command error"')
    found = [ask(subject, "SYST:ERR?") for _ in range(21)]
    assert found[19] == b'-350,"Queue overflow"\n'
    assert found[20] == b'0,"No error"\n'


@pytest.mark.parametrize(
    ("family", "arm", "force"),
    [
        ("positional", "SING", "*TRG"),
        ("keyed", "INIT", "TRIG:FORC"),
        ("standard", "INIT", "*TRG"),
        ("described", "CAPT:ARM", "CAPT:TRIG"),
        ("listed", "INIT", "*TRG"),
    ],
)
def test_the_trigger_goes_from_armed_to_done(family: str, arm: str, force: str) -> None:
    turns = iter(range(1, 100))
    subject = make_family(family, volts=lambda: [square(seed=next(turns))], dt_s=1e-5)
    subject.set_fault("trigger_never")
    before = subject.record[0]
    ask(subject, arm)
    assert subject.status() == "wait"
    ask(subject, arm)
    assert ask(subject, "SYST:ERR?") == b'-213,"Init ignored"\n'
    ask(subject, force)
    assert subject.status() == "done"
    assert not np.array_equal(subject.record[0], before)
    ask(subject, force)
    assert ask(subject, "SYST:ERR?") == b'-211,"Trigger ignored"\n'


def test_an_open_opc_query_holds_all_that_follows_until_a_device_clear() -> None:
    subject = simulated("positional", fault="trigger_never")
    assert ask(subject, "SING;*OPC?") is None
    assert ask(subject, "*IDN?") is None
    subject.clear()
    assert subject.output() is None
    assert ask(subject, "TRIG:STAT?") == b"WAIT\n"
    subject.receive(b"*OPC?")
    subject.receive(b"*IDN?")
    subject.set_fault(None)
    assert subject.output() == b"1\n"
    assert subject.output() == b"Invented,Simulated digitiser,0,1.0\n"


@pytest.mark.parametrize("family", FAMILIES)
def test_the_samples_stand_for_the_volts_that_were_seen(family: str) -> None:
    subject = simulated(family)
    volts = subject.volts_of(subject.codes())  # type: ignore[attr-defined]  # each has its own
    step_v = 0.05 if family == "positional" else 2e-4  # of 8 bits, and of 16, over 7.5 V
    assert np.abs(volts - subject.record[0]).max() < step_v


def test_what_there_is_not_is_refused() -> None:
    with pytest.raises(ValueError, match="no family"):
        make_family("other", volts=[square()], dt_s=1.0)
    with pytest.raises(ValueError, match="no fault"):
        make_family("keyed", volts=[square()], dt_s=1.0, fault="other")
