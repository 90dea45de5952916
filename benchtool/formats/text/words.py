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
COUNT_UNITS = _set("samples sample pts points point index count counts # n")
PLAIN_UNITS = _set("a ma ua µa ohm w mw db dbm degc °c c k % bar pa code codes lsb raw 1 bool")

_PER_SAMPLE = re.compile(r" ?(?:/| per ) ?(?:samples?|sa|smp|pts?|points?)$")
_TIME_WORDS = _set(
    "time times zeit zeiten temps tiempo tempo tijd tid aika czas elapsed timestamp timestamps "
    "unix datetime date datum uhrzeit seconds second secs sec epoch abszisse zeitstempel datumzeit "
    "uptime millis micros millisec microsec heure horodatage hora ora zaman čas cas idő время "
    "时间 時間 timeus timems timens abscissa"
)
_LENGTH_WORDS = _set(
    "period periods width widths duration durations delay delays rise risetime fall falltime high "
    "low tau bin bins jitter latency settling response pulse pulses cycle cycles exposure duty on "
    "off dauer periode anstiegszeit abfallzeit pulsbreite thigh tlow ton toff lag lead dead hold "
    "setup delta deltas dt δt length held gap spacing durée durata duración"
)
_LASTING_WORDS = _set("duration durations length width held lasts dauer durée durata duración")
_RISE_WORDS = _set("rise rising up on steigend ton posedge montant")
_FALL_WORDS = _set("fall falling down off fallend toff negedge descendant")
_AXIS_WORDS = _set(
    "freq frequency frequencies frequenz fréquence frequenza frecuencia hz khz mhz bin bins f "
    "omega wavelength angle temp temperature temperatur volt voltage current year month distance "
    "position"
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
_INTERVAL = (
    r"interval|intervall|increment|incr|dt|δt|∆t|delta t|delta|t delta|ts|time ?step|step|xinc\w*|"
    r"(?:sampl\w*|abtast\w*) ?(?:interval\w*|period\w*|step|spacing|time|dt|zeit)|abtastintervall|"
    r"(?:time|x|horizontal|hor|h) ?(?:interval|increment|incr|inc|resolution|step|spacing|delta)|"
    r"(?:seconds?|time) (?:per|/) ?(?:sample|point)|sampl\w* every|interval between samples|"
    r"(?:sample|sampling|log|logging|record|recording|scan|point|measurement|acquisition|tick) "
    r"interval|t ?inc\w*|delta ?[xt]|1 sample|zeitschritt|messintervall|"
    r"(?:période|periode|pas|intervalle) (?:d')?échantillonnage|"
    r"(?:periodo|intervallo|passo) di campionamento|(?:periodo|intervalo) de muestreo"
)
_INTERVAL_PARTS = _set(
    "interval inc dt δt ∆t delta ts step sampl abtast spacing resolution per schritt zeit chant "
    "campion muestr"
)
_RATE_PARTS = _set("rate freq clock speed fs sps sr sampl abtast chant campion muestr")
_RATE = (
    r"(?:sampl\w*|acquisition|scan|data|digiti[sz]\w*|adc|logging|abtast\w*|capture) ?"
    r"(?:rate|frequency|freq|clock|speed|frequenz)|rate|fs|samplerate|abtastrate|abtastfrequenz|"
    r"sampl\w* ?(?:per|/) ?sec\w*|sps|sr|sample rate \w+|sampled at|sampling|actual sample rate|"
    r"fréquence (?:d')?échantillonnage|(?:cadence|taux) (?:d')?échantillonnage|"
    r"frequenza di campionamento|(?:frecuencia|tasa) de muestreo"
)
_NOT_OURS = (
    r"baud|refresh|\b(?:max|min|display|generator|output|cal)\w*\b|frame|bit ?rate|vertical|"
    r"\by\b|volt|trigger|delay|holdoff|update|duration|"
    r"length|window|total|memory|points?$|depth|count|scale|div|signal freq|range|offset|position"
)
_FOREIGN_RATE = _set("max maximum min minimum display generator refresh update baud limit")
_DECIMATION_WORDS = _set("decimation decimate downsampling downsample subsampling dezimierung")
_CHANNEL_WORDS = _set(
    "channel chan ch kanal canal voie signal probe sensor input pin gpio source line"
)
_START = r"(?:x ?)?(?:start|origin|t0|x0|xzero|zero|first)(?: (?:time|x|t))?"
_TIME_UNIT_KEY = (
    r"(?:time|horizontal|hor|x|abscissa|zeit|t)(?: ?(?:axis|base|scale|column))?"
    r" ?(?:units?|einheit|unite|scale)|units?|einheit|unite"
)
_VALUE_UNIT_KEY = (
    r"(?:vertical|vert|y|voltage|amplitude|value|ordinate|channel \w+|ch\d+|signal)"
    r"(?: ?(?:axis|scale|column))? ?(?:units?|einheit|unite)"
)
_CHANNEL_LIKE = re.compile(
    r"(?:ch|chan|channel|kanal|canal|voie|v|u|volt\w*|out\w*|in\w*|data|adc|signal|trace|"
    r"spannung|value|amplitude|level|y|d|a|node|cap\w*|supply|trigger|state|logic)\b.*"
)


def normal(name: str) -> str:
    """Return a name in lower case, words apart: ``Sample_Interval`` as ``sample interval``."""
    name = name.replace("’", "'").replace("()", "")
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z][a-z])", " ", name.strip())
    return re.sub(r"[\s_\-]+", " ", spaced).strip(" .:=#").lower()


def _words(name: str) -> set[str]:
    """Return the words of a name, without the marks around them."""
    return {word.strip("()[]{}<>/.,:;'\"") for word in normal(name).split()}


def time_unit(text: str) -> TimeUnit | None:
    """Return the unit of time that ``text`` names, brackets or none."""
    return TIME_UNITS.get(_PER_SAMPLE.sub("", _bare(text).lower()))


def is_time_unit(text: str) -> bool:
    """Say whether a text is nothing but a unit of time."""
    return time_unit(text) is not None


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
    words = normal(name)
    if (is_interval_key(name) and words != "ts") or _words(name) & _LENGTH_WORDS:
        return False
    return words == "ts" or bool(_TIME_ALONE.fullmatch(words) or _words(name) & _TIME_WORDS)


def is_bare_axis(name: str) -> bool:
    """Say whether a name is that of an axis and not of a quantity: ``x``, ``X-Axis``."""
    return re.fullmatch(r"x\d*(?: (?:axis|values?|data))?", normal(name)) is not None


def is_letter(name: str) -> bool:
    """Say whether a name is but one letter, which may mean time or anything else."""
    return re.fullmatch(r"[tx]\d*", normal(name)) is not None


def is_length_name(name: str) -> bool:
    """Say whether a name means a length of time and not a point of it: ``Period``, ``t_high``."""
    return bool(_words(name) & _LENGTH_WORDS)


def is_lasting(name: str) -> bool:
    """Say whether a name means how long a state lasted, and not the time since the last one."""
    return bool(_words(name) & _LASTING_WORDS)


def edge_of(name: str) -> str:
    """Return ``rise`` or ``fall`` where a name means such an edge, else nothing."""
    told = _words(name)
    return "rise" if told & _RISE_WORDS else "fall" if told & _FALL_WORDS else ""


def is_count_name(name: str) -> bool:
    """Say whether a name means how often something was met."""
    return bool(_words(name) & {"hits", "count", "counts", "occurrences", "häufigkeit"})


def is_other_axis(name: str) -> bool:
    """Say whether a name means what is swept in a table that is no capture: ``Frequency``."""
    return bool(_words(name) & _AXIS_WORDS)


def is_channel_key(name: str) -> bool:
    """Say whether a column's name means that it tells which channel a row is of."""
    first, *others = normal(name).split() or [""]
    return first in _CHANNEL_WORDS and set(others) <= _set("no nr number name id #")


def is_decimation_key(key: str) -> bool:
    """Say whether a metadata key means that samples were left out."""
    return bool(_words(key) & _DECIMATION_WORDS)


def is_foreign_rate(line: str) -> bool:
    """Say whether a line with a rate speaks of another rate than that of the samples."""
    return bool(_words(line) & _FOREIGN_RATE)


def is_index_name(name: str) -> bool:
    """Say whether a column's name means a running number."""
    return name.strip() == "#" or bool(_INDEX.fullmatch(normal(name)))


def is_segment_name(name: str) -> bool:
    """Say whether a column's name means the number of a segment."""
    return bool(_SEGMENT.fullmatch(normal(name)))


def speaks_of_segments(line: str) -> bool:
    """Say whether a line of text has a word for a segment in it."""
    return any(_SEGMENT.fullmatch(word.rstrip("0123456789")) for word in _words(line))


def is_channel_name(name: str) -> bool:
    """Say whether a column's name means a signal."""
    return bool(_CHANNEL_LIKE.fullmatch(re.sub(r"(?<=[a-z])\d+", "", normal(name))))


def is_interval_key(key: str) -> bool:
    """Say whether a metadata key means the sample interval."""
    words = normal(key)
    if not any(part in words for part in _INTERVAL_PARTS):
        return False  # most names: no pattern is compiled for them
    return bool(re.fullmatch(_INTERVAL, words)) and not re.search(_NOT_OURS, words)


def is_rate_key(key: str) -> bool:
    """Say whether a metadata key means the sample rate."""
    words = normal(key)
    if not any(part in words for part in _RATE_PARTS):
        return False
    return bool(re.fullmatch(_RATE, words)) and not re.search(_NOT_OURS, words)


def is_start_key(key: str) -> bool:
    """Say whether a metadata key or column means the time of the first sample."""
    return bool(re.fullmatch(_START, normal(key)))


def is_time_unit_key(key: str) -> bool:
    """Say whether a metadata key means the unit of the time column."""
    return _speaks_of_units(key) and bool(re.fullmatch(_TIME_UNIT_KEY, normal(key)))


def _speaks_of_units(key: str) -> bool:
    return any(part in key.lower() for part in ("unit", "einheit", "scale"))


def is_value_unit_key(key: str) -> bool:
    """Say whether a metadata key means the unit of the values."""
    return _speaks_of_units(key) and bool(re.fullmatch(_VALUE_UNIT_KEY, normal(key)))
