"""Faults and findings: what is seen in a trace and what can cause it."""

from benchtool.diagnose.findings import find_findings, flat_length, flat_state

__all__ = ["find_findings", "flat_length", "flat_state"]
