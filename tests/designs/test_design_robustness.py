"""Whatever a file holds, loading ends in a design or in faults, never in another exception."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.designs import parse_design
from benchtool.designs.notation import key_text, value_text
from benchtool.designs.vocabulary import IC_TERMS, QUANTITIES
from benchtool.errors import DesignError
from benchtool.model.design import Design

VALUES = st.one_of(
    st.sampled_from(
        ["100k 1%", "12 V 5%", "1,5", "..", "5 .. ", "% ", "±", "1 %%", "1e999", "cmos", "astable"]
    ),
    st.text(st.characters(exclude_categories=["Cs"]), max_size=8),
    st.integers(-3, 10**6),
    st.floats(allow_nan=False, allow_infinity=False),
    st.booleans(),
)
WORDS = (
    "topology RA RB R C ic leak leak_to channel trigger divide value tolerance family limits "
    "derive quantities lower upper"
)
KEYS = st.sampled_from([*WORDS.split(), "R A", *QUANTITIES, *IC_TERMS])
NODES = st.recursive(
    VALUES,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(KEYS, inner, max_size=5),
    max_leaves=8,
)
STAGE = st.fixed_dictionaries(
    {
        "topology": st.sampled_from(["astable", "one-shot", "schmitt", "power-on", "astabel"]),
        "R": VALUES,
        "C": NODES,
        "ic": NODES,
        "limits": st.dictionaries(KEYS, NODES, max_size=4) | VALUES,
    },
    optional={"RA": NODES, "divide": VALUES, "channel": VALUES, "leak_to": VALUES},
)
DOCUMENTS = st.fixed_dictionaries(
    {
        "schema": st.just(1) | VALUES,
        "board": NODES,
        "stage": st.dictionaries(KEYS, STAGE | NODES, max_size=2),
    },
    optional={"decision": NODES, "probe": NODES, "supply": NODES},
)


def parsed(text: str) -> Design | DesignError:
    try:
        return parse_design(text)
    except DesignError as error:
        return error


@given(DOCUMENTS)
@settings(max_examples=80, deadline=None, derandomize=True)
def test_any_table_is_a_design_or_faults_with_lines(document: dict[str, object]) -> None:
    text = "\n".join(f"{key_text((key,))} = {value_text(value)}" for key, value in document.items())
    result = parsed(text)
    if isinstance(result, DesignError):
        assert result.faults
        assert all(fault.key and fault.message for fault in result.faults)
        stated = [fault for fault in result.faults if fault.key.split(".")[0] in document]
        assert all(fault.line for fault in stated)


@given(st.text(st.characters(exclude_categories=["Cs"]), max_size=60))
@settings(max_examples=100, deadline=None, derandomize=True)
def test_any_text_is_faults(text: str) -> None:
    result = parsed(text)
    assert isinstance(result, DesignError)
    assert result.faults
