"""Ways out of an ambiguity, each tried before it is offered."""

from __future__ import annotations

from dataclasses import replace

from benchtool.errors import AmbiguousStructureError, BenchtoolError, Way
from benchtool.formats.claim import Format
from benchtool.formats.content import HEAD_BYTES, Content
from benchtool.formats.overrules import OPTIONS
from benchtool.model.capture import ReadOptions


def tried(
    error: AmbiguousStructureError, format_: Format, content: Content, options: ReadOptions
) -> AmbiguousStructureError:
    """Return an error whose hint names only those ways that do lead to a reading.

    Args:
        error: The refusal, with the ways that could settle it.
        format_: The format that refused.
        content: The file, of which the head is tried.
        options: What was overruled already.
    """
    head = _head_of(content)
    good = [way for way in error.ways if _leads_on(way, error, format_, head, options)]
    if good:
        offered = ", or ".join(f"{_typed(way)} ({way.meaning})" for way in good)
        hint = f"Say which with {offered}."
    else:
        hint = "No option makes whole rows of it: export the capture with another delimiter."
    return AmbiguousStructureError(error.message, hint=hint, code=error.code)


def _typed(way: Way) -> str:
    return " ".join(f"{OPTIONS[name]} {_quoted(text)}" for name, text in way.options)


def _quoted(text: str) -> str:
    """Return a value as it must be typed: a shell ends a command at a semicolon or a bar."""
    return f"'{text}'" if text in ";|" else text


def _head_of(content: Content) -> Content:
    head = content.head()
    if content.size > HEAD_BYTES:
        head = head[: head.rfind(b"\n") + 1] or head
    return replace(content, data=head, path=None, size=len(head))


def _leads_on(
    way: Way, error: AmbiguousStructureError, format_: Format, head: Content, options: ReadOptions
) -> bool:
    """Say whether a way leads to a capture, or at least to another question."""
    chosen = replace(options, **dict(way.options))  # type: ignore[arg-type]
    try:
        format_.read(head, chosen)
    except AmbiguousStructureError as other:
        if other.code == "no-time-unit":  # any answer shows whether the rows can be read
            answered = replace(options, time_unit="s")
            return _leads_on(way, error, format_, head, answered)
        return other.message != error.message and not other.ways
    except BenchtoolError:
        return False
    return True
