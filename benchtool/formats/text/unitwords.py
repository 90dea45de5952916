"""The words that captures use for units: of time, of voltage, of a rate, and plain counts."""

from __future__ import annotations

import re

from benchtool.frozen import frozen_record


@frozen_record(eq=False)
class TimeUnit:
    """A unit of time: ``seconds = value * times / over``, both exact."""

    name: str
    times: float = 1.0
    over: float = 1.0

    def seconds(self, value: float) -> float:
        """Return ``value`` in seconds."""
        return value * self.times / self.over


def word_set(text: str) -> frozenset[str]:
    """Return the words of a text, to look words up in."""
    return frozenset(text.split())


SECOND = TimeUnit(name="s")
_UNITS = {
    SECOND: "s sec secs second seconds sekunde sekunden sek seconde secondes segundo segundos "
    "secondo secondi с сек 秒",
    TimeUnit(name="ms", over=1e3): "ms msec msecs millisec millisecond milliseconds millis "
    "millisekunden milliseconde millisecondes milisegundos millisecondi мс 毫秒",
    TimeUnit(name="us", over=1e6): "us µs μs usec usecs µsec μsec microsec microsecond "
    "microseconds micros mikrosekunden microseconde microsecondes microsegundos microsecondi "
    "мкс 微秒",
    TimeUnit(name="ns", over=1e9): "ns nsec nsecs nanosec nanosecond nanoseconds nanos "
    "nanosekunden нс",
    TimeUnit(name="ps", over=1e12): "ps psec picosecond picoseconds",
    TimeUnit(name="fs", over=1e15): "fs femtosecond femtoseconds",
    TimeUnit(name="min", times=60.0): "min mins minute minutes minuten",
    TimeUnit(name="h", times=3600.0): "h hr hrs hour hours stunden",
    TimeUnit(name="d", times=86400.0): "day days tage jours giorni dias",
}
TIME_UNITS = {word: unit for unit, words in _UNITS.items() for word in words.split()}

_VOLTS = (
    (1.0, "v volt volts в 伏"),
    (1e-3, "mv millivolt millivolts мв"),
    (1e-6, "uv µv μv microvolt microvolts"),
    (1e3, "kv kilovolt kilovolts"),
)
VOLT_UNITS = {word: factor for factor, words in _VOLTS for word in words.split()}
_RATES = {"hz": 1.0, "s/s": 1.0, "sa/s": 1.0, "sps": 1.0, "samples/s": 1.0, "sample/s": 1.0,
          "samples/sec": 1.0, "samples/second": 1.0, "1/s": 1.0, "smp/s": 1.0, "pts/s": 1.0,
          "samples per second": 1.0, "points/s": 1.0}  # fmt: skip
_PREFIXES = {"": 1.0, "k": 1e3, "m": 1e6, "g": 1e9}
COUNT_UNITS = word_set("samples sample pts points point index count counts # n")
PLAIN_UNITS = word_set("a ma ua µa ohm w mw db dbm degc °c c k % bar pa code codes lsb raw 1 bool")

_PER_SAMPLE = r" ?(?:/| per ) ?(?:samples?|sa|smp|pts?|points?)$"


def time_unit(text: str) -> TimeUnit | None:
    """Return the unit of time that ``text`` names, brackets or none."""
    bare = _bare(text).lower()
    known = TIME_UNITS.get(bare)
    if known is None and _may_be_per_sample(bare):
        known = TIME_UNITS.get(re.sub(_PER_SAMPLE, "", bare))
    return known


def _may_be_per_sample(text: str) -> bool:
    return "/" in text or "per" in text  # else the pattern need not even be compiled


def is_time_unit(text: str) -> bool:
    """Say whether a text is nothing but a unit of time."""
    return time_unit(text) is not None


def is_per_sample(text: str) -> bool:
    """Say whether a unit is a time for each sample."""
    lower = text.lower()
    shared = _may_be_per_sample(lower) and re.search(_PER_SAMPLE, lower) is not None
    return shared and time_unit(text) is not None


def volt_factor(text: str) -> float | None:
    """Return how many volts the unit in ``text`` is; None for megavolts or what is no voltage."""
    bare = _bare(text)
    return None if bare == "MV" else VOLT_UNITS.get(bare.lower())


def rate_factor(text: str) -> float | None:
    """Return how many samples a second the unit in ``text`` is."""
    bare = _bare(text).lower()
    for prefix, factor in _PREFIXES.items():
        unit = bare.removeprefix(prefix).strip() if bare.startswith(prefix) else ""
        if unit in _RATES:
            return factor * _RATES[unit]
    return None


def _bare(text: str) -> str:
    return text.strip().strip("()[]{}<>\"'").strip().rstrip(".")


def is_unit(text: str) -> bool:
    """Say whether a whole cell is nothing but a unit."""
    bare = _bare(text).lower()
    known = bare in TIME_UNITS or bare in VOLT_UNITS or bare in PLAIN_UNITS | COUNT_UNITS
    return known or rate_factor(text) is not None
