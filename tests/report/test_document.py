"""The document of hand-made analyses: what no capture of a test would easily show."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from importlib.resources import files
from typing import Any

import jsonschema
import pytest
from page_cases import MADE_AT, design, seconds

from benchtool.errors import BenchtoolError, DesignError, DesignFault, UsageError
from benchtool.model.design import Rule
from benchtool.model.judgement import Check, PartEstimate, Solution
from benchtool.model.quantity import Bound, Measured, Notice
from benchtool.model.result import Analysis, Finding, Gap, IntervalCounts, StageResult, TraceFacts
from benchtool.model.timing import Jitter, Timing
from benchtool.report.document import (
    analysis_document,
    error_document,
    quantity,
    rows_document,
)

SCHEMA = json.loads((files("benchtool.report") / "document.schema.json").read_text("utf-8"))
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)
TRACE = TraceFacts(
    channel="OUT",
    role="output",
    kind="waveform",
    samples=None,
    sample_interval_s=None,
    tick_s=None,
    start_s=0.0,
    duration_s=9.0,
    gaps=(Gap(start_s=1.0, end_s=2.5),),
)


COUNTS = IntervalCounts(high=0, low=0, period=0)


def document(analysis: Analysis, *, budget: bool = False) -> dict[str, Any]:
    made = analysis_document(analysis, version="0.1.0", made_at=MADE_AT, budget=budget)
    text = json.dumps(made, allow_nan=False)
    found: dict[str, Any] = json.loads(text)
    VALIDATOR.validate(found)
    return found


def judged(**given: Any) -> Analysis:
    parts = {"timing": Timing(), "jitter": Jitter(), "intervals": COUNTS} | given
    result = StageResult(source=0, stage="spacing", trace=TRACE, verdict="fail", **parts)
    return Analysis(command="judge", sources=(), results=(result,), verdict="fail", rule=Rule())


def test_the_schema_itself_is_sound() -> None:
    jsonschema.Draft202012Validator.check_schema(SCHEMA)


def test_the_schema_refuses_what_the_contract_forbids() -> None:
    sound = document(judged())
    VALIDATOR.validate(sound | {"key_of_tomorrow": 1})  # within /1 keys are only added
    for key, wrong in (
        ("schema", "benchtool/2"),
        ("made_at", "today"),
        ("verdict", "good"),
        ("results", [{"stage": "spacing"}]),
    ):
        with pytest.raises(jsonschema.ValidationError):
            VALIDATOR.validate(sound | {key: wrong})


def test_a_quantity_is_value_u_dof_k_and_U() -> None:
    made = quantity(Measured(value=1e-3, u=1e-7, unit="s", dof=98, n=99))
    assert made is not None
    assert made.keys() == {"value", "unit", "u", "dof", "k", "U", "n"}
    # the example of the contract: k 1.984, U 1.984e-7
    assert made["k"] == pytest.approx(1.984, abs=5e-4)
    assert made["U"] == pytest.approx(1.984e-7, abs=5e-11)


def test_k_takes_whole_degrees_of_freedom_and_dof_stays_as_it_is() -> None:
    made = quantity(Measured(value=1.0, u=0.1, unit="s", dof=4.97))
    assert made is not None
    assert made["dof"] == 4.97
    assert made["k"] == pytest.approx(2.776, abs=5e-4)  # 4 degrees, JCGM 100:2008 G.4.1


def test_infinite_dof_is_null() -> None:
    made = quantity(Measured(value=1.0, u=0.1, unit="s", dof=math.inf))
    assert made is not None
    assert (made["dof"], round(made["k"], 3)) == (None, 1.960)


@pytest.mark.parametrize(
    ("bound", "keys"),
    [
        (Bound(unit="s", at_least=3.2), {"at_least": 3.2}),
        (Bound(unit="Hz", at_most=0.3), {"at_most": 0.3}),
        (Bound(unit="s", at_least=0.0, at_most=2.0), {"at_least": 0.0, "at_most": 2.0}),
    ],
)
def test_a_bound_says_what_is_known(bound: Bound, keys: dict[str, float]) -> None:
    assert quantity(bound) == {"value": None, "unit": bound.unit, **keys}


def test_nothing_is_null() -> None:
    assert quantity(None) is None
    timing = document(judged(timing=Timing()))["results"][0]["timing"]
    assert set(timing.values()) == {None}
    assert len(timing) == 8


def test_what_was_not_found_is_null_and_what_was_not_made_is_absent() -> None:
    result = document(judged())["results"][0]
    assert result["levels"] is None
    assert result["circuit"] is None
    assert "budgets" not in result
    assert "changes" not in result
    assert "likely" not in result
    assert result["trace"]["samples"] is None
    assert result["trace"]["gaps"] == [{"start_s": 1.0, "end_s": 2.5}]


def test_a_circuit_of_one_resistor_leaves_the_ratio_null() -> None:
    part = PartEstimate(
        ref="C", nominal=None, estimate=None, change=None, assumes=("R",), within_tolerance=None
    )
    solution = Solution(topology="one-shot", tau_charge=seconds(3.2, 0.01), parts=(part,))
    circuit = document(judged(solution=solution))["results"][0]["circuit"]
    assert circuit["tau_ratio"] is None
    assert circuit["effective"] == {"charge": None, "discharge": None}
    assert circuit["parts"][0]["assumes"] == ["R"]


def test_an_open_limit_is_null() -> None:
    check = Check(
        quantity="jitter_period",
        measured=Bound(unit="s", at_most=0.01),
        lower=None,
        upper=0.05,
        unit="s",
        accept_lower=None,
        accept_upper=0.05,
        source="drawing",
        p_conform=None,
        verdict="pass",
        reason="It is below.",
    )
    made = document(judged(checks=(check,)))["results"][0]["checks"][0]
    assert (made["lower"], made["accept_lower"], made["p_conform"]) == (None, None, None)
    assert made["measured"]["at_most"] == 0.01


def test_findings_and_warnings_keep_their_codes() -> None:
    finding = Finding(code="stuck-high", text="It stays high.", may_be=("C-short",))
    notice = Notice(code="clipped", text="It is clipped.")
    made = document(judged(findings=(finding,), warnings=(notice,)))["results"][0]
    assert made["findings"][0]["may_be"] == ["C-short"]
    assert made["warnings"] == [{"code": "clipped", "text": "It is clipped."}]


def test_a_budget_adds_parts_of_measured_quantities_alone() -> None:
    timing = Timing(t_high=seconds(14.0, 0.01), t_low=Bound(unit="s", at_least=3.0))
    analysis = replace(judged(timing=timing), command="measure", verdict=None, rule=None)
    assert "budgets" not in document(analysis)["results"][0]
    budgets = document(analysis, budget=True)["results"][0]["budgets"]
    assert budgets.keys() == {"t_high"}
    assert budgets["t_high"][0]["dof"] is None


def test_jitter_may_be_a_bound() -> None:
    jitter = Jitter(period_sd=Bound(unit="s", at_most=0.02))
    made = document(judged(jitter=jitter))["results"][0]["jitter"]
    assert made["period_sd"] == {"value": None, "at_most": 0.02, "unit": "s"}
    assert made["cycle_rms"] is None


def test_rows_and_errors_are_documents_too() -> None:
    VALIDATOR.validate(rows_document("explain", [], version="0.1.0", made_at=MADE_AT))
    for error in (BenchtoolError("a", hint="b"), UsageError("a", hint="b", code="file-exists")):
        made = error_document(error, command=None)
        VALIDATOR.validate(made)
        assert made["error"]["faults"] == []
    fault = DesignFault(key="board.suply", message="unknown", near="supply")
    made = error_document(DesignError("a", hint="b", faults=(fault,)), command="design check")
    VALIDATOR.validate(made)
    assert made["error"]["faults"][0]["line"] is None


def test_every_verdict_and_rule_fits_the_schema() -> None:
    schema_verdicts = set(SCHEMA["$defs"]["verdict"]["enum"])
    assert schema_verdicts == {
        *("pass", "conditional-pass", "conditional-fail", "undecided", "fail", "unusable"),
    }
    assert design().rule.name in SCHEMA["$defs"]["rule"]["properties"]["name"]["enum"]
