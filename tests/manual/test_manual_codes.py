"""Every code that the program can print has an entry."""

import ast
from collections.abc import Iterator
from pathlib import Path

import benchtool
import benchtool_drivers
from benchtool.circuits.faults import FAULTS
from benchtool.circuits.topologies import TOPOLOGIES
from benchtool.designs.vocabulary import IC_TERMS, QUANTITIES
from benchtool.manual import lookup

ROOTS = [Path(package.__file__).parent for package in (benchtool, benchtool_drivers)]


def literal_codes() -> Iterator[str]:
    """Yield every text given as ``code=`` or as an error class's ``default_code``."""
    for path in (path for root in ROOTS for path in root.rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            for name, value in _named(node):
                if name in {"code", "default_code"} and isinstance(value, ast.Constant):
                    yield value.value


def _named(node: ast.AST) -> Iterator[tuple[str | None, ast.expr | None]]:
    if isinstance(node, ast.Call):
        yield from ((keyword.arg, keyword.value) for keyword in node.keywords)
    elif isinstance(node, ast.Assign) and isinstance(node.targets[0], ast.Name):
        yield node.targets[0].id, node.value
    elif isinstance(node, ast.AnnAssign) and isinstance(node.target, ast.Name):
        yield node.target.id, node.value


CODES = sorted({code for code in literal_codes() if isinstance(code, str)})


def test_the_scan_finds_codes_of_errors_and_of_warnings() -> None:
    assert {"usage", "unit", "no-solution", "limits-narrower-than-u"} <= set(CODES)


def test_every_code_is_explained() -> None:
    assert [code for code in CODES if lookup(code) is None] == []


def test_every_fault_topology_ic_term_and_quantity_is_explained() -> None:
    names = [*FAULTS, *TOPOLOGIES, *IC_TERMS, *QUANTITIES]
    assert [name for name in names if lookup(name) is None] == []
