"""What a simulated capture holds in truth, as a record and as JSON."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import fields, replace
from typing import Any

from benchtool.errors import InputError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

SCHEMA = "benchtool-truth/1"


@frozen_record(eq=False)
class Truth:
    """What a simulated capture holds in truth; None where the circuit has no such figure.

    Times are true seconds, whatever the instrument's clock shows.

    Attributes:
        topology: Of the circuit.
        t_high, t_low, period, frequency, duty: Long-run means of the output.
        first_high: First high time after power-up; a ripple leaves it open.
        delay: Delay after power-up.
        stuck: State in which the output stays and why; None where it moves.
        tau_charge, tau_discharge, tau_RA: Products of the parts alone, seconds.
        parts: Part values by reference, ohms and farads.
        supply_v: The supply without its ripple.
        powered_s: When the supply was switched on, after the first sample.
        edges_s: True times of the output's edges inside the record, shape (n,).
        edge_rising: Direction of each.
        timebase_rel: Relative error of the instrument's clock.
        jitter_rel: Standard deviation of a period, relative.
        fault: Name of the fault, ``healthy`` where there is none.
        fault_size: Its size in the fault's own unit.
        seed: Seed of the random generator.
    """

    topology: str
    t_high: float | None
    t_low: float | None
    period: float | None
    frequency: float | None
    duty: float | None
    first_high: float | None
    delay: float | None
    stuck: str | None
    tau_charge: float
    tau_discharge: float
    tau_RA: float | None
    parts: Mapping[str, float]
    supply_v: float
    powered_s: float | None
    edges_s: FloatArray
    edge_rising: tuple[bool, ...]
    timebase_rel: float
    jitter_rel: float
    fault: str = "healthy"
    fault_size: float | None = None
    seed: int | None = None

    def labelled(self, *, fault: str, fault_size: float | None, seed: int | None) -> Truth:
        """Return the truth with the fault and the seed that led to it."""
        return replace(self, fault=fault, fault_size=fault_size, seed=seed)

    def to_json(self) -> str:
        """Return the truth as a JSON document."""
        document: dict[str, Any] = {"schema": SCHEMA}
        for item in fields(self):
            document[item.name] = getattr(self, item.name)
        document["parts"] = dict(self.parts)
        document["edges_s"] = self.edges_s.tolist()
        document["edge_rising"] = list(self.edge_rising)
        return json.dumps(document, indent=1, allow_nan=False) + "\n"


def read_truth(text: str) -> Truth:
    """Return the truth that a JSON document holds.

    Raises:
        InputError: If it is no truth.
    """
    import numpy as np

    try:
        document = json.loads(text)
        if document.pop("schema") != SCHEMA:
            raise ValueError("unknown schema")
        document["edges_s"] = np.array(document["edges_s"], dtype=np.float64)
        document["edge_rising"] = tuple(document["edge_rising"])
        return Truth(**document)
    except (ValueError, TypeError, KeyError, AttributeError) as error:
        raise InputError(
            f"this is no truth of a simulated capture: {error}",
            hint=f"A truth file is JSON with schema {SCHEMA}.",
        ) from error


def number_or_none(value: float) -> float | None:
    """Return a finite number, None in place of NaN and infinity."""
    return value if math.isfinite(value) else None
