"""Simulated instruments with the dialects that are meant for them, and what they hold."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager

import numpy as np

from benchtool.instruments import Instrument
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, UniformTime, Waveform
from benchtool_drivers.link import LinkSettings
from benchtool_drivers.loopback.families import make_family
from benchtool_drivers.loopback.families.instrument import SimulatedInstrument
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

DIALECTS = {
    "positional": "positional-start-stop",
    "keyed": "keyvalue-offset-count",
    "standard": "scpi99-trace",
    "described": "descriptor-block",
    "listed": "list-of-volts",
}
TRANSPORTS = ("socket", "hislip", "vxi11", "usbtmc", "pty")
DT_S = 1e-5
QUICK = LinkSettings(timeout_s=0.3, block_timeout_s=0.3)


def square(n: int = 2000, seed: int = 1) -> FloatArray:
    """Return a square wave of 0.1 V and 5 V with 20 mV of noise."""
    noise = np.random.default_rng(seed).normal(0, 0.02, n)
    wave: FloatArray = np.where(np.arange(n) % 200 < 80, 5.0, 0.1) + noise
    return wave


def simulated(
    family: str, *, fault: str | None = None, running: bool = False, n: int = 2000
) -> SimulatedInstrument:
    """Return an instrument with two channels."""
    return make_family(
        family, volts=[square(n, 1), square(n, 2)], dt_s=DT_S, fault=fault, running=running
    )


@contextmanager
def opened(subject: SimulatedInstrument, transport: str, family: str) -> Iterator[Instrument]:
    """Serve an instrument, and open it in the dialect meant for it."""
    with (
        serve(subject, transport) as resource,
        closing(open_instrument(resource, dialect=DIALECTS[family], settings=QUICK)) as instrument,
    ):
        yield instrument


def holds(condition: Callable[[], bool]) -> bool:
    """Say whether something holds soon: a command without an answer takes effect when it comes."""
    end_s = time.monotonic() + 1.0
    while not condition() and time.monotonic() < end_s:
        time.sleep(0.005)
    return condition()


def becomes(subject: SimulatedInstrument, status: str) -> bool:
    """Say whether an instrument soon has a status."""
    return holds(lambda: subject.status() == status)


def assert_whole(capture: Capture, subject: SimulatedInstrument, *numbers: int) -> None:
    """Hold a capture against what the instrument recorded.

    Codes must be its own; the volts must be those it saw within one step of its converter, which
    ties the scale to the wave itself and not to the figures that were sent.
    """
    numbers = numbers or (1,)
    assert [trace.channel for trace in capture.traces] == [f"CH{number}" for number in numbers]
    for number, trace in zip(numbers, capture.traces, strict=True):
        assert isinstance(trace, Waveform)
        samples = np.concatenate(list(trace.samples.blocks()))
        subject.choose(f"CH{number}")
        codes = subject.codes()  # type: ignore[attr-defined]  # each family has its own
        np.testing.assert_array_equal(samples, codes.astype(codes.dtype.newbyteorder("=")))
        seen = subject.record[number - 1]
        step_v = (seen.max() - seen.min()) * 1.5 / 255 if samples.itemsize == 1 else 2e-4
        volts = samples.astype(np.float64) * trace.scale.gain + trace.scale.offset
        # a rounded code is within half a step; ten printed digits add nothing that counts
        assert np.abs(volts - seen).max() <= step_v
        assert isinstance(trace.time, UniformTime)
        assert abs(trace.time.dt_s - DT_S) <= 1e-9 * DT_S
