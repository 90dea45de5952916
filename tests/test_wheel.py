"""In the second run of the checks it is the installed wheel that is tested."""

from __future__ import annotations

import os
from importlib.resources import files
from pathlib import Path

import pytest

import benchtool
import benchtool_drivers


@pytest.mark.skipif("BENCHTOOL_WHEEL" not in os.environ, reason="the sources are tested")
def test_the_package_lies_in_site_packages() -> None:
    for package in (benchtool, benchtool_drivers):
        assert "site-packages" in Path(package.__file__).parts


@pytest.mark.parametrize(
    "name",
    ["py.typed", "report/document.schema.json", "report/page/templates", "manual/topics"],
)
def test_the_package_carries_its_data(name: str) -> None:
    resource = files("benchtool").joinpath(name)
    assert resource.is_file() or any(resource.iterdir())


@pytest.mark.parametrize("name", ["py.typed", "dialects"])
def test_the_drivers_carry_their_data(name: str) -> None:
    resource = files("benchtool_drivers").joinpath(name)
    assert resource.is_file() or any(item.name.endswith(".toml") for item in resource.iterdir())
