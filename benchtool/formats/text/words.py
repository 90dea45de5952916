"""The words that captures use for times, channels, intervals and rates, in several languages."""

from __future__ import annotations

import re

from benchtool.formats.text import unitwords
from benchtool.formats.text.unitwords import word_set

_TIME_WORDS = word_set(
    "time times zeit zeiten temps tiempo tempo tijd tid aika czas elapsed timestamp timestamps "
    "unix datetime date datum uhrzeit seconds second secs sec epoch abszisse zeitstempel datumzeit "
    "uptime millis micros millisec microsec heure horodatage hora ora zaman čas cas idő время "
    "时间 時間 timeus timems timens abscissa"
)
_LENGTH_WORDS = word_set(
    "period periods width widths duration durations delay delays rise risetime fall falltime high "
    "low tau bin bins jitter latency settling response pulse pulses cycle cycles exposure duty on "
    "off dauer periode anstiegszeit abfallzeit pulsbreite thigh tlow ton toff lag lead dead hold "
    "setup delta deltas dt δt length held gap spacing durée durata duración"
)
_LASTING_WORDS = word_set("duration durations length width held lasts dauer durée durata duración")
_RISE_WORDS = word_set("rise rising up on steigend ton posedge montant")
_FALL_WORDS = word_set("fall falling down off fallend toff negedge descendant")
_AXIS_WORDS = word_set(
    "freq frequency frequencies frequenz fréquence frequenza frecuencia hz khz mhz bin bins f "
    "omega wavelength angle temp temperature temperatur volt voltage current year month distance "
    "position"
)
_TIME_ALONE = r"(?:[tx]|x (?:axis|values?|data)|ms|us|µs|μs|ns|s)\d*(?: (?:ch|channel)? ?\w)?"
_INDEX = (
    r"(?:(?:sample|point|data|row|line|record|x|array)s? ?)?"
    r"(?:index|idx|samples?|points?|no\.?|n|nr\.?|num|number|#|id|seq|sequence|row|counter|i|"
    r"lfd nr)"
)
_INDEX_ENDS = (
    *("index", "idx", "sample", "samples", "point", "points", "no", "no.", "n", "nr", "nr."),
    *("num", "number", "#", "id", "seq", "sequence", "row", "counter", "i"),
)
_SEGMENTS = ("segment", "seg", "frame", "sweep", "block", "burst", "trace", "acquisition")
_SEGMENT = rf"(?:{'|'.join(_SEGMENTS)})s?(?: (?:no|nr|number|index|id|#))?"
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
_INTERVAL_PARTS = word_set(
    "interval inc dt δt ∆t delta ts step sampl abtast spacing resolution per schritt zeit chant "
    "campion muestr"
)
_RATE_PARTS = word_set("rate freq clock speed fs sps sr sampl abtast chant campion muestr")
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
_FOREIGN_RATE = word_set("max maximum min minimum display generator refresh update baud limit")
_DECIMATION_WORDS = word_set("decimation decimate downsampling downsample subsampling dezimierung")
_CHANNEL_WORDS = word_set(
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
_CHANNEL_LIKE = (
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


def is_time_name(name: str) -> bool:
    """Say whether a column's name (unit taken off) means time."""
    words = normal(name)
    if (is_interval_key(name) and words != "ts") or _words(name) & _LENGTH_WORDS:
        return False
    return words == "ts" or bool(_words(name) & _TIME_WORDS) or _is_time_alone(words)


def _is_time_alone(words: str) -> bool:
    """Say whether a name is one letter or a bare unit; for most names no pattern is compiled."""
    return words[:1] in ("t", "x", "m", "u", "µ", "μ", "n", "s") and bool(
        re.fullmatch(_TIME_ALONE, words)
    )


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
    return first in _CHANNEL_WORDS and set(others) <= word_set("no nr number name id #")


def is_decimation_key(key: str) -> bool:
    """Say whether a metadata key means that samples were left out."""
    return bool(_words(key) & _DECIMATION_WORDS)


def is_foreign_rate(line: str) -> bool:
    """Say whether a line with a rate speaks of another rate than that of the samples."""
    return bool(_words(line) & _FOREIGN_RATE)


def is_index_name(name: str) -> bool:
    """Say whether a column's name means a running number."""
    words = normal(name)
    return name.strip() == "#" or (
        words.endswith(_INDEX_ENDS) and bool(re.fullmatch(_INDEX, words))
    )


def is_segment_name(name: str) -> bool:
    """Say whether a column's name means the number of a segment."""
    return _is_segment(normal(name))


def _is_segment(words: str) -> bool:
    return words.startswith(_SEGMENTS) and bool(re.fullmatch(_SEGMENT, words))


def speaks_of_segments(line: str) -> bool:
    """Say whether a line of text has a word for a segment in it."""
    return any(_is_segment(word.rstrip("0123456789")) for word in _words(line))


def is_channel_name(name: str) -> bool:
    """Say whether a column's name means a signal."""
    return bool(re.fullmatch(_CHANNEL_LIKE, re.sub(r"(?<=[a-z])\d+", "", normal(name))))


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


def split_unit(key: str) -> tuple[str, str]:
    """Split ``Interval (us)``, ``dt/us`` or ``dt_us`` into name and unit."""
    match = re.fullmatch(r"(.*)[(\[{<]\s*([^()\[\]{}<>]*?)\s*[)\]}>]\s*(?:#\d+)?", key)
    if match:
        return match[1].strip(), match[2]
    if unitwords.rate_factor(key.rpartition(" ")[2]):
        return key.strip(), ""
    for mark in ("/", "_", " in ", ",", ":", ".", " "):
        name, found, unit = key.rpartition(mark)
        if found and unit.lower() == "min" and not is_time_name(name):
            continue  # the least value, not minutes
        if found and name.strip() and _is_known_unit(unit):
            return name.strip(), unit.strip()
    return key.strip(), ""


def _is_known_unit(unit: str) -> bool:
    return bool(
        unitwords.time_unit(unit) or unitwords.volt_factor(unit) or unitwords.rate_factor(unit)
    )
