"""Quantities with their uncertainty, and bounds where there is no value."""

from __future__ import annotations

import math
from dataclasses import replace

from benchtool.frozen import frozen_record


@frozen_record
class Contribution:
    """One line of an uncertainty budget.

    Attributes:
        source: What it comes from. Two contributions of the same source that are ``common``
            are the same error, fully correlated between the quantities that hold them.
        u: Signed standard uncertainty that it gives the quantity, in the quantity's unit.
        dof: Degrees of freedom, ``inf`` where the figure is taken as exact.
        common: Whether the same error enters other quantities of the same capture.
        note: How the figure was come by, a few words.
    """

    source: str
    u: float
    dof: float = math.inf
    common: bool = False
    note: str = ""

    def __post_init__(self) -> None:
        if not math.isfinite(self.u):
            raise ValueError(f"contribution {self.source!r} needs a finite u, got {self.u}")
        if not self.dof > 0:
            raise ValueError(f"contribution {self.source!r} needs dof > 0, got {self.dof}")

    def scaled(self, factor: float) -> Contribution:
        """Return the contribution times a sensitivity coefficient."""
        return replace(self, u=self.u * factor)


@frozen_record
class Measured:
    """A value with its standard uncertainty (JCGM 100).

    Attributes:
        value: The estimate, in ``unit``.
        u: Standard uncertainty, in ``unit``, zero or more.
        unit: SI unit symbol: s, Hz, V, ohm, F, A, 1 or 1/s.
        dof: Effective degrees of freedom, ``inf`` where unlimited.
        n: Number of observations behind the value.
        budget: What ``u`` is made of; empty where it was stated as a whole.
    """

    value: float
    u: float
    unit: str
    dof: float = math.inf
    n: int = 1
    budget: tuple[Contribution, ...] = ()

    def __post_init__(self) -> None:
        if not math.isfinite(self.value):
            raise ValueError(f"a measured value must be finite, got {self.value}")
        if not (math.isfinite(self.u) and self.u >= 0):
            raise ValueError(f"a standard uncertainty must be finite and >= 0, got {self.u}")
        if not self.dof > 0:
            raise ValueError(f"degrees of freedom must be > 0, got {self.dof}")


@frozen_record
class Bound:
    """What is known of a quantity whose value cannot be had."""

    unit: str
    at_least: float | None = None
    at_most: float | None = None

    def __post_init__(self) -> None:
        if self.at_least is None and self.at_most is None:
            raise ValueError("a bound needs at_least or at_most")


Quantity = Measured | Bound


@frozen_record
class Notice:
    """A warning: a stable code that ``explain`` knows, and a sentence about this case."""

    code: str
    text: str
