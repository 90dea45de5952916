"""``benchtool parts``."""

from __future__ import annotations

import click

from benchtool.cli.commands import PARTS
from benchtool.cli.verbs import VerbGroup


@click.group("parts", cls=VerbGroup, sections=PARTS, no_args_is_help=True)
def command() -> None:
    """Read what parts are marked with."""
