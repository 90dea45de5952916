"""Keeping a structure: the file that is written, and what is said of it."""

from __future__ import annotations

from pathlib import Path

import click

from benchtool.cli.output import Output, write_file
from benchtool.errors import UsageError
from benchtool.formats.content import open_content
from benchtool.formats.keeping import added, check_name, match_of, table_of
from benchtool.formats.kept import merged, read_kept
from benchtool.formats.keptfiles import choose_kept, read_text
from benchtool.formats.keptplaces import beside, of_the_user
from benchtool.formats.overrules import settled
from benchtool.formats.reading import choose_format
from benchtool.frozen import frozen_record
from benchtool.model.capture import ReadOptions


@frozen_record
class KeptFile:
    """What is to be written: the file's whole text, and what is new in it."""

    path: Path
    text: str
    name: str
    table: str
    source: str


def keep_structure(
    source: str, name: str, options: ReadOptions, *, everywhere: bool, force: bool
) -> KeptFile:
    """Return the file that keeps what was settled about a capture's structure.

    What a kept structure settled already is taken over, where no option says otherwise.

    Args:
        source: The capture.
        name: Name to keep it under.
        options: What the user settled.
        everywhere: Whether to keep it in the user's folder, not beside the capture.
        force: Whether a structure of the same name may be replaced.

    Raises:
        UsageError: If nothing was settled (``nothing-to-keep``), the name is taken
            (``file-exists``), or the file there has a fault.
    """
    check_name(name)
    content = open_content(source)
    applied = choose_kept(content, options.structure)
    if applied is not None:
        options, _ = merged(options, applied)
    settles = settled(options)
    if not settles:
        raise UsageError(
            f"nothing was settled about {source} that could be kept",
            hint="Give the options that make it read right, such as --time-unit ms.",
            code="nothing-to-keep",
        )
    path = of_the_user() if everywhere else beside(source)
    if path is None:
        raise _no_place(everywhere=everywhere)
    text = read_text(path) if path.exists() else ""
    if not force and name in {kept.name for kept in read_kept(text, str(path))}:
        raise UsageError(
            f"{name} is kept in {path} already",
            hint="Give --force to replace it, or another name.",
            code="file-exists",
        )
    match = match_of(content, options, choose_format(content, options).name)
    table = table_of(name, match, settles)
    return KeptFile(path=path, text=added(text, name, table), name=name, table=table, source=source)


def _no_place(*, everywhere: bool) -> UsageError:
    if everywhere:
        return UsageError("you have no folder of your own", hint="Set HOME, or XDG_CONFIG_HOME.")
    return UsageError("nothing lies beside standard input", hint="Add --everywhere.")


def write_structure(kept: KeptFile, output: Output) -> None:
    """Write the file whole, and say on stderr what is kept now, unless told not to."""
    read_kept(kept.text, str(kept.path))
    kept.path.parent.mkdir(parents=True, exist_ok=True)
    write_file(kept.path, kept.text.encode(), force=True)
    if output.quiet or output.as_json:
        return
    from benchtool.report.commands import quoted
    from benchtool.report.text import printable

    lines = "\n".join(f"  {printable(line)}" for line in kept.table.splitlines())
    click.echo(f"kept in {printable(str(kept.path))}:\n{lines}", err=True)
    click.echo(printable(f"Next:  benchtool look {quoted(kept.source)}"), err=True)
