"""Who may import whom: the rooms keep their direction, inside functions too."""

from __future__ import annotations

import ast
import subprocess
import sys
from functools import cache
from pathlib import Path

import pytest

import benchtool
import benchtool_drivers

ROOT = Path(benchtool.__file__).parent
EVERYWHERE = {"errors", "frozen", "__init__"}
ALLOWED: dict[str, set[str]] = {
    "__init__": {"pipeline"},
    "__main__": {"cli"},
    "errors": set(),
    "frozen": set(),
    "units": set(),
    "plugins": set(),
    "model": set(),
    "manual": set(),
    "instruments": {"model"},
    "uncertainty": {"model"},
    "timing": {"model", "units", "uncertainty"},
    "circuits": {"model", "units", "uncertainty", "plugins"},
    "parts": {"model", "units", "uncertainty"},
    "judge": {"model", "units", "uncertainty", "circuits"},
    "diagnose": {"model", "units", "uncertainty", "circuits", "judge", "parts"},
    "simulation": {"model", "units", "uncertainty", "circuits"},
    "designs": {"model", "units", "circuits"},
    "folder": set(),
    "formats": {"model", "units", "plugins", "folder"},
    "report": {"model", "units", "manual", "uncertainty"},
    "targets": {"model", "timing"},
    "provenance": {"model", "formats"},
    "comparison": {"model", "uncertainty"},
    "observation": {"model", "timing", "diagnose", "targets"},
    "counts": {"model", "timing", "observation", "provenance", "targets"},
    "intake": {"counts", "model", "formats", "timing", "observation", "provenance", "targets"},
    "nodes": {"model", "circuits", "node", "observation", "targets", "timing"},
    "sightings": {"model", "units", "uncertainty", "circuits", "diagnose", "node", "timing"},
    "evidence": {"model", "diagnose", "nodes", "sightings"},
    "assessment": {"model", "circuits", "judge", "observation", "parts"},
    "kit": {"model", "units", "designs"},
    "jobs": {
        *("pipeline", "records", "model", "instruments", "uncertainty", "units", "plugins"),
        *("formats", "assessment", "circuits", "judge", "observation", "targets", "timing"),
    },
    "fitting": {"model"},
    "node": {"model", "uncertainty", "fitting", "timing", "circuits"},
    "selftest": {"model", "uncertainty", "circuits", "timing", "simulation"},
}
FREE = {"pipeline": {"cli", "report", "records", "jobs"}, "cli": {"__main__"}}
"""Rooms that know all but these."""

PURE = (
    *("timing", "circuits", "parts", "judge", "diagnose", "simulation", "model"),
    *("targets", "comparison", "observation", "assessment", "selftest"),
    *("fitting", "node"),
)
IMPURE_MODULES = {"os", "io", "pathlib", "time", "datetime", "rich", "pandas", "sys", "click"}


def python_files() -> list[Path]:
    return sorted(ROOT.rglob("*.py"))


def room_of(path: Path) -> str:
    return path.relative_to(ROOT).parts[0].removesuffix(".py")


@cache
def nodes_of(path: Path) -> tuple[ast.AST, ...]:
    return tuple(ast.walk(ast.parse(path.read_text(encoding="utf-8"))))


@cache
def imports_of(path: Path) -> frozenset[str]:
    found: set[str] = set()
    for node in nodes_of(path):
        if isinstance(node, ast.Import):
            found |= {name.name for name in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.add(node.module)
            if node.module == "benchtool":
                found |= {f"benchtool.{name.name}" for name in node.names}
    return frozenset(found)


def rooms_imported(path: Path) -> set[str]:
    parts = [name.split(".") for name in imports_of(path)]
    rooms = {words[1] for words in parts if words[0] == "benchtool" and len(words) > 1}
    return {room for room in rooms if (ROOT / room).is_dir() or (ROOT / f"{room}.py").exists()}


@pytest.mark.parametrize("path", python_files(), ids=lambda path: str(path.relative_to(ROOT)))
def test_a_room_imports_only_what_it_may_know(path: Path) -> None:
    room = room_of(path)
    others = rooms_imported(path) - EVERYWHERE - {room}
    if room in FREE:
        assert not others & FREE[room]
    else:
        assert others <= ALLOWED[room], f"{room} may not know {sorted(others - ALLOWED[room])}"


@pytest.mark.parametrize("path", python_files(), ids=lambda path: str(path.relative_to(ROOT)))
def test_pure_rooms_touch_no_files_clock_or_screen(path: Path) -> None:
    if room_of(path) not in PURE:
        return
    outside = {name.split(".")[0] for name in imports_of(path)} & IMPURE_MODULES
    calls = {
        node.func.id
        for node in nodes_of(path)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    }
    assert not outside
    assert not calls & {"print", "open", "input"}


@pytest.mark.parametrize("path", python_files(), ids=lambda path: str(path.relative_to(ROOT)))
def test_only_cli_prints_and_exits(path: Path) -> None:
    if room_of(path) in ("cli", "__main__"):
        return
    names = {node.id for node in nodes_of(path) if isinstance(node, ast.Name)}
    assert not names & {"print", "exit", "quit", "SystemExit"}
    assert not {name.split(".")[0] for name in imports_of(path)} & {"click"}


def test_every_room_has_a_rule() -> None:
    rooms = {room_of(path) for path in python_files()}
    assert rooms <= ALLOWED.keys() | FREE.keys()


@pytest.mark.parametrize(
    ("statement", "forbidden"),
    [
        ("import benchtool.cli.main", {"numpy", "rich", "pydantic", "scipy", "benchtool.model"}),
        ("import benchtool.pipeline", {"scipy", "pandas", "rich", "matplotlib", "pydantic"}),
    ],
)
def test_start_up_loads_nothing_heavy(statement: str, forbidden: set[str]) -> None:
    code = f"{statement}; import sys; print(*sys.modules)"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert not forbidden & set(run.stdout.split())


DRIVERS = Path(benchtool_drivers.__file__).parent
BEHIND_THE_SEAM = {"errors", "frozen", "folder", "model", "units", "instruments", "designs"}
"""What drivers may know: files of theirs tell their faults as designs do."""
LOOPBACK = BEHIND_THE_SEAM | {"simulation", "circuits"}
WIRES = {"pyvisa", "pyvisa_py", "serial", "usb"}


@pytest.mark.parametrize(
    "path", sorted(DRIVERS.rglob("*.py")), ids=lambda path: str(path.relative_to(DRIVERS))
)
def test_a_driver_knows_only_what_lies_behind_the_seam(path: Path) -> None:
    allowed = LOOPBACK if path.relative_to(DRIVERS).parts[0] == "loopback" else BEHIND_THE_SEAM
    assert rooms_imported(path) - {"__init__"} <= allowed


@pytest.mark.parametrize("path", python_files(), ids=lambda path: str(path.relative_to(ROOT)))
def test_only_drivers_know_the_libraries_of_wires(path: Path) -> None:
    assert not {name.split(".")[0] for name in imports_of(path)} & WIRES


@pytest.mark.parametrize("path", python_files(), ids=lambda path: str(path.relative_to(ROOT)))
def test_only_cli_names_a_driver_and_others_load_it_by_name(path: Path) -> None:
    if room_of(path) != "cli":
        assert "benchtool_drivers" not in {name.split(".")[0] for name in imports_of(path)}
