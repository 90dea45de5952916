"""Fixtures that several rooms share: the misting controller's captures and its design."""

from __future__ import annotations

from pathlib import Path

import pytest
from captures import DESIGN, write_square


@pytest.fixture
def design(tmp_path: Path) -> Path:
    """The design of the spacing stage."""
    path = tmp_path / "mist.toml"
    path.write_text(DESIGN, encoding="utf-8")
    return path


@pytest.fixture
def good(tmp_path: Path) -> Path:
    """A capture of a board as designed."""
    return write_square(tmp_path / "good.csv")


LOWER_BOUNDS = {"designs", "samples", "timing", "report"}
"""Rooms that touch every dependency: their tests also run at the lowest versions."""


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Mark the subset that also runs at the lower bounds of the dependencies."""
    for item in items:
        if item.path.parent.name in LOWER_BOUNDS and "browser" not in item.keywords:
            item.add_marker(pytest.mark.lower_bounds)
