"""Whatever stands in a file, short and printable.

Why: a message repeats what it found, and a file must neither flood the screen nor drive the terminal.
"""

from __future__ import annotations

import datetime
import unicodedata
from collections.abc import Iterable, Mapping, Sequence

SHORT = 40
"""Longest piece of a file that a message repeats [characters]."""

NOT_PRINTABLE = frozenset(("Cc", "Cs", "Zl", "Zp"))
"""Unicode categories that a line of text may not hold: controls, surrogates, line and paragraph ends."""

BIDI = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")
"""Characters that reverse the writing direction, so that a name would read as another one."""


def is_printable(text: str) -> bool:
    """Whether one line of a terminal shows the text as it is."""
    return not any(unicodedata.category(sign) in NOT_PRINTABLE or sign in BIDI for sign in text)


def printable(text: str, limit: int = SHORT) -> str:
    """The text cut to `limit` characters, with every sign that a terminal would obey written as its code."""
    plain = "".join(sign if is_printable(sign) and sign.isprintable() else _code(sign) for sign in text[: limit + 1])
    return plain if len(plain) <= limit else plain[: limit - 1] + "…"


def _code(sign: str) -> str:
    return f"\\u{ord(sign):04x}"


def quoted(text: str, limit: int = SHORT) -> str:
    """The text between quotation marks, short and printable."""
    return f'"{printable(text, limit)}"'


def shown(value: object) -> str:
    """A TOML value as a message repeats it."""
    match value:
        case str():
            return quoted(value)
        case bool():
            return "true" if value else "false"
        case int() if abs(value) >= 10**15:
            return "a very large number"
        case int() | float() | datetime.date() | datetime.time():
            return str(value)
        case Mapping():
            return "a table"
        case Sequence():
            return f"a list of {len(value)}"
    return "something else"


def listed(words: Iterable[str], last: str = "or") -> str:
    """`a, b or c`; "nothing" for an empty list."""
    *first, end = tuple(words) or ("nothing",)
    return f"{', '.join(first)} {last} {end}" if first else end


def names_listed(names: Iterable[str]) -> str:
    """`"a", "b" or "c"`: names as a case file spells them."""
    return listed(quoted(name, 60) for name in names)
