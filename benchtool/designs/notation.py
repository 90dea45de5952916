"""Keys and values as TOML writes them."""

from __future__ import annotations

import re
from collections.abc import Mapping

from benchtool.designs.lines import Path

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")


def key_text(path: Path) -> str:
    """Return a path as TOML writes it: ``stage.spacing.RA``, ``stage."a b".quantities[0]``."""
    text = ""
    for step in path:
        if isinstance(step, int):
            text += f"[{step}]"
            continue
        word = step if _BARE_KEY.fullmatch(step) else _quoted(step)
        text += f".{word}" if text else word
    return text


def value_text(value: object) -> str:
    """Return a value as TOML writes it on one line."""
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, Mapping):
        pairs = (f"{key_text((key,))} = {value_text(item)}" for key, item in value.items())
        return f"{{ {', '.join(pairs)} }}"
    if isinstance(value, tuple | list):
        return f"[{', '.join(value_text(item) for item in value)}]"
    return str(value).lower() if isinstance(value, bool) else f"{value}"


def _quoted(text: str) -> str:
    """Quote a text: as it stands where it holds a backslash and can, else with escapes."""
    if "\\" in text and "'" not in text and text.isprintable():
        return f"'{text}'"
    return f'"{"".join(_escaped(sign) for sign in text)}"'


def _escaped(sign: str) -> str:
    if sign in '"\\':
        return f"\\{sign}"
    if 0xD800 <= ord(sign) <= 0xDFFF:  # half a character, from a shell in another encoding
        return "\N{REPLACEMENT CHARACTER}"
    return sign if sign.isprintable() else f"\\U{ord(sign):08x}"
