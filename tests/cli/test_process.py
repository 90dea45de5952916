"""What the process as a whole is told: no idle threads, no search for plug-ins, a short end."""

from __future__ import annotations

import os
import subprocess
import sys

_AT_THE_END = """
import atexit, gc, os, sys
atexit.register(lambda: print(os.environ["OPENBLAS_NUM_THREADS"], gc.get_freeze_count() > 0))
from benchtool.cli.main import run
sys.argv = ["benchtool", "--version"]
run()
"""


def last_line(**environment: str) -> str:
    others = {k: v for k, v in os.environ.items() if k != "OPENBLAS_NUM_THREADS"}
    done = subprocess.run(
        [sys.executable, "-c", _AT_THE_END],
        env={**others, **environment},
        capture_output=True,
        text=True,
        check=True,
    )
    return done.stdout.splitlines()[-1]


def test_no_thread_waits_for_algebra_and_the_end_looks_for_no_garbage() -> None:
    assert last_line() == "1 True"


def test_the_users_own_number_of_threads_stands() -> None:
    assert last_line(OPENBLAS_NUM_THREADS="2") == "2 True"
