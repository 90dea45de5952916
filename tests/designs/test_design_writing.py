from __future__ import annotations

import tomllib

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.designs import NewDesign, parse_design, write_design
from benchtool.designs.vocabulary import TOPOLOGY_PARTS, TOPOLOGY_QUANTITIES
from benchtool.errors import DesignError

ASTABLE = NewDesign(
    name="Mist valve timer",
    topology="astable",
    parts={"RA": "100k 1%", "RB": "330k 1%", "C": {"value": "47u", "tolerance": "10%"}},
    supply="12 V 5%",
    stage="spacing",
    limits={"period": {"lower": "22 s", "upper": "28 s", "source": "drawing GH-MV-07 sheet 4"}},
)
SCHMITT_IC = {"upper_threshold": "60%", "lower_threshold": "40%", "u_threshold": "5%"}

# Whatever a keyboard or a shell can give; lone surrogates, which no file can hold, apart.
NAMES = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=20)


@st.composite
def answers(draw: st.DrawFn) -> NewDesign:
    topology = draw(st.sampled_from(sorted(TOPOLOGY_PARTS)))
    number = st.integers(1, 999)
    percent = st.integers(1, 20)
    prefix = {"C": "pnu", "RA": " kM", "RB": " kM", "R": " kM"}
    parts = {
        ref: f"{draw(number)}{draw(st.sampled_from(prefix[ref])).strip()} {draw(percent)}%"
        for ref in TOPOLOGY_PARTS[topology]
    }
    judged = [name for name in TOPOLOGY_QUANTITIES[topology] if name[:6] not in ("duty", "jitter")]
    unit = {"frequency": "Hz"}
    limits = {
        name: f"{draw(number)} {unit.get(name, 's')} {draw(st.integers(1, 30))}%"
        for name in draw(st.lists(st.sampled_from(judged), unique=True))
    }
    return NewDesign(
        name=draw(NAMES),
        stage=draw(NAMES),
        topology=topology,
        parts=parts,
        supply=f"{draw(st.integers(2, 30))} V {draw(st.integers(0, 20))}%",
        temperature=draw(st.none() | st.just("10 .. 40 degC")),
        ic=SCHMITT_IC if topology == "schmitt" else draw(st.sampled_from(["cmos", "bipolar"])),
        channel=draw(st.none() | NAMES),
        assembly=draw(st.none() | NAMES),
        serial_pattern=draw(st.none() | st.sampled_from([r"^\d{6}$", "^'x'\\w+$", "a\tb"])),
        limits=limits,
        derive=draw(st.sampled_from(["worst-case", "rss", "monte-carlo"])),
        quantities=tuple(draw(st.lists(st.sampled_from(judged), unique=True))),
    )


@given(answers())
@settings(max_examples=80, deadline=None, derandomize=True)
def test_what_is_written_reads_back_with_the_same_values(given_: NewDesign) -> None:
    design = parse_design(write_design(given_))
    (stage,) = design.stages
    assert (design.name, design.assembly, stage.name) == (
        given_.name,
        given_.assembly,
        given_.stage,
    )
    assert (stage.topology, stage.channel) == (given_.topology, given_.channel)
    assert design.serial_pattern == given_.serial_pattern
    assert (stage.derive, set(given_.limits)) == (given_.derive, {x.quantity for x in stage.limits})
    assert not given_.quantities or stage.quantities == given_.quantities
    for ref, text in given_.parts.items():
        value, tolerance = str(text).split()
        factor = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "k": 1e3, "M": 1e6}.get(value[-1], 1.0)
        # 1e-12: the same decimal read in two ways
        expected = float(value.rstrip("pnukM")) * factor
        assert stage.parts[ref].value == pytest.approx(expected, rel=1e-12)
        assert stage.parts[ref].upper_rel == pytest.approx(float(tolerance[:-1]) / 100, rel=1e-12)
    for limit in stage.limits:
        value, _, half = str(given_.limits[limit.quantity]).split()
        low = float(value) * (1 - float(half[:-1]) / 100)
        assert limit.lower == pytest.approx(low, rel=1e-12)


def test_the_file_explains_itself_within_a_hundred_columns() -> None:
    text = write_design(ASTABLE)
    assert "worst-case, rss or monte-carlo" in text
    assert max(len(row) for row in text.splitlines()) <= 100
    assert text.endswith("\n")
    assert tomllib.loads(text)["stage"]["spacing"]["limits"]["period"]["source"]


def test_the_usual_quantities_are_written_out() -> None:
    limits = tomllib.loads(write_design(ASTABLE))["stage"]["spacing"]["limits"]
    assert limits["quantities"] == ["t_high", "t_low", "period", "duty"]


def test_an_answer_that_makes_no_design_is_refused_before_anything_is_written() -> None:
    bad = NewDesign(name="Mist", topology="astable", parts={"R": "1k", "C": "1,5u"}, supply="12 V")
    with pytest.raises(DesignError) as caught:
        write_design(bad)
    assert {fault.key for fault in caught.value.faults} >= {"stage.main.R", "stage.main.C"}


def test_limits_alone_need_no_derivation() -> None:
    answers_ = NewDesign(
        name="Mist",
        topology="one-shot",
        parts={"R": "9k1 1%", "C": "10n 5%"},
        supply="5 V",
        limits={"t_high": "100us 10%"},
        derive=None,
    )
    (stage,) = parse_design(write_design(answers_)).stages
    assert (stage.derive, stage.quantities) == (None, ())


def test_half_a_character_from_a_shell_does_not_spoil_the_file() -> None:
    text = write_design(NewDesign(**{**_fields(ASTABLE), "name": "Mist \udce4"}))
    assert "Mist \N{REPLACEMENT CHARACTER}" in text
    assert text.encode("utf-8")


def _fields(answers_: NewDesign) -> dict[str, object]:
    return {name: getattr(answers_, name) for name in NewDesign.__dataclass_fields__}
