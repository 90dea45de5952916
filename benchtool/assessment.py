"""From the figures of a trace to the products of its parts, and to its verdict."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from benchtool.circuits import find_topology, solve, solve_without_design
from benchtool.circuits.inverse import NOTHING_KNOWN
from benchtool.errors import SolveError
from benchtool.judge import judge_stage, name_likely_part, stage_limits, worst
from benchtool.model.design import Design, Ic, TopologyName
from benchtool.model.judgement import VerdictName
from benchtool.model.quantity import Measured, Notice
from benchtool.model.result import StageResult
from benchtool.model.timing import Timing
from benchtool.observation import Settings
from benchtool.parts.combinations import fit_combinations


def solve_stage(
    result: StageResult, design: Design, *, known: Mapping[str, float] = NOTHING_KNOWN
) -> StageResult:
    """Add the products that the measured times give.

    Raises:
        SolveError: If the times are too few, or no parts of this topology give them.
    """
    if result.timing is None or result.design is None:
        return result
    solution = solve(result.timing, result.design, design, known=known)
    return replace(result, solution=solution, warnings=(*result.warnings, *solution.warnings))


def solve_plain(
    result: StageResult,
    topology: TopologyName,
    *,
    ic: Ic | None,
    supply_v: float | None,
    known: Mapping[str, float] = NOTHING_KNOWN,
) -> StageResult:
    """Add the products where there is no design, only the topology.

    Raises:
        SolveError: If the times are too few, or no parts of this topology give them.
    """
    timing = result.timing or Timing()
    solution = solve_without_design(timing, topology, ic=ic, supply_v=supply_v, known=known)
    return replace(result, solution=solution, warnings=(*result.warnings, *solution.warnings))


def combine_parts(result: StageResult) -> StageResult:
    """Add which preferred values could give the products of a board without markings."""
    solution = result.solution
    if solution is None or solution.tau_charge is None:
        return result
    charge, discharge = find_topology(solution.topology).resistors
    found = fit_combinations(
        solution.tau_charge,
        solution.tau_discharge or solution.tau_charge,
        charge=charge,
        discharge=discharge,
    )
    return replace(result, combinations=found)


def judge_board(
    results: tuple[StageResult, ...], design: Design, settings: Settings
) -> tuple[tuple[StageResult, ...], VerdictName | None]:
    """Judge every stage; return the results and the worst of their verdicts.

    Args:
        results: What was observed, one result a stage.
        design: Its stages, limits and decision rule.
        settings: As settled for this run.
    """
    judged = tuple(_judge(item, design, settings) for item in results)
    return judged, worst(item.verdict for item in judged if item.verdict)


def _judge(result: StageResult, design: Design, settings: Settings) -> StageResult:
    """Add products, checks and verdict; a board that cannot be solved is still judged."""
    stage = result.design
    if stage is None:
        return result
    solved = _solved_if_possible(result, design)
    checks = judge_stage(
        stage,
        stage_limits(stage, design),
        timing=solved.timing,
        jitter=solved.jitter,
        solution=solved.solution,
        rule=design.rule,
        intervals=solved.series,
        longest_flat_s=solved.flat.length_s if solved.flat else None,
        flat_state=solved.flat.state if solved.flat else None,
        timebase_rel=settings.timebase_rel,
    )
    verdict = worst(check.verdict for check in checks)
    likely = name_likely_part(stage, design, solved.timing) if verdict == "fail" else None
    notices = tuple(notice for check in checks for notice in check.warnings)
    return replace(
        solved,
        checks=checks,
        verdict=verdict,
        likely=likely,
        warnings=tuple(dict.fromkeys((*solved.warnings, *notices))),
    )


def _solved_if_possible(result: StageResult, design: Design) -> StageResult:
    timing = result.timing
    times = (timing.t_high, timing.t_low, timing.period, timing.delay) if timing else ()
    if not any(isinstance(time, Measured) for time in times):
        return result
    try:
        return solve_stage(result, design)
    except SolveError as error:
        notice = Notice(code="not-solved", text=f"no R·C products: {error.message}")
        return replace(result, warnings=(*result.warnings, notice))
