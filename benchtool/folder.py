"""The user's own folder, where kit, dialects and kept structures lie."""

from __future__ import annotations

import os
from pathlib import Path


def user_folder() -> Path | None:
    """Return the folder, which need not be there; None for a user without a home.

    References:
        XDG Base Directory Specification: a relative XDG_CONFIG_HOME is ignored.
    """
    base = Path(os.environ.get("XDG_CONFIG_HOME", ""))
    if not base.is_absolute():
        try:
            base = Path.home() / ".config"
        except RuntimeError:
            return None
    return base / "benchtool"
