"""The one-page report: a verdict, the figures behind it, and how to get them again."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

from benchtool.errors import UsageError

if TYPE_CHECKING:
    from collections.abc import Mapping

    from benchtool.model.result import Analysis

_WRITERS = {".html": "html", ".md": "markdown", ".txt": "plain"}


def render(
    analysis: Analysis,
    *,
    suffix: str,
    version: str,
    versions: Mapping[str, str],
    made_at: str,
    command_line: str,
) -> str:
    """Return the report on an analysis as the text of a file.

    Args:
        analysis: What was found.
        suffix: ``.html``, ``.md`` or ``.txt``, in either case.
        version: Version of benchtool.
        versions: Name to version of what it stands on.
        made_at: UTC time in ISO 8601 with a Z.
        command_line: The command that made the report.

    Raises:
        UsageError: If there is no report of that suffix (``report-suffix``).
    """
    writer = _WRITERS.get(suffix.lower())
    if writer is None:
        raise UsageError(
            f"there is no report ending in {suffix!r}",
            hint=f"Name the report so that it ends in one of {', '.join(_WRITERS)}.",
            code="report-suffix",
        )
    from benchtool.report.page.content import build_page
    from benchtool.report.page.views import Stamp

    stamp = Stamp(version=version, versions=versions, made_at=made_at, command_line=command_line)
    page = build_page(analysis, stamp)
    written: str = import_module(f"{__name__}.{writer}").write_page(page)
    return written
