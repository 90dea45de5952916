"""``benchtool instruments``."""

from __future__ import annotations

import click

from benchtool.cli.commands import INSTRUMENTS
from benchtool.cli.verbs import VerbGroup


@click.group("instruments", cls=VerbGroup, sections=INSTRUMENTS, no_args_is_help=True)
def command() -> None:
    """See what is connected, and how each instrument is spoken to."""
