"""``benchtool design``."""

from __future__ import annotations

import click

from benchtool.cli.commands import DESIGN
from benchtool.cli.verbs import VerbGroup


@click.group("design", cls=VerbGroup, sections=DESIGN, no_args_is_help=True)
def command() -> None:
    """Make, check and show design files (TOML): what a board is meant to do."""
