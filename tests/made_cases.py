"""Cases made at random for the tests: every one valid, with names and values nobody would think of typing."""

from __future__ import annotations

import datetime
from typing import Any

from hypothesis import strategies as st

from benchtool.board import (
    UNKNOWN,
    Bleeder,
    Board,
    Choice,
    Dropper,
    Flag,
    Fuse,
    Inrush,
    Load,
    Mains,
    Moment,
    Names,
    Quantity,
    Rail,
    Reservoir,
    Text,
    Varistor,
    Whole,
    Zener,
)
from benchtool.case import Case, Repair, Replaced, Safe, Ticket
from benchtool.casefile.check import DROPPER_KEYS, FEED_KEYS, LOAD_KEYS, Keys, part_names
from benchtool.casefile.schema import fields_of
from benchtool.catalogue.accepted import accepted, lacking
from benchtool.catalogue.readings import READING_KINDS, ReadingKind
from benchtool.observed import Accuracy, AccuracyOf, Meter, Reading

SIGNS = "ab Z09_-'\"\\#[]{}=,.:;%äΩµ電🔌"
WORDS = st.text(SIGNS, min_size=1, max_size=12).filter(lambda word: word.strip() != "")
LINES = st.text(SIGNS + "\n\t", max_size=20)


def numbers(low: float, high: float) -> st.SearchStrategy[float]:
    return st.one_of(st.sampled_from((low, high)), st.floats(low, high, allow_subnormal=False))


def value_of(rule: Any) -> st.SearchStrategy[Any]:
    """Any value that the rule of a key allows."""
    match rule:
        case Quantity(low=low, high=high, unknown=unknown):
            return st.one_of(numbers(low, high), st.just(UNKNOWN)) if unknown else numbers(low, high)
        case Choice(words):
            return st.sampled_from(words)
        case Text(lines=lines):
            return LINES if lines else WORDS
        case Whole(low, high):
            return st.integers(low, high)
        case Flag():
            return st.booleans()
        case Moment(time_of_day):
            first = datetime.datetime(1970, 1, 1)
            return st.datetimes(first) if time_of_day else st.dates(first.date())
        case Names():
            return st.lists(WORDS, max_size=3).map(tuple)
        case AccuracyOf():
            return st.builds(Accuracy, numbers(0.0, 1.0), numbers(1e-12, 1.0))
    raise TypeError(rule)


@st.composite
def records(draw: st.DrawFn, /, record: type, skip: tuple[str, ...] = (), **given: Any) -> Any:
    """A record with the given fields, its other required ones, and some of the optional ones."""
    values = dict(given)
    for each in fields_of(record):
        if each.name not in (*given, *skip) and (each.required or draw(st.booleans())):
            values[each.name] = draw(value_of(each.rule))
    return record(**values)


@st.composite
def of_kind(draw: st.DrawFn, /, record: type, of: str, table: dict[str, Keys], **given: Any) -> Any:
    """A record whose keys belong to its kind, the needed ones all there."""
    keys, others = table[of], {key for keys in table.values() for key in (*keys.needs, *keys.may)}
    rules = {each.name: each.rule for each in fields_of(record)}
    needed = {key: draw(value_of(rules[key])) for key in keys.needs}
    foreign = tuple(others - {*keys.needs, *keys.may})
    return draw(records(record, skip=foreign, **{**needed, **given}))


def maybe(strategy: st.SearchStrategy[Any]) -> st.SearchStrategy[Any]:
    return st.one_of(st.none(), strategy)


@st.composite
def rails(draw: st.DrawFn, /, rectifier: str) -> tuple[Rail, ...]:
    names = draw(
        st.lists(
            WORDS.filter(lambda name: name not in ("common", "rectifier")),
            min_size=1,
            max_size=4,
            unique=True,
        )
    )
    feeds = [draw(st.sampled_from(("resistor", "regulator", "zener"))) for _ in names]
    made = []
    for index, name in enumerate(names):
        stacked = index + 1 < len(names) and feeds[index + 1] == "zener"
        clamp = names[index + 1] if stacked else "common"
        zener = records(Zener, clamps_to=clamp)
        needed = stacked or (index == 0 and rectifier == "half-wave-zener")
        given = {
            "name": name,
            "zener": draw(zener if needed else maybe(zener)),
            "reservoir": draw(maybe(records(Reservoir))),
        }
        if index == 0:
            feed_keys = tuple(key for keys in FEED_KEYS.values() for key in (*keys.needs, *keys.may))
            made.append(draw(records(Rail, skip=(*feed_keys, "fed_through"), fed_by="rectifier", **given)))
        else:
            given |= {"fed_by": names[index - 1], "fed_through": feeds[index]}
            made.append(draw(of_kind(Rail, feeds[index], FEED_KEYS, **given)))
    return tuple(made)


@st.composite
def loads(draw: st.DrawFn, /, rail_names: tuple[str, ...]) -> tuple[Load, ...]:
    names = draw(
        st.lists(WORDS.filter(lambda name: name not in ("common", "rectifier")), max_size=4, unique=True)
    )
    made = []
    for name in names:
        kind = draw(st.sampled_from(tuple(LOAD_KEYS)))
        level = draw(st.integers(0, len(rail_names) - 1))
        given: dict[str, Any] = {"name": name, "kind": kind, "rail": rail_names[level]}
        given["returns_to"] = draw(st.sampled_from(("common", *rail_names[level + 1 :])))
        if kind in ("coil", "resistor"):
            given["resistance"] = draw(numbers(1.0, 1e5))
        if kind == "coil":
            given |= {"pull_in": draw(numbers(0.5, 1.0)), "drop_out": draw(numbers(0.01, 0.4))}
        made.append(draw(of_kind(Load, kind, LOAD_KEYS, **given)))
    return tuple(made)


@st.composite
def boards(draw: st.DrawFn, /) -> Board:
    rectifier = draw(st.sampled_from(("bridge", "half-wave", "half-wave-zener")))
    kind = draw(st.sampled_from(tuple(DROPPER_KEYS)))
    chain = draw(rails(rectifier))
    parts = {key: draw(maybe(records(record))) for key, record in PARTS.items()}
    parts |= {"mains": draw(records(Mains)), "dropper": draw(of_kind(Dropper, kind, DROPPER_KEYS, kind=kind))}
    parts["loads"] = draw(loads(tuple(rail.name for rail in chain)))
    board: Board = draw(records(Board, rectifier=rectifier, rails=chain, **parts))
    return board


PARTS: dict[str, type] = {"fuse": Fuse, "varistor": Varistor, "inrush": Inrush, "bleeder": Bleeder}


def value_for(kind: ReadingKind, board: Board) -> st.SearchStrategy[Any]:
    words = st.sampled_from(kind.words) if kind.words else st.nothing()
    if kind.several:
        return st.lists(st.sampled_from(kind.words[1:]), min_size=1, unique=True).map(tuple)
    return words if kind.unit is None else st.one_of(numbers(*accepted(kind, board)), words)


@st.composite
def readings(draw: st.DrawFn, /, board: Board) -> Reading | None:
    """A reading that this board allows; None where the drawn kind does not fit it."""
    kind = READING_KINDS[draw(st.sampled_from(tuple(READING_KINDS)))]
    if "load" in kind.needs and not board.loads:
        return None
    rail = draw(st.sampled_from(board.rails)) if "rail" in kind.needs else None
    load = draw(st.sampled_from(board.loads)) if "load" in kind.needs else None
    if lacking(kind, board, rail, load) is not None:
        return None
    given: dict[str, Any] = {"what": kind.name, "rail": rail and rail.name, "load": load and load.name}
    given["value"] = draw(value_for(kind, board))
    given["on"] = None
    if "on" in kind.may:
        switched = board.switched_loads()
        given["on"] = tuple(draw(st.lists(st.sampled_from(switched), unique=True))) if switched else ()
    skip = tuple(key for key in ("lifted", "clamp", "limit") if key not in kind.may)
    reading: Reading = draw(records(Reading, skip=skip, **given))
    return reading


@st.composite
def cases(draw: st.DrawFn, /) -> Case:
    """A whole valid case."""
    board = draw(boards())
    taken = [draw(readings(board)) for _ in range(draw(st.integers(0, 4)))]
    after = [draw(readings(board)) for _ in range(draw(st.integers(0, 2)))]
    part = draw(st.sampled_from(part_names(board)))
    replaced = tuple(draw(st.lists(records(Replaced, part=part), max_size=2)))
    repair = draw(records(Repair, replaced=replaced, readings=tuple(reading for reading in after if reading)))
    return Case(
        board=board,
        ticket=draw(records(Ticket)),
        safe=draw(records(Safe)),
        meter=draw(records(Meter)),
        readings=tuple(reading for reading in taken if reading),
        repair=repair,
    )
