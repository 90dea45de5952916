"""Pictures with axes, drawn from the overview of a result: no sample is needed."""

from __future__ import annotations

from collections.abc import Callable
from io import StringIO
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.overview import Overview
from benchtool.model.quantity import Measured
from benchtool.model.result import StageResult
from benchtool.model.timing import Levels
from benchtool.report.page.svg import ACCENT, INK, SOFT, fit_svg
from benchtool.units import format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_MOST_BINS = 400  # of an envelope: more cannot be told apart at the printed width
_MOST_MARKS = 60
_WIDE_IN, _NARROW_IN, _HEIGHT_IN = 3.5, 2.3, 1.45
_STYLE: Any = {
    "svg.fonttype": "none",
    "svg.hashsalt": "benchtool",
    "font.size": 7,
    "axes.linewidth": 0.5,
    "axes.edgecolor": SOFT,
    "axes.labelcolor": SOFT,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.formatter.useoffset": False,
    "text.color": SOFT,
    "text.parse_math": False,
    "xtick.color": SOFT,
    "ytick.color": SOFT,
    "xtick.major.width": 0.5,
    "ytick.major.width": 0.5,
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "figure.facecolor": "none",
    "axes.facecolor": "none",
}


@frozen_record
class Picture:
    """A picture as an SVG element, with its caption."""

    name: str
    caption: str
    svg: str


def draw_pictures(result: StageResult, *, prefix: str) -> tuple[Picture, ...]:
    """Draw the trace, the histogram of its periods, and them over time, as far as there are any.

    Args:
        result: One result with its overview.
        prefix: Begins every id of the pictures.
    """
    overview = result.overview
    if overview is None:
        return ()
    found: list[tuple[str, str, float, Callable[[Axes], None]]] = []
    if overview.envelope_s.size > 1:
        found.append(
            ("trace", _trace_caption(result), _WIDE_IN, lambda axes: _trace(axes, result, overview))
        )
    if overview.periods_s.size > 1:
        centre = _Centre.of(result, overview)
        caption = f"Periods, as distance from {centre.text}"
        if overview.histogram_count.size:  # equal periods have none
            found.append(
                ("histogram", caption, _NARROW_IN, lambda axes: _histogram(axes, overview, centre))
            )
        found.append(
            ("periods", "The same over time", _NARROW_IN, lambda a: _over_time(a, overview, centre))
        )
    return tuple(
        Picture(
            name=name,
            caption=caption,
            svg=_draw(draw, width_in=width_in, prefix=f"{prefix}{name}-", title=caption),
        )
        for name, caption, width_in, draw in found
    )


def _draw(draw: Callable[[Axes], None], *, width_in: float, prefix: str, title: str) -> str:
    import matplotlib as mpl
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    with mpl.rc_context(_STYLE):
        figure = Figure(figsize=(width_in, _HEIGHT_IN))
        figure.set_layout_engine("constrained", w_pad=0.1)  # inch: room for the last tick's figure
        FigureCanvasSVG(figure)
        draw(figure.add_subplot())
        page = StringIO()
        figure.savefig(page, format="svg", metadata={"Date": None})
    return fit_svg(page.getvalue(), prefix=prefix, title=title)


@frozen_record
class _Centre:
    """The mean period, and the unit in which the periods differ from it."""

    period_s: float
    factor: float
    symbol: str

    @staticmethod
    def of(result: StageResult, overview: Overview) -> _Centre:
        period = result.timing.period if result.timing else None
        mean_s = float(np.mean(overview.periods_s))
        period_s = period.value if isinstance(period, Measured) else mean_s
        reach_s = float(np.max(np.abs(overview.periods_s - period_s)))
        factor, symbol = time_scale(reach_s or abs(period_s) * 1e-6)
        return _Centre(period_s=period_s, factor=factor, symbol=symbol)

    @property
    def text(self) -> str:
        return format_value(self.period_s, "s", 6)

    def distance(self, times_s: FloatArray) -> FloatArray:
        return np.asarray((times_s - self.period_s) * self.factor, dtype=np.float64)


def time_scale(reach_s: float) -> tuple[float, str]:
    """Return the factor and the symbol of the unit that suits an axis.

    Args:
        reach_s: The largest time on the axis, seconds, greater than 0.
    """
    scales = ((1.0, "s"), (1e3, "ms"), (1e6, "µs"), (1e9, "ns"))
    return next((item for item in scales if reach_s * item[0] >= 1), (1e12, "ps"))


def _trace(axes: Axes, result: StageResult, overview: Overview) -> None:
    times_s, low, high = _decimated(overview)
    factor, symbol = time_scale(float(times_s[-1] - times_s[0]) or 1.0)
    logic = result.trace is not None and result.trace.kind == "logic"
    # Samples are joined, states last until the next.
    step: Literal["post"] | None = "post" if logic else None
    axes.fill_between(
        times_s * factor, low, high, step=step, facecolor=INK, edgecolor=INK, linewidth=0.8
    )
    marks_s = overview.edges_s[:_MOST_MARKS]
    middle = _draw_levels(axes, result, logic=logic)
    heights = np.full(marks_s.size, middle)
    if _is_node(result):  # it turns at its edges, and crosses nothing
        heights = np.interp(marks_s, times_s, (low + high) / 2)
    axes.plot(
        marks_s * factor,
        heights,
        "o",
        markersize=3,
        markerfacecolor="none",
        markeredgecolor=ACCENT,
        markeredgewidth=0.8,
    )
    axes.set_xlabel(f"time, {symbol}")
    axes.set_xlim(float(times_s[0]) * factor, float(times_s[-1]) * factor)
    axes.margins(y=0.12)


def _is_node(result: StageResult) -> bool:
    return result.trace is not None and result.trace.role == "capacitor"


def _trace_caption(result: StageResult) -> str:
    if result.levels is not None and result.levels.kind in {"flat", "noise"}:
        return "The record, with its mean level"
    if _is_node(result):
        return "The first cycles, with turning points"
    return "The first cycles, with levels and edges"


def _draw_levels(axes: Axes, result: StageResult, *, logic: bool) -> float:
    """Draw the levels with their names at the right end; return the mid level."""
    levels = result.levels
    if levels is None or logic:
        axes.set_yticks([0, 1], ["low", "high"])
        return 0.5
    axes.set_ylabel("volts")
    for level_v, name, style in _named_levels(levels, node=_is_node(result)):
        axes.axhline(level_v, color=SOFT, linestyle=style, linewidth=0.6)
        axes.annotate(
            name,
            (1.01, level_v),
            xycoords=("axes fraction", "data"),
            va="center",
            annotation_clip=False,
        )
    return levels.mid_v


def _named_levels(levels: Levels, *, node: bool) -> list[tuple[float, str, str]]:
    if levels.kind in {"flat", "noise"}:
        return [(levels.low_v, "mean", "--")]
    states = [(levels.low_v, "low", "--"), (levels.high_v, "high", "--")]
    if node:
        return states if levels.kind == "node" else []
    return [*states, (levels.mid_v, "mid", ":")]


def _decimated(overview: Overview) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the envelope in at most so many bins as can be told apart."""
    size = overview.envelope_s.size
    starts = np.arange(0, size, -(-size // _MOST_BINS))
    low = np.fmin.reduceat(overview.envelope_low_v, starts)
    high = np.fmax.reduceat(overview.envelope_high_v, starts)
    return overview.envelope_s[starts], low, high


def _histogram(axes: Axes, overview: Overview, centre: _Centre) -> None:
    from matplotlib.ticker import MaxNLocator

    axes.stairs(
        overview.histogram_count,
        centre.distance(overview.histogram_s),
        fill=True,
        facecolor=(SOFT, 0.25),
        edgecolor=INK,
        linewidth=0.6,
    )
    axes.axvline(0.0, color=ACCENT, linewidth=0.8, linestyle="--")
    axes.set_xlabel(f"distance, {centre.symbol}")
    axes.set_ylabel("periods")
    axes.yaxis.set_major_locator(MaxNLocator(nbins=4, integer=True))


def _over_time(axes: Axes, overview: Overview, centre: _Centre) -> None:
    factor, symbol = time_scale(float(np.max(np.abs(overview.periods_at_s))) or 1.0)
    mark = "o" if overview.periods_s.size <= _MOST_MARKS else ""
    axes.plot(
        overview.periods_at_s * factor,
        centre.distance(overview.periods_s),
        color=INK,
        linewidth=0.6,
        marker=mark,
        markersize=2,
    )
    axes.axhline(0.0, color=ACCENT, linewidth=0.8, linestyle="--")
    axes.set_xlabel(f"time, {symbol}")
    axes.set_ylabel(f"distance, {centre.symbol}")
