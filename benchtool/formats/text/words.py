"""The words that captures use for times, units, intervals and rates, in several languages."""

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


def _set(text: str) -> frozenset[str]:
    return frozenset(text.split())


SECOND = TimeUnit(name="s")
_UNITS = (
    (SECOND, "s sec secs second seconds sekunde sekunden sek seconde secondes segundos secondi"),
    (TimeUnit(name="ms", over=1e3), "ms msec msecs millisecond milliseconds millis millisekunden"),
    (TimeUnit(name="us", over=1e6), "us µs μs usec usecs microsecond microseconds mikrosekunden"),
    (TimeUnit(name="ns", over=1e9), "ns nsec nsecs nanosecond nanoseconds nanosekunden"),
    (TimeUnit(name="ps", over=1e12), "ps psec picosecond picoseconds"),
    (TimeUnit(name="fs", over=1e15), "fs femtosecond femtoseconds"),
    (TimeUnit(name="min", times=60.0), "min mins minute minutes minuten"),
    (TimeUnit(name="h", times=3600.0), "h hr hrs hour hours stunden"),
)
TIME_UNITS = {word: unit for unit, words in _UNITS for word in words.split()}

_VOLTS = (
    (1.0, "v volt volts"),
    (1e-3, "mv millivolt millivolts"),
    (1e-6, "uv µv μv microvolt microvolts"),
    (1e3, "kv kilovolt kilovolts"),
)
VOLT_UNITS = {word: factor for factor, words in _VOLTS for word in words.split()}
_RATES = {"hz": 1.0, "s/s": 1.0, "sa/s": 1.0, "sps": 1.0, "samples/s": 1.0, "sample/s": 1.0,
          "samples/sec": 1.0, "samples/second": 1.0, "1/s": 1.0, "smp/s": 1.0, "pts/s": 1.0,
          "samples per second": 1.0, "points/s": 1.0}  # fmt: skip
_PREFIXES = {"": 1.0, "k": 1e3, "m": 1e6, "g": 1e9}
COUNT_UNITS = _set("samples sample pts points point index count counts # n")
PLAIN_UNITS = _set("a ma ua µa ohm w mw db dbm degc °c c k % bar pa code codes lsb raw 1 bool")

_PER_SAMPLE = re.compile(r" ?(?:/| per ) ?(?:samples?|sa|smp|pts?|points?)$")
_TIME_WORDS = _set(
    "time times zeit zeiten temps tiempo tempo tijd tid aika czas elapsed timestamp timestamps "
    "datetime date datum uhrzeit seconds second secs sec epoch abszisse"
)
_TIME_ALONE = re.compile(
    r"(?:[tx]|x (?:axis|values?|data)|ms|us|µs|μs|ns|s)\d*(?: (?:ch|channel)? ?\w)?"
)
_INDEX = re.compile(
    r"(?:(?:sample|point|data|row|line|record|x|array)s? ?)?"
    r"(?:index|idx|samples?|points?|no\.?|n|nr\.?|num|number|#|id|seq|sequence|row|counter|i|"
    r"lfd nr)"
)
_SEGMENT = re.compile(
    r"(?:segment|seg|frame|sweep|block|burst|trace|acquisition)s?(?: (?:no|nr|number|index|id|#))?"
)
_INTERVAL = re.compile(
    r"interval|intervall|increment|incr|dt|δt|∆t|delta t|delta|t delta|ts|time ?step|step|xinc\w*|"
    r"(?:sampl\w*|abtast\w*) ?(?:interval\w*|period\w*|step|spacing|time|dt|zeit)|abtastintervall|"
    r"(?:time|x|horizontal|hor|h) ?(?:interval|increment|incr|inc|resolution|step|spacing|delta)|"
    r"(?:seconds?|time) (?:per|/) ?(?:sample|point)|sampl\w* every|interval between \w+|"
    r"\w+ interval|x origin increment"
)
_RATE = re.compile(
    r"(?:sampl\w*|acquisition|scan|data|digiti[sz]\w*|adc|logging|abtast\w*|capture) ?"
    r"(?:rate|frequency|freq|clock|speed|frequenz)|rate|fs|samplerate|abtastrate|abtastfrequenz|"
    r"sampl\w* (?:per|/) ?sec\w*|sps|sample rate \w+|sampled at|sampling"
)
_NOT_OURS = re.compile(
    r"baud|refresh|frame|bit ?rate|vertical|\by\b|volt|trigger|delay|holdoff|update|duration|"
    r"length|window|total|memory|points?$|depth|count|scale|div|signal freq|range|offset|position"
)
_START = re.compile(r"(?:x ?)?(?:start|origin|t0|x0|xzero|zero|first)(?: (?:time|x|t))?")
_TIME_UNIT_KEY = re.compile(
    r"(?:time|horizontal|hor|x|abscissa|zeit|t)(?: ?(?:axis|base|scale|column))?"
    r" ?(?:units?|einheit|unite|scale)"
)
_VALUE_UNIT_KEY = re.compile(
    r"(?:vertical|vert|y|voltage|amplitude|value|ordinate|channel \w+|ch\d+|signal)"
    r"(?: ?(?:axis|scale|column))? ?(?:units?|einheit|unite)"
)
_CHANNEL_LIKE = re.compile(
    r"(?:ch|chan|channel|kanal|canal|voie|v|u|volt\w*|out\w*|in\w*|data|adc|signal|trace|"
    r"spannung|value|amplitude|level|y|d|a|node|cap\w*|supply|trigger|state|logic)\b.*"
)


def normal(name: str) -> str:
    """Return a name in lower case, words apart: ``Sample_Interval`` as ``sample interval``."""
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z][a-z])", " ", name.strip())
    return re.sub(r"[\s_\-]+", " ", spaced).strip(" .:=#").lower()


def time_unit(text: str) -> TimeUnit | None:
    """Return the unit of time that ``text`` names, brackets or none."""
    return TIME_UNITS.get(_PER_SAMPLE.sub("", _bare(text).lower()))


def is_per_sample(text: str) -> bool:
    """Say whether a unit is a time for each sample."""
    return _PER_SAMPLE.search(text.lower()) is not None and time_unit(text) is not None


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


def is_time_name(name: str) -> bool:
    """Say whether a column's name (unit taken off) means time."""
    if is_interval_key(name):
        return False
    words = normal(name)
    return bool(_TIME_ALONE.fullmatch(words) or set(words.split()) & _TIME_WORDS)


def is_index_name(name: str) -> bool:
    """Say whether a column's name means a running number."""
    return name.strip() == "#" or bool(_INDEX.fullmatch(normal(name)))


def is_segment_name(name: str) -> bool:
    """Say whether a column's name means the number of a segment."""
    return bool(_SEGMENT.fullmatch(normal(name)))


def is_channel_name(name: str) -> bool:
    """Say whether a column's name means a signal."""
    return bool(_CHANNEL_LIKE.fullmatch(re.sub(r"(?<=[a-z])\d+", "", normal(name))))


def is_interval_key(key: str) -> bool:
    """Say whether a metadata key means the sample interval."""
    words = normal(key)
    return bool(_INTERVAL.fullmatch(words)) and not _NOT_OURS.search(words)


def is_rate_key(key: str) -> bool:
    """Say whether a metadata key means the sample rate."""
    words = normal(key)
    return bool(_RATE.fullmatch(words)) and not _NOT_OURS.search(words)


def is_start_key(key: str) -> bool:
    """Say whether a metadata key or column means the time of the first sample."""
    return bool(_START.fullmatch(normal(key)))


def is_time_unit_key(key: str) -> bool:
    """Say whether a metadata key means the unit of the time column."""
    return bool(_TIME_UNIT_KEY.fullmatch(normal(key)))


def is_value_unit_key(key: str) -> bool:
    """Say whether a metadata key means the unit of the values."""
    return bool(_VALUE_UNIT_KEY.fullmatch(normal(key)))
