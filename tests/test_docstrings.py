"""Every public function of the physics says what its arrays are: a unit in brackets, or that they are flags, counts or shares.

In a core of bare SI arrays the docstring is the only place where a unit stands.
"""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

PHYSICS = Path(__file__).parent.parent / "benchtool" / "physics"
UNITS = {"V", "V RMS", "V DC", "A", "A RMS", "W", "VA", "J", "F", "ohm", "ohm·F", "S", "s", "Hz", "rad", "degC", "K"}
UNITS |= {"K/W", "1/K", "1"}
ARRAY_TYPES = re.compile(r"\b(Array|Number|Flags|Branch)\b")
BRACKETS = re.compile(r"\[([\w·/ ,]+)\]")
NO_UNIT = re.compile(r"\b(whether|bool|flags?|where|counts?|share|points|coordinate)\b", re.IGNORECASE)


def public(tree: ast.Module) -> Iterator[tuple[str, ast.FunctionDef]]:
    """Functions of the module and methods of its public classes; not those within functions, that no one calls from outside."""
    for node in tree.body:
        inner = node.body if isinstance(node, ast.ClassDef) and not node.name.startswith("_") else [node]
        for each in inner:
            if isinstance(each, ast.FunctionDef) and not each.name.startswith("_"):
                yield each.name, each


def documented() -> list[tuple[str, str, str]]:
    """Public functions and methods of the physics: where, their annotations, their docstring."""
    found = []
    for path in sorted(PHYSICS.glob("*.py")):
        for name, node in public(ast.parse(path.read_text(encoding="utf-8"))):
            types = [ast.unparse(each.annotation) for each in node.args.args if each.annotation]
            types.append(ast.unparse(node.returns) if node.returns else "")
            found.append((f"{path.stem}.{name}", " ".join(types), ast.get_docstring(node) or ""))
    return found


FUNCTIONS = documented()


def test_public_functions_say_what_they_are_for() -> None:
    assert not [where for where, _, text in FUNCTIONS if len(text.split()) < 3]


HANDLING_ARRAYS = [(where, text) for where, types, text in FUNCTIONS if ARRAY_TYPES.search(types)]


@pytest.mark.parametrize(("where", "text"), HANDLING_ARRAYS, ids=[where for where, _ in HANDLING_ARRAYS])
def test_arrays_have_a_unit_or_are_said_to_be_flags_or_counts(where: str, text: str) -> None:
    named = {unit for group in BRACKETS.findall(text) for unit in re.split(r", *", group)}
    assert named & UNITS or NO_UNIT.search(text), f"{where}: no unit in brackets, and nothing about flags or counts"


def test_units_are_spelled_one_way() -> None:
    stray = {
        f"{where}: [{group}]"
        for where, _, text in FUNCTIONS
        for group in BRACKETS.findall(text)
        if not set(re.split(r", *", group)) <= UNITS
    }
    assert not stray
