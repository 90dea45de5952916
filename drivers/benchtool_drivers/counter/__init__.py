"""Counters: readings of durations, and time stamps of edges, in any dialect."""

from benchtool_drivers.counter.counter import Counter

__all__ = ["Counter"]
