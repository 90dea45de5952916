"""The data interchange format: a record that describes itself in nested parentheses.

References:
    SCPI-1999, volume 3, Data Interchange Format. Read here: the dimensions X (implicit) and Y with
    SCALe, OFFSet and SIZE, ENCode with FORMat, and the VALues of one CURVe.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from itertools import pairwise
from typing import Any

from benchtool_drivers.digitiser.talk import Talk, cut

_TOKENS = re.compile(r'\s*(\(|\)|"[^"]*"|[^\s()]+)')

Node = tuple[str, list[str], list[Any]]
"""Keyword, plain words, and the nodes below."""


def read_dif(talk: Talk, text: str) -> Mapping[str, str]:
    """Return the figures of a record in the data interchange format.

    Args:
        talk: The instrument.
        text: All of it, or what stands before the block of its values.

    Raises:
        ReplyError: If it is none, or has no dimensions X and Y.
    """
    root = _tree(text)
    dimensions = {
        keyword.partition("=")[2]: below
        for keyword, _, below in _all(root)
        if keyword.startswith("DIM") and "=" in keyword
    }
    if root is None or "X" not in dimensions or "Y" not in dimensions:
        raise _no_dif(talk, text)
    x, y = _words(dimensions["X"]), _words(dimensions["Y"])
    encoded = next((_words(below) for word, _, below in _all(root) if word.startswith("ENC")), {})
    found = {
        "points": x.get("SIZE") or y.get("SIZE"),
        "dt": x.get("SCAL"),
        "t0": x.get("OFFS", "0"),
        "gain": y.get("SCAL", "1"),
        "offset": y.get("OFFS", "0"),
        "format": encoded.get("FORM", ""),
    }
    if found["dt"] is None or found["points"] is None:
        raise _no_dif(talk, text)
    return {name: str(value) for name, value in found.items()}


def printed_values(talk: Talk, text: str) -> bytes:
    """Return the printed values of a record.

    Raises:
        ReplyError: If there are none.
    """
    found = re.search(r"\(VAL(?:UES)?\s+([^()#]*)\)", text, re.IGNORECASE)
    if not found:
        raise _no_dif(talk, text)
    return found[1].strip().encode("latin-1")


def _tree(text: str) -> Node | None:
    """Return the outermost node; brackets that the block leaves open are closed."""
    root: Node = ("", [], [])
    open_nodes = [root]
    for token in _TOKENS.findall(text):
        if token == "(":
            node: Node = ("", [], [])
            open_nodes[-1][2].append(node)
            open_nodes.append(node)
        elif token == ")":
            open_nodes.pop()
            if not open_nodes:
                return None
        else:
            _add_word(open_nodes, token)
    return root if root[2] and root[2][0][0] == "DIF" else None


def _add_word(open_nodes: list[Node], token: str) -> None:
    keyword, words, below = open_nodes[-1]
    if keyword or len(open_nodes) == 1:
        words.append(token.strip('"'))
        return
    parent = open_nodes[-2][2]
    parent[-1] = (token.upper(), words, below)
    open_nodes[-1] = parent[-1]


def _all(node: Node | None) -> list[Node]:
    if node is None:
        return []
    return [node, *(item for child in node[2] for item in _all(child))]


def _words(nodes: list[Node]) -> dict[str, str]:
    """Return the first word of each node, and of those below, by the keyword's short form."""
    found: dict[str, str] = {}
    for node in nodes:
        for keyword, words, _ in _all(node):
            # "(TYPE IMPLicit SCALe 1E-6)" holds pairs of words as well
            chain = [keyword, *words]
            for key, value in pairwise(chain):
                found.setdefault(key.upper()[:4], value)
    return found


def _no_dif(talk: Talk, text: str) -> Exception:
    return talk.wrong(
        "the answer is no record in the data interchange format",
        hint="Is FORM:DINT on? Compare what came with the manual.",
        command=talk.dialect.body.data.query,
        expected="(DIF (DIMension=X ...) (DIMension=Y ...) ...)",
        got=cut(text),
    )
