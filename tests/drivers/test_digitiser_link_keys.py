"""Instruments that talk oddly: what the [link] table of a dialect says is heeded."""

from __future__ import annotations

from contextlib import closing

import pytest
from simulated import DIALECTS, assert_whole, simulated

from benchtool.errors import InstrumentError, RefusedError
from benchtool.instruments import Order
from benchtool_drivers.dialect import Dialect, find_dialect, parse_dialect
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument


class Odd:
    """An instrument with a prompt, or one that repeats each command first."""

    def __init__(self, subject: SimulatedInstrument, *, prompt: bytes, echo: bool) -> None:
        self.subject, self.prompt, self.echo = subject, prompt, echo
        self.out: list[bytes] = []

    def receive(self, message: bytes) -> None:
        """Pass a message on."""
        if self.echo:
            self.out.append(message + b"\n")
        self.subject.receive(message)
        while (answer := self.subject.output()) is not None:
            self.out.append(answer)
        if self.prompt:
            self.out.append(self.prompt)

    def output(self) -> bytes | None:
        """Give the next piece."""
        return self.out.pop(0) if self.out else None

    def clear(self) -> None:
        """Forget what is under way."""
        self.out.clear()
        self.subject.clear()


def answer_of(subject: SimulatedInstrument, query: bytes) -> bytes | None:
    """Return what an instrument answers at its front."""
    subject.receive(query)
    return subject.output()


def with_link(family: str, keys: str) -> Dialect:
    """Return the family's dialect with keys of [link] added."""
    text = find_dialect(DIALECTS[family]).text
    quick = f"[link]\ntimeout_s = 0.3\nblock_timeout_s = 0.3\n{keys}\n"
    if "[link]" in text:
        return parse_dialect(text.replace("[link]\n", quick))
    return parse_dialect(text.replace("[probe]", f"{quick}[probe]"))


@pytest.mark.parametrize("transport", ["socket", "pty"])
@pytest.mark.parametrize("family", ["positional", "listed", "standard"])
@pytest.mark.parametrize("keys", ['prompt = "> "', "echo = true", 'prompt = "> "\necho = true'])
def test_prompt_and_echo_are_heeded(family: str, keys: str, transport: str) -> None:
    subject = simulated(family)
    odd = Odd(subject, prompt=b"> " if "prompt" in keys else b"", echo="echo" in keys)
    with (
        serve(odd, transport) as resource,
        closing(open_instrument(resource, dialect=with_link(family, keys))) as instrument,
    ):
        for _ in range(2):
            assert_whole(instrument.acquire(Order()), subject)


def test_an_echo_that_the_dialect_does_not_know_of_is_told_as_one() -> None:
    odd = Odd(simulated("listed"), prompt=b"", echo=True)
    with serve(odd, "socket") as resource, pytest.raises(InstrumentError, match="repeats"):
        open_instrument(resource, dialect=with_link("listed", ""))


def test_a_status_register_in_place_of_an_error_queue_is_read_bit_by_bit() -> None:
    subject = simulated("positional")
    dialect = with_link("positional", 'error_query = "*ESR?"\nerror_bits = 60')
    with (
        serve(subject, "socket") as resource,
        closing(open_instrument(resource, dialect=dialect)) as instrument,
    ):
        assert_whole(instrument.acquire(Order()), subject)
        subject.set_fault("error_during")
        with pytest.raises(RefusedError, match=r"16 \(execution error\)"):
            instrument.acquire(Order())


def test_an_instrument_without_any_error_query_is_not_asked() -> None:
    subject = simulated("listed")
    with (
        serve(subject, "socket") as resource,
        closing(
            open_instrument(resource, dialect=with_link("listed", 'error_query = ""'))
        ) as instrument,
    ):
        subject.push_error('-100,"Command error"')
        assert_whole(instrument.acquire(Order()), subject)
        assert answer_of(subject, b"SYST:ERR?") == b'-100,"Command error"\n'


def test_headers_that_cannot_be_switched_off_are_taken_off_answers_and_blocks() -> None:
    subject = simulated("keyed")
    text = with_link("keyed", "headers = true").text
    text = text.replace('header_off = ["HEAD OFF"]\n', "").replace(
        'wrap  = "definite"', 'wrap = "definite"\nlead = true'
    )
    with (
        serve(subject, "socket") as resource,
        closing(open_instrument(resource, dialect=parse_dialect(text))) as instrument,
    ):
        assert_whole(instrument.acquire(Order(channels=("CH1", "CH2"))), subject, 1, 2)
        assert answer_of(subject, b"HEAD?") == b":HEADER 1\n"
