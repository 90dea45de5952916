"""``benchtool instruments try``: a dialect file spoken to an instrument, step by step."""

from __future__ import annotations

from contextlib import closing
from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.instruments.resource import exchange_log, log_option, resource_of
from benchtool.cli.options import output_options, positive
from benchtool.cli.output import Output
from benchtool.frozen import frozen_record

if TYPE_CHECKING:
    from benchtool.instruments import Order
    from benchtool.model.capture import Capture
    from benchtool_drivers.dialect import Dialect
    from benchtool_drivers.digitiser.talk import Told
    from benchtool_drivers.link import ExchangeLog


@click.command("try")
@click.argument("file", metavar="FILE")
@click.argument("resource", metavar="RESOURCE")
@click.option("--channel", "channels", multiple=True, metavar="NAME", help="Channel; repeatable.")
@click.option("--from-memory", is_flag=True, help="Read what the instrument holds; do not arm.")
@click.option("--force-trigger", is_flag=True, help="Trigger by command.")
@click.option("--trigger-timeout", metavar="TIME", help="How long to wait for the trigger.")
@log_option
@output_options
def command(file: str, resource: str, log: str | None, output: Output, **given: Any) -> int:
    """Read one record in the dialect of FILE, and print each command, answer and field.

    FILE may be the name of a dialect. Write one beside the manual of your instrument: run this,
    compare what it prints with the manual, correct the file, run it again.
    """
    from benchtool.cli.cautions import tell_cautions
    from benchtool.instruments import Order
    from benchtool_drivers.dialect import find_dialect

    trial = Trial(file=file, resource=resource_of(resource), output=output, steps=[])
    dialect = find_dialect(file)
    order = Order(
        channels=given["channels"],
        arm=not given["from_memory"],
        force=given["force_trigger"],
        trigger_timeout_s=positive("--trigger-timeout", given["trigger_timeout"], "s"),
    )
    tell_cautions(output)
    with exchange_log(log) as said:
        trial.show(dialect.name, trial.read(dialect, order, said))
    return OK


@frozen_record(eq=False)
class Trial:
    """One run: each step is shown as soon as it is known, so a failure shows what went before."""

    file: str
    resource: str
    output: Output
    steps: list[dict[str, str]]

    def read(self, dialect: Dialect, order: Order, log: ExchangeLog | None) -> Capture:
        """Read one record, and tell of each step."""
        from benchtool_drivers.opening import open_instrument

        opened = open_instrument(self.resource, dialect=dialect, log=log, tell=self._tell)
        with closing(opened) as instrument:
            self._show_now("draw_trial", self.resource, instrument.identity, dialect.name)
            return instrument.acquire(order)

    def _tell(self, told: Told) -> None:
        row = {
            "kind": told.kind,
            "command": told.command,
            "answer": told.answer,
            "meaning": told.meaning,
        }
        self.steps.append(row)
        self._show_now("draw_step", row)

    def show(self, dialect: str, capture: Capture) -> None:
        """Show what came of it."""
        traces = [_summary(trace) for trace in capture.traces]
        row = {"resource": self.resource, "dialect": dialect, "steps": self.steps, "traces": traces}
        if not self.output.as_json and self.output.path is None:
            self._show_now("draw_summary", {**row, "file": self.file}, capture.warnings)
            return
        notes = [{"code": item.code, "text": item.text} for item in capture.warnings]
        rows = [{**row, "warnings": notes}]
        whole = {**row, "file": self.file, "identity": capture.origin.instrument or ""}
        screen = "instruments:draw_whole_trial"
        self.output.show_rows("instruments try", rows, screen, whole, capture.warnings)

    def _show_now(self, function: str, *content: Any) -> None:
        """Draw a piece on the screen; what goes into a file or a document waits for the end."""
        if self.output.as_json or self.output.path is not None:
            return
        from benchtool.report.screen import instruments as screen

        self.output.draw(lambda console: getattr(screen, function)(console, *content))


def _summary(trace: Any) -> dict[str, Any]:
    """Return what a trace holds, in SI units."""
    import numpy as np

    samples = np.concatenate(list(trace.samples.blocks()))
    volts = samples * trace.scale.gain + trace.scale.offset
    dt_s = getattr(trace.time, "dt_s", None)
    return {
        "channel": trace.channel,
        "unit": trace.unit,
        "samples": int(samples.size),
        "sample_interval_s": dt_s,
        "least": float(np.nanmin(volts)),
        "greatest": float(np.nanmax(volts)),
        "step": trace.scale.step_v,
    }
