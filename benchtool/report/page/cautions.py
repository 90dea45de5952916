"""The cautions printed where the work can hurt."""

from __future__ import annotations

CAUTIONS = (
    "An earth-referenced probe clip on a live chassis is a short circuit. A board fed through a "
    "capacitive dropper has no safe 0 V: treat all of it as live. Capacitors stay charged after "
    "the supply is off: discharge them and measure before touching. Fit polarised parts the "
    "right way round. A timer can start its load by itself: disconnect or block the load first. "
    "Local codes and licensed practice come before anything said here."
)
