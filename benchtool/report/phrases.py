"""Words and figures that screen and page share."""

from __future__ import annotations

import math

from benchtool.model.judgement import WORST_FIRST, Check, VerdictName
from benchtool.model.quantity import Bound, Measured, Quantity
from benchtool.model.result import Analysis, StageResult
from benchtool.report.numberline import NumberLine
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

LABELS: dict[str, str] = {
    "t_high": "high time",
    "t_low": "low time",
    "period": "period",
    "frequency": "frequency",
    "duty": "duty",
    "first_high": "first high",
    "delay": "delay",
    "drift": "drift",
    "tau_charge": "charging R·C",
    "tau_discharge": "discharging R·C",
    "tau_RA": "RA·C",
    "tau_ratio": "ratio of the two",
    "jitter_period": "period jitter sd",
    "jitter_cycle": "cycle jitter rms",
    "period_sd": "period jitter, sd",
    "period_pp": "period jitter, peak-peak",
    "cycle_rms": "cycle-to-cycle, rms",
    "cycle_peak": "cycle-to-cycle, peak",
    "grid_share": "sd of the grid alone",
}

PRODUCTS: dict[str, tuple[str, str]] = {
    "astable": ("(RA+RB)·C", "RB·C"),
    "astable-diode": ("RA·C", "RB·C"),
}
"""What the charging and discharging products are made of; R·C both where not named."""

VERDICT_STYLES: dict[str | None, str] = {
    "pass": "bold green",
    "conditional-pass": "bold yellow",
    "conditional-fail": "bold yellow",
    "undecided": "bold yellow",
    "fail": "bold red",
    "unusable": "bold magenta",
}


def gloss(name: str) -> str:
    """Return a quantity's name in words; nothing where they only repeat the name."""
    label = LABELS.get(name, "")
    return "" if label == name.replace("_", " ") else label


def quantity_text(item: Quantity | None) -> str:
    """Return "14.0102 s ± 0.0031 s", a bound in words, or a dash."""
    if item is None:
        return "–"
    if isinstance(item, Measured) and item.u == 0:
        return format_value(item.value, item.unit)
    if isinstance(item, Measured):
        return format_measured(item.value, expanded(item), item.unit)
    return bound_text(item)


def ratio_text(item: Measured) -> str:
    """Return a ratio of two like things as a plain number: "1.260 ± 0.059"."""
    U = expanded(item)
    places = max(0, 1 - math.floor(math.log10(U))) if U > 0 else 4
    return f"{item.value:.{places}f} ± {U:.{places}f}"


def bound_text(item: Bound) -> str:
    """Return a bound in words: "at least 3.2 s"."""
    words = []
    if item.at_least is not None:
        words.append(f"at least {format_value(item.at_least, item.unit)}")
    if item.at_most is not None:
        words.append(f"at most {format_value(item.at_most, item.unit)}")
    return ", ".join(words)


def limits_text(lower: float | None, upper: float | None, unit: str, digits: int = 5) -> str:
    """Return "18.2 s … 21.5 s", "≤ 21.5 s" or "≥ 18.2 s"."""
    if lower is None and upper is None:
        return "–"
    if lower is None:
        return f"≤ {format_value(upper or 0.0, unit, digits)}"
    if upper is None:
        return f"≥ {format_value(lower, unit, digits)}"
    return f"{format_value(lower, unit, digits)} … {format_value(upper, unit, digits)}"


def conform_text(p: float | None) -> str:
    """Return a conformance probability in percent, never rounded up to certainty."""
    if p is None:
        return "–"
    if p > 0.9995:
        return "> 99.9 %"
    return "< 0.1 %" if p < 0.0005 else f"{100 * p:.1f} %"


def room_text(check: Check) -> str:
    """Return the distance to the nearer limit in multiples of U; negative outside."""
    if not isinstance(check.measured, Measured):
        return "–"
    U = expanded(check.measured)
    rooms = []
    if check.lower is not None:
        rooms.append(check.measured.value - check.lower)
    if check.upper is not None:
        rooms.append(check.upper - check.measured.value)
    if not rooms or U == 0:
        return "–"
    room = min(rooms) / U
    return f"{room:+.1f} U" if abs(room) < 1000 else f"{room:+.0f} U"


def verdict_sentence(result: StageResult) -> str:
    """Return one sentence that says why: the reason of the worst check."""
    if result.verdict == "pass":
        return "Every quantity is inside its limits, guard band kept."
    worst = next(
        (check for name in WORST_FIRST for check in result.checks if check.verdict == name), None
    )
    return worst.reason if worst else ""


def product_names(topology: str) -> tuple[str, str]:
    """Return what the charging and the discharging product are made of."""
    return PRODUCTS.get(topology, ("R·C", "R·C"))


def file_name(analysis: Analysis, result: StageResult) -> str:
    """Return the name of the file that a result comes from."""
    return analysis.sources[result.source].name if analysis.sources else "figures as given"


def worst_first(verdict: VerdictName | None) -> int:
    """Return a rank by which the worst verdict sorts first and none at all last."""
    return len(WORST_FIRST) if verdict is None else WORST_FIRST.index(verdict)


def check_line(check: Check) -> NumberLine:
    """Return what the number line of a check shows."""
    measured = check.measured if isinstance(check.measured, Measured) else None
    return NumberLine(
        value=measured.value if measured else None,
        U=expanded(measured) if measured else 0.0,
        lower=check.lower,
        upper=check.upper,
        accept_lower=check.accept_lower,
        accept_upper=check.accept_upper,
    )
