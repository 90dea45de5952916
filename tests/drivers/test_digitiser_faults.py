"""What an instrument may say wrongly: a named error, nothing partial, and a whole record after."""

from __future__ import annotations

import pytest
from simulated import DIALECTS, TRANSPORTS, assert_whole, opened, simulated

from benchtool.errors import InstrumentError, NoTriggerError, RefusedError, ReplyError
from benchtool.instruments import Order
from benchtool_drivers.dialect import find_dialect
from benchtool_drivers.loopback.families import FAMILIES
from benchtool_drivers.loopback.families.instrument import CONTENT_FAULTS

ORDER = Order(trigger_timeout_s=0.25)

STANDS = {"error_before": "earlier-errors", "leftovers": "earlier-errors", "slow_trigger": ""}
"""Faults with which a record is whole all the same, and the notice it then carries."""

MARKED = {"nan": "invalid-samples", "inf": "invalid-samples"}
STANDS_FOR = {
    "standard": MARKED,
    "listed": {**MARKED, "wrong_order": "", "error_setup": ""},
    "described": {"comma": "", "error_setup": ""},
}
"""Likewise, by family: faults of what it does not send."""

ERRORS: dict[str, type[InstrumentError]] = {
    "error_setup": RefusedError,
    "error_during": RefusedError,
    "busy": RefusedError,
    "trigger_never": NoTriggerError,
    "count_more": InstrumentError,  # a timeout, or an answer that ends early
}


def check(family: str, fault: str, transport: str) -> None:
    subject = simulated(family, fault=fault)
    stands = {**STANDS, **STANDS_FOR.get(family, {})}
    with opened(subject, transport, family) as instrument:
        if fault in stands:
            capture = instrument.acquire(ORDER)
            assert {notice.code for notice in capture.warnings} == {stands[fault]} - {""}
        else:
            with pytest.raises(ERRORS.get(fault, ReplyError)) as caught:
                instrument.acquire(ORDER)
            assert caught.value.step.resource == instrument.resource
            assert caught.value.step.command
            assert caught.value.hint
        subject.set_fault(None)
        assert_whole(instrument.acquire(Order(channels=("CH2",))), subject, 2)


@pytest.mark.parametrize("fault", CONTENT_FAULTS)
@pytest.mark.parametrize("family", FAMILIES)
def test_a_fault_ends_in_a_named_error_and_the_next_record_is_whole(
    family: str, fault: str
) -> None:
    check(family, fault, "socket")


@pytest.mark.parametrize(
    "fault", ["count_more", "count_less", "garbage_header", "error_during", "trigger_never"]
)
@pytest.mark.parametrize("transport", TRANSPORTS[1:])
def test_a_fault_ends_so_over_every_transport(transport: str, fault: str) -> None:
    check("positional", fault, transport)


@pytest.mark.parametrize("family", FAMILIES)
def test_a_busy_instrument_is_told_before_old_samples_are_moved(family: str) -> None:
    subject = simulated(family, fault="busy")
    with opened(subject, "socket", family) as instrument:
        with pytest.raises(RefusedError, match="-213") as caught:
            instrument.acquire(ORDER)
        armed_by = find_dialect(DIALECTS[family]).body.acquire.arm
        assert caught.value.step.command == "; ".join(armed_by)


@pytest.mark.parametrize(
    ("family", "fault", "code"),
    [
        ("positional", "window_stuck", "window-kept"),
        ("keyed", "window_stuck", "window-kept"),
        ("described", "window_stuck", "window-kept"),
        ("listed", "window_stuck", "wrong-count"),
        ("positional", "wrong_order", "byte-order"),
        ("keyed", "wrong_order", "byte-order"),
        ("described", "wrong_order", "byte-order"),
        ("standard", "wrong_order", "byte-order"),
        ("listed", "all_nan", "no-valid-samples"),
        ("positional", "nan", "bad-preamble"),
        ("keyed", "inf", "bad-preamble"),
        ("described", "nan", "bad-preamble"),
        ("listed", "count_more", "wrong-count"),
        ("keyed", "empty", "empty-record"),
    ],
)
def test_a_fault_has_its_own_code(family: str, fault: str, code: str) -> None:
    subject = simulated(family, fault=fault)
    with opened(subject, "socket", family) as instrument:
        with pytest.raises(InstrumentError) as caught:
            instrument.acquire(ORDER)
        assert caught.value.code == code
