"""The loop: captures as they come, keys, and sources that go."""

from __future__ import annotations

import signal
import time
from collections.abc import Iterator

import pytest
from moving_boards import RB_OHM, Played, quick_design, records

from benchtool.errors import NotConnectedError, NoTriggerError
from benchtool.instruments import Stream
from benchtool.jobs.watch import Ending, View, plan_watch, press, watch
from benchtool.jobs.watch_state import begin
from benchtool.model.capture import Capture
from benchtool.model.options import MeasureOptions
from benchtool.model.watch import Reading
from benchtool.observation import settle


@pytest.fixture(autouse=True)
def hang_guard() -> Iterator[None]:
    """End a loop that waits for ever."""
    before = signal.signal(signal.SIGALRM, lambda *_: pytest.fail("the watch does not end"))
    signal.alarm(30)
    yield
    signal.alarm(0)
    signal.signal(signal.SIGALRM, before)


class Onlooker:
    """Keeps what it is shown, and presses keys after so many updates."""

    def __init__(self, keys: dict[int, str] | None = None) -> None:
        self.updates: list[Reading] = []
        self.ticks: list[Reading] = []
        self._keys = dict(keys or {})

    def update(self, reading: Reading, now_s: float) -> None:  # noqa: ARG002 - as an audience
        """Keep it."""
        self.updates.append(reading)

    def tick(self, reading: Reading, now_s: float) -> None:  # noqa: ARG002 - as an audience
        """Keep it."""
        self.ticks.append(reading)

    def pressed(self) -> str:
        """Return the keys for so many updates."""
        return self._keys.pop(len(self.updates), "")


def run(stream: Stream, onlooker: Onlooker, most: int | None = None) -> tuple[Reading, Ending]:
    design = quick_design()
    settings = settle(MeasureOptions(), design)
    view = View(settings=settings, design=design, own_axis=True)
    return watch(stream, plan_watch(settings, design), view, onlooker, most_updates=most)


def few(n: int = 3) -> Played:
    return Played(records([RB_OHM] * n, periods=4.5))


def test_each_capture_is_one_update_and_the_end_is_an_error() -> None:
    stream, onlooker = few(), Onlooker()
    with pytest.raises(NotConnectedError):
        run(stream, onlooker)
    assert [r.n_updates for r in onlooker.updates] == [1, 2, 3]
    assert stream.closed


def test_it_ends_after_the_updates_asked_for() -> None:
    stream = few()
    reading, ending = run(stream, Onlooker(), most=2)
    assert (reading.n_updates, ending) == (2, "enough")
    assert stream.closed


@pytest.mark.parametrize(("key", "ending"), [("q", "left"), ("a", "accepted"), ("A", "accepted")])
def test_keys_end_it(key: str, ending: str) -> None:
    reading, found = run(few(), Onlooker({2: key}))
    assert (found, reading.n_updates) == (ending, 2)


def test_marks_are_set_and_taken_back_by_keys() -> None:
    onlooker = Onlooker({1: "mm", 2: "uq"})
    reading, _ = run(few(), onlooker)
    assert [m.number for m in reading.marks] == [1]


def test_nothing_is_accepted_before_there_is_a_value() -> None:
    design = quick_design()
    state = begin(plan_watch(settle(MeasureOptions(), design), design))
    assert press(state, "a") == (state, None)
    assert press(state, "q") == (state, "left")


class Waiting:
    """An instrument whose trigger comes at the third try, as a stream."""

    source = "waiting"

    def __init__(self) -> None:
        self.closed = False
        self._answers = self._play()

    def newest(self, timeout_s: float) -> Capture | None:  # noqa: ARG002 - a stream's signature
        """Return the next."""
        answer = next(self._answers)
        if answer is None:
            raise NoTriggerError("nothing was recorded in time", hint="See the trigger level.")
        return answer

    def close(self) -> None:
        """Note the end."""
        self.closed = True

    def _play(self) -> Iterator[Capture | None]:
        yield None
        yield None
        yield from records([RB_OHM] * 9, periods=4.5)


def test_a_trigger_that_does_not_come_is_waited_for() -> None:
    onlooker = Onlooker()
    reading, _ = run(Waiting(), onlooker, most=1)
    assert reading.trouble is None
    troubles = [r.trouble.code for r in onlooker.ticks if r.trouble]
    assert troubles == ["no-trigger"] * 2


class Deaf:
    """A source that blocks for long; keys and clock must go on."""

    source = "deaf"

    def newest(self, timeout_s: float) -> Capture | None:  # noqa: ARG002 - a stream's signature
        """Return the next."""
        time.sleep(0.4)
        return None

    def close(self) -> None:
        """Note nothing."""


def test_keys_are_heard_while_the_source_is_waited_for() -> None:
    begun_s = time.monotonic()
    _, ending = run(Deaf(), Onlooker({0: "q"}))
    assert ending == "left"
    assert time.monotonic() - begun_s < 2.0  # two waits of the source and much to spare
