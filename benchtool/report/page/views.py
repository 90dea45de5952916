"""What a page shows, in the order it shows it: plain text, free of any markup.

A page is sheets, a sheet is sections, a section is blocks. Each writer knows how to write each
kind of block and nothing about analyses.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import ClassVar

from benchtool.frozen import frozen_record
from benchtool.model.judgement import VerdictName
from benchtool.model.result import StageResult
from benchtool.report.compass import Point
from benchtool.report.numberline import NumberLine
from benchtool.report.suspicion import Row


@frozen_record
class Stamp:
    """Who made the page, when and how: what the analysis itself does not hold."""

    version: str
    versions: Mapping[str, str]
    made_at: str
    command_line: str


@frozen_record
class Verdict:
    """A word and a sentence; ``name`` is None where nothing was judged."""

    word: str
    sentence: str
    name: VerdictName | None = None

    @property
    def of_all(self) -> str:
        """What a verdict on several stages or traces is about."""
        return "The board" if self.name else "All traces"


@frozen_record
class Prose:
    """A paragraph."""

    kind: ClassVar[str] = "prose"
    text: str


@frozen_record
class Facts:
    """Names, each with what is said of it."""

    kind: ClassVar[str] = "facts"
    rows: tuple[tuple[str, str], ...]


@frozen_record
class Grid:
    """A table.

    Attributes:
        caption: What it shows, for those who do not see it.
        heads: A heading for each column.
        rows: Cells, the first of each row its heading.
        names: The name that commands and files use for each row; empty where there is none.
        verdicts: The verdict in the last cell of each row; empty where none was given.
        numeric: Columns that hold figures.
    """

    kind: ClassVar[str] = "grid"
    caption: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    names: tuple[str, ...] = ()
    verdicts: tuple[VerdictName | None, ...] = ()
    numeric: frozenset[int] = frozenset()


@frozen_record
class Line:
    """The number line of one check, with its figures in words.

    Attributes:
        name: Timing name.
        label: The same in words.
        value: The measured value with its U, or a bound.
        lower, upper: The limits; empty where open.
        accepted: What the guard band leaves.
        verdict: The verdict of the check.
        at_least, at_most: What is known in place of a value.
        scale: Where all this lies.
    """

    name: str
    label: str
    value: str
    lower: str
    upper: str
    accepted: str
    verdict: VerdictName
    scale: NumberLine
    at_least: float | None = None
    at_most: float | None = None


@frozen_record
class Lines:
    """A number line for each check."""

    kind: ClassVar[str] = "lines"
    lines: tuple[Line, ...]


@frozen_record(eq=False)
class Pictures:
    """What can be drawn of a result: its trace, the histogram of its periods, them over time."""

    kind: ClassVar[str] = "pictures"
    result: StageResult


@frozen_record
class Bars:
    """Suspects, each with a bar as long as its probability."""

    kind: ClassVar[str] = "bars"
    rows: tuple[Row, ...]


@frozen_record
class Compass:
    """Which way high and low time went, beside where faults lead."""

    kind: ClassVar[str] = "compass"
    points: tuple[Point, ...]


@frozen_record
class Note:
    """A finding or a warning."""

    word: str
    text: str
    code: str


@frozen_record
class Notes:
    """Findings and warnings."""

    kind: ClassVar[str] = "notes"
    notes: tuple[Note, ...]


@frozen_record
class Command:
    """A command to copy."""

    kind: ClassVar[str] = "command"
    text: str


Block = Prose | Facts | Grid | Lines | Pictures | Bars | Compass | Notes | Command


@frozen_record(eq=False)
class Section:
    """Blocks under a title; ``key`` tells a writer where it belongs."""

    key: str
    title: str
    blocks: tuple[Block, ...]


@frozen_record(eq=False)
class Sheet:
    """All that is shown of one stage or one trace."""

    title: str
    verdict: Verdict
    sections: tuple[Section, ...]


@frozen_record(eq=False)
class Page:
    """The whole report.

    Attributes:
        title: The board, or the file where there is no design.
        subtitle: What tells it from others of its kind.
        source: The file or files it is about.
        made: When and by what it was made.
        verdict: Of the board.
        sheets: One for each stage or trace.
        closing: What holds for all of them.
    """

    title: str
    subtitle: str
    source: str
    made: str
    verdict: Verdict
    sheets: tuple[Sheet, ...]
    closing: tuple[Section, ...]
