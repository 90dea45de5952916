"""Timing of a trace: levels, edges, intervals, and the figures made of them."""

from benchtool.timing.bounds import require_intervals, require_states
from benchtool.timing.delay import measure_delay
from benchtool.timing.edges import find_edges
from benchtool.timing.intervals import find_intervals
from benchtool.timing.jitter import measure_jitter
from benchtool.timing.levels import find_levels
from benchtool.timing.node import find_turning_points
from benchtool.timing.overview import make_overview
from benchtool.timing.roles import Shape, find_roles, find_shapes
from benchtool.timing.stability import measure_stability
from benchtool.timing.statistics import measure_timing

__all__ = [
    "Shape",
    "find_edges",
    "find_intervals",
    "find_levels",
    "find_roles",
    "find_shapes",
    "find_turning_points",
    "make_overview",
    "measure_delay",
    "measure_jitter",
    "measure_stability",
    "measure_timing",
    "require_intervals",
    "require_states",
]
