"""Writing a design file from answers, with comments that say what else could stand there."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import field

from benchtool.designs.notation import key_text, value_text
from benchtool.designs.reading import parse_design
from benchtool.designs.vocabulary import SCHEMA, TOPOLOGY_PARTS, usual_quantities
from benchtool.frozen import frozen_record

Text = str | Mapping[str, str]
"""A value as the file has it: a text, or a table of texts."""

_COMMENT_COLUMN = 34
_WIDTH = 100
_COMMENTS = {
    "supply": 'half-width, or a range: "11.4 V .. 12.6 V"',
    "temperature": 'or a range: "10 .. 40 degC"; part values refer to 25 degC',
    "serial_pattern": "what a serial number must look like",
    "topology": "astable, astable-diode, output-fed, one-shot, schmitt or power-on",
    "channel": "name of the output's trace in the capture",
    "divide": "the output counts so many cycles",
    "RA": "from the supply to the discharge pin",
    "RB": "from the discharge pin to the capacitor",
    "R": "the timing resistor",
    "C": "a table may add kind, tempco, leakage and esr to value and tolerance",
    "ic": "bipolar, cmos, or a table with family and the terms you know",
    "derive": "worst-case, rss or monte-carlo",
    "quantities": "judged by limits that follow from the tolerances",
}


@frozen_record
class NewDesign:
    """The answers from which a design file is written; texts as the file has them.

    Attributes:
        name: What the board is called.
        topology: One of the six topologies.
        parts: RA, RB, C or R, C: "100k 1%" or a table.
        supply: "12 V 5%".
        ic: Family, or a table of terms; a Schmitt inverter needs its thresholds.
        stage: Name of the stage.
        temperature: "25 degC" or a range; None leaves the default.
        assembly, revision, serial_pattern: Of the board, where there are any.
        channel, capacitor, trigger: Names of the traces, where known.
        divide: The output counts so many cycles.
        limits: Quantity to "25 s 5%" or to a table of lower, upper and source.
        derive: How the other limits follow from the tolerances; None judges by ``limits`` alone.
        quantities: What is judged by derived limits; empty for the usual ones.
    """

    name: str
    topology: str
    parts: Mapping[str, Text]
    supply: str
    ic: Text = "cmos"
    stage: str = "main"
    temperature: str | None = None
    assembly: str | None = None
    revision: str | None = None
    serial_pattern: str | None = None
    channel: str | None = None
    capacitor: str | None = None
    trigger: str | None = None
    divide: int = 1
    limits: Mapping[str, Text] = field(default_factory=dict)
    derive: str | None = "worst-case"
    quantities: tuple[str, ...] = ()


def write_design(answers: NewDesign) -> str:
    """Return the TOML text of a design file.

    Raises:
        DesignError: If the answers make no sound design; the lines are those of the text that
            would have been written.
    """
    text = "\n".join(_rows(answers)) + "\n"
    parse_design(text)
    return text


def _rows(answers: NewDesign) -> Iterator[str]:
    yield "# What the board should do: `benchtool design check` finds every fault in this file."
    yield f"schema = {SCHEMA}"
    yield ""
    yield "[board]"
    for key in ("name", "assembly", "revision", "serial_pattern", "supply", "temperature"):
        yield from _row(key, getattr(answers, key))
    yield ""
    yield f"[{key_text(('stage', answers.stage))}]"
    yield from _stage_rows(answers)
    yield ""
    yield f"[{key_text(('stage', answers.stage, 'limits'))}]"
    yield from _limit_rows(answers)


def _stage_rows(answers: NewDesign) -> Iterator[str]:
    yield from _row("topology", answers.topology)
    for key in ("channel", "capacitor", "trigger"):
        yield from _row(key, getattr(answers, key))
    yield from _row("divide", answers.divide if answers.divide != 1 else None)
    order = [*TOPOLOGY_PARTS.get(answers.topology, ()), *answers.parts]
    for ref in dict.fromkeys(ref for ref in order if ref in answers.parts):
        yield from _row(ref, answers.parts[ref])
    yield from _row("ic", answers.ic)


def _limit_rows(answers: NewDesign) -> Iterator[str]:
    if answers.derive is not None:
        usual = usual_quantities(answers.topology, answers.divide)
        yield from _row("derive", answers.derive)
        yield from _row("quantities", answers.quantities or usual)
    for quantity, limit in answers.limits.items():
        yield from _row(quantity, limit)


def _row(key: str, value: object) -> Iterator[str]:
    """Yield ``key = value``, with a comment where there is something to know."""
    if value is None:
        return
    row = f"{key_text((key,))} = {value_text(value)}"
    comment = _COMMENTS.get(key)
    beside = f"{row:<{_COMMENT_COLUMN}}# {comment}"
    if comment is None:
        yield row
    elif len(row) < _COMMENT_COLUMN and len(beside) <= _WIDTH:
        yield beside
    else:
        yield from (f"# {key}: {comment}", row)
