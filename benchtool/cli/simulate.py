"""``benchtool simulate``: a synthetic capture with its truth."""

from __future__ import annotations

from collections.abc import Callable
from io import BytesIO
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options, positive, share, value_of
from benchtool.cli.output import Output, refuse_existing, write_file
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.model.capture import Capture
    from benchtool.simulation import Acquisition, Injected, Ripple

_ROLES = ("output", "capacitor", "supply", "trigger")
_KINDS = ("waveform", "sampled-logic", "logic")


@click.command("simulate")
@click.argument("design", metavar="DESIGN")
@click.option("--stage", metavar="NAME", help="The stage to simulate.")
@click.option("--fault", default="healthy", show_default=True, metavar="NAME", help="Its fault.")
@click.option("--size", metavar="SIZE", help="Size of the fault in its own unit; -20% is a share.")
@click.option("--rate", required=True, metavar="FREQ", help="Samples a second, such as 1kHz.")
@click.option("--duration", metavar="TIME", help="Length of the record.")
@click.option(
    "--periods", type=float, metavar="COUNT", help="Length of the record in nominal periods."
)
@click.option(
    "--kind",
    type=click.Choice(_KINDS),
    default="waveform",
    show_default=True,
    help="Samples in volts, samples 0 and 1, or times of edges.",
)
@click.option(
    "--record", multiple=True, type=click.Choice(_ROLES), help="Trace to record; repeatable."
)
@click.option("--bits", type=int, metavar="COUNT", help="Resolution of the converter.")
@click.option("--noise", metavar="VOLTS", help="Standard deviation of the noise, such as 20mV.")
@click.option("--bandwidth", metavar="FREQ", help="One-pole bandwidth of the input, such as 1MHz.")
@click.option("--jitter", metavar="REL", help="Standard deviation of a period, relative.")
@click.option("--timebase-error", metavar="REL", help="Relative error of the clock.")
@click.option("--ripple", metavar='"REL FREQ"', help='On the supply, such as "2% 100Hz".')
@click.option("--start-up", is_flag=True, help="Switch the supply on inside the record.")
@click.option(
    "--seed",
    type=int,
    metavar="NUMBER",
    default=0,
    show_default=True,
    help="The same number gives the same noise again.",
)
@click.option(
    "--serve",
    type=click.Choice(["tcp", "hislip", "pty"]),
    help="Be an instrument in place of writing a file; pty prints edge times.",
)
@click.option("--port", type=click.IntRange(0, 65535), default=0, help="TCP port of --serve.")
@click.option("--speaks", default="positional", metavar="NAME", help="Structure it speaks.")
@click.option("--trimmer", metavar='"REF LOW HIGH TIME"', help="A part that is turned to and fro.")
@click.option("--pace", type=float, default=1.0, help="Edges so many times faster than in life.")
@output_options
def command(design: str, output: Output, **given: Any) -> int:
    """Simulate a capture of DESIGN into the file of -o: .csv, .vcd or .npz.

    Beside it, with .truth.json added to its name, goes what the capture holds in truth. With
    --serve it is an instrument in place of that, for the live verbs to be tried on.

    \b
    benchtool simulate mist_valve.toml --rate 200Hz --periods 6 -o good.csv
    benchtool simulate mist_valve.toml --fault C-low --size=-20% \\
        --rate 200Hz --periods 6 -o low.csv
    benchtool simulate mist_valve.toml --rate 200Hz --periods 6 --serve tcp
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.designs import load_design
    from benchtool.simulation import simulate_stage
    from benchtool.targets import choose_stages

    path = None if given["serve"] else _target(output.path)
    loaded = load_design(design)
    stages = choose_stages(loaded, given["stage"])
    if len(stages) > 1:
        names = ", ".join(stage.name for stage in stages)
        raise UsageError(f"{design} has {len(stages)} stages", hint=f"Give --stage: {names}.")
    if path is None:
        from benchtool.cli.serving import serve_stage

        return serve_stage(stages[0], loaded, _acquisition(given), _fault(given), given)
    capture, truth = simulate_stage(
        stages[0], loaded, _acquisition(given), fault=_fault(given), seed=given["seed"]
    )
    truth_path = path.with_name(path.name + ".truth.json")
    content = BytesIO()
    _writer(path)(capture, content)
    refuse_existing(truth_path, force=output.force)
    write_file(path, content.getvalue(), force=output.force)
    write_file(truth_path, truth.to_json().encode(), force=output.force)
    if output.as_json:
        output.print_made("simulate", [{"file": str(path), "truth_file": str(truth_path)}])
    output.tell_written([str(path), str(truth_path)], "benchtool look")
    return OK


def _target(name: str | None) -> Path:
    if name is None or name == "-":
        raise UsageError("simulate writes a file", hint="Name it: -o good.csv, .vcd or .npz.")
    _writer(Path(name))
    return Path(name)


def _writer(path: Path) -> Callable[[Capture, BytesIO], None]:
    from benchtool import formats

    writers: dict[str, Callable[[Capture, Any], None]] = {
        ".csv": formats.write_text,
        ".vcd": formats.write_vcd,
        ".npz": formats.write_npz,
    }
    if path.suffix not in writers:
        raise UsageError(f"{path} does not say what to write", hint="End it in .csv, .vcd or .npz.")
    return writers[path.suffix]


def _acquisition(given: dict[str, Any]) -> Acquisition:
    from benchtool.simulation import Acquisition

    return Acquisition(
        rate_hz=positive("--rate", given["rate"], "Hz") or 0.0,
        duration_s=positive("--duration", given["duration"], "s"),
        periods=given["periods"],
        kind=given["kind"],
        bits=given["bits"],
        noise_v=value_of("--noise", given["noise"], "V") or 0.0,
        bandwidth_hz=positive("--bandwidth", given["bandwidth"], "Hz"),
        timebase_rel=value_of("--timebase-error", given["timebase_error"], "1") or 0.0,
        jitter_rel=share("--jitter", given["jitter"]) or 0.0,
        ripple=_ripple(given["ripple"]),
        start_up=given["start_up"],
        record=given["record"] or ("output",),
    )


def _ripple(text: str | None) -> Ripple | None:
    from benchtool.simulation import Ripple

    if text is None:
        return None
    words = text.split()
    if len(words) != 2:
        raise UsageError(
            f"--ripple wants a share and a frequency, got {text!r}", hint='Such as "2% 100Hz".'
        )
    depth = share("--ripple", words[0]) or 0.0
    return Ripple(depth_rel=depth, frequency_hz=positive("--ripple", words[1], "Hz") or 0.0)


def _fault(given: dict[str, Any]) -> Injected:
    from benchtool.circuits import find_fault
    from benchtool.simulation import Injected

    fault = find_fault(given["fault"])
    text = given["size"]
    return Injected(
        name=given["fault"], size=value_of("--size", text, fault.unit) if text else None
    )
