"""From a file name to a capture: whose structure is it, and let that format read it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
from pathlib import Path
from typing import cast

from benchtool.errors import AmbiguousStructureError, BenchtoolError, UnknownStructureError
from benchtool.formats.claim import Claim, Format
from benchtool.formats.content import IN_MEMORY_BYTES, Content, open_content
from benchtool.formats.keptplaces import places
from benchtool.model.capture import Capture, ReadOptions, StructurePoint
from benchtool.plugins import Registry

FORMATS = Registry(
    group="benchtool.formats",
    ours={
        "text": "benchtool.formats.text:FORMAT",
        "vcd": "benchtool.formats.vcd:FORMAT",
        "npz": "benchtool.formats.npz:FORMAT",
        "wav": "benchtool.formats.wav:FORMAT",
    },
)

_DEFAULTS = ReadOptions()
_NOTHING: Mapping[str, str] = {}
_ASSUMED = {
    "assumed-volts": ("volts", "V", "no unit in the file"),
    "assumed-first-edge": ("first row", "an edge", "no like interval to check it against"),
}


def read_capture(
    source: str | Path,
    options: ReadOptions = _DEFAULTS,
    *,
    in_memory_bytes: int = IN_MEMORY_BYTES,
) -> Capture:
    """Read a capture file.

    Args:
        source: Path of the file, or ``-`` for standard input.
        options: What the user overrules about the file's structure.
        in_memory_bytes: A text file up to this size is decoded once and held; a larger one is
            walked in blocks each time its samples are asked for.

    Returns:
        The capture, with the evidence for its structure and a notice for all that was assumed.

    Raises:
        InputError: The file cannot be opened.
        UnknownStructureError: No format claims it.
        AmbiguousStructureError: Two readings are sound; the hint names the option.
        MalformedCaptureError: The file is damaged or holds nothing to measure.
        UsageError: An option cannot apply, or a kept structure has a fault.
    """
    return read_content(open_content(source, in_memory_bytes), options)


def read_content(content: Content, options: ReadOptions = _DEFAULTS) -> Capture:
    """Read a capture whose bytes are at hand; returns and raises as ``read_capture`` does."""
    if options.structure is None and not places(content.source):
        return _read_as(content, options, _NOTHING)
    from benchtool.formats.keptfiles import choose_kept

    kept = choose_kept(content, options.structure)
    if kept is None:
        return _read_as(content, options, _NOTHING)
    from benchtool.formats.kept import merged, said

    chosen, words = merged(options, kept)
    try:
        capture = _read_as(content, chosen, words)
        return said(capture, kept, words, named=options.structure is not None)
    except BenchtoolError as error:
        error.hint += f" (It is {kept.words}; --structure none reads it without.)"
        raise


def _read_as(content: Content, options: ReadOptions, kept: Mapping[str, str]) -> Capture:
    """Read a capture with all options settled; ``kept`` names those that a user keeps."""
    format_ = choose_format(content, options)
    overruled = options != _DEFAULTS
    if overruled:
        from benchtool.formats.overrules import marked, refuse_idle

        refuse_idle(options, format_.name, content.source)
    try:
        capture = format_.read(content, options)
    except AmbiguousStructureError as error:
        if not error.ways:
            raise
        from benchtool.formats.trials import tried

        raise tried(error, format_, content, options) from None
    if options.interval_s is not None:
        from benchtool.formats.retiming import retimed

        capture = retimed(capture, options.interval_s)
    if overruled:
        capture = marked(capture, options, kept)
    whole = replace(
        capture,
        warnings=(*content.warnings, *capture.warnings),
        structure=(*content.structure, *capture.structure, *_assumed_points(capture)),
    )
    return content.settled(whole)


def _assumed_points(capture: Capture) -> Iterator[StructurePoint]:
    """Yield what was assumed and stands nowhere else in the structure."""
    codes = dict.fromkeys(notice.code for notice in capture.warnings)
    for name, value, evidence in (_ASSUMED[code] for code in codes if code in _ASSUMED):
        yield StructurePoint(name=name, value=value, evidence=evidence, sure="assumed")


def choose_format(content: Content, options: ReadOptions) -> Format:
    """Return the format that claims ``content``, or the one that the user named.

    Raises:
        UnknownStructureError: If no format claims it.
        AmbiguousStructureError: If two claim it equally.
        UsageError: If there is no format of the name given.
    """
    if options.format is not None:
        return cast(Format, FORMATS.load(options.format))
    head, tried = content.head(), list[str]()
    for each in (FORMATS.each_of_ours, FORMATS.each_outsider):
        claims = _claims(each(), head, content.suffix, tried)
        if claims:
            return _highest(claims, content.source)
    raise UnknownStructureError(
        f"{content.source} is no capture that any format recognises (tried: {', '.join(tried)})",
        hint="If you know the structure, name it with --format; "
        "otherwise export the capture as delimited text.",
    )


def _claims(
    candidates: Iterator[tuple[str, object]], head: bytes, suffix: str, tried: list[str]
) -> list[tuple[Claim, Format]]:
    claims = []
    for name, loaded in candidates:
        format_ = cast(Format, loaded)
        tried.append(name)
        claim = format_.sniff(head, suffix)
        if claim > Claim.NO:
            claims.append((claim, format_))
    return claims


def _highest(claims: list[tuple[Claim, Format]], source: str) -> Format:
    top = max(claim for claim, _ in claims)
    winners = [format_ for claim, format_ in claims if claim == top]
    if len(winners) == 1:
        return winners[0]
    names = " and ".join(format_.name for format_ in winners)
    raise AmbiguousStructureError(
        f"{source} is claimed by {names} alike",
        hint=f"Say which it is with --format {winners[0].name} or --format {winners[1].name}.",
    )
