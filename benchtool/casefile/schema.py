"""One table of a case file ↔ one frozen record, made from what the records say beside their fields.

Why: a key is described once, in its record; the reader, the writer and every error sentence follow from it.
A value that is refused is noted and replaced by a stand-in, so that all problems of a file come out together.
"""

from __future__ import annotations

import dataclasses
import difflib
from collections.abc import Iterable, Mapping
from dataclasses import MISSING, dataclass, fields
from typing import Any, TypeVar, get_type_hints

from benchtool.board import Table, Tables
from benchtool.casefile.values import Rule, describe, read, stand_in, write
from benchtool.errors import CaseError, Problem, QuantityError
from benchtool.printable import listed, printable, quoted, shown

Path = tuple[str | int, ...]
Toml = Mapping[str, object]
R = TypeVar("R")

MOST_UNKNOWN = 50
"""Unknown keys of one table that are told one by one: a table with more is no table of a case."""
DEEPEST = 5
"""Levels of a case file that problems can stand on: board, rail, its number, zener, voltage."""


@dataclass(frozen=True, slots=True)
class Place:
    """Where a table stands: its path in the file, how a message names it, what its keys are called there."""

    path: Path = ()
    table: str = ""
    prefix: str = ""

    def inside(self, key: str) -> Place:
        """The table under `key`; in a list's entry it has no header: its keys are named `zener.voltage`."""
        path = (*self.path, key)
        if any(isinstance(step, int) for step in path):
            return Place(path, self.table, f"{self.prefix}{key}.")
        return Place(path, f"[{_dotted(path)}]")

    def entry(self, key: str, index: int, name: object) -> Place:
        """Entry `index` of the tables under `key`: in messages counted from one, with its name if any."""
        label = f" {quoted(name, 60)}" if isinstance(name, str) and name else ""
        return Place((*self.path, key, index), f"[[{_dotted((*self.path, key))}]] {index + 1}{label}")


def _dotted(path: Path) -> str:
    return ".".join(str(step) for step in path)


class Findings:
    """The problems of one file; the first one at a place counts, what follows from it is not told again."""

    def __init__(self) -> None:
        self._problems: dict[Path, Problem] = {}

    def add(self, place: Place, key: str, found: str, allowed: str) -> None:
        """Note a problem of `key` in the table at `place`."""
        problem = Problem(place.table, place.prefix + printable(key), found, allowed.rstrip("."))
        self._problems.setdefault((*place.path, key), problem)

    def in_order(self, data: Toml) -> tuple[Problem, ...]:
        """All problems in the order of the file; a missing key stands where its table begins."""
        order: dict[Path, int] = {}
        _number(data, (), order)
        paths = sorted(self._problems, key=lambda path: _rank(path, order))
        return tuple(self._problems[path] for path in paths)

    def raise_any(self, name: str, data: Toml) -> None:
        """CaseError with every problem; nothing happens where there is none."""
        if self._problems:
            raise CaseError(name, self.in_order(data))


def _number(node: object, path: Path, order: dict[Path, int]) -> None:
    """Number every path of the file as it is met, down to where problems can stand."""
    order[path] = len(order)
    if len(path) == DEEPEST:
        return
    children: Iterable[tuple[str | int, object]] = ()
    if isinstance(node, dict):
        children = node.items()
    elif isinstance(node, list):
        children = enumerate(node)
    for step, child in children:
        _number(child, (*path, step), order)


def _rank(path: Path, order: dict[Path, int]) -> int:
    while path not in order:
        path = path[:-1]
    return order[path]


@dataclass(frozen=True, slots=True)
class Field:
    """One key of a record: the field's name, the key in the file, its rule, its default unless required."""

    name: str
    key: str
    rule: Rule
    required: bool
    default: object


_fields: dict[type, tuple[Field, ...]] = {}


def fields_of(record: type) -> tuple[Field, ...]:
    """The keys of a record in its order; a field without a rule is not a key of its table."""
    if record not in _fields:
        _fields[record] = _read_rules(record)
    return _fields[record]


def _read_rules(record: Any) -> tuple[Field, ...]:
    hints = get_type_hints(record, include_extras=True)
    rules = {name: hint.__metadata__[0] for name, hint in hints.items() if hasattr(hint, "__metadata__")}
    return tuple(_field(each, rules[each.name]) for each in fields(record) if each.name in rules)


def _field(each: dataclasses.Field[Any], rule: Rule) -> Field:
    return Field(each.name, getattr(rule, "key", each.name), rule, each.default is MISSING, each.default)


def read_record(
    record: type[R],
    data: Toml,
    place: Place,
    findings: Findings,
    *,
    also: tuple[str, ...] = (),
    **given: Any,
) -> R:
    """The record of one table; `also` are keys the caller reads, `given` fields that stand elsewhere."""
    known = fields_of(record)
    note_unknown_keys(data, (*(each.key for each in known), *also), place, findings)
    values = {each.name: _read_field(each, data, place, findings) for each in known}
    return record(**values, **given)


def note_unknown_keys(data: Toml, known: tuple[str, ...], place: Place, findings: Findings) -> None:
    """A problem for every key that the table does not know, with the one that was probably meant."""
    strange = [key for key in data if key not in known]
    for key in strange[:MOST_UNKNOWN]:
        meant = difflib.get_close_matches(printable(key), known, n=1)
        hint = f"{meant[0]} (probably meant); all keys here: " if meant else ""
        findings.add(place, key, "an unknown key", hint + listed(known))
    if len(strange) > MOST_UNKNOWN:
        findings.add(
            place, strange[MOST_UNKNOWN], f"{len(strange) - MOST_UNKNOWN} more unknown keys", listed(known)
        )


def _read_field(each: Field, data: Toml, place: Place, findings: Findings) -> Any:
    if each.key not in data:
        return _absent(each, place, findings)
    value = data[each.key]
    match each.rule:
        case Table(record):
            return read_table(record, value, place, each.key, findings)
        case Tables(record):
            return _read_tables(each.rule, value, place, findings)
    return read_or_note(each.rule, value, place, each.key, findings)


def read_or_note(rule: Rule, value: object, place: Place, key: str, findings: Findings) -> object:
    """The value by its rule; where that refuses it, a problem and the stand-in."""
    try:
        return read(rule, value)
    except QuantityError as refusal:
        findings.add(place, key, refusal.found, refusal.allowed)
        return stand_in(rule)


def _absent(each: Field, place: Place, findings: Findings) -> object:
    if not each.required:
        return each.default
    findings.add(place, each.key, "nothing", f"{describe(each.rule)} (required)")
    return _stand_in_field(each)


def stand_in_record(record: type[R], **given: Any) -> R:
    """A record of stand-ins, in place of a table that is missing or is none."""
    return record(**{each.name: _stand_in_field(each) for each in fields_of(record)}, **given)


def _stand_in_field(each: Field) -> object:
    match each.rule:
        case Table(record):
            return stand_in_record(record) if each.required else each.default
    return stand_in(each.rule)


def read_table(
    record: type[R],
    value: object,
    place: Place,
    key: str,
    findings: Findings,
    *,
    also: tuple[str, ...] = (),
    **given: Any,
) -> R:
    """The record of the table under `key`; what is no table at all is one problem, not one a key."""
    if isinstance(value, dict):
        return read_record(record, value, place.inside(key), findings, also=also, **given)
    findings.add(place, key, shown(value), "a table")
    return stand_in_record(record, **given)


def _read_tables(rule: Tables, value: object, place: Place, findings: Findings) -> tuple[object, ...]:
    entries = entries_of(value, place, rule.key, findings, least=rule.least, most=rule.most)
    return tuple(read_record(rule.record, entry, where, findings) for entry, where in entries)


LABELS = ("name", "what", "part")
"""The key by which an entry is known in messages: a rail's or load's, a reading's, a replaced part's."""


def entries_of(
    value: object, place: Place, key: str, findings: Findings, *, least: int = 0, most: int
) -> list[tuple[Toml, Place]]:
    """The tables under `key` with their places, at most `most`; a problem for what is no list of tables."""
    if not isinstance(value, list) or not all(isinstance(entry, dict) for entry in value):
        findings.add(place, key, shown(value), f"tables, each under a [[{_dotted((*place.path, key))}]]")
        return []
    if not least <= len(value) <= most:
        findings.add(place, key, f"{len(value)} tables", f"{least} to {most}")
    return [(entry, place.entry(key, index, _label(entry))) for index, entry in enumerate(value[:most])]


def _label(entry: Toml) -> object:
    return next((entry[key] for key in LABELS if key in entry), "")


def to_toml(record: Any) -> dict[str, Any]:
    """The table of a record: keys that differ from their default; plain values, then tables, then lists."""
    table: dict[str, Any] = {}
    for each in sorted(fields_of(type(record)), key=_layout):
        value = getattr(record, each.name)
        if each.required or value != each.default:
            table[each.key] = _written(each.rule, value)
    return table


def _layout(each: Field) -> int:
    """TOML wants plain keys before tables: they would else fall into the table above them."""
    match each.rule:
        case Tables():
            return 2
        case Table():
            return 1
    return 0


def _written(rule: Rule, value: Any) -> object:
    match rule:
        case Table():
            return to_toml(value)
        case Tables():
            return [to_toml(entry) for entry in value]
    return write(rule, value)
