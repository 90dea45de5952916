"""The verdict in a word and a sentence, or what was done where nothing was judged."""

from __future__ import annotations

from benchtool.model.judgement import Solution
from benchtool.model.result import Analysis, StageResult
from benchtool.report.page.views import Verdict
from benchtool.report.phrases import (
    product_names,
    quantity_text,
    verdict_sentence,
    worst_first,
)

_WORDS = {"look": "read", "measure": "measured", "solve": "solved"}
_UNJUDGED = "No limits were given, so there is no verdict."


def board_verdict(analysis: Analysis) -> Verdict:
    """Return the verdict of the whole analysis.

    Args:
        analysis: What was found; of several stages the worst is named.
    """
    results = analysis.results
    if len(results) == 1:
        return result_verdict(analysis, results[0])
    if analysis.verdict is None:
        word = _WORDS.get(analysis.command, analysis.command)
        tail = "" if analysis.command == "look" else f" {_UNJUDGED}"
        return Verdict(word=word, sentence=f"{_count(len(results), 'trace')} {word}.{tail}")
    return Verdict(word=analysis.verdict, name=analysis.verdict, sentence=_tally(analysis))


def result_verdict(analysis: Analysis, result: StageResult) -> Verdict:
    """Return the verdict of one stage, or the figure that matters most without one.

    Args:
        analysis: The analysis that the result belongs to.
        result: One of its results.
    """
    if result.verdict is not None:
        sentence = verdict_sentence(result) or "Nothing was found that could be judged."
        return Verdict(word=result.verdict, name=result.verdict, sentence=sentence)
    word = _WORDS.get(analysis.command, analysis.command)
    if result.diagnosis is not None:
        return Verdict(word="diagnosed", sentence=result.diagnosis.sentence)
    if analysis.command == "look":
        return Verdict(word=word, sentence=_recognised(result))
    return Verdict(word=word, sentence=f"{_essence(result)} {_UNJUDGED}")


def _tally(analysis: Analysis) -> str:
    """Say how many stages pass, and which is worst and why."""
    results = analysis.results
    n_pass = sum(result.verdict == "pass" for result in results)
    verb = "passes" if n_pass == 1 else "pass"
    counted = f"{n_pass} of {len(results)} stages {verb}."
    if n_pass == len(results):
        return counted
    worst = min(results, key=lambda result: worst_first(result.verdict))
    return f"{counted} Worst is {worst.stage or 'one without a name'}: {verdict_sentence(worst)}"


def _recognised(result: StageResult) -> str:
    """Say what a trace was taken for."""
    if result.trace is None:
        return "There is no trace."
    n_periods = result.intervals.period if result.intervals else 0
    counted = f", with {_count(n_periods, 'whole period')}" if n_periods else ""
    role = "no part of a timed circuit" if result.trace.role == "other" else result.trace.role
    article = "" if result.trace.role == "other" else "the "
    return f"{result.trace.channel} looks like {article}{role}{counted}."


def _essence(result: StageResult) -> str:
    """Say in one sentence what matters most of a result that was not judged."""
    if result.solution is not None and result.solution.tau_charge is not None:
        return _products(result.solution)
    timing = result.timing
    if timing is not None and timing.period is not None:
        return f"The period is {quantity_text(timing.period)}."
    if timing is not None and timing.t_high is not None:
        return f"The high time is {quantity_text(timing.t_high)}; there is no complete period."
    return "There is no complete interval."


def _products(solution: Solution) -> str:
    names = product_names(solution.topology)
    figures = (solution.tau_charge, solution.tau_discharge)
    said = [
        f"{name} is {quantity_text(figure)}"
        for name, figure in zip(names, figures, strict=True)
        if figure is not None
    ]
    return f"{' and '.join(dict.fromkeys(said))}."


def _count(n: int, noun: str) -> str:
    return f"{n} {noun}" if n == 1 else f"{n} {noun}s"
