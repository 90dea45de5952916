"""A guard round each test: the library beneath can spin for ever."""

from __future__ import annotations

import signal
from collections.abc import Iterator
from types import FrameType

import pytest

from benchtool_drivers.link import recovery

LONGEST_S = 20.0


@pytest.fixture(autouse=True)
def hang_guard() -> Iterator[None]:
    """End a test that hangs, and say where it hung."""

    def end(_number: int, _frame: FrameType | None) -> None:
        pytest.fail(f"nothing came of this test in {LONGEST_S:g} s")

    before = signal.signal(signal.SIGALRM, end)
    signal.setitimer(signal.ITIMER_REAL, LONGEST_S)
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0.0)
        signal.signal(signal.SIGALRM, before)


@pytest.fixture
def short_quiet(monkeypatch: pytest.MonkeyPatch) -> None:
    """Believe sooner that a line is quiet: nothing in these tests takes longer on its way."""
    monkeypatch.setattr(recovery, "QUIET_S", 0.04)
