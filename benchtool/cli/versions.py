"""Versions of what benchtool stands on."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version

_LIBRARIES = ("numpy", "scipy", "pydantic", "click", "rich", "jinja2", "matplotlib")


def library_versions() -> dict[str, str]:
    """Return name to version of Python and the libraries, without importing them."""
    found = {"python": platform.python_version()}
    for name in _LIBRARIES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:
            found[name] = "not installed"
    return found
