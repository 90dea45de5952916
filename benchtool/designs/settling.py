"""The design that a capture is held against: as it was written, and as the user overrules it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from benchtool.designs.reading import load_design
from benchtool.model.design import Band, Design, Probe
from benchtool.model.options import MeasureOptions


def settled_design(design: str | Path | Design, options: MeasureOptions) -> Design:
    """Return a design with probe and temperature as the user overrules them.

    Args:
        design: The design, or its file.
        options: What is overruled.

    Raises:
        DesignError: If the file has a fault.
        InputError: If it cannot be opened.
    """
    if isinstance(design, str | Path):
        design = load_design(design)
    if options.probe is not None:
        design = replace(design, probe=_placed(options.probe, design))
    if options.temperature_c is not None:
        at = options.temperature_c
        design = replace(design, temperature=Band(nominal=at, lower=at, upper=at))
    return design


def _placed(probe: Probe, design: Design) -> Probe:
    """Return the probe where the design puts it: an option says what it is, not where."""
    only_nodes = all(stage.capacitor and not stage.channel for stage in design.stages)
    if design.probe.at == "capacitor" or only_nodes:
        return replace(probe, at="capacitor")
    return probe
