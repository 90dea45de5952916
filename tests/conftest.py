"""Fixtures that several rooms share: the misting controller's captures and its design."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest
from captures import DESIGN, write_square


@pytest.fixture(scope="session", autouse=True)
def no_structures_of_the_user(tmp_path_factory: pytest.TempPathFactory) -> Iterator[None]:
    """Keep what the user of this machine keeps out of the tests."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("XDG_CONFIG_HOME", str(tmp_path_factory.mktemp("config")))
        yield


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


def pytest_configure() -> None:
    """Let the processes that tests begin keep what they compile: there are hundreds of them."""
    os.environ.pop("PYTHONDONTWRITEBYTECODE", None)


LOWER_BOUNDS = {"designs", "drivers", "samples", "timing", "report"}
"""Rooms that touch every dependency: their tests also run at the lowest versions."""


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Mark the subset that also runs at the lower bounds of the dependencies."""
    for item in items:
        if item.path.parent.name in LOWER_BOUNDS and "browser" not in item.keywords:
            item.add_marker(pytest.mark.lower_bounds)
