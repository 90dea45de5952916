"""Runs the command line in this process or in one of its own."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from benchtool.cli.main import main


@dataclass(frozen=True, kw_only=True)
class Ran:
    """What a run gave."""

    code: int
    out: str
    err: str

    @property
    def document(self) -> dict[str, Any]:
        """The one JSON document on stdout; anything else there is an error."""
        document: dict[str, Any] = json.loads(self.out)
        return document


def run_here(capsys: pytest.CaptureFixture[str], *arguments: str | Path) -> Ran:
    """Run in this process."""
    capsys.readouterr()
    code = main([str(item) for item in arguments])
    out, err = capsys.readouterr()
    return Ran(code=code, out=out, err=err)


def run_apart(
    *arguments: str | Path, environment: Mapping[str, str] | None = None, given: bytes = b""
) -> Ran:
    """Run ``python -m benchtool`` in a process of its own."""
    done = subprocess.run(
        [sys.executable, "-m", "benchtool", *map(str, arguments)],
        input=given,
        capture_output=True,
        env={**os.environ, **(environment or {})},
        check=False,
    )
    return Ran(code=done.returncode, out=done.stdout.decode(), err=done.stderr.decode())
