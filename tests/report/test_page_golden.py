"""Whole pages as Markdown and plain text, held against files that were read by eye.

Run as a program it writes the files anew; read the difference before keeping it.
"""

from __future__ import annotations

from pathlib import Path

import page_cases as cases
import pytest

from benchtool.report.page import render

GOLDEN = Path(__file__).parent / "golden"
PAGES = {
    "page_failing": cases.failing,
    "page_dead": cases.dead,
    "page_measured": cases.measured_only,
    "page_two_stages": cases.two_stages,
}


@pytest.mark.parametrize("suffix", [".md", ".txt"])
@pytest.mark.parametrize("name", list(PAGES))
def test_the_page_is_as_it_was_read(name: str, suffix: str) -> None:
    expected = (GOLDEN / f"{name}{suffix}").read_text(encoding="utf-8")
    assert render(PAGES[name](), suffix=suffix, **cases.STAMP) == expected  # type: ignore[arg-type]


if __name__ == "__main__":
    for name, make in PAGES.items():
        for suffix in (".md", ".txt"):
            text = render(make(), suffix=suffix, **cases.STAMP)  # type: ignore[arg-type]
            (GOLDEN / f"{name}{suffix}").write_text(text, encoding="utf-8")
