"""What is known about each unit, in one table, so that reading, writing and refusing cannot disagree."""

from __future__ import annotations

from decimal import Context, Decimal, localcontext
from functools import lru_cache
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from pint import UnitRegistry


class Kind(NamedTuple):
    """How one unit is called, spelled, marked on parts and explained to a person."""

    noun: str
    plural: str
    number: str  # example of a number
    mark: str  # example that needs no unit beside it
    floor: str  # example of the absolute part of an accuracy
    pint_name: str
    symbol: str  # for people
    spelling: str  # regular expression for what may stand for the unit, in either case
    inner: str = ""  # letters that may stand in place of the decimal point, as in 2k2
    leading: str = ""  # those that may also stand before all figures, as in n47
    before: str = ""  # regular expression for what may stand before the number and says nothing
    alone: bool = True  # a prefix letter is enough; but "40 K" as a temperature is kelvin, not 40 000 degrees


_VOLT = "v(?: ?(?:ac|dc))?"
_AMPERE = "a(?: ?(?:ac|dc))?"
_WAVE = "(?:~ ?)?"
# Meters and plates say AC or DC beside volts and amperes; which of the two is meant follows from what is asked.

# A k or M between figures is a resistor's marking and p or n a capacitor's (IEC 60062). "2k2" where volts are
# asked for is a slip of the row and is refused, while "2.2 kV" says what it means.
KINDS = {
    "V": Kind("voltage", "volts", "23.1", "850m", "20 mV", "volt", "V", _VOLT, "VvmuU", before=_WAVE),
    "A": Kind("current", "amperes", "0.0035", "3m5", "50 uA", "ampere", "A", _AMPERE, "AamuUnNpP", before=_WAVE),
    "F": Kind("capacitance", "farads", "680 nF", "0u68", "0.2 nF", "farad", "F", "f", "FfmuUnNpP", "muUnNpP"),
    "ohm": Kind("resistance", "ohms", "470", "2k2", "0.2 ohm", "ohm", "Ω", "ohms?|Ω|r", "RrΩωmkKMG", "RrkKM"),
    "W": Kind("power", "watts", "1.3", "400m", "10 mW", "watt", "W", "w", "WwmuU"),
    "Hz": Kind("frequency", "hertz", "50", "1k5", "0.1 Hz", "hertz", "Hz", "hz", "kKM"),
    "s": Kind("time", "seconds", "1.8", "250u", "10 ms", "second", "s", "s", "SsmuUnN"),
    "degC": Kind(
        "temperature",
        "degrees Celsius",
        "40",
        "40C",
        "1 degC",
        "celsius",
        "°C",
        "(?:deg|°) ?c|°|c",
        alone=False,
    ),
    "%": Kind("percentage", "percent", "10", "0.5%", "1 %", "percent", "%", "%", alone=False),
}
EXPONENTS = {"G": 9, "M": 6, "k": 3, "": 0, "m": -3, "u": -6, "n": -9, "p": -12}
_NAMES = {"G": "giga", "M": "mega", "k": "kilo", "m": "milli", "u": "micro", "n": "nano", "p": "pico"}

WIDE = Context(prec=100, Emax=9999, Emin=-9999)
"""Arithmetic in which no typed or stored figure is rounded on its way to or from a float."""


def to_si(number: Decimal, prefix: str, unit: str) -> float:
    """The number of prefixed units in SI [unit; "%": fraction], in decimal, so that 680 nF is just 6.8e-07.

    The result may be infinite, or zero for a number that was not: the caller has the words to refuse it.
    """
    name = KINDS[unit].pint_name
    base = "dimensionless" if unit == "%" else name
    with localcontext(WIDE):
        return float(_registry().Quantity(number, _NAMES.get(prefix, "") + name).to(base).magnitude)


@lru_cache
def _registry() -> UnitRegistry[Decimal]:
    """Pint with our own definitions only: ready in 3 ms, not 100, and without units that nobody asked for."""
    from pint import UnitRegistry  # importing it takes longer than all the rest: only once something is typed

    prefixes = [f"{name}- = 1e{EXPONENTS[letter]}" for letter, name in _NAMES.items()]
    units = [f"{kind.pint_name} = [{kind.pint_name}]" for unit, kind in KINDS.items() if unit != "%"]
    return UnitRegistry([*prefixes, *units, "percent = 0.01"], non_int_type=Decimal)
