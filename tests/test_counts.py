"""From a counter's readings to the result of a stage."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from benchtool.counts import observe_counted, result_of_counted
from benchtool.designs import load_design
from benchtool.errors import UsageError
from benchtool.intake import take
from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Measured, Notice
from benchtool.observation import settle

ROOT = Path(__file__).parents[1]
OPTIONS = MeasureOptions()


def counted(**values: float) -> Counted:
    readings: dict[CountedName, Readings] = {
        name: Readings(values=value + 1e-5 * np.arange(5.0)) for name, value in values.items()
    }  # type: ignore[misc]  # names of keywords are plain texts
    return Counted(
        source="TCPIP::192.0.2.7::INSTR",
        identity="Invented,Counter,0,1",
        dialect="counter-scpi99",
        channel="1",
        readings=readings,
        resolution_s=1e-9,
        warnings=(Notice(code="readings-missing", text="2 of 7 readings are marked as none"),),
    )


def test_a_result_has_figures_and_no_trace() -> None:
    analysis = observe_counted(counted(t_high=14.0, period=24.7), None, None, OPTIONS, "measure")
    (result,) = analysis.results
    assert (result.trace, result.edges, result.series, result.stage) == (None, None, None, None)
    assert result.counted is not None
    assert result.timing is not None
    assert isinstance(result.timing.t_low, Measured)
    assert [notice.code for notice in analysis.warnings] == ["readings-missing"]
    assert "readings-apart" in [notice.code for notice in result.warnings]
    source = analysis.sources[0]
    assert (source.format, source.instrument) == ("readings", "Invented,Counter,0,1")
    assert {point.name for point in source.structure} >= {"dialect", "t_high", "period"}


def test_the_low_pulse_of_a_one_shot_is_its_high_time() -> None:
    design = load_design(ROOT / "sample_captures" / "mist_pulse.toml")
    settings = settle(OPTIONS, design)
    readings = counted(t_high=3.0, t_low=1.0)
    whole = design.stages[0]
    for stage, t_high in (
        (replace(whole, active="high"), 3.0),
        (replace(whole, active="low"), 1.0),
    ):
        timing = result_of_counted(readings, stage, settings).timing
        assert timing is not None
        assert isinstance(timing.t_high, Measured)
        assert timing.t_high.value == pytest.approx(t_high, rel=1e-4)  # the readings' own spread


def test_the_stage_that_was_counted_must_be_named_where_there_are_several() -> None:
    design = load_design(ROOT / "tests" / "designs" / "every_feature.toml")
    assert len(design.stages) > 1
    with pytest.raises(UsageError) as caught:
        observe_counted(counted(period=1.0), design, None, OPTIONS, "judge")
    assert caught.value.code == "choose-stage"
    name = design.stages[1].name
    analysis = observe_counted(counted(period=1.0), design, name, OPTIONS, "judge")
    assert analysis.results[0].stage == name
    with pytest.raises(UsageError) as caught:
        observe_counted(counted(period=1.0), design, "none", OPTIONS, "judge")
    assert caught.value.code == "no-such-stage"


def test_where_a_trace_is_wanted_readings_are_refused() -> None:
    with pytest.raises(UsageError) as caught:
        take(counted(period=1.0), OPTIONS)
    assert caught.value.code == "counter-readings"


def test_a_jitter_that_is_only_a_bound_is_told_of() -> None:
    coarse = replace(counted(period=24.7), resolution_s=1e-3)
    analysis = observe_counted(coarse, None, None, OPTIONS, "measure")
    assert "jitter-below-grid" in [notice.code for notice in analysis.results[0].warnings]
