"""Make the sample captures: ``python sample_captures/make.py [FOLDER]``.

Every file is simulated from its design with a fixed seed, so the same bytes come out again. The
layouts are invented; each is one of the structures that saved captures come in.
"""

from __future__ import annotations

import gzip
import io
import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from benchtool.circuits import apply_fault, circuit_at
from benchtool.designs import load_design
from benchtool.formats import write_vcd
from benchtool.model.capture import Capture, LogicTrace, UniformTime, Waveform
from benchtool.simulation import HEALTHY, Acquisition, Injected, Ripple, Truth, simulate

HERE = Path(__file__).parent
BOARD_WITHOUT_LEAK = {"leakage": 0.0}

Layout = Callable[[Capture], bytes]


def volts_of(trace: Waveform) -> np.ndarray:
    """Return the samples in volts."""
    codes = np.concatenate(list(trace.samples.blocks()))
    return codes * trace.scale.gain + trace.scale.offset


def times_of(trace: Waveform) -> np.ndarray:
    """Return the time of each sample, seconds."""
    assert isinstance(trace.time, UniformTime)
    return np.arange(trace.samples.size) * trace.time.dt_s


def columns_of(capture: Capture) -> tuple[list[str], list[np.ndarray]]:
    """Return names and volts of all traces, the times first."""
    traces = [trace for trace in capture.traces if isinstance(trace, Waveform)]
    names = [trace.channel for trace in traces]
    return names, [times_of(traces[0]), *(volts_of(trace) for trace in traces)]


def rows(columns: list[np.ndarray], formats: list[str], delimiter: str, end: str = "\n") -> str:
    """Return one line a sample, each column in its own format."""
    lines = (
        delimiter.join(form % value for form, value in zip(formats, row, strict=True))
        for row in zip(*columns, strict=True)
    )
    return "".join(line + end for line in lines)


def plain(capture: Capture) -> bytes:
    """Units in the header, comma, seconds."""
    names, columns = columns_of(capture)
    head = ",".join(["Time (s)", *(f"{name} (V)" for name in names)])
    return f"{head}\n{rows(columns, ['%.4f', *['%.3f'] * len(names)], ',')}".encode()


def zipped(capture: Capture) -> bytes:
    """The plain layout, compressed; the time of packing is left out of the file."""
    return gzip.compress(plain(capture), mtime=0)


def tabbed(capture: Capture) -> bytes:
    """Tabs, milliseconds, remarks before the header."""
    names, columns = columns_of(capture)
    head = "\t".join(["t [ms]", *(f"{name} [V]" for name in names)])
    columns[0] = columns[0] * 1e3
    remarks = "# soak bench 2, slot 14\n# invented data\n"
    return f"{remarks}{head}\n{rows(columns, ['%.0f', '%.3f'], chr(9))}".encode()


def interval_in_remarks(capture: Capture) -> bytes:
    """No time column: the interval stands among the remarks before the header."""
    names, columns = columns_of(capture)
    remarks = (
        "Record,misting controller (invented)\n"
        f"Sample interval,{columns[0][1]:.6g},s\n"
        f"Samples,{columns[0].size}\n\n"
    )
    head = ",".join(f"{name} (V)" for name in names)
    return f"{remarks}{head}\n{rows(columns[1:], ['%.3f'] * len(names), ',')}".encode()


def numbered(capture: Capture) -> bytes:
    """An index column, quoted names, a delimiter at the end of each line."""
    names, columns = columns_of(capture)
    head = ",".join(f'"{name}"' for name in ["Sample", "Time (s)", *(f"{n} (V)" for n in names)])
    index = np.arange(columns[0].size)
    body = rows([index, *columns], ["%d", "%.4f", *["%.3f"] * len(names)], ",", ",\n")
    return f"{head},\n{body}".encode()


def european(capture: Capture) -> bytes:
    """Byte order mark, semicolons, decimal commas, a row of units, carriage returns."""
    names, columns = columns_of(capture)
    head = ";".join(["Time", *names]) + "\r\n" + ";".join(["s", *["V"] * len(names)]) + "\r\n"
    body = rows(columns, ["%.3f"] * len(columns), ";", "\r\n").replace(".", ",")
    return ("\ufeff" + head + body).encode()


def exponents(capture: Capture) -> bytes:
    """Columns apart by blanks, engineering exponents, a foot line."""
    names, columns = columns_of(capture)
    head = " ".join(["Time(s)", *(f"{name}(V)" for name in names)])
    body = rows(columns, ["%.5E", *["%.3E"] * len(names)], " ")
    return f"{head}\n{body}".encode()


def sampled_states(capture: Capture) -> bytes:
    """A logic column of 0 and 1."""
    names, columns = columns_of(capture)
    head = ",".join(["Time (s)", *names])
    return f"{head}\n{rows(columns, ['%.2f', '%d'], ',')}".encode()


def transition_list(capture: Capture) -> bytes:
    """Time and state of each transition; the first line is the state at the start."""
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    span = trace.spans[0]
    lines = [f"Time (s),{trace.channel}", f"{0:.3f},{int(span.starts_high)}"]
    pairs = zip(trace.times_s, trace.states, strict=True)
    lines += [f"{time:.3f},{int(state)}" for time, state in pairs]
    return ("\n".join(lines) + "\n").encode()


def value_changes(capture: Capture) -> bytes:
    """Return a value change dump."""
    dump = io.BytesIO()
    write_vcd(capture, dump)
    return dump.getvalue()


@dataclass(frozen=True, kw_only=True)
class Sample:
    """One sample: a board, what is wrong with it, how it is recorded and written."""

    file: str
    design: str
    acquisition: Acquisition
    layout: Layout
    seed: int
    board: Mapping[str, float] = field(default_factory=lambda: BOARD_WITHOUT_LEAK)
    fault: Injected = HEALTHY


def slow(**changes: object) -> Acquisition:
    """Return how the spacing stage is recorded: 150 s at 100 samples a second, 8 bits."""
    settings: dict[str, object] = {
        "rate_hz": 100.0,
        "duration_s": 150.0,
        "bits": 8,
        "noise_v": 0.04,
        "jitter_rel": 5e-4,
        "timebase_rel": 12e-6,
    }
    return Acquisition(**{**settings, **changes})  # type: ignore[arg-type]


VALVE, NODE, POWER_UP = "mist_valve.toml", "mist_valve_node.toml", "mist_valve_power_up.toml"

SAMPLES = (
    Sample(file="good_board.csv", design=VALVE, acquisition=slow(), layout=plain, seed=101),
    Sample(
        file="marginal_board.tsv",
        design=VALVE,
        acquisition=slow(),
        layout=tabbed,
        seed=102,
        board={"leakage": 0.0, "C": 41.76e-6},
    ),
    Sample(
        file="c_20_percent_low.csv",
        design=VALVE,
        acquisition=slow(),
        layout=interval_in_remarks,
        seed=103,
        fault=Injected(name="C-low", size=-0.2),
    ),
    Sample(
        file="leaky_c.csv",
        design=VALVE,
        acquisition=slow(rate_hz=80.0, duration_s=160.0),
        layout=numbered,
        seed=104,
        fault=Injected(name="C-leaky", size=2.2e6),
    ),
    Sample(
        file="wrong_rb.txt",
        design=VALVE,
        acquisition=slow(rate_hz=50.0),
        layout=exponents,
        seed=105,
        board={"leakage": 0.0, "RB": 33e3},
    ),
    Sample(
        file="rippling_supply.csv.gz",
        design=VALVE,
        acquisition=slow(
            rate_hz=125.0,
            duration_s=130.0,
            jitter_rel=0.0,
            ripple=Ripple(depth_rel=0.05, frequency_hz=100.0),
            record=("output", "supply"),
        ),
        layout=zipped,
        seed=106,
    ),
    Sample(
        file="one_shot.csv",
        design="mist_pulse.toml",
        acquisition=slow(
            rate_hz=80.0,
            trigger_every_s=24.76,
            trigger_width_s=0.25,
            record=("output", "trigger"),
            names={"output": "VALVE", "trigger": "TRIG"},
        ),
        layout=plain,
        seed=107,
    ),
    Sample(
        file="schmitt_heartbeat.csv",
        design="mist_heartbeat.toml",
        acquisition=slow(
            rate_hz=500.0,
            duration_s=20.0,
            bandwidth_hz=40.0,
            jitter_rel=1e-3,
            names={"output": "LAMP"},
        ),
        layout=interval_in_remarks,
        seed=108,
    ),
    Sample(
        file="power_up.csv",
        design=POWER_UP,
        acquisition=slow(rate_hz=80.0, start_up=True, power_up_s=5.0, record=("output", "supply")),
        layout=plain,
        seed=109,
    ),
    Sample(
        file="good_board.vcd",
        design=VALVE,
        acquisition=slow(kind="logic", rate_hz=1e3),
        layout=value_changes,
        seed=110,
    ),
    Sample(
        file="good_board_transitions.csv",
        design=VALVE,
        acquisition=slow(kind="logic", rate_hz=1e3),
        layout=transition_list,
        seed=111,
    ),
    Sample(
        file="good_board_european.txt", design=VALVE, acquisition=slow(), layout=european, seed=112
    ),
    Sample(
        file="good_board_states.csv",
        design=VALVE,
        acquisition=slow(kind="sampled-logic"),
        layout=sampled_states,
        seed=113,
    ),
    Sample(
        file="node_probed.csv",
        design=NODE,
        acquisition=slow(rate_hz=50.0, bits=12, noise_v=0.01, record=("capacitor",)),
        layout=plain,
        seed=114,
    ),
    Sample(
        file="stuck_high.csv",
        design=VALVE,
        acquisition=slow(rate_hz=50.0, duration_s=60.0, jitter_rel=0.0),
        layout=plain,
        seed=115,
        fault=Injected(name="C-leaky", size=700e3),
    ),
    Sample(
        file="too_short.csv",
        design=VALVE,
        acquisition=slow(duration_s=20.0),
        layout=plain,
        seed=116,
    ),
)


def make(sample: Sample) -> tuple[bytes, Truth]:
    """Return the bytes of a sample and its truth."""
    design = load_design(HERE / sample.design)
    circuit = circuit_at(design.stages[0], design, sample.board)
    faulty = apply_fault(sample.fault.name, circuit, sample.fault.size)
    capture, truth = simulate(faulty, sample.acquisition, np.random.default_rng(sample.seed))
    named = truth.labelled(fault=sample.fault.name, fault_size=sample.fault.size, seed=sample.seed)
    return sample.layout(capture), named


def main(folder: Path) -> None:
    """Write all samples into ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    for sample in SAMPLES:
        content, _ = make(sample)
        (folder / sample.file).write_bytes(content)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
