"""What a probe would do at the capacitor: computed by the model, for the probe at hand."""

from __future__ import annotations

from dataclasses import replace

from benchtool.judge.responses import respond_nominally
from benchtool.model.design import Design, Probe, Stage
from benchtool.model.plan import ProbeShift

USUAL_PROBE = Probe(r_ohm=10e6, c_f=12e-12)
"""A passive divider probe: common practice."""

_TIMES = ("t_high", "t_low", "period", "delay")


def shift_by_probe(stage: Stage, design: Design, probe: Probe | None) -> ProbeShift:
    """Return what a probe at the capacitor does to the nominal times.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature, and the probe where none is given.
        probe: The probe; None takes the design's, or a usual one of 10 MΩ and 12 pF.
    """
    stated = design.probe if design.probe != Probe() else USUAL_PROBE
    load = replace(probe or stated, at="capacitor")
    free = respond_nominally(stage, replace(design, probe=Probe()))
    loaded = respond_nominally(stage, replace(design, probe=load))
    shifts = {}
    for name in _TIMES:
        before, after = free.get(name), loaded.get(name)
        if before and after:
            shifts[name] = after / before - 1
    stops = not shifts and any(free.get(name) for name in _TIMES)
    return ProbeShift(probe=load, shifts=shifts, stops=stops)
