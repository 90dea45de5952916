"""Groups whose verbs stand in a table and are imported when called."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from importlib import import_module
from pathlib import Path
from typing import Any

import click

from benchtool.errors import UsageError


@dataclass(frozen=True, slots=True)
class Verb:
    """A verb: the module it lives in, below ``benchtool.cli``, and its line in the help."""

    module: str
    summary: str


class VerbGroup(click.Group):
    """A group that reads its help from the table and imports only the verb that is called.

    Args:
        sections: Heading to verbs, in the order of the help.
        given: What ``click.Group`` takes.
    """

    def __init__(self, *given: Any, sections: Mapping[str, Mapping[str, Verb]], **named: Any):
        super().__init__(*given, **named)
        self.sections = sections
        self.verbs = {name: verb for verbs in sections.values() for name, verb in verbs.items()}

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002 - click's signature
        """Return the verbs in the order of the table."""
        return list(self.verbs)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002 - click's signature
        """Import the verb's module and return its command."""
        if cmd_name not in self.verbs:
            return None
        module = import_module(f"benchtool.cli.{self.verbs[cmd_name].module}")
        command: click.Command = module.command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Find the verb, or say what was meant."""
        if args and args[0] not in self.verbs and not args[0].startswith("-"):
            raise self._unknown(ctx.command_path, args[0])
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:  # noqa: ARG002 - click's signature
        """Write the verbs by heading, without importing them."""
        for title, verbs in self.sections.items():
            with formatter.section(title):
                formatter.write_dl([(name, verb.summary) for name, verb in verbs.items()])

    def _unknown(self, path: str, word: str) -> UsageError:
        if Path(word).is_file():
            from benchtool.report.commands import quoted

            hint = f"Try: benchtool look {quoted(word)}"
            return UsageError(f"{word!r} is a file, not a verb", hint=hint)
        from difflib import get_close_matches

        near = get_close_matches(word.casefold(), self.verbs, n=1)
        hint = f"Did you mean: {path} {near[0]}?" if near else f"See: {path} --help"
        return UsageError(f"there is no verb {word!r}", hint=hint)
