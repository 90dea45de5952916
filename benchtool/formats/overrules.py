"""What the user overrules: what it can apply to, and how it is shown as evidence."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields, replace
from typing import TYPE_CHECKING

from benchtool.errors import UsageError
from benchtool.model.capture import Capture, ReadOptions, StructurePoint

if TYPE_CHECKING:
    from benchtool.model.window import Window

OPTIONS: Mapping[str, str] = {
    "format": "--format",
    "delimiter": "--delimiter",
    "decimal": "--decimal",
    "time": "--time",
    "time_unit": "--time-unit",
    "interval_s": "--interval or --rate",
    "skip": "--skip",
    "channel": "--channel",
}
"""Each field of :class:`ReadOptions` that settles something, and how the user writes it."""

_TAKEN = {
    "text": frozenset(OPTIONS),
    "vcd": frozenset({"format", "time_unit", "channel"}),
    "npz": frozenset({"format", "time", "time_unit", "interval_s", "channel"}),
    "wav": frozenset({"format", "interval_s", "channel"}),
}
_SHOWN_AS = {"interval_s": "interval"}
_MARKED = ("delimiter", "decimal", "time", "time_unit", "interval_s")


def settled(options: ReadOptions) -> dict[str, object]:
    """Return what options settle, field to value."""
    given = {found.name: getattr(options, found.name) for found in fields(options)}
    return {name: given[name] for name in OPTIONS if given[name] is not None}


def words_of(options: ReadOptions, window: Window | None) -> tuple[str, ...]:
    """Return options as the words of a command line, to read a capture again the same way."""
    words: list[str] = []
    for name, value in settled(options).items():
        shown = f"{value!r}s" if name == "interval_s" else str(value)
        words += [OPTIONS[name].partition(" ")[0], shown]
    if options.structure is not None:
        words += ["--structure", options.structure]
    if window is not None:
        words += ["--from", f"{window.from_s!r}s"] if window.from_s else []
        words += ["--to", f"{window.to_s!r}s"] if window.to_s != float("inf") else []
    return tuple(words)


def refuse_idle(options: ReadOptions, format_name: str, source: str) -> None:
    """Refuse an option that a format has no use for, before it is silently left out.

    Args:
        options: What the user overrules.
        format_name: Name of the reader; what an outsider's takes is not known here.
        source: File name, for the message.

    Raises:
        UsageError: With code ``option-idle``.
    """
    taken = _TAKEN.get(format_name, frozenset(OPTIONS))
    idle = [name for name in settled(options) if name not in taken]
    if idle:
        others = ", ".join(OPTIONS[name] for name in OPTIONS if name in taken)
        raise idle_option(
            idle[0], source, f"it is read as {format_name}", f"Such a file takes: {others}."
        )


def idle_option(name: str, source: str, reason: str, hint: str) -> UsageError:
    """Return the error for an option that cannot apply to a file."""
    return UsageError(
        f"{OPTIONS[name]} cannot apply to {source}: {reason}", hint=hint, code="option-idle"
    )


def marked(capture: Capture, options: ReadOptions, kept: Mapping[str, str]) -> Capture:
    """Return a capture whose structure says which points the user settled.

    Args:
        capture: As the format read it.
        options: What was overruled.
        kept: Fields that a kept structure settled, and the words for it.
    """
    given = settled(options)
    said = {
        _SHOWN_AS.get(name, name): kept.get(name, OPTIONS[name])
        for name in _MARKED
        if name in given
    }
    points = [
        replace(point, evidence=said[point.name], sure="stated") if point.name in said else point
        for point in capture.structure
    ]
    if options.skip:
        words = kept.get("skip", OPTIONS["skip"])
        skipped = f"{options.skip} line{'s' if options.skip > 1 else ''}"
        points.insert(0, StructurePoint(name="skip", value=skipped, evidence=words, sure="stated"))
    return replace(capture, structure=tuple(points))
