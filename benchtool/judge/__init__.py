"""Limits from tolerances, decision rules and checks: is the board right, and how sure are we."""

from benchtool.judge.checks import judge_stage
from benchtool.judge.likely import name_likely_part
from benchtool.judge.limits import derive_limits, limits_three_ways, stage_limits
from benchtool.judge.soundness import examine
from benchtool.judge.verdict import worst

__all__ = [
    "derive_limits",
    "examine",
    "judge_stage",
    "limits_three_ways",
    "name_likely_part",
    "stage_limits",
    "worst",
]
