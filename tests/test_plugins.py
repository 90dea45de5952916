"""The registry: ours from a table, outsiders by entry point, ours win."""

from __future__ import annotations

import sys
from importlib.metadata import entry_points
from pathlib import Path

import pytest

from benchtool.errors import UsageError
from benchtool.plugins import Registry

GROUP = "benchtool.sprayers"
REGISTRY = Registry(group=GROUP, ours={"fine": "math:pi", "coarse": "math:e"})


@pytest.fixture
def outsider(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A distribution of somebody else's, with a sprayer of its own and one named as ours."""
    (tmp_path / "outside_sprayer.py").write_text("wide = 'wide'\nfine = 'not ours'\n")
    info = tmp_path / "outside_sprayer-1.0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text("Metadata-Version: 2.1\nName: outside-sprayer\nVersion: 1.0\n")
    (info / "entry_points.txt").write_text(
        f"[{GROUP}]\nfine = outside_sprayer:fine\nwide = outside_sprayer:wide\n"
    )
    monkeypatch.syspath_prepend(tmp_path)
    monkeypatch.delitem(sys.modules, "outside_sprayer", raising=False)


def test_ours_are_loaded_by_name() -> None:
    assert REGISTRY.load("fine") == pytest.approx(3.14159, abs=1e-5)


def test_ours_come_in_the_order_of_the_table() -> None:
    assert [name for name, _ in REGISTRY.each_of_ours()] == ["fine", "coarse"]


def test_our_names_need_no_look_up(monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(**_: object) -> None:
        raise AssertionError("looked for outsiders")

    monkeypatch.setattr("importlib.metadata.entry_points", fail)
    REGISTRY.load("coarse")
    list(REGISTRY.each_of_ours())
    with pytest.raises(AssertionError, match="looked"):
        REGISTRY.load("wide")


@pytest.mark.usefixtures("outsider")
def test_an_outsider_is_found_by_its_entry_point() -> None:
    assert {point.name for point in entry_points(group=GROUP)} >= {"wide", "fine"}
    assert REGISTRY.load("wide") == "wide"
    assert "outside_sprayer" in sys.modules


@pytest.mark.usefixtures("outsider")
def test_ours_win_over_an_outsider_of_the_same_name() -> None:
    assert REGISTRY.load("fine") == pytest.approx(3.14159, abs=1e-5)
    assert "outside_sprayer" not in sys.modules


@pytest.mark.usefixtures("outsider")
def test_outsiders_are_listed_without_those_that_ours_hide() -> None:
    assert list(REGISTRY.each_outsider()) == [("wide", "wide")]


@pytest.mark.usefixtures("outsider")
def test_an_unknown_name_lists_all_that_are_known() -> None:
    with pytest.raises(UsageError, match="no sprayer called 'mist'") as caught:
        REGISTRY.load("mist")
    assert caught.value.hint == "Known: coarse, fine, wide."


@pytest.mark.usefixtures("outsider")
def test_an_unknown_format_names_ours_and_theirs() -> None:
    from benchtool.formats import FORMATS

    with pytest.raises(UsageError) as caught:
        FORMATS.load("mist")
    assert {"text", "vcd", "npz", "wav"} <= set(
        caught.value.hint.removeprefix("Known: ")[:-1].split(", ")
    )
