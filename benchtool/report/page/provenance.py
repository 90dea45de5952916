"""Where it all comes from: files with their hashes, the design, and the versions that read them."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, datetime

from benchtool.model.result import Analysis, Source
from benchtool.report.page.facts import timebase_rows
from benchtool.report.page.views import Block, Facts, Stamp

_NS_PER_S = 1_000_000_000


def provenance_blocks(analysis: Analysis, stamp: Stamp) -> tuple[Block, ...]:
    """Return sources, timebase, design and versions.

    Args:
        analysis: What was found.
        stamp: Versions and time.
    """
    rows = [*_sources(analysis), *timebase_rows(analysis), *_design(analysis)]
    libraries = ", ".join(f"{name} {version}" for name, version in stamp.versions.items())
    rows.append(("versions", f"benchtool {stamp.version}{', ' if libraries else ''}{libraries}"))
    return (Facts(rows=tuple(rows)),)


def _sources(analysis: Analysis) -> Iterable[tuple[str, str]]:
    if not analysis.sources:
        yield "file", "none: figures as given"
    for source in analysis.sources:
        role = "" if source.role == "main" else f"{source.role}: "
        yield "file", f"{role}{source.name}"
        yield "sha256", source.sha256 or "not known"
        yield "format", _format(source)
        yield "instrument", source.instrument or "the file names none"
        if source.start_ns is not None:
            yield "began", _moment(source.start_ns)


def _format(source: Source) -> str:
    points = ", ".join(f"{point.name} {_legible(point.value)}" for point in source.structure)
    return f"{source.format}{': ' if points else ''}{points}"


def _legible(value: str) -> str:
    """Return a value in quotes where it is a lone mark, such as a delimiter."""
    return f'"{value}"' if len(value) == 1 and not value.isalnum() else value


def _moment(start_ns: int) -> str:
    """Return a moment in UTC to the microsecond; one beyond the calendar as plain seconds."""
    seconds, rest_ns = divmod(start_ns, _NS_PER_S)
    try:
        moment = datetime.fromtimestamp(seconds, UTC)
    except (ValueError, OverflowError, OSError):
        return f"{seconds} s after 1970-01-01 UTC"
    return f"{moment:%Y-%m-%d %H:%M:%S}.{rest_ns // 1000:06d} UTC"


def _design(analysis: Analysis) -> Iterable[tuple[str, str]]:
    if analysis.design is None:
        yield "design", "none given"
        return
    yield "design", analysis.design.source or "not from a file"
    if analysis.design.sha256:
        yield "sha256", analysis.design.sha256
