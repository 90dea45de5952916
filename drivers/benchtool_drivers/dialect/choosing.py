"""Choosing the dialect of an instrument: as the user says, as before, or by probing."""

from __future__ import annotations

from collections.abc import Callable

from benchtool.errors import BenchtoolError, InstrumentError, Step, UsageError
from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.places import find_dialect, known_dialects
from benchtool_drivers.dialect.probing import TIMEOUT_S, Fit, Prober
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.dialect.remembering import remember, remembered
from benchtool_drivers.link import Link


@frozen_record
class Choice:
    """A dialect, and how it was come by."""

    dialect: Dialect
    how: str


Look = Callable[[tuple[Fit, ...]], None]
"""Is told which dialects fit, and why."""


def choose_dialect(link: Link, *, quick_s: float = TIMEOUT_S, look: Look | None = None) -> Choice:
    """Return the dialect of an instrument that nobody named one for.

    The one that went with its identity before is taken where it still fits; otherwise all are
    probed, and the one that fits is remembered.

    Args:
        link: The instrument.
        quick_s: How long it took to say who it is.
        look: Is told how each dialect did.

    Raises:
        UsageError: If several fit (``several-dialects``).
        InstrumentError: If none fits (``no-dialect``).
    """
    prober = Prober(link, quick_s)
    before = _as_before(link, prober)
    if before is not None:
        return before
    fits = prober.probe(known_dialects().dialects.values())
    if look is not None:
        look(fits)
    choice = settle(link, fits)
    remember(link.identity, choice.dialect.name)
    return choice


def settle(link: Link, fits: tuple[Fit, ...]) -> Choice:
    """Return the one dialect that fits.

    Raises:
        UsageError: If several fit (``several-dialects``).
        InstrumentError: If none fits (``no-dialect``).
    """
    found = [fit for fit in fits if fit.fits]
    if len(found) == 1:
        return Choice(dialect=found[0].dialect, how=f"probed: {found[0].why}")
    if found:
        names = " or ".join(f"--dialect {fit.dialect.name}" for fit in found)
        raise UsageError(
            f"{len(found)} dialects fit {link.resource}: "
            + ", ".join(fit.dialect.name for fit in found),
            hint=f"Say which with {names}; the manual of the instrument tells.",
            code="several-dialects",
        )
    raise InstrumentError(
        f"{link.resource} answers ({link.identity or 'without a name'}), but no dialect fits it",
        hint="`benchtool instruments identify` shows why not; write a dialect from its manual, "
        "beginning with one of `benchtool instruments dialects`, and give it with --dialect.",
        step=Step(resource=link.resource, last_good=link.last_good),
        code="no-dialect",
    )


def _as_before(link: Link, prober: Prober) -> Choice | None:
    name = remembered(link.identity)
    if name is None:
        return None
    try:
        dialect = find_dialect(name)
    except BenchtoolError:  # a file that has gone: look again
        return None
    fit = prober.probe([dialect], likely=True)[0]
    return Choice(dialect=dialect, how="as before with this identity") if fit.fits else None
