"""Words and figures about suspects that screen and page share."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool.manual import lookup
from benchtool.model.diagnosis import Diagnosis, Group, NextReading, Suspect
from benchtool.model.node import EarlyTau
from benchtool.model.picking import Combinations
from benchtool.report.compass import Point, place_directions
from benchtool.report.phrases import quantity_text
from benchtool.units import format_value

_LEAST_SHOWN = 0.005
_LEAST_GROUP = 0.02
_MOST_SHOWN = 8
_MOST_NAMED = 6
_LONG = 60  # characters
_TELLS = ((0.5, "much"), (0.2, "some"), (-1.0, "a little"))
"""Bits expected of a reading, in words."""


@frozen_record
class Row:
    """One suspect in words.

    Attributes:
        name: Name of the fault, or of both.
        share: Its probability.
        percent: The same in words.
        meaning: What it is.
        size: Its size with its interval; empty where it has none.
    """

    name: str
    share: float
    percent: str
    meaning: str
    size: str


def suspect_rows(found: Diagnosis) -> tuple[Row, ...]:
    """Return the suspects worth a row, the likeliest first."""
    return tuple(_row(item) for item in _shown(found))


def others_text(found: Diagnosis) -> str:
    """Return what is left for all suspects without a row; empty where that is nothing."""
    left = 1 - sum(item.probability for item in _shown(found))
    return f"All others together: {percent(left)}." if left >= _LEAST_SHOWN else ""


def compass_points(found: Diagnosis) -> tuple[Point, ...]:
    """Return the points of the compass; none of a board that is likely healthy or stands still."""
    if found.best.fault == "healthy":
        return ()
    return place_directions(found.directions, [item.fault for item in _shown(found)])


def group_text(group: Group) -> str:
    """Return why the members of a group cannot be told apart; empty for one alone."""
    if len(group.members) < 2 or not group.why or group.probability < _LEAST_GROUP:
        return ""
    if group.members[0] == "healthy":
        return group.why
    more = len(group.members) - _MOST_NAMED
    names = ", ".join(group.members[:_MOST_NAMED]) + (f" and {more} more" if more > 0 else "")
    return f"Not told apart: {names}. {group.why}"


def reading_title(item: NextReading) -> str:
    """Return the name of a reading with what is to be clipped on or set."""
    value = f" {format_value(item.value, item.unit)}" if item.value is not None else ""
    return f"{item.reading}{value}"


def reading_cost(item: NextReading) -> str:
    """Return what a reading costs and how much it is expected to tell."""
    tells = next(word for least, word in _TELLS if item.gain_bits >= least)
    return f"about {item.minutes:g} min, tells {tells}"


def next_heading(found: Diagnosis) -> str:
    """Return the words over the readings to take next."""
    if found.best.fault == "healthy":
        return "To be surer still, what tells most for the time first:"
    return "To measure next, what tells most for the time first:"


def shorter_caution(caution: str, said: set[str]) -> str:
    """Return a caution, long sentences that were said before cut to their first words.

    Args:
        caution: Its sentences.
        said: Sentences that were said; those of this one are added.
    """
    words = []
    for sentence in caution.split(". "):
        text = sentence.strip().rstrip(".")
        cut = text in said and len(text) > _LONG
        words.append(f"{_head(text)} (as above)." if cut else f"{text}.")
        said.add(text)
    return " ".join(words)


def _head(text: str) -> str:
    return text.partition(":")[0].partition(",")[0]


def unmarked_sentence(found: Combinations) -> str:
    """Return what can be said of a board of which no part is known."""
    counted = (
        f"{found.n_fitting} sets of preferred values give these times; the usual ones first"
        if found.n_fitting
        else "no set of preferred values gives these times: a part has moved, or is of no series"
    )
    return f"The output tells products of R and C and no part alone; {counted}."


def combination_rows(found: Combinations) -> tuple[tuple[str, str, str], ...]:
    """Return a row for each set of preferred values: its parts, how far off its products are."""
    return tuple(
        (
            "  ".join(
                f"{ref} {format_value(value, 'F' if ref == 'C' else 'ohm')}"
                for ref, value in item.parts.items()
            ),
            f"{100 * item.off_charge:+.1f} %",
            f"{100 * item.off_discharge:+.1f} %",
        )
        for item in found.best
    )


def early_rows(found: EarlyTau) -> tuple[tuple[str, str, str], ...]:
    """Return the rows of an early answer: name, what it is, figure."""
    way = "rise" if found.rises else "fall"
    rows = (
        ("tau", f"time constant of the {way}", found.tau),
        ("end", "voltage to which it would settle", found.end),
        ("arrives", "at the threshold, after the first sample", found.arrives),
        ("length", f"of the whole {way}", found.length),
    )
    shown = [(name, label, quantity_text(item)) for name, label, item in rows if item is not None]
    return (*shown, ("covered", "of a time constant, by this record", f"{found.covered:.2f}"))


def percent(p: float) -> str:
    """Return a probability in percent, never rounded to certainty."""
    if p > 0.995:
        return "> 99 %"
    return "< 1 %" if p < 0.01 else f"{100 * p:.0f} %"


def _shown(found: Diagnosis) -> list[Suspect]:
    return [item for item in found.suspects if item.probability >= _LEAST_SHOWN][:_MOST_SHOWN]


def _row(item: Suspect) -> Row:
    entry = None if item.faults else lookup(item.fault)
    return Row(
        name=" + ".join(item.faults) if item.faults else item.fault,
        share=item.probability,
        percent=percent(item.probability),
        meaning=entry.title if entry else "two faults at once" if item.faults else "",
        size=_size(item),
    )


def _size(item: Suspect) -> str:
    if item.estimate is None:
        return ""
    unit = item.estimate.unit
    if item.lower is None or item.upper is None:
        return format_value(item.estimate.value, unit)
    text = f"{format_value(item.lower, unit, 3)} … {format_value(item.upper, unit, 3)}"
    return f"{text} (design {format_value(item.nominal, unit, 3)})" if item.nominal else text
