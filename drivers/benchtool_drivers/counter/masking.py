"""Readings that are none, and such as cannot be."""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.quantity import Notice
from benchtool_drivers.dialect.counting import CounterKeys
from benchtool_drivers.digitiser.talk import Talk

_NEAR = 1e-6


def masked(
    talk: Talk, raw: AnyArray, what: str, query: str
) -> tuple[FloatArray, int, tuple[Notice, ...]]:
    """Return the readings that are some, how many are none, and the notice of that.

    Args:
        talk: Where they came from.
        raw: All numbers as they came.
        what: What they are of.
        query: The query that brought them.

    Raises:
        ReplyError: ``no-valid-readings``: if there is none.
    """
    missing = is_missing(talk, raw)
    n_missing = int(missing.sum())
    values: FloatArray = raw[~missing].astype(np.float64)
    if not values.size:
        raise talk.wrong(
            f"all {raw.size} readings of {what} are marked as none",
            hint="Check signal, level and coupling at the counter: it says that it saw nothing.",
            command=query,
            expected="readings",
            got=f"{raw.size} times no reading",
            code="no-valid-readings",
        )
    if not n_missing:
        return values, 0, ()
    text = f"{n_missing} of {raw.size} readings of {what} are marked as none; they are left out"
    return values, n_missing, (Notice(code="readings-missing", text=text),)


def is_missing(talk: Talk, raw: AnyArray) -> np.ndarray:
    """Say which numbers mark that there is no reading, shape of ``raw``."""
    body: CounterKeys = talk.dialect.body
    values = raw.astype(np.float64)
    missing: np.ndarray = ~np.isfinite(values)
    for mark in body.data.missing:
        missing |= np.abs(values - mark) <= _NEAR * abs(mark)
    return missing


def checked(talk: Talk, values: FloatArray, name: str, query: str) -> None:
    """Refuse readings that cannot be: no time and no frequency is 0 or less, no duty beyond 1.

    Raises:
        ReplyError: ``impossible-reading``.
    """
    wrong = ~((values > 0) & (values < 1)) if name == "duty" else ~(values > 0)
    if not wrong.any():
        return
    first = int(np.argmax(wrong))
    unit = "a share between 0 and 1: percent or ratio?" if name == "duty" else "more than 0"
    raise talk.wrong(
        f"reading {first + 1} of {name} is {values[first]:.6g}, which cannot be",
        hint="Compare unit in [functions] and the words there with the manual.",
        command=query,
        expected=unit,
        got=f"{values[first]:.6g}",
        code="impossible-reading",
    )
