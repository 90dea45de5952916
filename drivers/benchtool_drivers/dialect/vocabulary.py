"""The words of dialect files: fields with their meanings, units, and the forms of scaling."""

from __future__ import annotations

from collections.abc import Mapping

DTYPES = ("u1", "i1", "u2", "i2", "u4", "i4", "f4", "f8", "ascii")
ORDERS = ("big", "little")
BLOCK_TYPES = ("u1", "i1", "u2", "i2", "u4", "i4", "u8", "i8", "f4", "f8")
"""Types of a number in a descriptor."""

FIELDS: Mapping[str, str] = {
    "points": "samples in the record",
    "bytes": "bytes of samples in the record, where points is not told",
    "dt": "seconds from one sample to the next",
    "rate": "samples a second",
    "t0": "time of the first sample, in seconds after the trigger",
    "delay": "time of the record's middle, in seconds after the trigger",
    "xref": "index of the sample at xorigin",
    "xorigin": "time of the sample at xref, in seconds after the trigger",
    "span": "seconds that the record lasts",
    "time_scale": "seconds a division",
    "divisions": "divisions that the record is wide",
    "inc": "volts a code",
    "ref": "code at the origin",
    "origin": "volts at the reference code",
    "gain": "volts a code",
    "offset": "volts added to, or taken from, the scaled code",
    "scale": "volts a division",
    "codes_per_division": "codes a division",
    "position": "divisions from the middle to 0 V",
    "bottom": "volts at low_code",
    "top": "volts at high_code",
    "low_code": "code at the bottom of the range",
    "high_code": "code at the top of the range",
    "probe": "factor of the probe",
    "unit": "unit of the samples",
}
"""Fields that have a meaning of their own; any other name is recorded, and may lead a lookup."""

FIELD_UNITS: Mapping[str, float] = {
    "s": 1.0,
    "ms": 1e-3,
    "us": 1e-6,
    "ns": 1e-9,
    "ps": 1e-12,
    "V": 1.0,
    "mV": 1e-3,
    "uV": 1e-6,
    "kV": 1e3,
    "Hz": 1.0,
    "kHz": 1e3,
    "MHz": 1e6,
    "GHz": 1e9,
    "1": 1.0,
    "%": 1e-2,
}
Y_UNITS: Mapping[str, float] = {"V": 1.0, "mV": 1e-3, "uV": 1e-6, "kV": 1e3}

Y_FORMS: Mapping[str, tuple[tuple[str, ...], tuple[str, ...], str]] = {
    "none": ((), (), "the samples are volts"),
    "ref-inc-origin": (("inc",), ("ref", "origin"), "(code - ref) * inc + origin"),
    "ref-inc-minus-origin": (("inc", "origin"), ("ref",), "(code - ref) * inc - origin"),
    "origin-ref-inc": (("inc", "origin"), ("ref",), "(code - origin - ref) * inc"),
    "gain-plus-offset": (("gain",), ("offset",), "code * gain + offset"),
    "gain-minus-offset": (("gain", "offset"), (), "code * gain - offset"),
    "offset-gain": (("gain", "offset"), (), "(code + offset) * gain"),
    "division-plus-offset": (
        ("scale", "codes_per_division"),
        ("ref", "offset"),
        "(code - ref) / codes_per_division * scale + offset",
    ),
    "division-minus-offset": (
        ("scale", "codes_per_division", "offset"),
        ("ref",),
        "(code - ref) / codes_per_division * scale - offset",
    ),
    "division-position": (
        ("scale", "codes_per_division", "position"),
        ("ref", "offset"),
        "((code - ref) / codes_per_division - position) * scale + offset",
    ),
    "bottom-top": (
        ("bottom", "top", "low_code", "high_code"),
        (),
        "bottom + (code - low_code) * (top - bottom) / (high_code - low_code)",
    ),
}
"""Ways to scale codes: fields needed, fields taken as 0 where absent, and the formula."""

X_FORMS: Mapping[str, tuple[tuple[str, ...], tuple[str, ...], str]] = {
    "index-dt": (("dt",), ("t0",), "t0 + i * dt"),
    "index-rate": (("rate",), ("t0",), "t0 + i / rate"),
    "xref-dt-xorigin": (("dt",), ("xref", "xorigin"), "(i - xref) * dt + xorigin"),
    "centred": (("dt",), ("delay",), "(i - points / 2) * dt + delay"),
    "span": (("span",), ("t0",), "t0 + i * span / points"),
    "divisions": (
        ("time_scale", "divisions"),
        ("delay",),
        "(i / points - 1 / 2) * time_scale * divisions + delay",
    ),
    "pairs": ((), (), "each sample has its time beside it"),
}
"""Ways to number samples in seconds, likewise."""
