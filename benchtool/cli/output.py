"""Where results go: screen, JSON, a file; whole files or none."""

from __future__ import annotations

import json
import os
import shlex
import sys
from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchtool import __version__
from benchtool.errors import InputError, UsageError
from benchtool.frozen import frozen_record

if TYPE_CHECKING:
    from rich.console import Console

    from benchtool.model.result import Analysis


@frozen_record
class Output:
    """What the user chose of ``--json``, ``-o``, ``--quiet``, ``--no-color``, ``--force``."""

    as_json: bool = False
    path: str | None = None
    quiet: bool = False
    no_color: bool = False
    force: bool = False

    def show(self, analysis: Analysis, *, report: str | None = None, budget: bool = False) -> None:
        """Print an analysis as JSON or draw its screen, and write its report where one is asked.

        Args:
            analysis: What was found.
            report: Name of the report to write; its ending says which kind.
            budget: Whether to show what each uncertainty is made of.
        """
        if report is not None:
            self._write_report(analysis, Path(report))
        if self.as_json:
            from benchtool.report.document import analysis_document

            stamp = made_at()
            self.print_json(
                analysis_document(analysis, version=__version__, made_at=stamp, budget=budget)
            )
        elif not (self.quiet and self.path is None):
            from benchtool.report.screen import draw_analysis

            self.draw(lambda console: draw_analysis(console, analysis, budget=budget))

    def _write_report(self, analysis: Analysis, path: Path) -> None:
        from benchtool.cli.versions import library_versions
        from benchtool.report.page import render

        page = render(
            analysis,
            suffix=path.suffix,
            version=__version__,
            versions=library_versions(),
            made_at=made_at(),
            command_line=shlex.join(["benchtool", *sys.argv[1:]]),
        )
        write_file(path, page.encode(), force=self.force)

    def show_rows(
        self, command: str, rows: list[dict[str, Any]], screen: str, *content: Any
    ) -> None:
        """Print the rows of a verb that measures nothing as JSON, or draw its screen.

        Args:
            command: Name of the verb.
            rows: What it found, ready for JSON.
            screen: ``module:function`` below ``benchtool.report.screen``.
            content: What that function draws.
        """
        if self.as_json:
            from benchtool.report.document import rows_document

            self.print_json(rows_document(command, rows, version=__version__, made_at=made_at()))
            return
        from importlib import import_module

        module, _, name = screen.partition(":")
        function = getattr(import_module(f"benchtool.report.screen.{module}"), name)
        self.draw(lambda console: function(console, *content))

    def print_json(self, document: dict[str, Any]) -> None:
        """Print one JSON document."""
        self._deliver(json.dumps(document, allow_nan=False) + "\n")

    def draw(self, draw: Callable[[Console], None]) -> None:
        """Draw on the screen, or into the file of ``-o`` without colour."""
        if self.quiet and self.path is None:
            return
        from benchtool.cli.progress import make_room
        from benchtool.cli.screen import make_console

        make_room()
        if self.path is None:
            draw(make_console(sys.stdout, no_color=self.no_color))
            return
        from io import StringIO

        page = StringIO()
        draw(make_console(page, no_color=True))
        self._deliver(page.getvalue())

    def print_text(self, command: str, text: str) -> None:
        """Print text that is the result itself, such as a design file; into a document by --json.

        Args:
            command: Name of the verb.
            text: The result.
        """
        to_file = self.path not in (None, "-")
        if to_file or not self.as_json:
            self._deliver(text)
        if self.as_json:
            self.print_made(command, [{"file": self.path if to_file else None, "text": text}])

    def print_made(self, command: str, rows: list[dict[str, Any]]) -> None:
        """Print the document of a verb whose result is a file, on stdout whatever ``-o`` says."""
        from benchtool.report.document import rows_document

        document = rows_document(command, rows, version=__version__, made_at=made_at())
        replace(self, path=None).print_json(document)

    def tell_written(self, names: list[str], following: str) -> None:
        """Say on stderr what was written and which verb takes it, unless told not to."""
        if self.quiet or self.as_json:
            return
        from benchtool.report.commands import quoted
        from benchtool.report.text import printable

        said = printable(f"wrote {' and '.join(names)}")
        command = printable(f"{following} {quoted(names[0])}")
        sys.stderr.write(f"{said}\nNext:  {command}\n")

    def _deliver(self, text: str) -> None:
        if self.path is None or self.path == "-":
            if self.as_json or not self.quiet:
                from benchtool.cli.progress import make_room
                from benchtool.report.text import spelled

                make_room()
                sys.stdout.write(spelled(text, sys.stdout.encoding or "utf-8"))
            return
        write_file(Path(self.path), text.encode(), force=self.force)


def write_file(path: Path, content: bytes, *, force: bool) -> None:
    """Write a whole file or none; a device or a pipe is written to and stays what it is.

    Raises:
        UsageError: As ``refuse_existing``.
        InputError: If the folder cannot be written.
    """
    refuse_existing(path, force=force)
    try:
        if _is_special(path):
            path.write_bytes(content)
        else:
            _replace(path.resolve(), content)
    except OSError as error:
        raise InputError(
            f"{path} could not be written: {error.strerror}",
            hint="Check the folder, its permissions and the free space.",
            code="not-writable",
        ) from error


def refuse_existing(path: Path, *, force: bool) -> None:
    """Refuse to replace a file without ``force``, and a dash in place of a name.

    Raises:
        UsageError: If the file exists, or the name is a dash.
    """
    if str(path) == "-":
        raise UsageError("- names no file to write", hint="Give a file name.")
    if path.exists() and not force and not _is_special(path):
        raise UsageError(
            f"{path} exists and was left as it is",
            hint="Give --force to replace it, or another name.",
            code="file-exists",
        )


def _is_special(path: Path) -> bool:
    return path.exists() and not path.is_file() and not path.is_dir()


def _replace(path: Path, content: bytes) -> None:
    import tempfile  # start-up without it is 5 ms shorter

    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(content)
        Path(name).chmod(0o666 & ~_umask())
        Path(name).replace(path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def made_at() -> str:
    """Return the time of the document; SOURCE_DATE_EPOCH fixes it for repeatable output."""
    fixed = os.environ.get("SOURCE_DATE_EPOCH", "")
    if fixed:
        try:
            moment = datetime.fromtimestamp(int(fixed), UTC)
        except (ValueError, OverflowError, OSError) as error:
            raise UsageError(
                f"SOURCE_DATE_EPOCH is {fixed!r}, not a number of seconds",
                hint="Set it to whole seconds since 1970, or unset it.",
            ) from error
    else:
        moment = datetime.now(UTC)
    return moment.strftime("%Y-%m-%dT%H:%M:%SZ")
