"""The tables of verbs."""

from __future__ import annotations

from benchtool.cli.verbs import Verb

SECTIONS: dict[str, dict[str, Verb]] = {
    "Saved captures": {
        "look": Verb("look", "what a capture file holds, and how it was read"),
        "measure": Verb("measure", "high and low time, period, frequency, duty, jitter"),
        "solve": Verb("solve", "the R·C products that give these times"),
        "judge": Verb("judge", "the times against a design, with a verdict"),
    },
    "Design and parts": {
        "design": Verb("design.group", "make, check and show a design file; its limits"),
        "parts": Verb("parts.group", "read part markings"),
        "simulate": Verb("simulate", "a synthetic capture with its truth"),
    },
    "Bench": {
        "acquire": Verb("acquire", "captures from a live instrument or a serial line, into files"),
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
        "schema": Verb("design.schema", "the JSON Schema of design files, for editors"),
    },
}

PARTS: dict[str, dict[str, Verb]] = {
    "Verbs": {
        "marking": Verb("parts.marking", "decode part markings: 103, 4n7K, colour bands"),
    },
}
