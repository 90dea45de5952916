"""The structure of the design file for editors, as JSON Schema."""

from __future__ import annotations

from typing import Any

SCHEMA_ID = "urn:benchtool:design:1"
_DIALECT = "https://json-schema.org/draft/2020-12/schema"
_NULL = {"type": "null"}


def design_schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of the design file.

    It knows tables, keys and choices; values with units are texts to it. ``load_design`` alone
    reads those.
    """
    from benchtool.designs.schema import DesignTable

    body = _tidied(DesignTable.model_json_schema(by_alias=True, mode="validation"))
    return {"$schema": _DIALECT, "$id": SCHEMA_ID, **body, "title": "benchtool design file"}


def _tidied(node: Any) -> Any:
    """Leave out what an editor of TOML has no use for: null, and defaults that are records."""
    if isinstance(node, list):
        return [_tidied(item) for item in node]
    if not isinstance(node, dict):
        return node
    kept = {key: _tidied(value) for key, value in node.items() if not _is_idle(key, value)}
    choices = kept.get("anyOf")
    if choices is None:
        return kept
    choices = [item for item in choices if item != _NULL]
    merged = choices[0] if len(choices) == 1 else {"anyOf": choices}
    return merged | {key: value for key, value in kept.items() if key != "anyOf"}


def _is_idle(key: str, value: Any) -> bool:
    return key == "default" and not isinstance(value, str | int | float)
