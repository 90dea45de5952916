"""From the bytes of a design file to its TOML table, with the line of whatever is no TOML."""

from __future__ import annotations

import re
import tomllib

from benchtool.errors import DesignError, DesignFault

_PLACE = re.compile(r"\s*\(at (?:line (?P<line>\d+), column \d+|end of document)\)")
_UNQUOTED = re.compile(r"""\s*(?P<key>[\w."-]+)\s*=\s*(?P<value>[^\s"'\[{#][^"'#]*?)\s*(?:#.*)?""")
_KEY = re.compile(r"\s*\[*\s*(?P<key>[\w.-]+)")
_TWICE = re.compile(r"Cannot (?:overwrite|declare|mutate)|Duplicate", re.IGNORECASE)
_QUOTE_HINT = "write values with a unit as a text between quotes"


def decode(content: bytes, *, source: str) -> str:
    """Return the text of a design file.

    Raises:
        DesignError: If it is not UTF-8.
    """
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise one_fault(
            DesignFault(key="", message="the file is not UTF-8 text", file=source, line=line),
            hint="save it as UTF-8 in a text editor; a design file is a TOML text",
        ) from None


def parse_toml(text: str, *, source: str) -> dict[str, object]:
    """Return the table of a TOML text.

    Raises:
        DesignError: If it is no TOML, with the line.
    """
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise _syntax_error(text, str(error), source) from None
    except RecursionError:
        fault = DesignFault(key="", message="the lists are nested too deeply", file=source)
        raise one_fault(fault, hint="a design needs no lists inside lists") from None
    except ValueError as error:  # a number longer than Python converts
        raise _syntax_error(text, str(error), source) from None


def one_fault(fault: DesignFault, *, hint: str) -> DesignError:
    """Return the error of a file whose one fault keeps it from being read further."""
    place = f"{fault.file or 'the design'}{f', line {fault.line}' if fault.line else ''}"
    return DesignError(f"{place}: {fault.message}", hint=hint, faults=(fault,))


def _syntax_error(text: str, reason: str, source: str) -> DesignError:
    rows = text.split("\n")
    place = _PLACE.search(reason)
    line = int(place["line"]) if place and place["line"] else len(text.rstrip().split("\n"))
    row = rows[line - 1] if line <= len(rows) else ""
    message, near, hint = _advise(row, _PLACE.sub("", reason))
    key = _KEY.match(row)
    fault = DesignFault(
        key=key["key"] if key else "", message=message, file=source, line=line, near=near
    )
    return one_fault(fault, hint=hint)


def _advise(row: str, reason: str) -> tuple[str, str | None, str]:
    """Return message, correction and hint for a line that is no TOML."""
    if _TWICE.search(reason):
        return "this is given twice", None, "keep one of the two"
    if "scape" in reason:
        return (
            "a backslash in a text between double quotes must be doubled",
            None,
            "put patterns with a backslash between single quotes, '^[A-Z]\\d+$'",
        )
    unquoted = _UNQUOTED.fullmatch(row)
    if unquoted:
        near = f'{unquoted["key"]} = "{unquoted["value"]}"'
        return f"this line is no TOML ({reason[:1].lower() + reason[1:]})", near, _QUOTE_HINT
    message = f"this is no TOML ({reason[:1].lower() + reason[1:]})"
    return message, None, "correct the line named; the rest is checked once it reads"
