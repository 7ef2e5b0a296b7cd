"""The current budget as a bar: what the rail gets against what the loads need, one cell a few milliamperes.

Why drawn: half of what the relay needs is seen before it is read. Every figure stands beside its bar.
"""

from __future__ import annotations

import string
from collections.abc import Iterator
from dataclasses import dataclass, replace

from benchtool.board import Board, Load, Unknown, resistance_of
from benchtool.diagnosis.effective import BY_LINE, Effective
from benchtool.physics import constants as known
from benchtool.physics.budget import Budget, demand
from benchtool.physics.specimens import as_marked
from benchtool.report.layout import IN_ASCII, Line, Page, cells, clipped, padded, paragraph
from benchtool.words import CANNOT_TELL, Words, milliamps

CELL_SIZES = (1e-4, 2e-4, 5e-4, 1e-3, 2e-3, 5e-3, 1e-2, 2e-2)
"""Currents that one cell may stand for [A]."""
LEAST_NARROW_CELL = 2e-3
"""The finest cell of the one row on a narrow page [A]."""
LABEL = 26
"""Columns before the bar."""
LEAST_ROOM = 5
"""Cells under which a bar shows nothing and is left out."""
ASSUMED = {"coil": known.COIL_TOLERANCE, "current": known.CURRENT_TOLERANCE, "gate": known.CURRENT_TOLERANCE}
"""Tolerances of loads that state none [1]."""
SURE, MAYBE, AT_LEAST, SHORT, OVER, FEED = "█", "▒", "→", "×", "+", "·"


@dataclass(frozen=True, slots=True)
class Scale:
    """What one cell stands for [A], and how many cells there are."""

    size: float
    room: int

    def cells(self, current: float) -> int:
        """Cells for a current [A], rounded half up, within the bar."""
        return min(max(int(current / self.size + 0.5 + 1e-9), 0), self.room)

    @property
    def places(self) -> int:
        """Decimal places of figures in milliamperes that fit these cells."""
        return 1 if self.size >= 5e-4 else 2


def scale_for(greatest: float, room: int, least: float = CELL_SIZES[0]) -> Scale:
    """The finest scale from `least` [A] up on which `greatest` [A] still fits into `room` cells."""
    sizes = [size for size in CELL_SIZES if size >= least * 0.999]
    return Scale(next((size for size in sizes if greatest / size + 0.5 < room + 1), sizes[-1]), room)


@dataclass(frozen=True, slots=True)
class Need:
    """What the loads need [A]: (sign, current) from left to right, their names, nominal total, heaviest boards."""

    parts: tuple[tuple[str, float], ...]
    legend: tuple[str, ...]
    total: float
    heaviest: float


def need_of(board: Board, total: float, words: Words, page: Page) -> Need:
    """The demand of `board` [A] shared among its loads, the heaviest last.

    A load's share is what the first rail must give for it alone, beyond what feeds of lower rails take anyway.
    """
    feeds = _demand(board, ()) or 0.0
    shares = [(load, (_demand(board, (load,)) or 0.0) - feeds) for load in board.loads]
    drawing = sorted(((load, share) for load, share in shares if share > 0.0), key=lambda item: item[1])
    letters = initials([page.plain(load.name) for load, _ in drawing])
    named = [f"{letter} {words.load(load.name)}" for letter, (load, _) in zip(letters, drawing, strict=True)]
    parts = [(letter, share) for letter, (_, share) in zip(letters, drawing, strict=True)]
    if feeds > 0.0:
        parts.insert(0, (FEED, feeds))
        named.insert(0, f"{FEED} feed of the lower rails")
    heaviest = _demand(board, tuple(heavier(load) for load in board.loads))
    return Need(tuple(parts), tuple(named), total, total if heaviest is None else max(heaviest, total))


def _demand(board: Board, loads: tuple[Load, ...]) -> float | None:
    changed = replace(board, loads=loads)
    return demand(changed, as_marked(changed))


def heavier(load: Load) -> Load:
    """The load at the heavy end of its tolerance: coils and resistors low, currents high."""
    tolerance = ASSUMED.get(load.kind, known.RESISTOR_TOLERANCE) if load.tolerance is None else load.tolerance
    resistance, current = resistance_of(load), load.current
    if isinstance(resistance, float):
        return replace(load, resistance=resistance * (1.0 - tolerance), power=None)
    if current is None or isinstance(current, Unknown):
        return load
    return replace(load, current=current * (1.0 + tolerance))


def initials(names: list[str]) -> list[str]:
    """A lowercase letter for every name: its first one that is still free, else any free one."""
    taken: list[str] = []
    for name in names:
        own = [sign for sign in name.lower() if sign in string.ascii_lowercase]
        free = [sign for sign in (*own, *string.ascii_lowercase) if sign not in taken]
        taken.append(free[0] if free else "?")
    return taken


def need_bar(need: Need, scale: Scale) -> str:
    """The loads' cells up to the demand, the last load filling it, then `MAYBE` on to the heaviest boards."""
    total, bar = scale.cells(need.total), ""
    for number, (sign, current) in enumerate(need.parts, start=1):
        left = total - len(bar)
        bar += sign * (left if number == len(need.parts) else min(scale.cells(current), left))
    return bar + MAYBE * (scale.cells(need.heaviest) - len(bar))


def supply_bar(low: float | None, high: float | None, scale: Scale) -> str:
    """`SURE` up to the lower bound and `MAYBE` to the upper; an arrow where there is no upper one."""
    if low is None:
        return ""
    sure = scale.cells(low)
    if high is None:
        return SURE * min(sure, scale.room - 1) + AT_LEAST
    return SURE * sure + MAYBE * (scale.cells(high) - sure)


@dataclass(frozen=True, slots=True)
class Difference:
    """Supply less demand [A], both at nominal, and the words for it."""

    supply: float
    demand: float

    def word(self, scale: Scale) -> str:
        """SHORT BY, OVER BY, or EVEN under half a cell."""
        if abs(self.supply - self.demand) < 0.5 * scale.size:
            return "EVEN"
        return "SHORT BY" if self.supply < self.demand else "OVER BY"

    def figure(self, scale: Scale) -> str:
        """The difference without its sign [mA]."""
        return milliamps(abs(self.supply - self.demand), scale.places)

    def bar(self, scale: Scale) -> str:
        """Cells between the two nominal ends; none where it is even."""
        if self.word(scale) == "EVEN":
            return ""
        start, end = sorted((scale.cells(self.supply), scale.cells(self.demand)))
        return " " * start + (SHORT if self.supply < self.demand else OVER) * (end - start)


def budget_lines(budget: Budget, effective: Effective, words: Words, page: Page) -> list[Line]:
    """The budget as a bar with its figures, every switched load on; one row on a narrow page."""
    if budget.available is None and budget.demand is None and effective.current_low is None:
        return paragraph(page, f"Current budget: {CANNOT_TELL} from what is marked on the board.")
    rows = _one_row if page.narrow else _rows
    return [*rows(budget, effective, words, page), *_short_by_its_marks(budget, words, page)]


def _short_by_its_marks(budget: Budget, words: Words, page: Page) -> list[Line]:
    if budget.margin is None or budget.margin >= 0.0:
        return []
    held = " with ".join(part for part in (words.rail(words.board.rails[0].name), words.state(budget.on)) if part)
    return paragraph(page, f"By its marks this board cannot hold {held}: check the values typed, or it was built so.")


def _greatest(*currents: float | None) -> float:
    return max(current or 0.0 for current in currents)


def _heading(page: Page, *parts: str) -> list[Line]:
    return paragraph(page, ", ".join(part for part in parts if part), role="heading")


def _a_cell(scale: Scale) -> str:
    return f"{scale.size * 1e3:g} mA a cell"


def _rows(budget: Budget, effective: Effective, words: Words, page: Page) -> Iterator[Line]:
    need = None if budget.demand is None else need_of(words.board, budget.demand, words, page)
    gets = (effective.current_high, effective.current_low)
    greatest = _greatest(budget.available_high, budget.available, *gets, None if need is None else need.heaviest)
    scale = scale_for(greatest, page.width - LABEL)
    state = page.plain(f"mA, {words.state(budget.on)}".rstrip(", "))
    yield from _heading(page, f"CURRENT INTO {words.rail(words.board.rails[0].name)}", _a_cell(scale))
    yield Line(f" {padded(clipped(state, LABEL - 2), LABEL - 1)}{ticks(scale)}".rstrip(), "body")
    if effective.current_low is not None:
        label, figure = _gets(effective, scale)
        yield _bar_row(page, label, figure, supply_bar(effective.current_low, effective.current_high, scale))
    needs = CANNOT_TELL if budget.demand is None else milliamps(budget.demand, scale.places)
    yield _bar_row(page, "loads need", needs, "" if need is None else need_bar(need, scale))
    difference = _difference(budget, effective)
    measured = effective.current is not None
    if difference is not None and measured:
        yield _bar_row(page, difference.word(scale), difference.figure(scale), difference.bar(scale))
    marked = CANNOT_TELL if budget.available is None else milliamps(budget.available, scale.places)
    yield _bar_row(page, "as marked", marked, supply_bar(budget.available_low, budget.available_high, scale))
    if difference is not None and not measured:
        label = f"{difference.word(scale)} as marked"
        yield _bar_row(page, label, difference.figure(scale), difference.bar(scale))
    if need is not None and need.legend:
        yield from paragraph(page, ", ".join(need.legend), first=" " * LABEL)
    yield from paragraph(page, f"{MAYBE} over mains and tolerance", first=" " * LABEL)


def _gets(effective: Effective, scale: Scale) -> tuple[str, str]:
    low, high = effective.current_low or 0.0, effective.current_high
    if effective.current is not None and by_line(effective):
        return "by mains current", milliamps(effective.current, scale.places)
    if effective.current is not None:
        return "rail gets now", milliamps(effective.current, scale.places)
    if high is None:
        return "rail gets now", f"> {milliamps(low, scale.places)}"
    return "gets now", f"{milliamps(low, scale.places)}-{milliamps(high, scale.places)}"


def by_line(effective: Effective) -> bool:
    """Whether the figure was read on the mains side, so that a faulty rectifier or leak behind it still takes its share."""
    return any(reading.what in BY_LINE for reading in effective.readings)


def _difference(budget: Budget, effective: Effective) -> Difference | None:
    """What is read against what is needed; where nothing tells it outright, what is marked."""
    supply = budget.available if effective.current is None else effective.current
    return None if supply is None or budget.demand is None else Difference(supply, budget.demand)


def _bar_row(page: Page, label: str, figure: str, bar: str) -> Line:
    before = f" {label} {figure:>{max(LABEL - 5 - len(label), 0)}}"
    return Line(page_bar(page, f"{padded(before, LABEL - 1)} {bar}").rstrip())


def page_bar(page: Page, text: str) -> str:
    """A drawn row in the signs that the page can show, one cell for one cell."""
    return text.translate(IN_ASCII) if page.ascii else text


def ticks(scale: Scale) -> str:
    """Figures [mA] above the bar: every ten cells, at 2 mA a cell every five."""
    step = 5 if abs(scale.size - 2e-3) < 1e-9 else 10
    text = ""
    for cell in range(0, scale.room, step):
        label = f"{cell * scale.size * 1e3:g}"
        if cell + len(label) <= scale.room:
            text = padded(text, cell) + label
    return text


def _one_row(budget: Budget, effective: Effective, words: Words, page: Page) -> list[Line]:
    measured = effective.current is not None
    nominal = effective.current if measured else budget.available
    low = effective.current_low if measured else budget.available_low
    high = effective.current_high if measured else budget.available_high
    difference = _difference(budget, effective)
    rough = Scale(LEAST_NARROW_CELL, 0)
    name = "marked" if not measured else "mains" if by_line(effective) else "gets"
    before = f"{name} {CANNOT_TELL if nominal is None else milliamps(nominal)} "
    demand = CANNOT_TELL if budget.demand is None else milliamps(budget.demand)
    gap = "" if difference is None else f"{difference.word(rough).removesuffix(' BY')} {difference.figure(rough)}"
    after = f"need {demand} mA {gap}".rstrip()
    room = page.width - cells(before) - cells(after) - 1
    if room < LEAST_ROOM or low is None:
        heading = _heading(page, "BUDGET", words.state(budget.on), "mA")
        told = [part for part in (f"{before.strip()}, needs {demand}", gap) if part]
        return [*heading, *(line for part in told for line in paragraph(page, part, first=" ", rest="  "))]
    scale = scale_for(_greatest(high, low), room, LEAST_NARROW_CELL)
    bar = page_bar(page, supply_bar(low, high, scale))
    return [*_heading(page, "BUDGET", words.state(budget.on), _a_cell(scale)), Line(f"{before}{bar} {after}")]
