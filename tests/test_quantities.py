"""Typed text to SI floats, held to IEC 60062, the SI prefixes and what an expression parser gets wrong."""

import math
import re
import subprocess
import sys
import time
from collections.abc import Callable

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.errors import QuantityError
from benchtool.quantities import (
    parse,
    parse_accuracy,
    parse_mark,
    parse_tolerance,
)

UNITS = ("V", "A", "F", "ohm", "W", "Hz", "s", "degC", "%")
SI_PREFIXES = {"p": -12, "n": -9, "u": -6, "µ": -6, "m": -3, "k": 3, "K": 3, "M": 6, "G": 9}  # SI brochure
SPELLINGS = {
    "V": ("V", "v"),
    "A": ("A", "a"),
    "F": ("F", "f"),
    "ohm": ("Ω", "ohm", "Ohms", "OHM", "R", "r"),
    "W": ("W", "w"),
    "Hz": ("Hz", "hz", "HZ"),
    "s": ("s", "S"),
}
SAME_EVERY_TIME = settings(derandomize=True, deadline=None, max_examples=400)

units = st.sampled_from(UNITS)
entry_like = st.text(alphabet="0123456789.,+-±eEkKmMuµμnpGRrΩ\u2126VAFWHzsohm%°C \t\u2212\u202f", max_size=45)


# --- what is taken


@pytest.mark.parametrize("prefix", SI_PREFIXES)
@pytest.mark.parametrize(("unit", "spelled"), [(unit, one) for unit in SPELLINGS for one in SPELLINGS[unit]])
@pytest.mark.parametrize("space", ["", " ", "\u00a0", "\u202f"])
def test_every_prefix_stands_on_every_unit(prefix: str, unit: str, spelled: str, space: str) -> None:
    assert parse(f"4.7{space}{prefix}{spelled}", unit) == float(f"4.7e{SI_PREFIXES[prefix]}")


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [  # spellings that a case file or a screen must take; each value is the SI meaning of the text
        ("680 nF", "F", 680e-9),
        ("0.68uF", "F", 0.68e-6),
        ("680NF", "F", 680e-9),
        ("220uf", "F", 220e-6),
        ("304n", "F", 304e-9),
        ("0u68", "F", 0.68e-6),
        ("3.04E-07 F", "F", 3.04e-07),
        ("850m", "V", 0.85),
        ("4V7", "V", 4.7),
        ("2.2 kV", "V", 2200.0),
        ("-23.1 V", "V", -23.1),
        ("7.4VDC", "V", 7.4),
        ("7.4 V DC", "V", 7.4),
        ("225 VAC", "V", 225.0),
        ("225 v ac", "V", 225.0),
        ("~7.4 V", "V", 7.4),
        ("850 mVdc", "V", 0.85),
        ("48.2 mA AC", "A", 0.0482),
        ("~ 3m5", "A", 0.0035),
        ("+5v", "V", 5.0),
        ("3m5", "A", 0.0035),
        ("250 us", "s", 250e-6),
        ("100 ohm", "ohm", 100.0),
        ("100r", "ohm", 100.0),
        ("470 kohm", "ohm", 470e3),
        ("4.7 k ohm", "ohm", 4700.0),
        ("2k2 ohm", "ohm", 2200.0),
        ("5 mohm", "ohm", 0.005),
        ("5 Mohm", "ohm", 5e6),
        ("1.3w", "W", 1.3),
        ("50 Hz", "Hz", 50.0),
        ("40 degC", "degC", 40.0),
        ("40 °C", "degC", 40.0),
        ("40\u2103", "degC", 40.0),
        ("40c", "degC", 40.0),
        ("-10 deg C", "degC", -10.0),
        ("10 %", "%", 0.10),
        ("0.5%", "%", 0.005),
        (" .5 V ", "V", 0.5),
        ("5. V", "V", 5.0),
    ],
)
def test_an_entry_means_what_a_technician_means(text: str, unit: str, value: float) -> None:
    assert parse(text, unit) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("13.1", "V", 13.1),
        ("0", "A", 0.0),
        ("40", "degC", 40.0),
        ("10", "%", 0.10),
        ("3.04E-07", "F", 3.04e-07),  # as meters type it
    ],
)
def test_a_bare_number_is_taken_only_where_it_is_allowed(text: str, unit: str, value: float) -> None:
    assert parse(text, unit, bare=True) == value
    with pytest.raises(QuantityError, match=f"^{re.escape(text)} needs a unit: "):
        parse(text, unit)


def test_a_decimal_text_becomes_the_nearest_float() -> None:
    # Binary arithmetic would give 6.800000000000001e-07; the reader of a file must see what was typed.
    assert parse("680 nF", "F") == 6.8e-07 != 680 * 1e-9


# IEC 60062: R47 = 0.47 ohm, 4R7, 470R, 4K7, 47K3, 4M7; n47, 4n7, 470n, 4µ7; three digits are two figures and
# the number of zeros in pF: 104 = 100 nF, 474 = 0.47 µF, 684 = 0.68 µF, 105 = 1 µF.
IEC_60062_MARKS = [
    ("R47", "ohm", "0.47"),
    ("4R7", "ohm", "4.7"),
    ("470R", "ohm", "470"),
    ("4K7", "ohm", "4.7e3"),
    ("47K3", "ohm", "47.3e3"),
    ("4M7", "ohm", "4.7e6"),
    ("n47", "F", "0.47e-9"),
    ("4n7", "F", "4.7e-9"),
    ("470n", "F", "470e-9"),
    ("4µ7", "F", "4.7e-6"),
]
IEC_60062_CODES = [
    ("104", "F", "100e-9"),
    ("474", "F", "0.47e-6"),
    ("684", "F", "0.68e-6"),
    ("105", "F", "1e-6"),
    ("684K", "F", "0.68e-6"),  # with the letter for 10 %
    ("104M", "F", "100e-9"),  # 20 %
    ("472", "ohm", "4.7e3"),  # chip resistors: value from memory
    ("100", "ohm", "10"),
]


@pytest.mark.parametrize(("text", "unit", "value"), IEC_60062_MARKS)
def test_marks_of_iec_60062_are_read_everywhere(text: str, unit: str, value: str) -> None:
    assert parse(text, unit) == parse_mark(text, unit) == float(value)


@pytest.mark.parametrize(("text", "unit", "value"), IEC_60062_CODES)
def test_codes_of_iec_60062_are_read_only_as_a_marking(text: str, unit: str, value: str) -> None:
    assert parse_mark(text, unit) == float(value)
    if text.isdigit():
        with pytest.raises(QuantityError, match="needs a unit"):
            parse(text, unit)


@pytest.mark.parametrize("text", ["689", "048", "000", "68", "6840", "684Z", "18"])
def test_what_is_no_code_is_no_marking(text: str) -> None:
    with pytest.raises(QuantityError):
        parse_mark(text, "F")


def test_a_marking_of_volts_is_read_like_an_entry() -> None:
    assert parse_mark("310V", "V") == 310.0


# IEC 60062 tolerance letters in percent; J, K, M read in the standard, the rest value from memory.
@pytest.mark.parametrize(
    ("letter", "percent"),
    [("B", 0.1), ("C", 0.25), ("D", 0.5), ("F", 1), ("G", 2), ("J", 5), ("K", 10), ("M", 20), ("N", 30)],
)
def test_tolerance_letters(letter: str, percent: float) -> None:
    assert parse_tolerance(letter) == pytest.approx(percent / 100, rel=1e-15)


@pytest.mark.parametrize("text", ["5 %", "±5 %", "+-5%", "+/- 5 %", "± 5%", "\u00b15\u202f%"])
def test_a_tolerance_may_be_written_both_ways(text: str) -> None:
    assert parse_tolerance(text) == 0.05


@pytest.mark.parametrize("text", ["5", "-5 %", "5 V", "X", "", "±", "JJ", "10 % 5 %"])
def test_what_is_no_tolerance(text: str) -> None:
    with pytest.raises(QuantityError, match="like 10 %"):
        parse_tolerance(text)


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("0.5 % + 20 mV", "V", (0.005, 0.02)),
        ("20 mV + 0.5 %", "V", (0.005, 0.02)),
        ("2%+0.2nF", "F", (0.02, 0.2e-9)),
        ("±1.5 % + 50 uA", "A", (0.015, 50e-6)),
        ("0.9 % + 2e-1 ohm", "ohm", (0.009, 0.2)),
        ("1 % + 1e+1 mV", "V", (0.01, 0.01)),
        ("1 %", "V", (0.01, 0.0)),
        ("0.2 ohm", "ohm", (0.0, 0.2)),
    ],
)
def test_accuracy_of_an_instrument(text: str, unit: str, value: tuple[float, float]) -> None:
    assert parse_accuracy(text, unit) == pytest.approx(value, rel=1e-15)


def test_an_accuracy_with_all_the_figures_of_a_float_is_read() -> None:
    text = "12.345678901234568 % + 0.00012345678901234567 ohm"
    assert len(text) > 40
    assert parse_accuracy(text, "ohm") == (0.12345678901234568, 0.00012345678901234567)
    with pytest.raises(QuantityError, match="too long"):
        parse_accuracy("1 % + " + "0" * 75, "ohm")


@pytest.mark.parametrize(
    "text", ["", "1 % +", "1 % + 2 %", "20 mV + 1 mV", "1 % + 5 A", "-1 %", "1 % + 2 dgt"]
)
def test_what_is_no_accuracy(text: str) -> None:
    with pytest.raises(QuantityError, match="like"):
        parse_accuracy(text, "V")


# --- what is refused


@pytest.mark.parametrize(
    ("text", "unit", "bare", "sentence"),
    [
        ("304", "F", True, "304 needs a unit: n for nF, u for µF, p for pF. Not taken as a bare number."),
        ("182", "F", True, "182 needs a unit: n for nF, u for µF, p for pF. Not taken as a bare number."),
        ("684", "F", True, "684 needs a unit: if 684 is printed on the part, that marking means 680 nF."),
        ("2k2", "V", True, "2k2 is not a voltage: volts, like 23.1 or 850m."),
        ("2k2 V", "V", False, "2k2 V is not a voltage: volts, like 23.1 V or 850m."),
        ("1,234", "V", True, "1,234 can mean two things: type 1.234 or 1234."),
        ("-1,234 mV", "V", False, "-1,234 can mean two things: type -1.234 or -1234."),
        ("18", "ohm", False, "18 needs a unit: ohms, like 470 ohm or 2k2."),
        ("5 A", "V", False, "5 A is not a voltage: volts, like 23.1 V or 850m."),
        ("4n7", "ohm", False, "4n7 is not a resistance: ohms, like 470 ohm or 2k2."),
        ("40 K", "degC", True, "40 K is not a temperature: degrees Celsius, like 40 or 40C."),
        ("ten", "%", False, "ten is not a percentage: percent, like 10 % or 0.5%."),
        ("", "A", True, "nothing typed: amperes, like 0.0035 or 3m5."),
        ("23\t1", "V", True, "23\\u00091 holds a sign that cannot be printed: volts, like 23.1 or 850m."),
        ("1e999", "V", True, "1e999 is beyond all bounds: volts, like 23.1 V or 850m."),
        ("1e-400", "V", True, "1e-400 is beyond all bounds: volts, like 23.1 V or 850m."),
    ],
)
def test_a_refusal_says_what_is_allowed(text: str, unit: str, bare: bool, sentence: str) -> None:
    with pytest.raises(QuantityError) as refused:
        parse(text, unit, bare=bare)
    assert str(refused.value) == sentence


@pytest.mark.parametrize("unit", UNITS)
def test_every_example_in_a_refusal_is_itself_an_entry(unit: str) -> None:
    for bare in (False, True):
        with pytest.raises(QuantityError) as refused:
            parse("?", unit, bare=bare)
        number, mark = refused.value.allowed.removesuffix(".").split(", like ")[1].split(" or ")
        assert math.isfinite(parse(number, unit, bare=bare))
        assert math.isfinite(parse(mark, unit, bare=bare))


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [  # what a general expression parser makes of it stands beside each; the value is what a person means
        ("4.7k", "ohm", 4700.0),  # Boltzmann constants
        ("100k", "ohm", 100e3),  # Boltzmann constants
        ("1M", "ohm", 1e6),  # molar
        ("1m", "ohm", 1e-3),  # metre
        ("0.1u", "F", 0.1e-6),  # atomic mass
        ("100 ma", "A", 0.1),  # milliyear
        ("3,3V", "V", 3.3),  # 33 V
        ("\u221212V", "V", -12.0),  # +12 V, with the minus sign U+2212
        ("10\u2126", "ohm", 10.0),  # fails, with the ohm sign U+2126
        ("4.7 \u00b5F", "F", 4.7e-6),  # one of the two micro signs
        ("4.7 \u03bcF", "F", 4.7e-6),  # and the other
    ],
)
def test_entries_that_an_expression_parser_gets_silently_wrong(text: str, unit: str, value: float) -> None:
    assert parse(text, unit) == pytest.approx(value, rel=1e-15)


EXPRESSIONS = ["12 V ± 0.5 V", "9**9**9", "nan", "inf", "-inf V", "1e999", "1e999999999 V", "2+3 V", "0x10"]
LOOKALIKES = ["5 V V", "12 V 3", "1_000 V", "١٢ V", "1² V", "- 5 V", "5 hV", "[5] V", "5\u200bV"]
FIGURES = ["1.2.3 V", "1,2,3 V", "1,234.5 V", "10 000 V"]


@pytest.mark.parametrize("text", EXPRESSIONS + LOOKALIKES + FIGURES)
def test_expressions_and_lookalikes_are_refused(text: str) -> None:
    with pytest.raises(QuantityError):
        parse(text, "V", bare=True)


@pytest.mark.parametrize(
    ("text", "value"),
    [("0,680", 0.68), ("3,3", 3.3), ("12,3456", 12.3456), ("1234,567", 1234.567), (",5", 0.5)],
)
def test_a_decimal_comma_is_taken_where_it_can_only_be_that(text: str, value: float) -> None:
    assert parse(text, "V", bare=True) == value


def test_refused_text_is_repeated_short_and_printable() -> None:
    with pytest.raises(QuantityError) as refused:
        parse("a\x1b[31m\n\u202eb" + "x" * 60, "V")
    assert refused.value.found.isprintable()
    assert len(refused.value.found) < 80


def test_long_and_hostile_text_costs_no_more_than_a_few_entries() -> None:
    def seconds(text: str) -> float:
        spans = []
        for _ in range(30):
            start = time.perf_counter()
            with pytest.raises(QuantityError):
                parse(text, "V")
            spans.append(time.perf_counter() - start)
        return min(spans)

    plain = seconds("12 x")
    hostile = ("9" * 40, "1" * 10**6, " " * 10**6, "1e" * 20, "9**9**9")
    assert max(seconds(text) for text in hostile) < 30 * plain


@SAME_EVERY_TIME
@given(text=st.text(max_size=50) | entry_like, unit=units, bare=st.booleans())
def test_any_text_is_a_finite_number_or_a_refusal(text: str, unit: str, bare: bool) -> None:
    doors: list[Callable[[], float]] = [
        lambda: parse(text, unit, bare=bare),
        lambda: parse_mark(text, unit),
        lambda: parse_tolerance(text),
        lambda: sum(parse_accuracy(text, unit)),
    ]
    for door in doors:
        assert outcome_is_plain(door)


def outcome_is_plain(door: Callable[[], float]) -> bool:
    """Whether a door gave a finite number, or refused in one short printable line."""
    try:
        return math.isfinite(door())
    except QuantityError as refused:
        return str(refused).isprintable() and len(str(refused)) < 160


# --- what it costs


def test_pint_is_loaded_only_once_something_is_typed() -> None:
    script = (
        "import sys, benchtool.quantities as q; assert 'pint' not in sys.modules;"
        "q.show(1.0, 'V'); q.exact(1.0, 'V');"
        "assert 'pint' not in sys.modules; q.parse('1 V', 'V'); assert 'pint' in sys.modules"
    )
    assert subprocess.run([sys.executable, "-c", script], check=False).returncode == 0
