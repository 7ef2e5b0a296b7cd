"""A look at a TOML text without parsing it: its comments, and whether a parser can be trusted with it.

Why: a key of a hundred thousand parts takes the standard parser gigabytes, so it is refused first; comments
are what a parser throws away.
"""

from __future__ import annotations

import re

MOST_PARTS = 10
"""Longest dotted key; a case file needs two or three parts."""

_STRING = r'''"""(?:\\.|[^\\])*?"{3,5}|\'{3}.*?\'{3,5}|"(?:\\.|[^"\\\n])*"|\'[^\'\n]*\''''
_STRING_OR_COMMENT = re.compile(rf"(?P<string>{_STRING})|(?P<comment>#[^\n]*)", re.DOTALL)
"""Strings are matched to step over them: a `#` inside one starts no comment."""

_PART = r"[^\s.=\[\]{},]++"  # possessive, and begun only at its first sign: linear in the text
_LONG_KEY = re.compile(rf"(?<![^\s.=\[\]{{}},]){_PART}(?:[ \t]*\.[ \t]*{_PART}){{{MOST_PARTS},}}")


def comments_of(text: str) -> list[str]:
    """Every comment of a TOML text, without its sign."""
    found = (match["comment"] for match in _STRING_OR_COMMENT.finditer(text))
    return [comment[1:].strip() for comment in found if comment is not None]


def has_long_key(text: str) -> bool:
    """Whether a key outside of strings and comments has more than `MOST_PARTS` parts."""
    bare = _STRING_OR_COMMENT.sub(lambda match: "s" if match["string"] else "", text)
    return _LONG_KEY.search(bare) is not None
