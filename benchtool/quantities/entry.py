"""Typed text to SI floats: one anchored grammar, and a sentence for whatever it does not take."""

from __future__ import annotations

import math
import re
from decimal import Decimal
from functools import lru_cache
from typing import NamedTuple

from benchtool.errors import QuantityError
from benchtool.printable import printable
from benchtool.quantities.series import SERIES
from benchtool.quantities.text import show
from benchtool.quantities.units import EXPONENTS, KINDS, to_si

_LONGEST = 40
_LONGEST_ACCURACY = 80  # two numbers with all the figures of a float
_NUMBER = r"[+-]?(?:[0-9]+(?:\.[0-9]*|,[0-9]+)?|[.,][0-9]+)(?:[eE][+-]?[0-9]{1,3})?"
_PREFIX = "[pPnNuUmMkKgG]"
_OTHER_CASE = {"P": "p", "N": "n", "U": "u", "K": "k", "g": "G"}  # only m and M differ
_TWO_MEANINGS = re.compile(r"[+-]?[1-9][0-9]{0,2},[0-9]{3}(?:[eE].*)?")
_BOTH_WAYS = re.compile(r"^(?:±|\+/?-) ?")
_SAME = str.maketrans(
    {
        **dict.fromkeys("\u00a0\u2002\u2003\u2004\u2005\u2006\u2007\u2008\u2009\u200a\u202f", " "),
        "\u00b5": "u",  # micro sign
        "\u03bc": "u",  # Greek mu
        "\u2126": "\u03a9",  # ohm sign to Greek omega
        "\u2212": "-",  # minus sign
        "\u2013": "-",  # en dash, which word processors make of a minus
        "\u2103": "°C",  # the one-sign form
        "\u00ba": "°",  # the ordinal sign that some keyboards offer for it
    }
)
_CODES = {
    # As tolerance count neither F and N, which are also farad and nano, nor a small m, which is milli. A last
    # figure of 8 or 9 means one thing to one maker and another to the next: not taken.
    "F": (re.compile("([1-9][0-9])([0-7])[BCDGJKMbcdgjk]?"), "p"),
    "ohm": (re.compile("([1-9][0-9])([0-7])"), ""),
}
_PERCENT_OF = {"B": 0.1, "C": 0.25, "D": 0.5, "F": 1, "G": 2, "J": 5, "K": 10, "M": 20, "N": 30}  # IEC 60062


def parse(text: str, unit: str, *, bare: bool = False) -> float:
    """Value of what a person typed [unit; "%": a fraction].

    bare: a number alone is taken in the unit ("%": in percent), except a capacitance without an exponent.
    Raises QuantityError for everything else than one finite quantity of that unit.
    """
    plain = _plain(text, unit, bare)
    read = _read_mark(plain, unit) or _read_number(plain, unit)
    if read is None:
        raise QuantityError(f"{printable(text)} is not a {KINDS[unit].noun}", _allowed(unit, bare))
    if _TWO_MEANINGS.fullmatch(read.number):
        point, whole = read.number.replace(",", "."), read.number.replace(",", "")
        raise QuantityError(f"{read.number} can mean two things", f"type {point} or {whole}.")
    if read.alone and not (bare and (unit != "F" or "e" in read.number.lower())):
        raise _needs_unit(plain, unit)
    return _finite(Decimal(read.number.replace(",", ".")), read.prefix, unit, text)


def parse_mark(text: str, unit: str) -> float:
    """Value of a marking as it is printed on a part [unit]: all that `parse` takes, and three-figure codes.

    Two figures and the number of zeros: in pF for "F" (684 is 680 nF), in ohm for "ohm" (472 is 4.7 kohm);
    IEC 60062. A capacitor's code may carry its tolerance letter, so 684K is 680 nF here and no kilofarad.
    """
    code = _code(_plain(text, unit, bare=False), unit)
    return parse(text, unit) if code is None else code


def parse_tolerance(text: str) -> float:
    """Tolerance [fraction] from "10 %", "±10 %", "+-5%" or a letter B C D F G J K M N (IEC 60062)."""
    plain = _plain(text, "%", bare=False)
    if percent := _PERCENT_OF.get(plain.upper()):
        return percent / 100
    allowed = "percent, like 10 % or ±5 %, or a letter, as J for 5, K for 10, M for 20."
    refusal = QuantityError(f"{printable(text)} is not a tolerance", allowed)
    try:
        fraction = parse(_BOTH_WAYS.sub("", plain), "%")
    except QuantityError:
        raise refusal from None
    if fraction < 0.0:
        raise refusal
    return fraction


def parse_accuracy(text: str, unit: str) -> tuple[float, float]:
    """Accuracy as (fraction of the reading, floor [unit]) from "0.5 % + 20 mV"; either may stand alone."""
    plain = _BOTH_WAYS.sub("", _plain(text, unit, bare=False, longest=_LONGEST_ACCURACY))
    terms = re.split(r" ?(?<![eE])\+ ?", plain)
    percents = [term for term in terms if term.endswith("%")]
    floors = [term for term in terms if not term.endswith("%")]
    example = f"percent, a floor or both, like 0.5 % + {KINDS[unit].floor}."
    refusal = QuantityError(f"{printable(text)} is not an accuracy", example)
    if "" in terms or len(percents) > 1 or len(floors) > 1:
        raise refusal
    fraction = parse(percents[0], "%") if percents else 0.0
    floor = parse(floors[0], unit) if floors else 0.0
    if min(fraction, floor) < 0.0:
        raise refusal
    return fraction, floor


class _Read(NamedTuple):
    number: str
    prefix: str
    alone: bool  # neither prefix nor unit stood beside the number


def _plain(text: str, unit: str, bare: bool, longest: int = _LONGEST) -> str:
    """The text with one spelling for each sign; refuses what cannot be an entry at all."""
    if len(text) > longest:
        raise QuantityError(f"{printable(text)} is too long", _allowed(unit, bare))
    plain = " ".join(part for part in text.translate(_SAME).split(" ") if part)
    if not plain.isprintable():
        raise QuantityError(f"{printable(text)} holds a sign that cannot be printed", _allowed(unit, bare))
    if not plain:
        raise QuantityError("nothing typed", _allowed(unit, bare))
    return plain


def _read_number(plain: str, unit: str) -> _Read | None:
    """Number, prefix, unit: "680 nF", "850m", "18.0"."""
    match = _number_pattern(unit).fullmatch(plain)
    if match is None:
        return None
    letter = match["prefix"] or ""
    return _Read(match["number"], _OTHER_CASE.get(letter, letter), not (letter or match["unit"]))


def _read_mark(plain: str, unit: str) -> _Read | None:
    """A letter in place of the decimal point: "2k2", "4R7", "n47"."""
    match = _mark_pattern(unit).fullmatch(plain)
    if match is None:
        return None
    letter = match["inner"] or match["leading"]
    prefix = _OTHER_CASE.get(letter, letter)
    number = f"{match['sign']}{match['whole'] or '0'}.{match['part']}"
    return _Read(number, prefix if prefix in EXPONENTS else "", alone=False)


@lru_cache
def _number_pattern(unit: str) -> re.Pattern[str]:
    kind = KINDS[unit]
    spelled = f"(?P<unit>(?i:{kind.spelling}))"
    prefix = f"(?P<prefix>{_PREFIX})?"
    return re.compile(
        f"{kind.before}(?P<number>{_NUMBER}) ?" + (f"{prefix} ?{spelled}?" if kind.alone else f"(?:{prefix} ?{spelled})?")
    )


@lru_cache
def _mark_pattern(unit: str) -> re.Pattern[str]:
    kind = KINDS[unit]
    inner = f"(?P<whole>[0-9]+)(?P<inner>{_one_of(kind.inner)})"
    leading = f"(?P<leading>{_one_of(kind.leading)})"
    return re.compile(f"{kind.before}(?P<sign>[+-]?)(?:{inner}|{leading})(?P<part>[0-9]+) ?(?i:{kind.spelling})?")


def _one_of(letters: str) -> str:
    return f"[{letters}]" if letters else "(?!)"


def _code(plain: str, unit: str) -> float | None:
    if unit not in _CODES:
        return None
    pattern, prefix = _CODES[unit]
    match = pattern.fullmatch(plain)
    return to_si(Decimal(f"{match[1]}e{match[2]}"), prefix, unit) if match else None


def _finite(number: Decimal, prefix: str, unit: str, text: str) -> float:
    value = to_si(number, prefix, unit)
    if not math.isfinite(value) or (value == 0.0 and number != 0):
        raise QuantityError(f"{printable(text)} is beyond all bounds", _allowed(unit, bare=False))
    return value


def _allowed(unit: str, bare: bool) -> str:
    kind = KINDS[unit]
    number = kind.number if bare or unit == "F" else f"{kind.number} {unit}"
    return f"{kind.plural}, like {number} or {kind.mark}."


def _needs_unit(plain: str, unit: str) -> QuantityError:
    """A bare number is refused; one that looks like a capacitor's marking is told what that would be."""
    hint = _allowed(unit, bare=False)
    if unit == "F":
        hint = "n for nF, u for µF, p for pF. Not taken as a bare number."
        if marking := _likely_marking(plain):
            hint = f"if {plain} is printed on the part, that marking means {show(marking, 'F')}."
    return QuantityError(f"{plain} needs a unit", hint)


def _likely_marking(plain: str) -> float | None:
    """The capacitance a code stands for [F], if one of E12 from 10 nF to 82 µF, as are asked for here."""
    in_series = plain[:2].isdecimal() and int(plain[:2]) in SERIES["E12"]
    return _code(plain, "F") if in_series and plain[2:] in ("3", "4", "5", "6") else None
