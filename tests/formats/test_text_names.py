"""Channels of one name: each gets a name of its own, by which it can be chosen."""

from __future__ import annotations

import pytest
from read_back import Read, point
from written import OTHER, TIMES_S, VOLTS, E, S, V, W, X, is_wave, rows

from benchtool.errors import UsageError
from benchtool.model.capture import Capture
from benchtool.targets import find_channel

TWO_OUT = "Time (s),OUT (V),OUT (V),CAP (V)\n" + rows(S, V, W, V)


def names(capture: Capture) -> list[str]:
    return [trace.channel for trace in capture.traces]


def test_columns_of_one_name_are_numbered_from_the_left(read: Read) -> None:
    capture = read(TWO_OUT)
    assert names(capture) == ["OUT (1)", "OUT (2)", "CAP"]
    assert point(capture, "channels") == "OUT (1), OUT (2), CAP"


def test_each_of_two_channels_of_one_name_is_chosen_by_its_own(read: Read) -> None:
    capture = read(TWO_OUT)
    for name, values in (("OUT (1)", VOLTS), ("out (2)", OTHER)):
        assert is_wave(capture.traces[find_channel(capture, name)], TIMES_S, values)


def test_a_name_that_two_channels_have_chooses_neither(read: Read) -> None:
    with pytest.raises(UsageError, match="no channel 'OUT'") as caught:
        find_channel(read(TWO_OUT), "OUT")
    assert "OUT (1), OUT (2)" in caught.value.hint


def test_names_that_are_their_own_stay_as_they_are(read: Read) -> None:
    assert names(read("Time (s),OUT (V),CAP (V)\n" + rows(S, V, W))) == ["OUT", "CAP"]


def test_channels_with_a_time_column_each_are_told_apart_too(read: Read) -> None:
    capture = read("Time (s),OUT (V),Time (s),OUT (V)\n" + rows(S, V, S, W))
    assert names(capture) == ["OUT (1)", "OUT (2)"]


def test_transitions_of_one_name_are_told_apart_too(read: Read) -> None:
    capture = read("Time (s),OUT,OUT\n" + rows(E, X, X[::-1]))
    assert names(capture) == ["OUT (1)", "OUT (2)"]


def test_words_of_one_name_keep_their_bits_beside_the_number(read: Read) -> None:
    words = [f"0x{i % 4:X}" for i in range(len(S))]
    capture = read("Time (s),port,port\n" + rows(S, words, words))
    assert names(capture)[::4] == ["port (1)[0]", "port (2)[0]"]
