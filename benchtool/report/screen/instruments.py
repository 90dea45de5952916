"""Screens about instruments and how they are spoken to."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import groupby
from typing import Any

from rich.console import Console
from rich.text import Text

from benchtool.model.quantity import Notice
from benchtool.report.commands import quoted
from benchtool.report.screen.blocks import (
    draw_cells,
    draw_heading,
    draw_line,
    draw_next,
    draw_notices,
    draw_rows,
)
from benchtool.units import format_value as value_text

Row = Mapping[str, Any]


def draw_found(console: Console, rows: Sequence[Row], notes: Sequence[str]) -> None:
    """Draw what is connected, and where was looked."""
    draw_heading(console, "Connected here", "")
    console.print()
    if rows:
        draw_rows(
            console,
            [(row["resource"], row["about"]) for row in rows],
            heads=("resource", "what it says of itself"),
        )
    else:
        draw_line(console, "nothing was found")
    console.print()
    for note in notes:
        draw_line(console, note, "dim")
    resource = rows[0]["resource"] if rows else "RESOURCE"
    draw_next(console, f"benchtool instruments identify {quoted(resource)}")


def draw_identity(console: Console, row: Row) -> None:
    """Draw who answers, and which dialects fit."""
    draw_heading(console, row["identity"] or "it answers without a name", row["resource"])
    console.print()
    draw_rows(
        console,
        [("fits" if item["fits"] else "-", item["name"], item["why"]) for item in row["dialects"]],
        heads=("", "dialect", "why"),
    )
    for message in row["faulty_files"]:
        draw_line(console, f"not looked at: {message}", "yellow")
    console.print()
    resource = quoted(row["resource"])
    if row["dialect"]:
        draw_line(console, f"It speaks {row['dialect']}, which is remembered for it.", "bold")
        draw_next(console, f"benchtool instruments try {row['dialect']} {resource}")
    elif row["fitting"]:
        names = ", ".join(row["fitting"])
        draw_line(console, f"Several dialects fit: {names}. Say which with --dialect.", "bold")
        draw_next(console, f"benchtool instruments try {row['fitting'][0]} {resource}")
    else:
        draw_line(console, "No dialect fits. Write one beside the manual:", "bold")
        draw_next(console, "benchtool instruments dialects list-of-volts -o mine.toml")


def draw_dialects(console: Console, rows: Sequence[Row], faulty: Sequence[str]) -> None:
    """Draw the dialects there are."""
    draw_heading(console, "Dialects", "")
    console.print()
    for row in rows:
        draw_line(console, f"{row['name']}   {row['kind']}", "bold")
        draw_line(console, row["basis"], deeper=2)
        draw_line(console, row["file"], "dim", deeper=2)
    for message in faulty:
        draw_line(console, f"left out: {message}", "yellow")
    name = rows[0]["name"] if rows else "NAME"
    draw_next(console, f"benchtool instruments dialects {quoted(name)} -o mine.toml")


def draw_keys(console: Console, rows: Sequence[Row]) -> None:
    """Draw all keys of dialect files, table by table."""
    draw_heading(console, "Keys of a dialect file", "")
    for table, group in groupby(rows, key=lambda row: row["table"]):
        console.print()
        draw_line(console, table or "top", "bold")
        draw_rows(console, [(row["key"], _of_key(row)) for row in group])


def _of_key(row: Row) -> str:
    parts = [row["meaning"]]
    if row["default"] == "needed":
        parts.append("(needed)")
    elif row["default"] not in ("none", "''", "", "False"):
        parts.append(f"(else {row['default']})")
    if row["example"]:
        parts.append(f"e.g. {row['example']}")
    return "  ".join(parts)


def draw_checked(console: Console, row: Row) -> None:
    """Draw what a sound dialect does."""
    draw_heading(console, "The dialect is sound", row["file"])
    console.print()
    draw_rows(console, [(item["about"], item["text"]) for item in row["does"]])
    draw_next(console, f"benchtool instruments try {quoted(row['file'])} RESOURCE")


def draw_trial(console: Console, resource: str, identity: str, dialect: str) -> None:
    """Draw what a trial begins with."""
    draw_heading(console, identity or "it answers without a name", resource)
    draw_line(console, f"spoken to in the dialect {dialect}")
    console.print()


def draw_whole_trial(console: Console, row: Row, notices: Sequence[Notice]) -> None:
    """Draw a trial from its beginning to its end."""
    draw_trial(console, row["resource"], row["identity"], row["dialect"])
    for step in row["steps"]:
        draw_step(console, step)
    draw_summary(console, row, notices)


_MARKS = {"sent": ">", "asked": "?", "block": "#", "field": "=", "note": ":"}


def draw_step(console: Console, row: Row) -> None:
    """Draw one step: the command, its answer, and what it means."""
    mark = _MARKS.get(row["kind"], " ")
    deeper = "    " if row["kind"] in ("field", "note") else ""
    start = Text(f"{deeper}{mark} ", style="dim")
    body = Text.assemble((row["command"], "bold" if not deeper else ""))
    if row["answer"]:
        joint = " = " if row["kind"] == "field" else "  " if deeper else "  ->  "
        body.append(f"{joint}{_short(row['answer'])}")
    if row["meaning"]:
        body.append(f"   {row['meaning']}", style="dim")
    draw_cells(console, start, body)


def draw_summary(console: Console, row: Row, notices: Sequence[Notice]) -> None:
    """Draw what a trial gave."""
    console.print()
    for trace in row["traces"]:
        draw_line(console, _of_trace(trace), "bold")
    draw_notices(console, notices)
    dialect, resource = quoted(row.get("file", row["dialect"])), quoted(row["resource"])
    draw_next(console, f"benchtool acquire {resource} --dialect {dialect} -o board.npz")


def _of_trace(trace: Row) -> str:
    if "per" in trace:
        least, greatest = (value_text(trace[key], trace["unit"]) for key in ("least", "greatest"))
        each = "one interval" if trace["per"] == "interval" else "an average over a gate"
        count = f"{trace['channel']}: {trace['samples']} readings"
        return f"{count}, {least} to {greatest}, each {each}"
    dt_s = trace["sample_interval_s"]
    spaced = "with a time each"
    if dt_s:
        spaced = f"{value_text(dt_s, 's')} apart, {value_text(dt_s * trace['samples'], 's')}"
    if trace["unit"] == "1":
        return f"{trace['channel']}: {trace['samples']} logic samples, {spaced}"
    least, greatest = value_text(trace["least"], "V"), value_text(trace["greatest"], "V")
    step = f", one code is {value_text(trace['step'], 'V')}" if trace["step"] else ""
    return f"{trace['channel']}: {trace['samples']} samples, {spaced}, {least} to {greatest}{step}"


def _short(text: str) -> str:
    return text if len(text) <= 160 else f"{text[:150]} .. ({len(text)} characters)"
