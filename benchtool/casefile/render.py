"""The text of a case file: written afresh, or the user's own text changed in the few places that differ.

Why: the file belongs to the technician. Comments, order and spelling are theirs, so a save compares what the
old text said with what the case says now and touches only that. Only this module knows tomlkit.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, MutableMapping, Sequence
from difflib import SequenceMatcher
from typing import Any

import tomlkit
from tomlkit.items import AoT, Table

Data = Mapping[str, Any]

BLOCKS = ("rail", "load", "reading")
"""Lists whose entries stand under headers of their own, `[[reading]]`; other lists stand on one line."""


def fresh(data: Data, comments: Sequence[str] = ()) -> str:
    """A new text for the plain tables of a case, headed by the comments of a text it takes the place of."""
    document = tomlkit.document()
    for comment in comments:
        document.add(tomlkit.comment(comment))
    for key, value in data.items():
        document.add(key, _item(key, value))
    return tomlkit.dumps(document)


def edited(text: str, old: Data, new: Data) -> str:
    """The text with what differs between `old`, the plain tables it stands for, and `new`."""
    ending = "\r\n" if "\r\n" in text else "\n"
    document = tomlkit.parse(text.replace("\r\n", "\n").rstrip("\n") + "\n")
    sections: dict[str, Any] = {
        key: {} for key, value in old.items() if isinstance(value, dict)
    }  # an emptied one keeps its header
    _update(document, old, {**sections, **new})
    return tomlkit.dumps(document).replace("\n", ending)


def _item(key: str, value: Any, *, in_entry: bool = False) -> Any:
    match value:
        case dict():
            return _filled(tomlkit.inline_table() if in_entry else tomlkit.table(), value, in_entry)
        case list() if key in BLOCKS:
            return _blocks(value)
        case list():
            array = tomlkit.array()
            array.extend(_item(key, entry, in_entry=True) for entry in value)
            return array
    return tomlkit.item(value)


def _filled(table: Any, data: Data, in_entry: bool) -> Any:
    for key, value in data.items():
        table.add(key, _item(key, value, in_entry=in_entry))
    return table


def _blocks(entries: Sequence[Data]) -> AoT:
    blocks = tomlkit.aot()
    for entry in entries:
        blocks.append(_block(entry))
    return blocks


def _block(entry: Data) -> Any:
    return _filled(tomlkit.table(), entry, in_entry=True)


def _update(table: MutableMapping[str, Any], old: Data, new: Data, *, in_entry: bool = False) -> None:
    for key in old:
        if key not in new:
            del table[key]
    for key, value in new.items():
        if key not in old or old[key] != value:
            _set(table, key, old.get(key), value, in_entry)


def _set(table: MutableMapping[str, Any], key: str, before: Any, value: Any, in_entry: bool) -> None:
    """Change one key; a table or a list of tables that stands in the text is changed inside."""
    present = table.get(key)
    if isinstance(value, dict) and isinstance(present, MutableMapping):
        _update(present, before or {}, value, in_entry=in_entry)
    elif isinstance(value, list) and present is not None and _are_tables(value) and _are_tables(before or []):
        _update_list(present, before or [], value)
    else:
        table[key] = _item(key, value, in_entry=in_entry)


def _are_tables(values: Sequence[Any]) -> bool:
    return all(isinstance(value, dict) for value in values)


def _update_list(entries: Any, old: Sequence[Data], new: Sequence[Data]) -> None:
    """Entries that stayed are left alone; from the end, so that places before a change stay valid."""
    steps = SequenceMatcher(None, _keys(old), _keys(new), autojunk=False).get_opcodes()
    for what, start, end, new_start, new_end in reversed(steps):
        if what == "equal":
            continue
        shared = min(end - start, new_end - new_start)
        for index in reversed(range(start + shared, end)):
            _remove(entries, index)
        for offset in range(shared, new_end - new_start):
            _insert(entries, start + offset, new[new_start + offset])
        for offset in range(shared):
            _update(entries[start + offset], old[start + offset], new[new_start + offset], in_entry=True)


def _keys(entries: Sequence[Data]) -> list[str]:
    return [json.dumps(entry, sort_keys=True, default=str) for entry in entries]


def _insert(entries: Any, index: int, entry: Data) -> None:
    if not isinstance(entries, AoT):
        entries.insert(index, _item("", entry, in_entry=True))
        return
    block = _block(entry)
    tail: list[Any] = [tomlkit.nl()]
    if index > 0:
        tail = _detach_tail(entries[index - 1])
        _innermost(entries[index - 1]).add(tomlkit.nl())
    for item in tail:
        block.add(item)
    entries.insert(index, block)


def _remove(entries: Any, index: int) -> None:
    """What follows an entry after a blank line heads the next one, and stays."""
    if isinstance(entries, AoT) and index > 0:
        tail = _detach_tail(entries[index])
        home = _innermost(entries[index - 1])
        _detach_tail(home)
        for item in tail:
            home.add(item)
    del entries[index]


def _innermost(table: Any) -> Any:
    """The table that the text of this one ends in: itself, or the last one under a header below its own."""
    body = table.value.body
    return _innermost(body[-1][1]) if body and isinstance(body[-1][1], Table) else table


def _detach_tail(table: Any) -> list[Any]:
    """Take off, from the first blank line behind the last key, what stands before the next header."""
    body = _innermost(table).value.body
    last_key = max((place for place, (key, _) in enumerate(body) if key is not None), default=-1)
    blank = (place for place in range(last_key + 1, len(body)) if not body[place][1].as_string().strip())
    cut = next(blank, len(body))
    tail = [item for _, item in body[cut:]]
    del body[cut:]
    return tail
