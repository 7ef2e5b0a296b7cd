"""The house's order as a failing test: imports run downwards only, and the core needs nothing but NumPy."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "benchtool"

# Top to bottom. Names in one row are neighbours: they do not import each other. A name stands for a module or a whole folder.
FLOORS: list[set[str]] = [
    {"__main__"},
    {"cli"},
    {"report"},
    {"assessment"},
    {"result"},
    {"words"},
    {"casefile"},
    {"case"},
    {"diagnosis"},
    {"catalogue"},
    {"physics"},
    {"quantities"},
    {"observed"},
    {"board"},
    {"errors", "printable"},
]
FLOOR_OF = {name: floor for floor, names in enumerate(FLOORS) for name in names}


def modules() -> list[tuple[str, Path]]:
    """Every module of the package with its room: a file, or the folder it stands in."""
    found = []
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(PACKAGE).with_suffix("").parts
        if parts != ("__init__",):
            found.append((parts[0], path))
    return found


def imported_rooms(source: str, room: str) -> set[str]:
    """Rooms of this package that a module imports, wherever in it the import stands; imports for types only are left out."""
    rooms: set[str] = set()
    tree = ast.parse(source)
    for guard in [node for node in ast.walk(tree) if isinstance(node, ast.If)]:
        if ast.unparse(guard.test) == "TYPE_CHECKING":
            guard.body = [ast.Pass()]
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom) and node.level == 0 and node.module:
            parts = node.module.split(".")
            if parts[0] == "benchtool":
                rooms |= {parts[1]} if len(parts) > 1 else {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.level:
            rooms.add(room)
        elif isinstance(node, ast.Import):
            rooms |= {alias.name.split(".")[1] for alias in node.names if alias.name.startswith("benchtool.")}
    return rooms - {room}


def upward(source: str, room: str) -> list[str]:
    """Imports of `source`, standing in `room`, that do not lead to a lower floor."""
    return sorted(target for target in imported_rooms(source, room) if FLOOR_OF.get(target, -1) <= FLOOR_OF[room])


@pytest.mark.parametrize(("room", "path"), modules(), ids=lambda value: value.name if isinstance(value, Path) else value)
def test_imports_run_downwards(room: str, path: Path) -> None:
    assert room in FLOOR_OF, f"{room} has no floor: give it one in tests/test_layers.py and in DEVELOPERS.md's map"
    assert upward(path.read_text(encoding="utf-8"), room) == []


def test_an_import_turned_upwards_is_found() -> None:
    assert upward("from benchtool.assessment import assess", "physics") == ["assessment"]
    assert upward("def f():\n    import benchtool.cli", "report") == ["cli"]
    assert upward("from benchtool.board import Board", "physics") == []


CORE_ALONE = """
import sys
import benchtool.diagnosis.checks, benchtool.diagnosis.effective, benchtool.diagnosis.evidence
import benchtool.diagnosis.disagreement, benchtool.diagnosis.safety, benchtool.physics.stress
loaded = {name.split(".")[0] for name in sys.modules}
print(sorted(loaded & {"pint", "rich", "textual", "tomlkit", "scipy"}))
"""


def test_physics_and_diagnosis_import_without_units_screens_or_files() -> None:
    done = subprocess.run([sys.executable, "-c", CORE_ALONE], capture_output=True, text=True, check=True, timeout=60)
    assert done.stdout.strip() == "[]"
