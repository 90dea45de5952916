"""What the numbers imply: products, part values with what they assume, the likely part."""

from __future__ import annotations

from benchtool.model.judgement import PartEstimate, Solution
from benchtool.model.result import StageResult
from benchtool.report.page.views import Block, Facts, Grid, Prose
from benchtool.report.phrases import product_names, quantity_text
from benchtool.units import format_value

_WITHIN = {True: "yes", False: "no", None: "not decided"}


def circuit_blocks(result: StageResult) -> tuple[Block | None, ...]:
    """Return the likely part, the products and the part values; empty where nothing was solved.

    Args:
        result: One result.
    """
    likely = Prose(text=result.likely) if result.likely else None
    if result.solution is None:
        return (likely,)
    return (likely, _products(result.solution), _parts(result.solution))


def _products(solution: Solution) -> Facts | None:
    charge, discharge = product_names(solution.topology)
    figures = (
        (f"{charge} of the parts", solution.tau_charge),
        (f"{discharge} of the parts", solution.tau_discharge),
        ("RA·C of the parts", solution.tau_RA),
        ("ratio of the two", solution.tau_ratio),
        ("R·C that acts, charging", solution.effective_charge),
        ("R·C that acts, discharging", solution.effective_discharge),
    )
    rows = tuple((name, quantity_text(item)) for name, item in figures if item is not None)
    return Facts(rows=_joint(rows)) if rows else None


def _joint(rows: tuple[tuple[str, str], ...]) -> tuple[tuple[str, str], ...]:
    """Return the rows without repetitions: one resistor gives one product twice."""
    return tuple(dict.fromkeys(rows))


def _parts(solution: Solution) -> Grid | None:
    parts = [part for part in solution.parts if part.estimate is not None]
    if not parts:
        return None
    return Grid(
        caption="Part values, each under its assumption",
        heads=("part", "value, ± U at 95 %", "change", "marked", "in tolerance", "if"),
        rows=tuple(_part(part) for part in parts),
        numeric=frozenset({1, 2, 3}),
    )


def _part(part: PartEstimate) -> tuple[str, ...]:
    unit = part.estimate.unit if part.estimate else "1"
    return (
        part.ref,
        quantity_text(part.estimate),
        f"{100 * part.change.value:+z.1f} %" if part.change else "–",
        "–" if part.nominal is None else format_value(part.nominal, unit),
        _WITHIN[part.within_tolerance] if part.nominal is not None else "–",
        " and ".join(part.assumes) or "nothing assumed",
    )
