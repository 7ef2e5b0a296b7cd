"""Plain lines that fit a width: cleaned of what a terminal would obey, no value parted from its unit.

Why: everything that is said comes through here, names out of a file included. What is fitted once is fitted
for the screen, a pipe, an ASCII terminal and paper; styling comes last and never changes a line.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import zip_longest
from typing import Literal

Role = Literal["body", "heading", "headline", "caution", "danger"]

NARROW = 76
"""Below this width [columns] tables turn into lists and bars into one row."""
LEAST, MOST = 32, 100
"""Widths [columns] between which a report stays readable; receipt paper has 32."""

LEAST_ROOM = 12
"""Columns that a text needs beside what stands before it."""

NO_BREAK = "\u00a0"
UNIT = r"(?:[GMkmµunp]?(?:VA|V|A|F|Ω|ohm|W|Hz|s)|%|°C|degC|min|bit|columns)(?![A-Za-z0-9])"
BEFORE_UNIT = re.compile(rf"(?<=[0-9]) (?={UNIT})")
WITHIN_RANGE = re.compile(rf"(?<=[0-9]) to (?=-?[0-9.]+[ {NO_BREAK}]{UNIT})")

IN_ASCII = str.maketrans(
    {
        "Ω": "ohm", "μ": "u", "µ": "u", "°": "deg", "±": "+-", "×": "x", "·": ".", "█": "#", "▒": ":", "→": ">",
        "–": "-", "—": "-", "‘": "'", "’": "'", "“": '"', "”": '"',
    }
)
DRAWN = "Ωµ°±×·█▒→"
"""Signs that an output must be able to show, or it gets ASCII."""


@dataclass(frozen=True, slots=True)
class Line:
    """One finished line of text, and what it is, for whoever styles it."""

    text: str
    role: Role = "body"


@dataclass(frozen=True, slots=True)
class Page:
    """What the lines are for: a width [columns], and whether only ASCII can be shown."""

    width: int = 80
    ascii: bool = False

    @property
    def narrow(self) -> bool:
        """Whether lists stand in the place of tables."""
        return self.width < NARROW

    def plain(self, text: str) -> str:
        """The text on one line, without signs that a terminal obeys, in ASCII where only that can be shown."""
        clean = _clean(text)
        if not self.ascii:
            return clean
        parts = unicodedata.normalize("NFKD", clean.translate(IN_ASCII)).translate(IN_ASCII)
        bare = "".join(sign for sign in parts if not unicodedata.combining(sign))
        return bare.encode("ascii", "replace").decode()


def _clean(text: str) -> str:
    """White space to single spaces; controls, direction marks, surrogates and unassigned signs out."""
    spaced = "".join(" " if sign.isspace() else sign for sign in text)
    kept = "".join(sign for sign in spaced if not unicodedata.category(sign).startswith("C"))
    return " ".join(kept.split())


def cells(text: str) -> int:
    """Columns that a terminal gives the text: two for wide signs, none for accents over the sign before."""
    return sum(_cells_of(sign) for sign in text)


def _cells_of(sign: str) -> int:
    if unicodedata.category(sign) in ("Mn", "Me"):
        return 0
    return 2 if unicodedata.east_asian_width(sign) in ("W", "F") else 1


def glued(text: str) -> str:
    """The text with no-break spaces between numbers and their units, and within "612 to 748 nF"."""
    return BEFORE_UNIT.sub(NO_BREAK, WITHIN_RANGE.sub(f"{NO_BREAK}to{NO_BREAK}", text))


def wrapped(text: str, width: int, rest: int | None = None) -> list[str]:
    """The text in lines of at most `width` cells, `rest` from the second one on; only longer words are cut.

    The library's textwrap counts characters, not cells, and breaks at hyphens.
    """
    assert min(width, width if rest is None else rest) > 1  # a wide sign takes two cells
    lines: list[str] = []
    current = ""
    for word in _pieces(glued(text), min(width, width if rest is None else rest)):
        longer = f"{current} {word}" if current else word
        if current and cells(longer) > (width if rest is None or not lines else rest):
            lines.append(current)
            longer = word
        current = longer
    return [line.replace(NO_BREAK, " ") for line in [*lines, current]]


def _pieces(text: str, width: int) -> Iterator[str]:
    """The words of the text, those wider than a line cut to fit it."""
    for word in text.split(" "):
        if cells(word) > width and NO_BREAK in word:
            yield from _pieces(word.replace(NO_BREAK, " "), width)
            continue
        while cells(word) > width:
            cut = max(clipped_length(word, width), 1)
            yield word[:cut]
            word = word[cut:]
        yield word


def clipped_length(text: str, width: int) -> int:
    """How many characters of the text fit into `width` cells."""
    taken = 0
    for index, sign in enumerate(text):
        taken += _cells_of(sign)
        if taken > width:
            return index
    return len(text)


def clipped(text: str, width: int) -> str:
    """The text, cut to `width` cells."""
    return text[: clipped_length(text, width)].rstrip()


def padded(text: str, width: int) -> str:
    """The text filled up with spaces to `width` cells."""
    return text + " " * (width - cells(text))


def paragraph(page: Page, text: str, *, first: str = "", rest: str | None = None, role: Role = "body") -> list[Line]:
    """The text wrapped to the page; `first` stands before its first line, `rest` (as wide a gap if None) before the others."""
    hang = " " * cells(first) if rest is None else rest
    if page.width - cells(first) < LEAST_ROOM:  # a heading as wide as the page stands on lines of its own
        heading = paragraph(page, first, rest=rest, role=role)
        return [*heading, *(paragraph(page, text, first=rest or "", role=role) if text else [])]
    rows = wrapped(page.plain(text), page.width - cells(first), page.width - cells(hang))
    return [Line(f"{first if number == 0 else hang}{row}".rstrip(), role) for number, row in enumerate(rows)]


def row(page: Page, columns: Sequence[str], widths: Sequence[int], *, role: Role = "body") -> list[Line]:
    """One row of a table: every cell wrapped inside its own column, the first one's further lines set in."""
    first, *others = (page.plain(cell) for cell in columns)
    head, *more = [first] if cells(first) <= widths[0] else wrapped(first, widths[0], widths[0] - 2)
    wrapped_cells = [[head, *(f"  {line}" for line in more)]]
    wrapped_cells.extend(wrapped(cell, width) for cell, width in zip(others, widths[1:], strict=True))
    lines = []
    for parts in zip_longest(*wrapped_cells, fillvalue=""):
        text = "  ".join(padded(part, width) for part, width in zip(parts, widths, strict=True))
        lines.append(Line(f" {text}".rstrip(), role))
    return lines


def table(page: Page, rows: Sequence[Sequence[str]], most: int = 18) -> list[Line]:
    """A table, its first row the heading; columns after the first as wide as they need, up to `most`, the first gets the rest.

    Where the rest is less than the first one's heading, the widest of the others give way.
    """
    needs = [max(cells(page.plain(cell)) for cell in column) for column in zip(*rows, strict=True)]
    others, least = [min(need, most) for need in needs[1:]], cells(page.plain(rows[0][0]))
    while (room := page.width - 1 - sum(width + 2 for width in others)) < least:
        others[others.index(max(others))] -= 1
    widths = [min(needs[0], room), *others]
    lines = row(page, rows[0], widths, role="heading")
    for columns in rows[1:]:
        lines.extend(row(page, columns, widths))
    return lines
