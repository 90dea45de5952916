"""What a counter may say wrongly: a named error, nothing partial, and whole readings after."""

from __future__ import annotations

import numpy as np
import pytest
from counted_boards import (
    AS_TEXT,
    FUNCTIONS,
    LOOP,
    STAMPS,
    changed,
    function_counter,
    opened,
    stamp_counter,
)
from simulated import TRANSPORTS

from benchtool.errors import InstrumentError, NoTriggerError, RefusedError, ReplyError
from benchtool.instruments import Order
from benchtool_drivers.dialect import Dialect
from benchtool_drivers.loopback.families.counters import SimulatedCounter
from benchtool_drivers.loopback.families.instrument import CONTENT_FAULTS

ORDER = Order(readings=8, trigger_timeout_s=0.25)
ONE = Order(readings=8, trigger_timeout_s=0.25, functions=("period",))

STANDS = {
    "error_before": {"earlier-errors"},
    "leftovers": {"earlier-errors"},
    "slow_trigger": set[str](),
    "window_stuck": set[str](),  # it has no window
    "nan": {"readings-missing"},
    "inf": set[str](),  # it has no such mark
    "comma": set[str](),  # a block has none, and neither has a stamp
}
"""Faults with which readings are whole all the same, and the notices they then carry."""

ERRORS: dict[str, type[InstrumentError]] = {
    "error_setup": RefusedError,
    "error_during": RefusedError,
    "busy": RefusedError,
    "trigger_never": NoTriggerError,
    "count_more": InstrumentError,  # a timeout, or an answer that ends early
}
CODES = {"all_nan": "no-valid-readings", "wrong_order": "byte-order"}


def check(subject: SimulatedCounter, dialect: Dialect, fault: str, transport: str) -> None:
    text = dialect.body.data.is_text
    stands = dict(STANDS)
    if text:
        del stands["comma"]
        stands["wrong_order"] = set()
    subject.set_fault(fault)
    with opened(subject, dialect, transport) as counter:
        if fault in stands:
            counted = counter.count(ONE)
            assert {notice.code for notice in counted.warnings} == stands[fault]
        else:
            with pytest.raises(ERRORS.get(fault, ReplyError)) as caught:
                counter.count(ONE)
            assert caught.value.step.resource == counter.resource
            assert caught.value.step.command
            assert caught.value.hint
            if fault in CODES:
                assert caught.value.code == CODES[fault]
        subject.set_fault(None)
        subject.sent.clear()
        after = counter.count(ONE).readings["period"]
        np.testing.assert_array_equal(after.values, subject.sent[0])
        assert after.values.size == 8


@pytest.mark.parametrize("fault", CONTENT_FAULTS)
def test_a_fault_ends_in_a_named_error_and_the_next_readings_are_whole(fault: str) -> None:
    # without a gate: its figure has a comma too, and is refused before any reading
    check(function_counter(), without_figures(FUNCTIONS), fault, "socket")


def without_figures(dialect: Dialect) -> Dialect:
    return changed(
        dialect,
        ('[gate]\nquery = "SENS:{function}:APER?"', ""),
        ('query = "SENS:TINT:RES?"', "s = 1e-9"),
    )


@pytest.mark.parametrize("fault", CONTENT_FAULTS)
def test_a_fault_ends_so_where_readings_are_printed(fault: str) -> None:
    check(function_counter(), without_figures(changed(FUNCTIONS, *AS_TEXT)), fault, "socket")


@pytest.mark.parametrize("fault", ["nan", "all_nan", "count_more", "trigger_never", "error_setup"])
@pytest.mark.parametrize("transport", [name for name in TRANSPORTS if name != "socket"])
def test_a_fault_ends_so_over_every_transport(transport: str, fault: str) -> None:
    check(function_counter(), without_figures(FUNCTIONS), fault, transport)


@pytest.mark.parametrize(
    "fault",
    ["count_more", "count_less", "garbage_header", "error_during", "busy", "trigger_never",
     "error_setup", "wrong_order", "stands_back"],
)  # fmt: skip
def test_a_fault_of_stamps_ends_in_a_named_error(fault: str) -> None:
    subject = stamp_counter(fault)
    with opened(subject, STAMPS) as counter:
        with pytest.raises(ERRORS.get(fault, ReplyError)) as caught:
            counter.acquire(ORDER)
        assert caught.value.step.command
        subject.set_fault(None)
        assert counter.acquire(ORDER).traces[0].times_s.size == 8  # type: ignore[union-attr]


def test_readings_that_are_none_are_counted_and_never_averaged() -> None:
    subject = function_counter("nan")
    with opened(subject, FUNCTIONS) as counter:
        counted = counter.count(ONE)
    item = counted.readings["period"]
    assert (item.values.size, item.n_missing) == (5, 3)
    np.testing.assert_array_equal(item.values, np.delete(subject.sent[0], slice(2, 5)))
    assert [notice.code for notice in counted.warnings] == ["readings-missing"]
    assert "3 of 8" in counted.warnings[0].text


@pytest.mark.parametrize("transport", ["socket", "hislip", "vxi11"])
def test_a_reading_that_never_comes_is_given_up_and_the_link_is_sound(transport: str) -> None:
    subject = function_counter("trigger_never")
    with opened(subject, changed(FUNCTIONS, *LOOP), transport) as counter:
        with pytest.raises(NoTriggerError, match=r"reading 1 did not come within 0\.25 s"):
            counter.count(ONE)
        subject.set_fault(None)
        assert counter.count(ONE).readings["period"].values.size == 8


def test_a_decimal_comma_is_named() -> None:
    with (
        opened(function_counter("comma"), changed(FUNCTIONS, *AS_TEXT)) as counter,
        pytest.raises(ReplyError, match="decimal comma"),
    ):
        counter.count(ONE)


def test_a_time_of_no_length_is_refused() -> None:
    class Zero(type(function_counter())):  # type: ignore[misc]  # a class made on the spot
        def numbers(self, values: np.ndarray) -> np.ndarray:
            return super().numbers(np.where(np.arange(values.size) == 3, 0.0, values))  # type: ignore[no-any-return]

    subject = Zero(function_counter().board)
    with (
        opened(subject, FUNCTIONS) as counter,
        pytest.raises(ReplyError, match="reading 4 of period is 0") as caught,
    ):
        counter.count(ONE)
    assert caught.value.code == "impossible-reading"
