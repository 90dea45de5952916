"""Every dialect over every transport: the samples exactly as the instrument recorded them."""

from __future__ import annotations

import time

import numpy as np
import pytest
from simulated import DIALECTS, TRANSPORTS, assert_whole, becomes, holds, opened, simulated, square

from benchtool.errors import NoTriggerError, RefusedError
from benchtool.instruments import Order
from benchtool.model.capture import Waveform
from benchtool_drivers.loopback.families import FAMILIES, make_family
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument


@pytest.mark.parametrize("transport", TRANSPORTS)
@pytest.mark.parametrize("family", FAMILIES)
def test_two_channels_come_exactly_as_they_were_recorded(family: str, transport: str) -> None:
    subject = simulated(family)
    with opened(subject, transport, family) as instrument:
        capture = instrument.acquire(Order(channels=("CH1", "CH2")))
        assert_whole(capture, subject, 1, 2)
        assert instrument.dialect == DIALECTS[family]
    assert capture.warnings == ()
    assert subject.n_resets == 0


@pytest.mark.parametrize("family", FAMILIES)
def test_a_record_longer_than_one_transfer_is_whole(family: str) -> None:
    subject = simulated(family, n=260_000 if family != "listed" else 20_000)
    with opened(subject, "socket", family) as instrument:
        assert_whole(instrument.acquire(Order()), subject)


@pytest.mark.parametrize("family", FAMILIES)
def test_record_follows_record_and_each_is_the_newest(family: str) -> None:
    """A trimmer moves: each trigger sees other volts."""
    turns = iter(range(1, 100))
    subject = make_family(family, volts=lambda: [square(seed=next(turns))], dt_s=1e-5)
    with opened(subject, "socket", family) as instrument:
        for _ in range(3):
            assert_whole(instrument.acquire(Order()), subject)


@pytest.mark.parametrize("family", ["positional", "keyed", "standard"])
def test_an_instrument_that_ran_runs_again_afterwards(family: str) -> None:
    subject = simulated(family, running=True)
    with opened(subject, "socket", family) as instrument:
        assert_whole(instrument.acquire(Order()), subject)
        assert becomes(subject, "free")
        subject.set_fault("error_during")
        with pytest.raises(RefusedError, match="-230"):
            instrument.acquire(Order())
        assert becomes(subject, "free")


@pytest.mark.parametrize("family", FAMILIES)
def test_the_memory_is_read_without_a_new_trigger(family: str) -> None:
    turns = iter(range(1, 100))
    subject = make_family(family, volts=lambda: [square(seed=next(turns))], dt_s=1e-5)
    before = subject.record[0]
    with opened(subject, "socket", family) as instrument:
        capture = instrument.acquire(Order(arm=False))
    assert subject.record[0] is before
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    volts = np.concatenate(list(trace.samples.blocks())) * trace.scale.gain + trace.scale.offset
    assert np.abs(volts - before).max() < 2e-4  # one step of 16 bits over 8 V


@pytest.mark.parametrize("family", FAMILIES)
def test_a_trigger_that_never_comes_is_given_up_and_forced_when_asked(family: str) -> None:
    subject = simulated(family, fault="trigger_never")
    with opened(subject, "socket", family) as instrument:
        told: list[float] = []
        began_s = time.monotonic()
        with pytest.raises(NoTriggerError) as caught:
            instrument.acquire(
                Order(trigger_timeout_s=0.2), armed=lambda: told.append(time.monotonic())
            )
        assert time.monotonic() - began_s < 1.0
        assert len(told) == 1
        assert caught.value.step.got in ("WAIT", "ARMED", "32")
        assert becomes(subject, "done")
        assert_whole(instrument.acquire(Order(force=True, trigger_timeout_s=0.3)), subject)
        subject.set_fault(None)
        assert_whole(instrument.acquire(Order()), subject)


def test_the_window_of_a_broken_transfer_is_not_taken_for_the_record() -> None:
    for family, commands in (
        ("positional", (b"WAV:STAR 5", b"WAV:STOP 20")),
        ("keyed", (b"DATA:OFFS 7", b"DATA:COUN 9")),
    ):
        subject = simulated(family)
        for command in commands:
            subject.receive(command)
        with opened(subject, "socket", family) as instrument:
            assert_whole(instrument.acquire(Order()), subject)


def test_a_transfer_puts_the_format_back_as_it_was() -> None:
    subject = simulated("positional")
    with opened(subject, "socket", "positional") as instrument:
        instrument.acquire(Order())
        assert form_of(subject) == b"WORD\n"
    assert holds(lambda: form_of(subject) == b"BYTE\n")


def form_of(subject: SimulatedInstrument) -> bytes | None:
    subject.receive(b"WAV:FORM?")
    return subject.output()
