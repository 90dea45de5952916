"""What can go wrong on the way while a record is read: an error, and a whole record afterwards."""

from __future__ import annotations

from contextlib import closing

import pytest
from simulated import DIALECTS, QUICK, assert_whole, becomes, simulated

from benchtool.errors import InstrumentError
from benchtool.instruments import Order
from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

BREAKS = ("silent", "half-stall", "half-close", "half-reset", "close-before", "drop-terminator")
ONCE_MORE = ("half-close", "half-reset", "close-before")


@pytest.mark.parametrize("kind", BREAKS)
@pytest.mark.parametrize(
    ("family", "on", "transport"),
    [
        *(("positional", "WAV:DATA", name) for name in ("socket", "hislip", "vxi11")),
        ("keyed", "DATA:VAL", "hislip"),
        ("listed", "DATA[?]$", "socket"),
    ],
)
def test_a_break_while_samples_come_leaves_nothing_partial(
    family: str, on: str, transport: str, kind: str
) -> None:
    subject = simulated(family)
    fault = TransportFault(kind=kind, on=on)  # type: ignore[arg-type]  # one of the kinds
    with (
        serve(subject, transport, fault) as resource,
        closing(open_instrument(resource, dialect=DIALECTS[family], settings=QUICK)) as instrument,
    ):
        with pytest.raises(InstrumentError) as caught:
            instrument.acquire(Order())
        assert caught.value.step.command
        capture = instrument.acquire(Order())
        assert_whole(capture, subject)
        renewed = "connection-renewed" in {notice.code for notice in capture.warnings}
        assert renewed or kind not in ONCE_MORE


@pytest.mark.parametrize("transport", ["socket", "hislip"])
def test_a_slow_transfer_is_whole(transport: str) -> None:
    subject = simulated("positional")
    fault = TransportFault(kind="trickle", on="WAV:DATA", wait_s=0.02, piece_bytes=500)
    with (
        serve(subject, transport, fault) as resource,
        closing(
            open_instrument(resource, dialect="positional-start-stop", settings=QUICK)
        ) as instrument,
    ):
        told: list[tuple[int, int]] = []
        capture = instrument.acquire(Order(), progress=lambda done, of: told.append((done, of)))
        assert_whole(capture, subject)
        assert told[-1] == (4000, 4000)
        assert [done for done, _ in told] == sorted(done for done, _ in told)


@pytest.mark.parametrize("again", [True, False])
def test_an_instrument_that_ran_before_the_connection_went_runs_again(again: bool) -> None:
    subject = simulated("keyed", running=True)
    fault = TransportFault(kind="half-close", on="DATA:VAL")
    with serve(subject, "socket", fault) as resource:
        instrument = open_instrument(resource, dialect=DIALECTS["keyed"], settings=QUICK)
        with pytest.raises(InstrumentError):
            instrument.acquire(Order())
        assert subject.status() == "done"
        if again:
            assert_whole(instrument.acquire(Order()), subject)
            assert becomes(subject, "free")
        instrument.close()
        assert becomes(subject, "free")
