"""How far a long walk has come, told to whoever watches."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar

Watcher = Callable[[str, int, int], None]
"""Is told what goes on, how much of it is done, and of how much, in bytes."""

_WATCHER: ContextVar[Watcher | None] = ContextVar("watcher", default=None)


@contextmanager
def watched(watcher: Watcher) -> Iterator[None]:
    """Have ``watcher`` told of all walks inside a ``with`` block."""
    token = _WATCHER.set(watcher)
    try:
        yield
    finally:
        _WATCHER.reset(token)


def tell(doing: str, done: int, total: int) -> None:
    """Say how far a walk has come.

    Args:
        doing: What goes on, in a word: reading or measuring.
        done: Bytes behind.
        total: Bytes in all.
    """
    watcher = _WATCHER.get()
    if watcher is not None:
        watcher(doing, done, total)
