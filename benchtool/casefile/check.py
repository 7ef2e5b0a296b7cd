"""What no single key can tell: names that must exist, keys that go together, rails hung from the rectifier.

Why: the physics takes a board as it comes and would give a wrong number for one that cannot be built. All
checks run on every file, also on one with other problems, so that one message is enough to mend it.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from benchtool.board import (
    COMMON,
    DEFAULT_DROP_OUT,
    DEFAULT_PULL_IN,
    RECTIFIER,
    Board,
    Dropper,
    Load,
    Rail,
    resistance_of,
)
from benchtool.case import Repair
from benchtool.casefile.schema import Findings, Place
from benchtool.printable import listed, names_listed, quoted

BOARD = Place().inside("board")
RESERVED = (COMMON, RECTIFIER)
UNREAD = ""
"""Stands in for a name or word that was refused; nothing that hangs on it is reported a second time."""


@dataclass(frozen=True, slots=True)
class Keys:
    """The keys that belong to one kind of part, beyond those that every kind has."""

    needs: tuple[str, ...] = ()
    may: tuple[str, ...] = ()


DROPPER_KEYS = {
    "capacitor": Keys(("capacitance",), ("fitted", "safety_class", "dielectric")),
    "resistor": Keys(("resistance",), ("rated_power",)),
    "divider": Keys(("capacitance", "shunt_capacitance"), ("fitted", "safety_class", "dielectric")),
}
FEED_KEYS = {
    "zener": Keys(),
    "resistor": Keys(("feed_resistance",), ("feed_tolerance",)),
    "regulator": Keys(("regulated_voltage",), ("dropout", "ground_current")),
}
LOAD_KEYS = {
    "current": Keys(("current",)),
    "coil": Keys((), ("resistance", "power", "nominal_voltage", "pull_in", "drop_out")),
    "resistor": Keys((), ("resistance", "power", "nominal_voltage")),
    "led": Keys(("forward_voltage", "resistance")),
    "gate": Keys(("current", "pulse")),
}


def check_board(board: Board, findings: Findings) -> None:
    """Note everything that does not fit together on the board."""
    _check_keys(board.dropper, board.dropper.kind, DROPPER_KEYS, BOARD.inside("dropper"), findings)
    _check_unique("rail", [rail.name for rail in board.rails], findings)
    _check_unique("load", [load.name for load in board.loads], findings)
    for index, rail in enumerate(board.rails):
        _check_rail(board, rail, index, findings)
    for index, load in enumerate(board.loads):
        _check_load(board, load, BOARD.entry("load", index, load.name), findings)


def _check_keys(
    part: Dropper | Rail | Load, kind: str, table: dict[str, Keys], place: Place, findings: Findings
) -> None:
    """Keys that this kind needs and lacks, and keys that belong to another kind."""
    if kind not in table:
        return
    known = table[kind]
    for key in dict.fromkeys(key for keys in table.values() for key in (*keys.needs, *keys.may)):
        present = getattr(part, key) is not None
        if key in known.needs and not present:
            findings.add(place, key, "nothing", f"a value (required for {quoted(kind)})")
        if present and key not in (*known.needs, *known.may):
            belongs = names_listed(name for name, keys in table.items() if key in (*keys.needs, *keys.may))
            findings.add(place, key, f"a key that {quoted(kind)} does not have", f"only with {belongs}")


def _check_unique(key: str, names: list[str], findings: Findings) -> None:
    for index, name in enumerate(names):
        place = BOARD.entry(key, index, name)
        if name in RESERVED:
            allowed = f"any name but {names_listed(RESERVED)}, which have a meaning of their own"
            findings.add(place, "name", quoted(name), allowed)
        if name != UNREAD and name in names[:index]:
            findings.add(place, "name", f"{quoted(name)} again", f"a name that no other {key} has")


def _check_rail(board: Board, rail: Rail, index: int, findings: Findings) -> None:
    place = BOARD.entry("rail", index, rail.name)
    if index == 0:
        _check_first_rail(board, rail, place, findings)
    else:
        _check_feeder(board, rail, place, findings)
    kind = RECTIFIER if index == 0 else rail.fed_through or UNREAD
    _check_keys(rail, kind, {**FEED_KEYS, RECTIFIER: Keys()}, place, findings)
    _check_stacking(board, rail, place, findings)


def _check_first_rail(board: Board, rail: Rail, place: Place, findings: Findings) -> None:
    if rail.fed_by != RECTIFIER:
        allowed = '"rectifier": the first rail is the one that the rectifier feeds'
        findings.add(place, "fed_by", quoted(rail.fed_by), allowed)
    if rail.fed_through is not None:
        allowed = "no such key: the rectifier feeds the first rail itself"
        findings.add(place, "fed_through", quoted(rail.fed_through), allowed)
    if board.rectifier == "half-wave-zener" and rail.zener is None:
        findings.add(place, "zener", "nothing", 'a table (required on the first rail of a "half-wave-zener")')


def _check_feeder(board: Board, rail: Rail, place: Place, findings: Findings) -> None:
    others = [other.name for other in board.rails if other.name != rail.name]
    if rail.fed_by == RECTIFIER:
        allowed = f"{names_listed(others)}: only the first rail is fed by the rectifier"
        findings.add(place, "fed_by", quoted(rail.fed_by), allowed)
    elif not exists(rail.fed_by, (*others, rail.name)):
        findings.add(place, "fed_by", quoted(rail.fed_by), names_listed(others))
    elif rail.name in _feeders(board, rail):
        allowed = "a rail that is itself fed, step by step, from the first; this goes round in a circle"
        findings.add(place, "fed_by", quoted(rail.fed_by), allowed)
    if rail.fed_through is None:
        allowed = f"{names_listed(FEED_KEYS)} (required on a rail fed by another)"
        findings.add(place, "fed_through", "nothing", allowed)


def exists(name: str, names: Collection[str]) -> bool:
    """Whether the name is among them, or may be, because one of them or the name itself was refused."""
    return name == UNREAD or name in names or UNREAD in names


def _feeders(board: Board, rail: Rail) -> list[str]:
    """Names of the rails that feed this one, nearest first, up to the first rail or once round a circle."""
    feeds = {other.name: other.fed_by for other in reversed(board.rails[1:])}
    chain: list[str] = []
    name = rail.fed_by
    while name not in chain and name not in (UNREAD, RECTIFIER):
        chain.append(name)
        name = feeds.get(name, UNREAD)
    return chain


def _check_stacking(board: Board, rail: Rail, place: Place, findings: Findings) -> None:
    """`clamps_to` of the upper rail and `fed_through = "zener"` of the lower tell the same thing twice."""
    target = rail.zener.clamps_to if rail.zener is not None else COMMON
    if target not in (COMMON, UNREAD) and not _agrees(board, rail, target):
        stacked = [
            lower for lower in board.rails if lower.fed_by == rail.name and lower.fed_through == "zener"
        ]
        below = names_listed((COMMON, *(lower.name for lower in stacked)))
        allowed = f'{below}: a lower rail says itself fed_by = {quoted(rail.name)}, fed_through = "zener"'
        findings.add(place.inside("zener"), "clamps_to", quoted(target), allowed)
    upper = _rail(board, rail.fed_by)
    if rail.fed_through == "zener" and upper is not None and not _clamps(upper, rail.name):
        agreeing = f"unless the zener of {quoted(upper.name)} says clamps_to = {quoted(rail.name)}"
        allowed = f'"resistor" or "regulator", {agreeing}'
        findings.add(place, "fed_through", '"zener"', allowed)


def _agrees(board: Board, upper: Rail, target: str) -> bool:
    lower = _rail(board, target)
    if lower is None:
        return exists(target, [rail.name for rail in board.rails])
    return lower.fed_through in ("zener", UNREAD) and (
        lower.fed_by == upper.name or UNREAD in (lower.fed_by, upper.name)
    )


def _clamps(upper: Rail, name: str) -> bool:
    return upper.zener is not None and upper.zener.clamps_to in (name, UNREAD)


def _rail(board: Board, name: str) -> Rail | None:
    return next((rail for rail in board.rails if rail.name == name), None)


def _check_load(board: Board, load: Load, place: Place, findings: Findings) -> None:
    _check_keys(load, load.kind, LOAD_KEYS, place, findings)
    if load.kind in ("coil", "resistor") and resistance_of(load) is None:
        findings.add(place, "resistance", "nothing", "resistance, or power with nominal_voltage (required)")
    if load.kind == "coil" and _or(load.pull_in, DEFAULT_PULL_IN) <= _or(load.drop_out, DEFAULT_DROP_OUT):
        key = "drop_out" if load.drop_out is not None else "pull_in"
        findings.add(
            place, key, "drop_out not below pull_in", "a coil lets go at less voltage than it pulls in at"
        )
    rails = [rail.name for rail in board.rails]
    if not exists(load.rail, rails):
        findings.add(place, "rail", quoted(load.rail), names_listed(rails))
        return
    _check_return(board, load, place, findings)


def _or(value: float | None, default: float) -> float:
    return default if value is None else value


def _check_return(board: Board, load: Load, place: Place, findings: Findings) -> None:
    if load.returns_to in (COMMON, UNREAD) or load.rail == UNREAD:
        return
    below = [
        rail.name for rail in board.rails if rail.name != load.rail and load.rail in _feeders(board, rail)
    ]
    if load.returns_to not in below and UNREAD not in [rail.name for rail in board.rails]:
        allowed = f"{names_listed((COMMON, *below))}: common, or a rail that stands below {quoted(load.rail)}"
        findings.add(place, "returns_to", quoted(load.returns_to), allowed)


PLAIN_PARTS = ("dropper", "shunt", "inrush", "bleeder", "fuse", "varistor", "rectifier")
RAIL_PARTS = ("zener", "reservoir", "feed")
PARTS_IN_WORDS = f"{listed(PLAIN_PARTS)}; or zener:RAIL, reservoir:RAIL, feed:RAIL, load:NAME of this board"


def part_names(board: Board) -> tuple[str, ...]:
    """Every name of a part that this board can have, fitted or not: a bleeder may be what the repair adds."""
    rails = tuple(f"{part}:{rail.name}" for rail in board.rails for part in RAIL_PARTS)
    return (*PLAIN_PARTS, *rails, *(f"load:{load.name}" for load in board.loads))


def check_repair(repair: Repair, board: Board, findings: Findings) -> None:
    """Note replaced parts that this board does not have."""
    place = Place().inside("repair")
    for index, replaced in enumerate(repair.replaced):
        if replaced.part != UNREAD and replaced.part not in part_names(board):
            where = place.entry("replaced", index, replaced.part)
            findings.add(where, "part", quoted(replaced.part, 80), PARTS_IN_WORDS)
