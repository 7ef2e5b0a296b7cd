"""Quantities of the boards' case texts as SI floats, read without the product: its reader may not vouch for its own samples."""

from __future__ import annotations

import re
from typing import Any

PREFIXES = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "": 1.0, "k": 1e3, "M": 1e6}
QUANTITY = re.compile(r"([\d.]+) (?:([pnumkM]?)(V|Hz|F|ohm|A|W|s)|(%))")


def to_si(value: Any) -> Any:
    """Return a table of the case file with its quantities as SI floats, other words as they are."""
    match value:
        case dict():
            return {key: to_si(part) for key, part in value.items()}
        case list():
            return [to_si(part) for part in value]
        case str() if found := QUANTITY.fullmatch(value):
            number, prefix, _, percent = found.groups()
            return float(number) * (0.01 if percent else PREFIXES[prefix or ""])
    return value
