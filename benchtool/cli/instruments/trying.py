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
    from benchtool.model.counted import Counted
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
@click.option("--readings", type=click.IntRange(min=1), metavar="N", help="Of a counter: so many.")
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
        readings=given["readings"],
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

    def read(self, dialect: Dialect, order: Order, log: ExchangeLog | None) -> Capture | Counted:
        """Read one record, or a counter's readings, and tell of each step."""
        from benchtool.jobs.counting import gives_readings
        from benchtool_drivers.opening import open_instrument

        opened = open_instrument(self.resource, dialect=dialect, log=log, tell=self._tell)
        with closing(opened) as instrument:
            self._show_now("draw_trial", self.resource, instrument.identity, dialect.name)
            if gives_readings(instrument):
                return instrument.count(order)
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

    def show(self, dialect: str, found: Capture | Counted) -> None:
        """Show what came of it."""
        from benchtool.model.capture import Capture

        if isinstance(found, Capture):
            traces = [_summary(trace) for trace in found.traces]
            identity = found.origin.instrument or ""
        else:
            traces, identity = _of_readings(found), found.identity
        row = {"resource": self.resource, "dialect": dialect, "steps": self.steps, "traces": traces}
        if not self.output.as_json and self.output.path is None:
            self._show_now("draw_summary", {**row, "file": self.file}, found.warnings)
            return
        notes = [{"code": item.code, "text": item.text} for item in found.warnings]
        rows = [{**row, "warnings": notes}]
        whole = {**row, "file": self.file, "identity": identity}
        screen = "instruments:draw_whole_trial"
        self.output.show_rows("instruments try", rows, screen, whole, found.warnings)

    def _show_now(self, function: str, *content: Any) -> None:
        """Draw a piece on the screen; what goes into a file or a document waits for the end."""
        if self.output.as_json or self.output.path is not None:
            return
        from benchtool.report.screen import instruments as screen

        self.output.draw(lambda console: getattr(screen, function)(console, *content))


def _of_readings(counted: Counted) -> list[dict[str, Any]]:
    """Return what a counter read, in SI units."""
    units = {"frequency": "Hz", "duty": "1"}
    return [
        {
            "channel": name,
            "unit": units.get(name, "s"),
            "samples": int(item.values.size),
            "sample_interval_s": None,
            "least": float(item.values.min()),
            "greatest": float(item.values.max()),
            "step": None,
            "per": item.per,
        }
        for name, item in counted.readings.items()
    ]


def _summary(trace: Any) -> dict[str, Any]:
    """Return what a trace holds, in SI units."""
    import numpy as np

    if hasattr(trace, "times_s"):
        states = {"least": 0.0, "greatest": 1.0, "step": None}
        n = int(trace.times_s.size)
        return {
            "channel": trace.channel,
            "unit": "1",
            "samples": n,
            "sample_interval_s": None,
            **states,
        }
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
