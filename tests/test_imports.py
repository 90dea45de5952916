"""Who may import whom: the rooms keep their direction, inside functions too."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Callable, Collection, Iterable
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
    "undrawn": {
        *("model", "intake", "observation", "provenance", "targets", "designs", "assessment"),
        "early",
    },
    "early": {"model", "circuits", "node", "observation", "targets"},
    "sightings": {"model", "units", "uncertainty", "circuits", "diagnose", "node", "timing"},
    "powerups": {"model", "circuits", "observation", "timing"},
    "mistakes": {"model", "units", "circuits", "evidence"},
    "evidence": {"model", "diagnose", "mistakes", "nodes", "sightings"},
    "assessment": {"model", "circuits", "judge", "observation", "parts"},
    "kit": {"model", "units", "designs"},
    "jobs": {
        *("pipeline", "records", "model", "instruments", "uncertainty", "units", "plugins"),
        *("formats", "assessment", "circuits", "counts", "judge", "observation"),
        *("provenance", "targets", "timing"),
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


@cache
def files_by_room() -> dict[str, list[Path]]:
    rooms: dict[str, list[Path]] = {}
    for path in sorted(ROOT.rglob("*.py")):
        room = path.relative_to(ROOT).parts[0].removesuffix(".py")
        rooms.setdefault(room, []).append(path)
    return rooms


ROOMS = sorted(files_by_room())


def offenders(
    paths: Iterable[Path], found: Callable[[Path], Collection[str]]
) -> dict[str, Collection[str]]:
    """Return what is found in each file, where anything is."""
    return {str(path.name): hits for path in paths if (hits := found(path))}


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
    return rooms & files_by_room().keys()


def libraries_of(path: Path) -> set[str]:
    return {name.split(".")[0] for name in imports_of(path)}


def called_in(path: Path) -> set[str]:
    return {
        node.func.id
        for node in nodes_of(path)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    }


def named_in(path: Path) -> set[str]:
    return {node.id for node in nodes_of(path) if isinstance(node, ast.Name)}


@pytest.mark.parametrize("room", ROOMS)
def test_a_room_imports_only_what_it_may_know(room: str) -> None:
    def unknown(path: Path) -> set[str]:
        others = rooms_imported(path) - EVERYWHERE - {room}
        return others & FREE[room] if room in FREE else others - ALLOWED[room]

    assert not offenders(files_by_room()[room], unknown)


@pytest.mark.parametrize("room", [room for room in ROOMS if room in PURE])
def test_pure_rooms_touch_no_files_clock_or_screen(room: str) -> None:
    def impure(path: Path) -> set[str]:
        return libraries_of(path) & IMPURE_MODULES | called_in(path) & {"print", "open", "input"}

    assert not offenders(files_by_room()[room], impure)


@pytest.mark.parametrize("room", [room for room in ROOMS if room not in ("cli", "__main__")])
def test_only_cli_prints_and_exits(room: str) -> None:
    def said(path: Path) -> set[str]:
        words = {"print", "exit", "quit", "SystemExit"}
        return named_in(path) & words | libraries_of(path) & {"click"}

    assert not offenders(files_by_room()[room], said)


def test_every_room_has_a_rule() -> None:
    assert set(ROOMS) <= ALLOWED.keys() | FREE.keys()


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


@pytest.mark.parametrize("part", sorted({path.name for path in DRIVERS.iterdir()}))
def test_a_driver_knows_only_what_lies_behind_the_seam(part: str) -> None:
    allowed = LOOPBACK if part == "loopback" else BEHIND_THE_SEAM
    paths = [DRIVERS / part] if part.endswith(".py") else sorted((DRIVERS / part).rglob("*.py"))
    assert not offenders(paths, lambda path: rooms_imported(path) - {"__init__"} - allowed)


@pytest.mark.parametrize("room", ROOMS)
def test_only_drivers_know_the_libraries_of_wires(room: str) -> None:
    assert not offenders(files_by_room()[room], lambda path: libraries_of(path) & WIRES)


@pytest.mark.parametrize("room", [room for room in ROOMS if room != "cli"])
def test_only_cli_names_a_driver_and_others_load_it_by_name(room: str) -> None:
    named = {"benchtool_drivers"}
    assert not offenders(files_by_room()[room], lambda path: libraries_of(path) & named)
