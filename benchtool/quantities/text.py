"""SI floats to text: `exact` for files, the rest for people. Figures nobody measured do not appear."""

from __future__ import annotations

import math
from decimal import ROUND_CEILING, ROUND_HALF_UP, Decimal

from benchtool.quantities.units import EXPONENTS, KINDS, WIDE

# The smallest size that still takes a prefix, where the trade departs from "at least 1 before the prefix":
# 0.25 W, 0.3 V, 0.47 ohm, and 4700 uF rather than 4.7 mF (common practice, no source).
_FLOORS = {
    **{(unit, ""): Decimal("0.1") for unit in ("V", "W", "ohm", "s", "Hz")},
    ("F", "m"): Decimal("0.01"),
}
_OFFERED = {"s": ("", "m", "u", "n", "p"), "degC": ("",), "%": ("",)}  # a time is 3600 s, never 3.6 ks


def exact(value: float, unit: str) -> str:
    """ASCII text that `parse` reads back to the same float, bit by bit, as people write it: "680 nF"."""
    number = _decimal(value)
    return _write(number, _prefix(number, unit), unit, ascii=True)


def show(value: float | None, unit: str, *, digits: int = 3, ascii: bool = False) -> str:
    """A value [unit] for people: that many significant digits, trade prefixes, trailing zeros dropped.

    None is "cannot tell". Raises ValueError for a value that is not finite: the caller has the word.
    """
    if value is None:
        return "cannot tell"
    return _show(_rounded(value, digits, ROUND_HALF_UP), unit, ascii)


def show_up(value: float, unit: str, *, digits: int = 2, ascii: bool = False) -> str:
    """Like `show`, but never less than the value [unit]: for safety times, which are rounded up."""
    return _show(_rounded(value, digits, ROUND_CEILING), unit, ascii)


def show_range(
    low: float, high: float, unit: str, *, digits: int = 3, ascii: bool = False, compact: bool = False
) -> str:
    """Both ends [unit], "612 nF to 748 nF"; compact: "612 to 748 nF" where both have the same prefix."""
    first, last = (show(end, unit, digits=digits, ascii=ascii) for end in (low, high))
    number, symbol = first.split(" ")
    return f"{number if compact and symbol == last.split(' ')[1] else first} to {last}"


def round_up(value: float, digits: int) -> float:
    """The value rounded to that many significant digits, never below it [unit of value]."""
    return float(_rounded(value, digits, ROUND_CEILING))


def _decimal(value: float) -> Decimal:
    """The shortest decimal that means this float: 1.1 is 1.1, so that rounding it up does not make 1.2."""
    if not math.isfinite(value):
        raise ValueError(f"{value!r} cannot be written as a quantity")
    return Decimal(repr(float(value)))


def _rounded(value: float, digits: int, rounding: str) -> Decimal:
    number = _decimal(value)
    last_place = Decimal(1).scaleb(number.adjusted() - digits + 1)
    return number.quantize(last_place, rounding, WIDE) if number else Decimal(0)  # people know no minus zero


def _show(number: Decimal, unit: str, ascii: bool) -> str:
    return _write(number, _prefix(number, unit), unit, ascii)


def _prefix(number: Decimal, unit: str) -> str:
    """The prefix under which a technician writes a number of this size."""
    offered = _OFFERED.get(unit, tuple(EXPONENTS))
    fitting = (p for p in offered if abs(number) >= _FLOORS.get((unit, p), Decimal(1).scaleb(EXPONENTS[p])))
    return next(fitting, offered[-1]) if number else ""


def _write(number: Decimal, prefix: str, unit: str, ascii: bool) -> str:
    base = number.scaleb(2 if unit == "%" else 0, WIDE)
    scaled = base.scaleb(-EXPONENTS[prefix], WIDE)
    if scaled and not -4 < scaled.adjusted() < 5:  # beyond every prefix an exponent is plainer than zeros
        scaled, prefix, style = base, "", "e"
    else:
        style = "f"
    figures = format(scaled.normalize(WIDE), style)
    symbol = prefix + unit if ascii else prefix.replace("u", "µ") + KINDS[unit].symbol
    return f"{figures} {symbol}"
