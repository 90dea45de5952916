"""Probing: which dialects an instrument may speak, found by harmless queries alone."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import replace

from benchtool.errors import InstrumentError, NotConnectedError
from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.linking import link_settings
from benchtool_drivers.dialect.records import Dialect, Question
from benchtool_drivers.link import Link

TIMEOUT_S = 0.5
"""Longest wait for the answer to a probe."""

_LEAST_TIMEOUT_S = 0.25
_COMMAND_ERROR = r"\s*-1\d\d\s*,"
"""SCPI-1999, volume 2, 21.8.9: errors from -199 to -100 are of the command's form."""

_QUICK_S = 0.05
"""An instrument that says who it is in this time is not given the whole wait for each query."""


@frozen_record
class Asked:
    """What came of one query: the answer, or why there is none."""

    query: str
    answer: str | None
    why_not: str = ""


@frozen_record
class Fit:
    """Whether a dialect fits, and why.

    Attributes:
        dialect: The dialect.
        fits: Whether it does.
        why: What it was told from.
        asked: Queries with their answers.
    """

    dialect: Dialect
    fits: bool
    why: str
    asked: tuple[Asked, ...]


class Prober:
    """Asks each query once, however many dialects want to know.

    Args:
        link: The instrument; its settings are as before afterwards.
        quick_s: How long it took to say who it is.
    """

    def __init__(self, link: Link, quick_s: float = TIMEOUT_S) -> None:
        self._link = link
        self._timeout_s = _LEAST_TIMEOUT_S if quick_s < _QUICK_S else TIMEOUT_S
        self._known: dict[str, Asked] = {}
        self._queues: dict[str, str] = {}
        resource = link.resource.upper()
        self._by_queue = resource.endswith("::SOCKET") or resource.startswith("ASRL")

    def probe(self, dialects: Iterable[Dialect], *, likely: bool = False) -> tuple[Fit, ...]:
        """Return for each dialect whether it fits.

        Args:
            dialects: The dialects.
            likely: Whether they are expected to fit.
        """
        before = self._link.settings
        try:
            return tuple(self._fit(dialect, likely=likely) for dialect in dialects)
        finally:
            self._link.use(before)

    def _fit(self, dialect: Dialect, *, likely: bool) -> Fit:
        settings = link_settings(dialect.link)
        self._link.use(replace(settings, timeout_s=min(self._timeout_s, settings.timeout_s)))
        asked: list[Asked] = []
        if not dialect.probe.ask:
            why = "it names no probe: only --dialect chooses it"
            return Fit(dialect=dialect, fits=False, why=why, asked=())
        for question in dialect.probe.ask:
            found = self._ask(question, dialect, likely=likely or bool(asked))
            asked.append(found)
            why_not = found.why_not or _misfit(question, found, dialect)
            if why_not and not question.optional:
                why = f"{found.query}: {why_not}"
                return Fit(dialect=dialect, fits=False, why=why, asked=tuple(asked))
        why_not = self._insane(dialect)
        queries = " and ".join(item.query for item in asked if item.answer is not None)
        return Fit(
            dialect=dialect,
            fits=not why_not,
            why=why_not or f"answers {queries} as it must",
            asked=tuple(asked),
        )

    def _ask(self, question: Question, dialect: Dialect, *, likely: bool) -> Asked:
        query = question.query.format(channel=dialect.channel.names[0])
        if query not in self._known:
            self._known[query] = self._asked(query, likely=likely)
        return self._known[query]

    def _asked(self, query: str, *, likely: bool) -> Asked:
        link = self._link
        unheard = self._queue_unheard()
        if unheard:
            return Asked(query=query, answer=None, why_not=unheard)
        try:
            unknown = "" if likely else self._unknown(query)
            if unknown:
                return Asked(query=query, answer=None, why_not=unknown)
            answer = link.ask(query)
            entries = link.errors()
        except InstrumentError as error:
            self._settle(error)
            return Asked(query=query, answer=None, why_not=_reason(error))
        if entries:
            return Asked(query=query, answer=None, why_not=entries[0])
        return Asked(query=query, answer=answer)

    def _queue_unheard(self) -> str:
        """Empty the error queue; return why that cannot be, asked once for each query of one."""
        query = self._link.settings.error_query or ""
        if query not in self._queues:
            try:
                self._link.errors()
            except InstrumentError as error:
                self._settle(error)
                self._queues[query] = f"{query}: {_reason(error)}"
                return self._queues[query]
            self._queues[query] = ""
        elif not self._queues[query]:
            self._link.errors()
        return self._queues[query]

    def _unknown(self, query: str) -> str:
        """Return what the error queue says to an unknown query, without waiting for its answer.

        Over a byte stream the queue may be read right behind a query. Where its entry comes first,
        there was no answer. Where the answer comes first, the link is brought back in step, and
        the query is asked again as usual. Other connections drop or mix up an answer that is not
        fetched, so there each unknown query takes its time.
        """
        error_query = self._link.settings.error_query
        if not self._by_queue or error_query is None:
            return ""
        try:
            self._link.send(query)
            first = self._link.ask(error_query)
            if re.match(_COMMAND_ERROR, first):
                self._link.errors()
                return first
            self._link.ask("*IDN?", match=f"^{re.escape(self._link.identity)}$")
        except NotConnectedError:
            raise
        except InstrumentError:
            self._link.recover()
        return ""

    def _settle(self, error: InstrumentError) -> None:
        """Bring the link back in step; the second loss of the connection is final."""
        if isinstance(error, NotConnectedError):
            self._link.recover()

    def _insane(self, dialect: Dialect) -> str:
        """Return what is impossible about the preamble, nothing where it is sound or not asked."""
        from benchtool_drivers.digitiser.sanity import find_nonsense

        if dialect.kind != "digitiser":
            return ""
        try:
            nonsense = find_nonsense(self._link, dialect)
            entries = self._link.errors()
        except InstrumentError as error:
            self._settle(error)
            return f"its preamble: {_reason(error)}"
        return nonsense or (entries[0] if entries else "")


def _misfit(question: Question, found: Asked, dialect: Dialect) -> str:
    if found.answer is None:
        return ""
    answer = dialect.link.plain(found.answer, found.query)
    if re.search(question.match, answer):
        return ""
    shown = answer if len(answer) <= 30 else f"{answer[:28]}.."
    return f"{shown!r} does not fit"


def _reason(error: InstrumentError) -> str:
    reported = re.search(r"reports (.*?)\.?$", error.message)
    return reported[1] if reported else error.message.rstrip(".")
