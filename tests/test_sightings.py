"""What stands beside the mean times, and the first sentence that must not pass over it."""

from __future__ import annotations

import pytest

from benchtool.model.diagnosis import Diagnosis, Suspect
from benchtool.model.result import Finding
from benchtool.sightings import sentence_with


def diagnosis(fault: str, sentence: str) -> Diagnosis:
    return Diagnosis(suspects=(Suspect(fault=fault, probability=1.0),), sentence=sentence)


@pytest.mark.parametrize("code", ["drifting", "ripple-line", "missed-edge", "output-level"])
def test_a_healthy_mean_does_not_hide_what_was_seen(code: str) -> None:
    found = diagnosis("healthy", "Nothing points to a fault (93 %).")
    said = sentence_with(found, [Finding(code=code, text="")])
    assert "Nothing points to a fault" not in said
    assert "begin with that" in said


def test_what_was_seen_twice_is_said_once_after_a_fault() -> None:
    line = Finding(code="ripple-line", text="")
    said = sentence_with(diagnosis("C-low", "Replace C."), [line, line])
    assert said == "Replace C. Besides, the period follows a ripple."


def test_what_the_figures_tell_already_is_not_repeated() -> None:
    found = diagnosis("C-low", "Replace C.")
    assert sentence_with(found, [Finding(code="first-pulse", text="")]) == "Replace C."
