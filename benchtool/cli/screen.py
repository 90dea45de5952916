"""The console: its width, its colours, and whether it is a terminal at all."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from rich.console import Console

_PIPE_WIDTH = 100


def make_console(stream: TextIO, *, no_color: bool) -> Console:
    """Return a console on ``stream``: the terminal's width, or 100 columns into a pipe.

    Highlighting, mark-up and emoji are off: what a file or a user named is shown as it is.
    """
    from rich.console import Console

    is_terminal = stream.isatty()
    told = is_terminal or "COLUMNS" in os.environ
    return Console(
        file=stream,
        width=None if told else _PIPE_WIDTH,
        force_terminal=None if is_terminal else False,  # a pipe stays plain, FORCE_COLOR or not
        no_color=True if no_color or not is_terminal else None,
        highlight=False,
        markup=False,
        emoji=False,
        soft_wrap=False,
    )
