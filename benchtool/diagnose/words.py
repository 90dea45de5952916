"""Words of a diagnosis: what to do about each fault, and the sentence on top, as data."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from benchtool.model.diagnosis import NextReading, Suspect
from benchtool.units import format_value

FIELD_UNITS: Mapping[str, str] = MappingProxyType(
    {
        "C": "F",
        "RA": "ohm",
        "RB": "ohm",
        "R": "ohm",
        "v_upper": "V",
        "v_lower": "V",
        "delay_upper": "s",
        "delay_lower": "s",
    }
)
"""Units of the figures that a fault moves by a share."""

ACTIONS: Mapping[str, str] = MappingProxyType(
    {
        "healthy": "Nothing points to a fault",
        "C-low": "Replace the capacitor C: it has lost capacitance",
        "C-high": "Check the capacitor C: it is larger than marked",
        "C-leaky": "Replace the capacitor C: it leaks",
        "C-esr": "Replace the capacitor C: its series resistance is high",
        "C-open": "Replace the capacitor C or its joints: it is open",
        "C-short": "Replace the capacitor C: it is shorted",
        "RA-low": "Replace the resistor RA: it is too low",
        "RA-high": "Replace the resistor RA: it is too high",
        "RA-open": "Replace the resistor RA or its joints: it is open",
        "RB-low": "Replace the resistor RB: it is too low",
        "RB-high": "Replace the resistor RB: it is too high",
        "RB-open": "Replace the resistor RB or its joints: it is open",
        "R-low": "Replace the resistor R: it is too low",
        "R-high": "Replace the resistor R: it is too high",
        "R-open": "Replace the resistor R or its joints: it is open",
        "R-all-low": "Check that RA and RB are the right ones: both are low by the same share",
        "R-all-high": "Check that RA and RB are the right ones: both are high by the same share",
        "discharge-leak": "Replace the IC: its discharge switch leaks",
        "discharge-weak": "Replace the IC: its discharge switch is weak",
        "control-low": "Look for what pulls the control pin down",
        "control-high": "Look for what pulls the control pin up",
        "control-bypass-missing": "Check the capacitor at the control pin",
        "upper-threshold": "Replace the IC: its upper threshold is off",
        "lower-threshold": "Replace the IC: its lower threshold is off",
        "node-leak-to-supply": "Clean the board around the capacitor: current leaks to the supply",
        "slow-ic": "Replace the IC: it is slow",
        "wrong-ic-family": "Check the marking on the IC: it behaves like the other family",
        "probe-load": "Take the probe off the capacitor: it loads the node",
        "output-high-drop": "Check the load on the output, then the IC: its high level is low",
        "output-low-rise": "Check the load on the output, then the IC: its low level is high",
        "diode-open": "Replace the steering diode: it is open",
        "diode-short": "Replace the steering diode: it is shorted",
    }
)

SHORT: Mapping[str, str] = MappingProxyType(
    {
        "healthy": "nothing wrong",
        "C-low": "C too small",
        "C-high": "C too large",
        "C-leaky": "C leaking",
        "C-esr": "C with a high series resistance",
        "discharge-leak": "a leaking discharge switch in the IC",
        "discharge-weak": "a weak discharge switch in the IC",
        "control-low": "a control pin pulled down",
        "control-high": "a control pin pulled up",
        "control-bypass-missing": "a missing capacitor at the control pin",
        "upper-threshold": "an upper threshold off inside the IC",
        "lower-threshold": "a lower threshold off inside the IC",
        "node-leak-to-supply": "a leak from the supply to the capacitor's node",
        "slow-ic": "a slow IC",
        "wrong-ic-family": "an IC of the other family",
        "probe-load": "a probe that loads the capacitor",
        "R-all-low": "RA and RB both too small",
        "R-all-high": "RA and RB both too large",
        "output-high-drop": "an output that does not rise fully",
        "output-low-rise": "an output that does not fall fully",
        "diode-open": "an open steering diode",
        "diode-short": "a shorted steering diode",
        "unexplained": "something that is not in the list",
    }
)

_LEAST_NAMED = 0.5
"""Probability from which a fault is named although two at once would do better than most."""

_ENDINGS = {"low": "too small", "high": "too large", "open": "open", "short": "shorted"}


def name_fault(fault: str) -> str:
    """Return a fault in a few words."""
    if fault in SHORT:
        return SHORT[fault]
    part, _, ending = fault.partition("-")
    return f"{part} {_ENDINGS.get(ending, ending)}"


def join(words: list[str], last: str = "or") -> str:
    """Return words as a list in a sentence."""
    *first, end = words
    return f"{', '.join(first)} {last} {end}" if first else end


def percent(probability: float) -> str:
    """Return a probability in whole percent, never 0 or 100."""
    return f"{min(99, max(1, round(100 * probability)))} %"


def describe_suspect(suspect: Suspect, seen: str) -> str:
    """Return what a suspect would mean, one or two sentences."""
    if suspect.estimate is None or suspect.lower is None or suspect.upper is None:
        return seen
    unit = suspect.estimate.unit
    low, high = format_value(suspect.lower, unit), format_value(suspect.upper, unit)
    if suspect.nominal is None:
        return f"{seen} It would take {low} to {high}."
    return f"{seen} It would be {low} to {high} in place of {format_value(suspect.nominal, unit)}."


def sum_up(
    suspects: tuple[Suspect, ...],
    first_group: tuple[str, ...],
    proposals: tuple[NextReading, ...],
    *,
    is_certain: bool,
    is_single: bool,
) -> str:
    """Return one sentence that says what to do now."""
    best = suspects[0]
    doubted = not is_single and best.probability < _LEAST_NAMED
    if doubted or best.fault in ("unexplained", "two-faults"):
        return _not_single(suspects, proposals)
    sure = percent(best.probability)
    if not is_single:
        return (
            f"Most likely {name_fault(best.fault)} ({sure}), but one fault alone rarely does this: "
            f"look for a second one too.{_then(proposals)}"
        )
    if best.fault == "healthy":
        return f"Nothing points to a fault ({sure}): the board does what healthy parts do."
    if is_certain:
        return f"{ACTIONS.get(best.fault, name_fault(best.fault))} ({sure} sure)."
    named = [name_fault(item.fault) for item in suspects if item.fault in first_group]
    shown = join(named[:3]) if len(named) <= 3 else f"{join(named[:3])} (or {len(named) - 3} more)"
    if len(named) == 1:
        shown = f"{named[0]} ({sure})"
    return f"Most likely {shown}.{_then(proposals)}"


def _not_single(suspects: tuple[Suspect, ...], proposals: tuple[NextReading, ...]) -> str:
    pair = next((item for item in suspects if item.fault == "two-faults"), None)
    text = "No single fault explains this."
    if pair is None:
        text = f"{text} Check first that design, readings and files are of this board."
    if pair is not None:
        text = f"{text} The best pair: {join([name_fault(item) for item in pair.faults], 'and')}."
    return f"{text}{_then(proposals)}"


def _then(proposals: tuple[NextReading, ...]) -> str:
    if not proposals:
        return ""
    first = proposals[0].why.partition(":")[0]
    return f" Next: {first[0].lower()}{first[1:]}."
