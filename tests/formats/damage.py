"""A wave with known times, and how a run on a file of it ends.

The misting controller's spacing stage: high for 14 s, low for 10.5 s, a sample each 0.5 s.
"""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from benchtool.cli.main import main

DT_S, HIGH_S, LOW_S, N = 0.5, 14.0, 10.5, 600
HEAD = "Time (s),OUT (V)"


def volts(k: int) -> float:
    """Return sample ``k``; high from 1.25 s before the record on."""
    return 12.0 if (k * DT_S + 1.25) % (HIGH_S + LOW_S) < HIGH_S else 0.0


def row(k: int) -> str:
    """Return sample ``k`` as a row of text."""
    return f"{k * DT_S:.1f},{volts(k):.2f}"


def table(rows: list[str], head: str = HEAD, end: str = "\n") -> bytes:
    """Return a header and rows as a file."""
    return (end.join([head, *rows]) + end).encode()


ROWS = [row(k) for k in range(N)]
WHOLE = table(ROWS)


def at_row(k: int, text: str) -> list[str]:
    """Return all rows with one replaced."""
    return [*ROWS[:k], text, *ROWS[k + 1 :]]


@dataclass(frozen=True, kw_only=True)
class End:
    """How a run ended."""

    code: int
    document: dict[str, Any]

    @property
    def error(self) -> str:
        """Code of the error."""
        return str(self.document["error"]["code"])

    @property
    def said(self) -> str:
        """All notices, one a line, with their codes."""
        told = [*self.document["warnings"], *self.document["results"][0]["warnings"]]
        return "\n".join(f"{notice['code']}: {notice['text']}" for notice in told)

    @property
    def n_samples(self) -> int:
        """Samples of the trace that was measured."""
        return int(self.document["results"][0]["trace"]["samples"])

    def demand_truth(self, *, scale: float = 1.0) -> None:
        """Demand both widths to be what the wave has, within their own uncertainty."""
        timing = self.document["results"][0]["timing"]
        for name, truth_s in (("t_high", HIGH_S), ("t_low", LOW_S)):
            found = timing[name]
            assert abs(found["value"] - truth_s * scale) <= found["U"], name
            assert found["U"] < 0.05 * truth_s * scale, "an uncertainty that says nothing"


Measure = Callable[..., End]


def measured(capsys: pytest.CaptureFixture[str], path: Path, *more: str) -> End:
    """Measure a file for its document, and for the screen; both must end alike and be calm."""
    arguments = ["measure", str(path), *more]
    code = main([*arguments, "--json"])
    out, err = capsys.readouterr()
    assert err == ""
    document = json.loads(out)
    assert main(arguments) == code
    shown = "".join(capsys.readouterr())
    assert "Traceback" not in shown
    assert re.search(r"[\x00-\x08\x0b-\x1f\x7f-\x9f]", shown) is None, "control codes on screen"
    if "error" in document:
        error = document["error"]
        assert error["code"] != "internal", error["message"]
        assert "\n" not in error["message"].replace(str(path), "")
        assert shown.startswith("benchtool: ")
        assert error["hint"].endswith(".")
        assert f"benchtool explain {error['code']}" in shown
    return End(code=code, document=document)
