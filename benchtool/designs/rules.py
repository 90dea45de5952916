"""What must hold between keys of a design, whatever else is wrong with it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from benchtool.designs.faults import Flaw
from benchtool.designs.vocabulary import (
    DIVIDED_QUANTITIES,
    JITTERS,
    QUANTITIES,
    TOPOLOGY_QUANTITIES,
    listed,
)

_THRESHOLDS = ("upper_threshold", "lower_threshold", "u_threshold")
_ONE_THRESHOLD = ("one-shot", "power-on")


def find_conflicts(document: Mapping[str, Any]) -> Iterator[Flaw]:
    """Yield every contradiction between keys; a value that is itself malformed is passed over."""
    stages = {name: stage for name, stage in _table(document, "stage").items() if _is_table(stage)}
    for name, stage in stages.items():
        yield from _quantity_conflicts(name, stage)
        yield from _leak_conflicts(name, stage)
        yield from _ic_conflicts(name, stage)
    yield from _channel_conflicts(stages)
    if stages and not any(stage.get("limits") for stage in stages.values()):
        yield _nothing_checked(next(iter(stages)))


def _quantity_conflicts(name: str, stage: Mapping[str, Any]) -> Iterator[Flaw]:
    """Find quantities that the stage does not have, or that nothing derives."""
    limits = _table(stage, "limits")
    path = ("stage", name, "limits")
    for quantity in limits:
        if quantity in QUANTITIES and (message := _misfit(quantity, stage)):
            yield Flaw(path=(*path, quantity), message=message)
    asked = limits.get("quantities")
    named = asked if isinstance(asked, list) else []
    for n, quantity in enumerate(named):
        if quantity in named[:n]:
            message = f"{quantity!r} is named twice"
        elif quantity in JITTERS:
            message = (
                f"{quantity} does not follow from tolerances; write a limit "
                f'{quantity} = {{ upper = "0.2%" }}'
            )
        else:
            message = _misfit(quantity, stage)
        if message:
            yield Flaw(path=(*path, "quantities", n), message=message)


def _misfit(quantity: object, stage: Mapping[str, Any]) -> str:
    """Return why a stage cannot be judged on a quantity, empty where it can."""
    topology = stage.get("topology")
    known = TOPOLOGY_QUANTITIES.get(topology) if isinstance(topology, str) else None
    if not known or quantity not in QUANTITIES:
        return ""
    if quantity not in known:
        return f"{topology} is not judged on {quantity}; it can be on {listed(known)}"
    divide = stage.get("divide")
    if isinstance(divide, int) and divide > 1 and quantity not in DIVIDED_QUANTITIES:
        usable = listed(item for item in known if item in DIVIDED_QUANTITIES)
        return f"means nothing behind a divider by {divide}; it can be judged on {usable}"
    return ""


def _leak_conflicts(name: str, stage: Mapping[str, Any]) -> Iterator[Flaw]:
    if "leak_to" in stage and "leak" not in stage:
        yield Flaw(
            path=("stage", name, "leak_to"),
            message='names the rail of a leak that is not given; add leak = "10M"',
        )


def _ic_conflicts(name: str, stage: Mapping[str, Any]) -> Iterator[Flaw]:
    """Find an IC of no family that leaves out the thresholds."""
    ic, topology = stage.get("ic"), stage.get("topology")
    if not isinstance(ic, dict) or "family" in ic or topology == "schmitt":
        return
    needed = (
        tuple(term for term in _THRESHOLDS if term != "lower_threshold")
        if topology in _ONE_THRESHOLD
        else _THRESHOLDS
    )
    if any(term not in ic for term in needed):
        yield Flaw(
            path=("stage", name, "ic", "family"),
            message=f'is missing, such as family = "cmos"; without it, state {listed(needed)}',
            missing="family",
        )


def _channel_conflicts(stages: Mapping[str, Mapping[str, Any]]) -> Iterator[Flaw]:
    """Find a trace that would be two things at once; a trigger may serve several stages."""
    taken: dict[str, str] = {}
    for name, stage in stages.items():
        for role in ("channel", "capacitor", "trigger"):
            trace = stage.get(role)
            if not isinstance(trace, str):
                continue
            path = ("stage", name, role)
            own = [stage.get(other) for other in ("channel", "capacitor")]
            if role != "trigger" and trace in taken:
                message = f"{trace!r} is already {taken[trace]}"
                yield Flaw(path=path, message=f"{message}; name another trace")
            elif role == "trigger" and trace in own:
                message = f"{trace!r} is the same stage's channel or capacitor"
                yield Flaw(path=path, message=f"{message}; name another trace")
            elif role != "trigger":
                taken[trace] = f"the {role} of stage {name}"


def _nothing_checked(name: str) -> Flaw:
    return Flaw(
        path=("stage", name, "limits"),
        message='is missing: the design checks nothing; add derive = "worst-case" or a limit '
        'such as period = "25 s 5%"',
        missing="limits",
    )


def _table(table: Mapping[str, Any], key: str) -> Mapping[str, Any]:
    value = table.get(key)
    return value if isinstance(value, dict) else {}


def _is_table(value: object) -> bool:
    return isinstance(value, dict)
