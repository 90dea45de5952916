"""Which trace is measured for which stage."""

from __future__ import annotations

import numpy as np
import pytest
from captures import HEAD, SPACING

from benchtool.designs import parse_design
from benchtool.errors import UsageError
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    Origin,
    Role,
    Span,
    UniformTime,
    Waveform,
)
from benchtool.targets import Lineup, choose_stages, choose_targets, find_channel
from benchtool.timing import Shape

ONE = parse_design(HEAD + SPACING, source="one.toml")
UNNAMED = parse_design(HEAD + SPACING.replace('channel = "OUT"\n', ""), source="unnamed.toml")
TWO = parse_design(
    HEAD + SPACING + SPACING.replace("spacing", "drain").replace("OUT", "DRAIN"), source="two.toml"
)
TRIGGERED = parse_design(
    HEAD + '[stage.pulse]\ntopology = "one-shot"\nchannel = "VALVE"\ntrigger = "TRIG"\n'
    'R = "68k"\nC = "47u"\nic = "cmos"\nlimits = { derive = "rss", quantities = ["t_high"] }\n',
    source="pulse.toml",
)


def capture_of(*names: str) -> Capture:
    volts = ArraySamples(np.zeros(8))
    traces = tuple(
        Waveform(
            samples=volts,
            time=UniformTime(dt_s=1.0),
            spans=(Span(start=0, stop=8, start_s=0.0),),
            channel=name,
        )
        for name in names
    )
    return Capture(origin=Origin(source="a.csv", format="text", sha256="0" * 64), traces=traces)


def lineup_of(capture: Capture, roles: tuple[Role, ...]) -> Lineup:
    shapes = tuple(Shape(trace=trace, levels=None, edges=None) for trace in capture.traces)
    return Lineup(capture=capture, shapes=shapes, roles=roles)


@pytest.mark.parametrize(
    ("roles", "chosen"),
    [
        (("output",), 0),
        (("other",), 0),
        (("supply", "output"), 1),
        (("trigger", "output", "supply"), 1),
        (("supply", "capacitor"), 1),
        (("capacitor", "output"), 1),
        (("capacitor", "output", "other"), 1),
    ],
)
def test_the_obvious_trace_is_measured(roles: tuple[Role, ...], chosen: int) -> None:
    capture = capture_of(*(f"CH{i}" for i in range(len(roles))))
    (target,) = choose_targets(lineup_of(capture, roles))
    assert target.shape.trace is capture.traces[chosen]
    assert target.role == roles[chosen]
    assert target.warnings == ()


@pytest.mark.parametrize(
    "roles",
    [("output", "output"), ("supply", "other"), ("output", "output", "capacitor")],
)
def test_what_is_not_obvious_is_asked_for(roles: tuple[Role, ...]) -> None:
    capture = capture_of(*(f"CH{i}" for i in range(len(roles))))
    with pytest.raises(UsageError, match="several traces that could be meant") as caught:
        choose_targets(lineup_of(capture, roles))
    assert caught.value.code == "choose-channel"
    assert all(f"CH{i} ({role})" in caught.value.hint for i, role in enumerate(roles))


@pytest.mark.parametrize(
    ("name", "index"), [("OUT", 0), ("out", 1), ("Aux", 2), ("aux", 2), ("3", 2), ("2", 3)]
)
def test_a_channel_is_a_name_before_it_is_a_number(name: str, index: int) -> None:
    assert find_channel(capture_of("OUT", "out", "Aux", "2"), name) == index


@pytest.mark.parametrize("name", ["Out", "0", "5", "-1", "1.0", ""])
def test_a_name_that_is_none_or_two_is_refused(name: str) -> None:
    with pytest.raises(UsageError) as caught:
        find_channel(capture_of("OUT", "out", "Aux", "2"), name)
    assert caught.value.code == "no-such-channel"
    assert caught.value.hint == "It has: OUT, out, Aux, 2."


def test_each_stage_gets_the_trace_that_it_names() -> None:
    capture = capture_of("DRAIN", "VCC", "OUT")
    targets = choose_targets(lineup_of(capture, ("output", "supply", "output")), design=TWO)
    found = [(target.stage.name, target.shape.trace.channel) for target in targets if target.stage]
    assert found == [("spacing", "OUT"), ("drain", "DRAIN")]
    assert all(target.supply and target.supply.trace is capture.traces[1] for target in targets)


def test_a_stage_without_a_name_for_it_takes_the_only_output() -> None:
    capture = capture_of("CH1", "CH2")
    (target,) = choose_targets(lineup_of(capture, ("supply", "output")), design=UNNAMED)
    assert target.shape.trace.channel == "CH2"
    assert target.warnings == ()


def test_a_lone_output_under_another_name_comes_with_a_warning() -> None:
    (target,) = choose_targets(
        lineup_of(capture_of("VCC", "CH2"), ("supply", "output")), design=ONE
    )
    assert target.shape.trace.channel == "CH2"
    assert [notice.code for notice in target.warnings] == ["assumed-channel"]


def test_two_outputs_under_other_names_are_refused() -> None:
    with pytest.raises(UsageError) as caught:
        choose_targets(lineup_of(capture_of("CH1", "CH2"), ("output", "output")), design=ONE)
    assert caught.value.code == "no-such-channel"


def test_what_the_user_names_is_never_replaced() -> None:
    with pytest.raises(UsageError) as caught:
        choose_targets(lineup_of(capture_of("CH1"), ("output",)), design=ONE, channel="CH2")
    assert caught.value.code == "no-such-channel"


def test_the_trigger_is_the_one_named_or_the_one_there_is() -> None:
    capture = capture_of("VALVE", "TRIG", "AUX")
    (named,) = choose_targets(lineup_of(capture, ("output", "other", "trigger")), design=TRIGGERED)
    assert named.trigger is not None
    assert named.trigger.trace is capture.traces[1]
    (found,) = choose_targets(lineup_of(capture, ("output", "other", "trigger")))
    assert found.trigger is not None
    assert found.trigger.trace is capture.traces[2]
    (none,) = choose_targets(lineup_of(capture, ("output", "trigger", "trigger")))
    assert none.trigger is None


def test_a_stage_is_chosen_by_name() -> None:
    assert [stage.name for stage in choose_stages(TWO, None)] == ["spacing", "drain"]
    assert [stage.name for stage in choose_stages(TWO, "drain")] == ["drain"]
    with pytest.raises(UsageError) as caught:
        choose_stages(TWO, "Drain")
    assert (caught.value.code, caught.value.hint) == ("no-such-stage", "It has: spacing, drain.")


@pytest.mark.parametrize("name", ["board.OUT", "OUT", "out [0]", "OUT[0]"])
def test_a_signal_is_found_with_or_without_scope_and_bit(name: str) -> None:
    assert find_channel(capture_of("bus[1]", "bus[0]", "board.timer.OUT [0]"), name) == 2


def test_a_bit_of_a_bus_is_never_taken_for_another() -> None:
    for names, asked in ((("bus[1]", "bus[0]"), "bus"), (("bus[1]", "OUT"), "bus[2]")):
        with pytest.raises(UsageError):
            find_channel(capture_of(*names), asked)
