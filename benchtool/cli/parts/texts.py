"""Values of parts, targets and diagnoses, read from the options of ``parts pick``."""

from __future__ import annotations

import json
import re
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from benchtool.cli.options import value_of
from benchtool.errors import InputError, UnitError, UsageError
from benchtool.model.picking import PartKind, Spread

if TYPE_CHECKING:
    from benchtool.model.design import Stage
    from benchtool.parts.picking_cautions import Seen

_SENSIBLE = {"ohm": (0.1, 1e12), "F": (1e-13, 0.1)}


def read_diagnosis(name: str | None) -> Seen | None:
    """Return suspects and findings of the document that ``diagnose --json`` printed.

    Raises:
        InputError: If the file cannot be read, or is no such document.
    """
    if name is None:
        return None
    from benchtool.parts.picking_cautions import Seen

    try:
        text = sys.stdin.read() if name == "-" else Path(name).read_text("utf-8")
        results = json.loads(text)["results"]
        suspects = {
            item["fault"]: float(item["probability"])
            for result in results
            for item in result.get("suspects", ())
        }
        findings = tuple(item["code"] for result in results for item in result.get("findings", ()))
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as error:
        raise InputError(
            f"{name} is no diagnosis: {error}",
            hint="Give the file that `benchtool diagnose FILE --json -o diagnosis.json` wrote.",
            code="no-diagnosis",
        ) from error
    return Seen(suspects=suspects, findings=findings)


def spread_from_text(option: str, text: str, unit: str) -> tuple[Spread, bool]:
    """Return a part from "346k" or "346k 0.5%", and whether its range is that of the last digit.

    Raises:
        UsageError: If the text is no such value; the message names the option.
    """
    from benchtool.parts.picking import spread_of
    from benchtool.units import parse_tolerance

    word, _, tolerance = text.strip().partition(" ")
    value = value_of(option, word, unit)
    if value is None or value <= 0:
        raise UsageError(f"{option}: a part is greater than 0, got {text}", hint="Correct it.")
    if not tolerance.strip():
        half_rel = 0.5 / max(1, int("".join(re.findall(r"\d", re.split("[eE]", word)[0])) or 1))
        return spread_of(value, -half_rel, half_rel), True
    try:
        return spread_of(value, *parse_tolerance(tolerance)), False
    except UnitError as error:
        raise UsageError(f"{option}: {error.message}", hint=error.hint, code="unit") from error


def kind_of(text: str) -> PartKind:
    """Return what a value must be of: 346k is no capacitor, 47u no resistor.

    Raises:
        UsageError: If it could be both or is neither (``which-kind``).
    """
    from benchtool.units import parse

    word = text.strip().partition(" ")[0]
    found: list[PartKind] = []
    kinds: tuple[tuple[PartKind, str], ...] = (("resistor", "ohm"), ("capacitor", "F"))
    kinds = kinds[:1] if re.fullmatch(r"[\d.]+", word) else kinds  # nobody writes plain farads
    for kind, unit in kinds:
        least, most = _SENSIBLE[unit]
        try:
            if least <= parse(word, unit) <= most:
                found.append(kind)
        except UnitError:
            continue
    if len(found) == 1:
        return found[0]
    raise UsageError(
        f"{text!r} could be a resistor and a capacitor" if found else f"{text!r} is no part value",
        hint="Give --kind resistor or --kind capacitor, or a value like 346k or 44u.",
        code="which-kind",
    )


def known_parts(stage: Stage, texts: tuple[str, ...]) -> tuple[dict[str, Spread], bool]:
    """Return the parts as measured, and whether one was good to its last digit alone."""
    found: dict[str, Spread] = {}
    any_by_digit = False
    for text in texts:
        ref, joint, value = text.partition("=")
        ref = ref.strip()
        if not joint or ref not in stage.parts:
            raise UsageError(
                f"--have: {text!r} names no part of stage {stage.name}",
                hint=f"Such as --have {next(iter(stage.parts))}=346k; it has "
                f"{', '.join(stage.parts)}.",
            )
        unit = "F" if ref == "C" else "ohm"
        found[ref], by_digit = spread_from_text(f"--have {ref}", value, unit)
        any_by_digit |= by_digit
    return found, any_by_digit


def target_of(text: str) -> tuple[str, float]:
    """Return quantity and value of "period=25s".

    Raises:
        UsageError: If the quantity is unknown, or the value is none of its unit.
    """
    from benchtool.judge.responses import UNITS

    name, joint, value = text.partition("=")
    name = name.strip()
    if not joint or name not in UNITS:
        raise UsageError(
            f"--target: {text!r} is no quantity with its value",
            hint=f"Such as --target period=25s; known: {', '.join(UNITS)}.",
        )
    found = value_of("--target", value.strip(), UNITS[name])
    if found is None or found <= 0:
        raise UsageError(f"--target must be greater than 0, got {text}", hint="Correct --target.")
    return name, found
