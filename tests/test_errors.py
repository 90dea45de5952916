"""Every error survives being sent to another process, and says what to do."""

from __future__ import annotations

import copy
import pickle

import pytest

from benchtool import errors
from benchtool.errors import BenchtoolError, DesignError, DesignFault, MalformedCaptureError


def classes_below(kind: type[BenchtoolError]) -> list[type[BenchtoolError]]:
    return [kind, *(found for below in kind.__subclasses__() for found in classes_below(below))]


CLASSES = [kind for kind in classes_below(BenchtoolError) if kind.__module__ == errors.__name__]
each = pytest.mark.parametrize("kind", CLASSES, ids=lambda kind: kind.__name__)


def test_the_tree_is_drawn_whole() -> None:
    assert errors.__doc__ is not None
    assert {kind.__name__ for kind in CLASSES} == {
        word for word in errors.__doc__.split() if word.endswith("Error")
    }


@each
@pytest.mark.parametrize(
    "send", [lambda x: pickle.loads(pickle.dumps(x)), copy.copy, copy.deepcopy]
)
def test_an_error_arrives_as_it_left(kind: type[BenchtoolError], send: object) -> None:
    error = kind("the file is cut", hint="save it again", code="file-cut")
    arrived = send(error)  # type: ignore[operator]
    assert type(arrived) is kind
    assert str(arrived) == "the file is cut"
    assert (arrived.message, arrived.hint, arrived.code) == (error.message, error.hint, error.code)
    assert arrived.args == error.args


def test_what_a_class_adds_arrives_too() -> None:
    fault = DesignFault(
        key="board.suply", message="unknown key", file="a.toml", line=4, near="supply"
    )
    design = DesignError("one fault", hint="correct it", faults=(fault,))
    assert pickle.loads(pickle.dumps(design)).faults == (fault,)
    cut = MalformedCaptureError("cut", hint="save it again", path="a.csv", line=17)
    arrived = pickle.loads(pickle.dumps(cut))
    assert (arrived.path, arrived.line) == ("a.csv", 17)


@each
def test_every_error_has_a_code_of_its_own_and_demands_a_hint(kind: type[BenchtoolError]) -> None:
    assert kind("x", hint="y").code == kind.default_code
    assert kind.default_code not in {other.default_code for other in CLASSES if other is not kind}
    with pytest.raises(TypeError, match="hint"):
        kind("x")  # type: ignore[call-arg]


def test_a_unit_error_is_what_a_caller_would_catch() -> None:
    with pytest.raises(ValueError, match="no value"):
        raise errors.UnitError("no value", hint="write 4k7")
