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
