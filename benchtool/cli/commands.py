"""The tables of verbs."""

from __future__ import annotations

from benchtool.cli.verbs import Verb

SECTIONS: dict[str, dict[str, Verb]] = {
    "Saved captures": {
        "look": Verb("look", "what a capture file holds, and how it was read"),
        "measure": Verb("measure", "high and low time, period, frequency, duty, jitter"),
        "solve": Verb("solve", "the R·C products that give these times"),
        "judge": Verb("judge", "the times against a design, with a verdict"),
        "diagnose": Verb("diagnose", "which part moved, how sure, and what to measure next"),
    },
    "Design and parts": {
        "design": Verb("design.group", "make, check and show a design file; its limits"),
        "parts": Verb("parts.group", "read part markings; pick parts to fit"),
        "simulate": Verb("simulate", "a synthetic capture with its truth"),
    },
    "Bench": {
        "acquire": Verb("acquire", "captures from a live instrument or a serial line, into files"),
        "watch": Verb("watch", "the live reading while a trimmer is turned"),
        "instruments": Verb("instruments.group", "what is connected, and how it is spoken to"),
    },
    "Reference": {
        "explain": Verb("explain", "a word, figure, warning, code or formula"),
        "selftest": Verb("selftest", "formulas and uncertainties, tried on this machine"),
    },
}

DESIGN: dict[str, dict[str, Verb]] = {
    "Verbs": {
        "new": Verb("design.new", "write a design file, from options or by asking"),
        "check": Verb("design.check", "every fault with its line, and what physics says"),
        "show": Verb("design.show", "every value the design works with, and its origin"),
        "limits": Verb("design.limits", "limits three ways, with the room against U"),
        "plan": Verb("design.plan", "before measuring: rate, span, periods, U to expect"),
        "schema": Verb("design.schema", "the JSON Schema of design files, for editors"),
    },
}

PARTS: dict[str, dict[str, Verb]] = {
    "Verbs": {
        "marking": Verb("parts.marking", "decode part markings: 103, 4n7K, colour bands"),
        "pick": Verb("parts.pick", "what to fit: replacement, part across it, part in series"),
    },
}

INSTRUMENTS: dict[str, dict[str, Verb]] = {
    "Verbs": {
        "list": Verb(
            "instruments.listing", "serial ports and USB instruments; the network if asked"
        ),
        "identify": Verb("instruments.identify", "who answers, and which dialect fits and why"),
        "dialects": Verb("instruments.dialects", "the dialects, the file of one, all their keys"),
        "check": Verb("instruments.check", "every fault of a dialect file with its line"),
        "try": Verb("instruments.trying", "a dialect file against an instrument, step by step"),
    },
}
