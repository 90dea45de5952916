"""Readings of functions: exact over every transport and in every way to take them."""

from __future__ import annotations

import numpy as np
import pytest
from counted_boards import (
    ARRAY,
    AS_TEXT,
    FUNCTIONS,
    JITTER_REL,
    LOOP,
    PERIOD_S,
    STAMPS,
    T_HIGH_S,
    T_LOW_S,
    changed,
    function_counter,
    opened,
    stamp_counter,
)
from simulated import TRANSPORTS, holds

from benchtool.errors import InstrumentError, UsageError
from benchtool.instruments import Counter, Instrument, Order
from benchtool.model.counted import COUNTED_NAMES, Counted, CountedName
from benchtool_drivers.dialect import Dialect
from benchtool_drivers.loopback.families import make_family
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

TRUTH: dict[CountedName, float] = {
    "t_high": T_HIGH_S,
    "t_low": T_LOW_S,
    "period": PERIOD_S,
    "frequency": 1 / PERIOD_S,
    "duty": T_HIGH_S / PERIOD_S,
}


def assert_read(counted: Counted, n: int) -> None:
    """Hold readings against the board: each cycle is within five of its own jitters."""
    assert counted.readings.keys() == set(COUNTED_NAMES)
    for name, item in counted.readings.items():
        assert item.values.size == n
        assert np.abs(item.values / TRUTH[name] - 1).max() < 5 * JITTER_REL
        assert item.n_missing == 0
        assert item.chains == ()


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_readings_are_exactly_those_that_were_sent(transport: str) -> None:
    subject = function_counter()
    with opened(subject, FUNCTIONS, transport) as counter:
        counted = counter.count(Order(readings=7))
    assert_read(counted, 7)
    for name, sent in zip(counted.readings, subject.sent, strict=True):
        factor = 1e-2 if name == "duty" else 1.0
        np.testing.assert_array_equal(counted.readings[name].values, sent * factor)
    assert (counted.channel, counted.dialect) == ("1", "counter-scpi99")
    assert counted.identity == subject.identity
    assert counted.resolution_s == subject.tick_s
    assert counted.settings == (("INP1:LEV?", "+2.500000000E+00"),)
    assert counted.warnings == ()


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_printed_readings_are_exact_too(transport: str) -> None:
    subject = function_counter()
    with opened(subject, changed(FUNCTIONS, *AS_TEXT), transport) as counter:
        counted = counter.count(Order(readings=5, functions=("period",), channels=("2",)))
    assert counted.channel == "2"
    np.testing.assert_array_equal(counted.readings["period"].values, subject.sent[0])


@pytest.mark.parametrize("way", [ARRAY, (*AS_TEXT, *ARRAY), LOOP])
def test_every_way_to_take_readings_gives_them(way: tuple[tuple[str, str], ...]) -> None:
    subject = function_counter()
    told: list[tuple[int, int]] = []
    with opened(subject, changed(FUNCTIONS, *way)) as counter:
        counted = counter.count(
            Order(readings=6), progress=lambda done, total: told.append((done, total))
        )
    assert_read(counted, 6)
    assert told[-1] == (30, 30)
    assert [done for done, _ in told] == sorted(done for done, _ in told)
    read = np.concatenate([item.values for item in counted.readings.values()])
    sent = np.concatenate(subject.sent)
    sent[-6:] *= 1e-2  # the duty comes last, in percent
    np.testing.assert_array_equal(read, sent)


def test_more_readings_than_one_transfer_holds_come_in_several() -> None:
    subject = function_counter()
    with opened(subject, changed(FUNCTIONS, ("most      = 10000", "most = 4"))) as counter:
        counted = counter.count(Order(readings=10, functions=("t_high",)))
    assert [sent.size for sent in subject.sent] == [4, 4, 2]
    np.testing.assert_array_equal(counted.readings["t_high"].values, np.concatenate(subject.sent))


def test_the_dialect_says_how_many_where_nobody_else_does() -> None:
    with opened(function_counter(), FUNCTIONS) as counter:
        assert counter.count(Order(functions=("t_low",))).readings["t_low"].values.size == 100


@pytest.mark.parametrize(
    ("gate_s", "per"), [(0.1, "gate"), (PERIOD_S * 1.1, "gate"), (PERIOD_S / 2, "interval")]
)
def test_a_reading_is_a_single_period_only_where_the_gate_is_shorter(
    gate_s: float, per: str
) -> None:
    subject = function_counter()
    subject.gate_s = gate_s
    with opened(subject, FUNCTIONS) as counter:
        readings = counter.count(Order(readings=50, functions=("period", "t_high"))).readings
    assert (readings["period"].per, readings["period"].gate_s) == (per, gate_s)
    assert (readings["t_high"].per, readings["t_high"].gate_s) == ("interval", None)


@pytest.mark.parametrize(
    ("gate", "per"),
    [
        ("", "gate"),
        ("[gate]\nquery = \"SENS:{function}:APER?\"\nsingle = '^.2'", "gate"),
        ("[gate]\nquery = \"SENS:{function}:APER?\"\nsingle = '^.1'", "interval"),
    ],
)
def test_a_gate_that_nobody_knows_of_is_taken_to_average(gate: str, per: str) -> None:
    dialect = changed(FUNCTIONS, ('[gate]\nquery = "SENS:{function}:APER?"', gate))
    with opened(function_counter(), dialect) as counter:
        item = counter.count(Order(readings=3, functions=("period",))).readings["period"]
    assert item.per == per


def test_a_duty_may_come_as_a_ratio() -> None:
    subject = function_counter()
    subject.duty_unit = 1.0
    dialect = changed(FUNCTIONS, ('unit = "%"', 'unit = "1"'))
    with opened(subject, dialect) as counter:
        item = counter.count(Order(readings=3, functions=("duty",))).readings["duty"]
    np.testing.assert_array_equal(item.values, subject.sent[0])


def test_percent_taken_for_a_ratio_is_refused() -> None:
    dialect = changed(FUNCTIONS, ('unit = "%"', 'unit = "1"'))
    with (
        opened(function_counter(), dialect) as counter,
        pytest.raises(InstrumentError, match="which cannot be") as caught,
    ):
        counter.count(Order(readings=3, functions=("duty",)))
    assert caught.value.code == "impossible-reading"


def test_what_was_set_is_put_back_and_nothing_is_reset() -> None:
    subject = function_counter()
    subject.function, subject.n_asked = "NWID", 42
    with opened(subject, FUNCTIONS) as counter:
        counter.count(Order(readings=3, functions=("period",)))
        assert (subject.function, subject.n_asked) == ("PER", 3)
    assert holds(lambda: subject.function == "NWID")
    assert holds(lambda: subject.n_asked == 42)
    assert subject._format_now("") == "ASC,9"
    assert subject.n_resets == 0


def test_a_counter_that_ran_runs_again() -> None:
    subject = function_counter()
    subject.run()
    with opened(subject, FUNCTIONS) as counter:
        counter.count(Order(readings=3, functions=("period",)))
        assert holds(lambda: subject.status() == "free")


def test_the_users_own_commands_are_sent_first_and_their_errors_end_it() -> None:
    subject = function_counter()
    with opened(subject, FUNCTIONS) as counter:
        counter.count(Order(readings=3, functions=("period",), settings=("FORM:BORD NORM",)))
        with pytest.raises(InstrumentError, match="-113"):
            counter.count(Order(readings=3, functions=("period",), settings=("NO:SUCH 1",)))


@pytest.mark.parametrize(
    ("order", "code"),
    [
        (Order(functions=("rise",)), "no-such-function"),
        (Order(channels=("3",)), "no-such-channel"),
        (Order(channels=("1", "2")), "usage"),
        (Order(force=True), "no-forced-trigger"),
        (Order(settings=("A\nB",)), "bad-setting"),
    ],
)
def test_what_the_dialect_does_not_offer_is_refused(order: Order, code: str) -> None:
    with opened(function_counter(), FUNCTIONS) as counter, pytest.raises(UsageError) as caught:
        counter.count(order)
    assert caught.value.code == code


def test_readings_and_edges_are_not_taken_for_each_other() -> None:
    with opened(function_counter(), FUNCTIONS) as counter:
        assert isinstance(counter, Counter)
        assert counter.delivers == "readings"
        with pytest.raises(UsageError) as caught:
            counter.acquire(Order())
        assert caught.value.code == "counter-delivers-readings"
    with opened(stamp_counter(), STAMPS) as counter:
        assert counter.delivers == "edges"
        with pytest.raises(UsageError) as caught:
            counter.count(Order())
        assert caught.value.code == "counter-delivers-edges"


@pytest.mark.parametrize("dialect", [FUNCTIONS, STAMPS])
@pytest.mark.parametrize("transport", ["socket", "hislip"])
def test_a_counter_is_recognised_by_probing(
    dialect: Dialect, transport: str, monkeypatch: pytest.MonkeyPatch, tmp_path: object
) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    subject = function_counter() if dialect is FUNCTIONS else stamp_counter()
    with serve(subject, transport) as resource:
        instrument = open_instrument(resource)
        assert instrument.dialect == dialect.name
        instrument.close()


def test_a_digitiser_is_no_counter() -> None:
    subject = make_family("listed", volts=[np.arange(9.0)], dt_s=1.0)
    with serve(subject, "socket") as resource:
        instrument: Instrument = open_instrument(resource, dialect="list-of-volts")
        assert not isinstance(instrument, Counter)
        instrument.close()
