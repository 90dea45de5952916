"""Frozen records behave as the standard library's frozen data classes do."""

from __future__ import annotations

import copy
import pickle
from dataclasses import FrozenInstanceError, dataclass, field, fields, replace
from typing import ClassVar

import pytest

from benchtool.frozen import frozen_record


@frozen_record
class Part:
    """A part of the misting controller."""

    kind: ClassVar[str] = "part"
    ref: str
    value: float
    notes: tuple[str, ...] = ()
    tags: list[str] = field(default_factory=list)

    def __post_init__(self) -> None:
        if self.value <= 0:
            raise ValueError(f"{self.ref} must be above zero")


@frozen_record(eq=False)
class Held:
    """Something that compares by identity."""

    value: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Standard:
    """The same by the standard decorator."""

    ref: str
    value: float
    told_by: str = field(default="", compare=False, repr=False)


@frozen_record
class Ours:
    """The same by ours."""

    ref: str
    value: float
    told_by: str = field(default="", compare=False, repr=False)


RA = Part(ref="RA", value=100e3)


def test_fields_are_given_by_name_and_defaults_fill_in() -> None:
    assert (RA.kind, RA.ref, RA.value, RA.notes, RA.tags) == ("part", "RA", 100e3, (), [])
    assert RA.tags is not Part(ref="RA", value=1.0).tags


@pytest.mark.parametrize(
    ("given", "said"),
    [({"ref": "RA"}, "needs value"), ({"ref": "RA", "value": 1, "x": 2}, "no field x")],
)
def test_a_missing_or_unknown_field_is_an_error(given: dict[str, object], said: str) -> None:
    with pytest.raises(TypeError, match=said):
        Part(**given)  # type: ignore[arg-type]


def test_a_wrong_record_cannot_be_made() -> None:
    with pytest.raises(ValueError, match="RA must be above zero"):
        replace(RA, value=-1.0)


def test_nothing_can_be_set_or_deleted() -> None:
    with pytest.raises(FrozenInstanceError):
        RA.value = 1.0  # type: ignore[misc]
    with pytest.raises(FrozenInstanceError):
        del RA.value
    with pytest.raises(FrozenInstanceError):
        object.__getattribute__(RA, "__setattr__")("other", 1.0)


def test_records_compare_by_value_unless_told_not_to() -> None:
    same = replace(Ours(ref="RA", value=1.0), value=2.0, told_by="a label")
    assert same == Ours(ref="RA", value=2.0)
    assert hash(same) == hash(Ours(ref="RA", value=2.0))
    assert same != Ours(ref="RA", value=1.0)
    assert same != Standard(ref="RA", value=2.0)
    assert Held(value=1.0) != Held(value=1.0)


def test_it_reads_as_the_standard_decorator_writes_it() -> None:
    ours, standard = Ours(ref="RA", value=1.0), Standard(ref="RA", value=1.0)
    assert repr(ours) == repr(standard).replace("Standard", "Ours")
    assert [item.name for item in fields(ours)] == [item.name for item in fields(standard)]
    assert not hasattr(ours, "__dict__")


def test_a_record_survives_copying_and_pickling() -> None:
    ours = Ours(ref="RA", value=1.0)
    assert copy.copy(ours) == copy.deepcopy(ours) == pickle.loads(pickle.dumps(ours)) == ours


def test_fields_and_annotations_keep_their_types() -> None:
    assert {each.name: each.type for each in fields(Part)} == {
        "ref": "str",
        "value": "float",
        "notes": "tuple[str, ...]",
        "tags": "list[str]",
    }
    assert Part.__annotations__["kind"] == "ClassVar[str]"
