"""Simulated counters with the dialects that are meant for them, and the board they look at."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import closing, contextmanager

from simulated import QUICK

from benchtool_drivers.counter import Counter
from benchtool_drivers.dialect import Dialect, find_dialect, parse_dialect
from benchtool_drivers.loopback.families.counters import (
    Beat,
    FunctionCounter,
    SimulatedCounter,
    StampCounter,
)
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

T_HIGH_S, T_LOW_S = 1.2e-3, 0.8e-3
PERIOD_S = T_HIGH_S + T_LOW_S
JITTER_REL = 1e-3
FUNCTIONS, STAMPS = find_dialect("counter-scpi99"), find_dialect("counter-timestamps")


def board() -> Beat:
    return Beat(t_high=T_HIGH_S, t_low=T_LOW_S, jitter_rel=JITTER_REL)


def function_counter(fault: str | None = None) -> FunctionCounter:
    return FunctionCounter(board, fault=fault)


def stamp_counter(fault: str | None = None) -> StampCounter:
    return StampCounter(board, fault=fault)


def changed(dialect: Dialect, *pairs: tuple[str, str]) -> Dialect:
    """Return a dialect with pieces of its text exchanged."""
    text = dialect.text
    for before, after in pairs:
        assert before in text, before
        text = text.replace(before, after)
    return parse_dialect(text)


AS_TEXT = (
    ('["FORM REAL,64", "FORM:BORD NORM"]', '["FORM ASC,9"]'),
    (r"'^REAL,\s*64'", "'^ASC'"),
    ('wrap  = "definite"', 'wrap = "ascii"'),
)
ARRAY = (
    ('by        = "count"', 'by = "array"'),
    (', "TRIG:COUN {n}"]', "]"),
    ('"FETC?"', '"FETC:ARR? {n}"'),
    ('arm       = ["ABOR", "INIT"]', ""),
)
LOOP = (
    *AS_TEXT,
    ('by        = "count"', 'by = "loop"'),
    (', "TRIG:COUN {n}"]', "]"),
    ("most      = 10000", ""),
    ('"FETC?"', '"READ?"'),
)


@contextmanager
def opened(
    subject: SimulatedCounter, dialect: Dialect, transport: str = "socket"
) -> Iterator[Counter]:
    """Serve a counter and open it."""
    with (
        serve(subject, transport) as resource,
        closing(open_instrument(resource, dialect=dialect, settings=QUICK)) as instrument,
    ):
        assert isinstance(instrument, Counter)
        yield instrument
