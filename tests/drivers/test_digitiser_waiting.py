"""Every way to wait for the end of an acquisition, with triggers that come and that do not."""

from __future__ import annotations

import time
from contextlib import closing

import pytest
from scripted import ScriptedLink, digitiser, record, volts
from simulated import DIALECTS, QUICK, assert_whole, simulated

from benchtool.errors import NoTriggerError
from benchtool.instruments import Order
from benchtool_drivers.dialect import Dialect, find_dialect, parse_dialect
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

POLLED = (
    'wait      = { by = "poll", query = "TRIG:STAT?", '
    "done = '^(STOP|DONE)$', waiting = '^WAIT$' }"
)


def waiting(wait: str, arm: str = '["SING"]') -> Dialect:
    """Return the positional dialect with another way to wait."""
    text = find_dialect(DIALECTS["positional"]).text
    assert POLLED in text
    return parse_dialect(text.replace(POLLED, f"wait = {wait}").replace('["SING"]', arm))


@pytest.mark.parametrize(
    "wait",
    [
        '{ by = "opc" }',
        '{ by = "delay", delay_s = 0.2 }',
        '{ by = "delay", delay_s = 0, opc = true }',
    ],
)
def test_a_slow_trigger_is_waited_for(wait: str) -> None:
    subject = simulated("positional", fault="slow_trigger")
    with (
        serve(subject, "socket") as resource,
        closing(open_instrument(resource, dialect=waiting(wait), settings=QUICK)) as instrument,
    ):
        assert_whole(instrument.acquire(Order(trigger_timeout_s=1.0)), subject)


@pytest.mark.parametrize("transport", ["socket", "hislip", "vxi11"])
def test_an_instrument_that_sits_on_its_opc_is_brought_back(transport: str) -> None:
    subject = simulated("positional", fault="trigger_never")
    with (
        serve(subject, transport) as resource,
        closing(
            open_instrument(resource, dialect=waiting('{ by = "opc" }'), settings=QUICK)
        ) as instrument,
    ):
        with pytest.raises(NoTriggerError) as caught:
            instrument.acquire(Order(trigger_timeout_s=0.2))
        assert caught.value.step.command == "*OPC?"
        subject.set_fault(None)
        assert_whole(instrument.acquire(Order(trigger_timeout_s=1.0)), subject)


def scripted(wait: str) -> str:
    return f"""[acquire]
arm = ["GO"]
force = ["PUSH"]
abort = ["HALT"]
wait = {wait}
timeout_s = 0.1
[preamble]
kind = "constant"
constant = {{ dt = 1, points = 2 }}
[data]
query = "DATA?"
wrap = "ascii"
[scale]
y = "none"
"""


def test_bits_are_masked_and_compared() -> None:
    registers = ["#H31", "+1.60E+01", "1"]
    link = ScriptedLink({"REG?": lambda: registers.pop(0), "DATA?": "1,2"})
    wait = '{ by = "bits", query = "REG?", mask = 0x30, equals = 0, interval_s = 0.001 }'
    assert volts(record(scripted(wait), link)).tolist() == [1, 2]
    assert registers == []
    with pytest.raises(Exception, match="the register is 'many'"):
        record(scripted(wait), ScriptedLink({"REG?": "many", "DATA?": "1,2"}))


def test_bits_may_have_to_be_set() -> None:
    registers = ["0", "128", "129"]
    link = ScriptedLink({"*ESR?": lambda: registers.pop(0), "DATA?": "1,2"})
    wait = '{ by = "bits", query = "*ESR?", mask = 1, equals = 1, interval_s = 0.001 }'
    assert volts(record(scripted(wait), link)).tolist() == [1, 2]


def test_the_trigger_is_forced_once_and_only_when_it_is_awaited() -> None:
    states = ["PREP", "LOOK", "LOOK", "HOLD"]
    link = ScriptedLink({"STATE?": lambda: states.pop(0), "DATA?": "1,2"})
    wait = (
        """{ by = "poll", query = "STATE?", done = "HOLD", waiting = "LOOK", interval_s = 0.001 }"""
    )
    told: list[int] = []
    capture = digitiser(scripted(wait), link).acquire(
        Order(force=True), armed=lambda: told.append(len(states))
    )
    assert volts(capture).tolist() == [1, 2]
    assert link.said == ["GO", "STATE?", "STATE?", "PUSH", "STATE?", "STATE?", "DATA?"]
    assert told == [2]


def test_a_record_that_is_there_at_once_is_armed_too_and_not_forced() -> None:
    link = ScriptedLink({"STATE?": "HOLD", "DATA?": "1,2"})
    wait = '{ by = "poll", query = "STATE?", done = "HOLD", waiting = "LOOK" }'
    told: list[bool] = []
    digitiser(scripted(wait), link).acquire(Order(force=True), armed=lambda: told.append(True))
    assert told == [True]
    assert "PUSH" not in link.said


def test_giving_up_takes_the_time_that_was_given_and_aborts() -> None:
    link = ScriptedLink({"STATE?": "LOOK", "DATA?": "1,2"})
    wait = '{ by = "poll", query = "STATE?", done = "HOLD" }'
    began_s = time.monotonic()
    with pytest.raises(NoTriggerError, match=r"within 0\.1 s; the last state was 'LOOK'"):
        record(scripted(wait), link)
    assert 0.1 <= time.monotonic() - began_s < 0.3
    assert link.said[-1] == "HALT"
    assert "DATA?" not in link.said
    began_s = time.monotonic()
    with pytest.raises(NoTriggerError):
        record(scripted(wait), link, Order(trigger_timeout_s=0.2))
    assert 0.2 <= time.monotonic() - began_s < 0.4


def test_the_state_of_before_is_not_asked_for_too_early() -> None:
    began_s = time.monotonic()
    link = ScriptedLink({"STATE?": lambda: f"{time.monotonic() - began_s:.3f}", "DATA?": "1,2"})
    wait = """{ by = "poll", query = "STATE?", done = '^0\\.[1-9]', settle_s = 0.1 }"""
    text = scripted(wait).replace("timeout_s = 0.1", "timeout_s = 0.11")
    assert volts(record(text, link)).tolist() == [1, 2]
    assert link.said.count("STATE?") <= 2


def test_an_instrument_that_ran_is_stopped_first_and_runs_again() -> None:
    states = ["ROLL", "HOLD"]
    link = ScriptedLink({"STATE?": lambda: states.pop(0), "DATA?": "1,2"})
    wait = '{ by = "poll", query = "STATE?", done = "HOLD" }'
    text = scripted(wait).replace(
        "timeout_s = 0.1",
        'stop = ["HALT"]\nrunning = { query = "STATE?", match = "ROLL" }\nresume = ["RUN"]',
    )
    record(text, link)
    assert link.said == ["STATE?", "HALT", "GO", "STATE?", "DATA?", "RUN"]
    states[:] = ["IDLE", "HOLD"]
    link.said.clear()
    record(text, link)
    assert link.said == ["STATE?", "GO", "STATE?", "DATA?"]


def test_an_interrupted_instrument_runs_again() -> None:
    def interrupted() -> str:
        raise KeyboardInterrupt

    link = ScriptedLink({"STATE?": "ROLL", "DATA?": interrupted})
    text = scripted('{ by = "poll", query = "STATE?", done = "ROLL" }').replace(
        "timeout_s = 0.1", 'running = { query = "STATE?", match = "ROLL" }\nresume = ["RUN"]'
    )
    with pytest.raises(KeyboardInterrupt):
        record(text, link)
    assert link.said[-1] == "RUN"
