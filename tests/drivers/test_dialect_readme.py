"""The walk through a dialect in drivers/README.md holds what it says."""

from __future__ import annotations

import re
from contextlib import closing
from pathlib import Path

from simulated import QUICK, assert_whole, simulated

from benchtool.instruments import Order
from benchtool_drivers.dialect import known_dialects, parse_dialect
from benchtool_drivers.dialect.bodies import CHUNK
from benchtool_drivers.dialect.preambles import PREAMBLE
from benchtool_drivers.dialect.vocabulary import X_FORMS, Y_FORMS
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

README = (Path(__file__).parents[2] / "drivers" / "README.md").read_text("utf-8")


def shown_dialect() -> str:
    rows = README.split("\n")
    start = rows.index("    schema = 1")
    stop = next(n for n in range(start, len(rows)) if rows[n] and not rows[n].startswith("    "))
    return "\n".join(row[4:] for row in rows[start:stop])


def test_the_dialect_shown_there_reads_an_instrument() -> None:
    dialect = parse_dialect(shown_dialect(), source="README.md")
    subject = simulated("listed")
    with (
        serve(subject, "socket") as resource,
        closing(open_instrument(resource, dialect=dialect, settings=QUICK)) as instrument,
    ):
        assert_whole(instrument.acquire(Order()), subject)


def test_every_form_and_every_digitisers_dialect_is_named_there() -> None:
    named = set(re.findall(r"`([a-z0-9-]+)`", README))
    assert {*X_FORMS, *Y_FORMS, *PREAMBLE.forms, *CHUNK.forms} <= named
    digitisers = known_dialects("digitiser").dialects.values()
    bundled = {item.name for item in digitisers if item.is_bundled}
    assert len(bundled) >= 5
    assert bundled <= named
