"""Mutants of the sample cases, always the same ones: what a case file may look like after a slip of the hand, a bad disk or a
program that writes nonsense. They stand apart from their test so that a mutant can be looked at by its number.

Three kinds: tables changed with an eye to their meaning (most of them, so that many still are cases), lines of the text moved
about, and bytes spoilt without any eye at all.
"""

from __future__ import annotations

import random
import re
import tomllib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import tomlkit

from benchtool import casefile
from benchtool.catalogue.accepted import accepted
from benchtool.catalogue.readings import LOOK_WORDS, READINGS

SAMPLES = tuple(sorted((Path(__file__).parent.parent / "sample-cases").glob("*.toml")))
SEED = 20261014
NUMBERS = ("0", "-1", "1e-12", "1e12", "1e308", "-0.0", "nan", "inf", "1e400", "0.1", "7", "33", "480")
UNITS = ("V", "A", "mA", "uF", "nF", "F", "ohm", "kohm", "W", "Hz", "s", "%", "degC", "", "furlong", "µF", "Ω")
WORDS = ("unknown", "open", "short", "good", "yes", "no", "always on", "no change", *LOOK_WORDS[:3], "common", "rectifier", "")
ODD: tuple[Any, ...] = (
    True, False, 0, -1, 10**30, 1.5, float("nan"), float("-inf"), [], [[]], ["x"], {}, {"a": {"b": []}}, "\u202e\x07", "é" * 600,
)
CHOICES: dict[str, tuple[object, ...]] = {
    "rectifier": ("bridge", "half-wave", "half-wave-zener", "full-wave"),
    "kind": ("capacitor", "resistor", "divider", "current", "coil", "led", "gate"),
    "fed_through": ("zener", "resistor", "regulator"),
    "connected_by": ("plug", "fixed"),
    "switched": (True, False),
    "lifted": (True, False),
    "when": ("cold", "warm", "hot"),
    "safety_class": ("X2", "none", "Z9"),
}
Random = random.Random
Slot = tuple[Any, Any]
"""A dictionary or list, and the key or index of one value in it."""


def mutant(number: int) -> bytes:
    """The mutant of that number, as the bytes of a file."""
    chance = Random(f"{SEED} {number}")
    path = chance.choice(SAMPLES)
    way = chance.choices((of_tables, of_lines, of_bytes), (11, 4, 5))[0]
    return way(path, chance)


# --- tables


@cache
def _text(path: Path) -> str:
    return path.read_text(encoding="utf-8")


def of_tables(path: Path, chance: Random) -> bytes:
    """One to three changes of the tables."""
    data = tomllib.loads(_text(path))
    for _ in range(chance.choice((1, 1, 2, 3))):
        change = chance.choices(list(CHANGES), list(CHANGES.values()))[0]
        change(data, chance)
    return tomlkit.dumps(data).encode("utf-8", "surrogatepass")


def _slots(node: Any) -> list[Slot]:
    keys = list(node) if isinstance(node, dict) else range(len(node)) if isinstance(node, list) else ()
    return [slot for key in keys for slot in ((node, key), *_slots(node[key]))]


def _pick(data: Any, chance: Random, wanted: Callable[[Any], bool] = lambda value: True) -> Slot | None:
    slots = [slot for slot in _slots(data) if wanted(slot[0][slot[1]])]
    return chance.choice(slots) if slots else None


def _is_text(value: Any) -> bool:
    return isinstance(value, str)


def _is_number_text(value: Any) -> bool:
    return isinstance(value, str) and re.match(r"[\d.]+ ", value) is not None


def _put(slot: Slot | None, value: Any) -> None:
    if slot is not None:
        slot[0][slot[1]] = value


def _delete(data: Any, chance: Random) -> None:
    slot = _pick(data, chance)
    if slot is not None:
        del slot[0][slot[1]]


def _rename(data: Any, chance: Random) -> None:
    slot = _pick(data, chance)
    if slot is not None and isinstance(slot[0], dict):
        slot[0][chance.choice((f"{slot[1]}s", "resistance", "value", "on", "", "ключ", "a.b"))] = slot[0].pop(slot[1])


def _swap(data: Any, chance: Random) -> None:
    first, second = _pick(data, chance, _is_text), _pick(data, chance, _is_text)
    if first is not None and second is not None:
        one, other = first[0][first[1]], second[0][second[1]]
        _put(first, other)
        _put(second, one)


def _extreme(data: Any, chance: Random) -> None:
    slot = _pick(data, chance, _is_number_text)
    if slot is not None:
        _, _, unit = slot[0][slot[1]].partition(" ")
        _put(slot, f"{chance.choice(NUMBERS)} {unit}".strip())


def _scaled(data: Any, chance: Random) -> None:
    """A number that stays in the trade: three decades up or down at most."""
    slot = _pick(data, chance, _is_number_text)
    if slot is not None:
        figures, _, unit = slot[0][slot[1]].partition(" ")
        _put(slot, f"{float(figures) * 10.0 ** chance.uniform(-3.0, 3.0):.6g} {unit}".strip())


def _other_unit(data: Any, chance: Random) -> None:
    slot = _pick(data, chance, _is_number_text)
    if slot is not None:
        figures, _, _ = slot[0][slot[1]].partition(" ")
        _put(slot, f"{figures} {chance.choice(UNITS)}")


def _word(data: Any, chance: Random) -> None:
    _put(_pick(data, chance, _is_text), chance.choice(WORDS))


def _unknown(data: Any, chance: Random) -> None:
    _put(_pick(data.get("board", data), chance, _is_number_text), "unknown")


def _odd(data: Any, chance: Random) -> None:
    _put(_pick(data, chance), chance.choice(ODD))


def _choice(data: Any, chance: Random) -> None:
    slots = [slot for slot in _slots(data) if slot[1] in CHOICES]
    if slots:
        slot = chance.choice(slots)
        _put(slot, chance.choice(CHOICES[slot[1]]))


def _names(data: Any) -> list[str]:
    board = data.get("board")
    parts = [part for key in ("rail", "load") for part in (board.get(key) or ()) if isinstance(board, dict)] if board else []
    return [part["name"] for part in parts if isinstance(part, dict) and isinstance(part.get("name"), str)]


def _other_name(data: Any, chance: Random) -> None:
    names = _names(data)
    if names:
        _put(_pick(data, chance, lambda value: value in names), chance.choice([*names, "common", "rectifier", "no such part"]))


def _list(data: Any, chance: Random) -> None:
    """An entry of a list doubled, taken out or moved."""
    slot = _pick(data, chance, lambda value: isinstance(value, list) and bool(value))
    if slot is None:
        return
    entries = list(slot[0][slot[1]])
    how = chance.choice(("double", "drop", "shuffle", "many"))
    if how == "double":
        entries.append(chance.choice(entries))
    elif how == "drop":
        entries.pop(chance.randrange(len(entries)))
    elif how == "shuffle":
        chance.shuffle(entries)
    else:
        entries = entries * 12
    _put(slot, entries)


def _bare(data: Any, chance: Random) -> None:
    """Every load taken off the board, and every reading that names one."""
    board, readings = data.get("board"), data.get("reading")
    if isinstance(board, dict) and isinstance(readings, list):
        board.pop("load", None)
        data["reading"] = [each for each in readings if isinstance(each, dict) and not each.get("on") and "load" not in each]


def _on(data: Any, chance: Random) -> None:
    slots = [slot for slot in _slots(data) if slot[1] == "on"]
    if slots:
        names = [*_names(data), "nothing like it"]
        _put(chance.choice(slots), chance.choices(names, k=chance.randrange(4)))


def _reading(data: Any, chance: Random) -> None:
    """One more reading of any kind, mostly one that the board allows, its number anywhere a file may have it."""
    kind = chance.choice(READINGS)
    entry: dict[str, Any] = {"what": kind.name}
    for key in kind.needs:
        parts = data.get("board", {}).get(key) if isinstance(data.get("board"), dict) else None
        names = [part.get("name") for part in parts or () if isinstance(part, dict)] if isinstance(parts, list) else []
        entry[key] = chance.choice(names) if names else "rail"
    entry["value"] = chance.choice(kind.words) if kind.words and chance.random() < 0.5 else _number(kind, chance)
    readings = data.setdefault("reading", [])
    if isinstance(readings, list):
        readings.append(entry)


def _number(kind: Any, chance: Random) -> str:
    if kind.unit is None:
        return "0"
    _, high = accepted(kind, casefile.loads(_text(SAMPLES[0])).board)
    return f"{chance.choice((0.0, high * 10.0 ** chance.uniform(-9.0, 0.0))):.6g} {kind.unit}"


CHANGES: dict[Callable[[Any, Random], None], int] = {
    _scaled: 5, _reading: 5, _choice: 3, _unknown: 3, _list: 3, _on: 2, _extreme: 4, _other_unit: 3, _word: 2, _other_name: 2,
    _swap: 2, _delete: 2, _odd: 2, _rename: 1, _bare: 1,
}


# --- lines and bytes


def of_lines(path: Path, chance: Random) -> bytes:
    """Lines doubled, dropped, exchanged, or joined."""
    lines = _text(path).splitlines()
    for _ in range(chance.choice((1, 1, 2, 4))):
        here, there = chance.randrange(len(lines)), chance.randrange(len(lines))
        how = chance.choice(("double", "drop", "exchange", "join", "blank", "comment"))
        if how == "double":
            lines.insert(there, lines[here])
        elif how == "drop":
            del lines[min(here, len(lines) - 1)]
        elif how == "exchange":
            lines[here], lines[there] = lines[there], lines[here]
        elif how == "join":
            lines[here] += lines[there]
        else:
            lines.insert(here, "" if how == "blank" else f"# {lines[there]}")
    return "\n".join(lines).encode("utf-8")


def of_bytes(path: Path, chance: Random) -> bytes:
    """Bits turned, bytes put in or cut out, the end lost."""
    content = bytearray(_text(path).encode("utf-8"))
    for _ in range(chance.choice((1, 1, 2, 8))):
        place = chance.randrange(len(content))
        how = chance.choice(("turn", "put in", "cut out", "lose", "move"))
        if how == "turn":
            content[place] ^= 1 << chance.randrange(8)
        elif how == "put in":
            content[place:place] = chance.randbytes(chance.choice((1, 2, 16)))
        elif how == "cut out":
            del content[place : place + chance.choice((1, 2, 16))]
        elif how == "lose" and place > 1:
            del content[place:]
        else:
            content[place:place] = content[: chance.randrange(40)]
    return bytes(content)
