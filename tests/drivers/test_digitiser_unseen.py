"""A dialect written beside a one-page manual reads an instrument of a structure not bundled."""

from __future__ import annotations

from contextlib import closing
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from simulated import TRANSPORTS, holds, square
from unseen import MV_PER_DIVISION, PAGE, PROBE, RATE_KHZ, Recorder
from unseen_box import HIGH_V, LOW_V, RATE_HZ, Box
from unseen_pages import DT_S, T0_S, Pages
from unseen_pages import PAGE as PAGE_OF_PAGES
from unseen_pages import STEP_V as STEP_OF_PAGES_V

from benchtool.errors import NoTriggerError, RefusedError, ReplyError
from benchtool.instruments import Order
from benchtool.model.capture import UniformTime, Waveform
from benchtool_drivers.dialect import load_dialect
from benchtool_drivers.dialect.linking import link_settings
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

FILE = Path(__file__).parent / "unseen.toml"
SETTINGS = replace(link_settings(load_dialect(FILE).link), timeout_s=0.3, block_timeout_s=0.3)
STEP_V = MV_PER_DIVISION / 1000 / 25 * PROBE


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_the_record_is_read_in_pages_and_scaled_as_the_manual_says(transport: str) -> None:
    recorder = Recorder(square(2 * PAGE + 345), rolling=True)
    with (
        serve(recorder, transport) as resource,
        closing(open_instrument(resource, dialect=str(FILE), settings=SETTINGS)) as instrument,
    ):
        capture = instrument.acquire(Order(channels=("A", "B")))
        assert holds(lambda: recorder.mode == "ROLL")
        for name, trace in zip("AB", capture.traces, strict=True):
            assert isinstance(trace, Waveform)
            codes = np.concatenate(list(trace.samples.blocks()))
            np.testing.assert_array_equal(codes, recorder.samples(name))
            volts = codes * trace.scale.gain + trace.scale.offset
            # a rounded code is within half a step of what the input saw
            assert np.abs(volts - recorder.inputs[name]).max() <= STEP_V / 2 * (1 + 1e-9)
            assert isinstance(trace.time, UniformTime)
            assert trace.time.dt_s == pytest.approx(1 / (RATE_KHZ * 1000), rel=1e-12)
        assert capture.warnings == ()


def test_its_failures_are_named_and_the_next_record_is_whole() -> None:
    recorder = Recorder(square(1500))
    with (
        serve(recorder, "socket") as resource,
        closing(open_instrument(resource, dialect=str(FILE), settings=SETTINGS)) as instrument,
    ):
        recorder.spoil_sum = True
        with pytest.raises(ReplyError, match="checksum"):
            instrument.acquire(Order())
        recorder.spoil_sum, recorder.deaf = False, True
        with pytest.raises(NoTriggerError):
            instrument.acquire(Order(trigger_timeout_s=0.2))
        assert holds(lambda: recorder.mode == "HOLD")
        with pytest.raises(RefusedError, match="E11"):
            instrument.acquire(Order(settings=("COUPLE AC",)))
        recorder.deaf = False
        trace = instrument.acquire(Order()).traces[0]
        assert isinstance(trace, Waveform)
        codes = np.concatenate(list(trace.samples.blocks()))
        np.testing.assert_array_equal(codes, recorder.samples("A"))


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_headers_decimal_commas_and_left_justified_words_are_read(transport: str) -> None:
    box = Box(square(2000))
    file = str(FILE.with_name("unseen_box.toml"))
    with (
        serve(box, transport) as resource,
        closing(open_instrument(resource, dialect=file)) as instrument,
    ):
        capture = instrument.acquire(Order())
        trace = capture.traces[0]
        assert isinstance(trace, Waveform)
        codes = np.concatenate(list(trace.samples.blocks()))
        np.testing.assert_array_equal(codes, box.codes())
        volts = codes * trace.scale.gain + trace.scale.offset
        half_step_v = (HIGH_V - LOW_V) / 4095 / 2
        assert np.abs(volts - box.volts).max() <= half_step_v * (1 + 1e-9)
        assert isinstance(trace.time, UniformTime)
        assert trace.time.dt_s == pytest.approx(1 / RATE_HZ, rel=1e-12)
        assert capture.warnings == ()
        with pytest.raises(RefusedError, match="unknown GAIN"):
            instrument.acquire(Order(settings=("GAIN 2",)))


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_figures_with_units_and_places_counted_in_bytes_are_read(transport: str) -> None:
    pages = Pages(square(10_000))
    file = str(FILE.with_name("unseen_pages.toml"))
    with (
        serve(pages, transport) as resource,
        closing(open_instrument(resource, dialect=file)) as instrument,
    ):
        capture = instrument.acquire(Order(channels=("B",)))
        trace = capture.traces[0]
        assert pages.seeks == [0, 2 * PAGE_OF_PAGES, 4 * PAGE_OF_PAGES]
        assert isinstance(trace, Waveform)
        codes = np.concatenate(list(trace.samples.blocks()))
        np.testing.assert_array_equal(codes, pages.codes("B"))
        volts = codes * trace.scale.gain + trace.scale.offset
        assert np.abs(volts - pages.inputs["B"]).max() <= STEP_OF_PAGES_V / 2 * (1 + 1e-9)
        assert isinstance(trace.time, UniformTime)
        assert trace.time.dt_s == pytest.approx(DT_S, rel=1e-12)
        told = {point.name: point.value for point in capture.structure}
        assert told["first sample"] == f"{T0_S} s after the trigger"
        pages.miscount = True
        with pytest.raises(ReplyError):
            instrument.acquire(Order())
        pages.miscount, pages.busy = False, True
        with pytest.raises(RefusedError, match="-213") as caught:
            instrument.acquire(Order())
        assert "busy" in caught.value.hint
