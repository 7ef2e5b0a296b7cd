"""Preferred values, and SI floats to text: nothing lost in a file, no figure nobody measured on a screen."""

import math
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.quantities import SERIES, exact, nearest, parse, round_up, show, show_range, show_up

SAME_EVERY_TIME = settings(derandomize=True, deadline=None, max_examples=400)

units = st.sampled_from(("V", "A", "F", "ohm", "W", "Hz", "s", "degC", "%"))
finite = st.floats(allow_nan=False, allow_infinity=False)
bench_sized = st.floats(min_value=1e-12, max_value=1e9)


# --- series


def test_series_of_iec_60063() -> None:
    assert SERIES["E6"] == (10, 15, 22, 33, 47, 68)
    assert sorted(set(SERIES["E12"]) - set(SERIES["E6"])) == [12, 18, 27, 39, 56, 82]
    assert sorted(set(SERIES["E24"]) - set(SERIES["E12"])) == [11, 13, 16, 20, 24, 30, 36, 43, 51, 62, 75, 91]
    assert [len(SERIES[name]) for name in ("E6", "E12", "E24")] == [6, 12, 24]


@pytest.mark.parametrize(
    ("value", "series", "neighbours"),
    [  # neighbours read off IEC 60063
        (500e-9, "E6", (470e-9, 680e-9)),
        (500e-9, "E12", (470e-9, 560e-9)),
        (500e-9, "E24", (470e-9, 510e-9)),
        (680e-9, "E6", (680e-9, 680e-9)),
        (680 * 1e-9, "E6", (680e-9, 680e-9)),  # a float beside it
        (0.95e-6, "E6", (0.68e-6, 1e-6)),  # over the decade's edge
        (9.2, "E24", (9.1, 10.0)),
        (1.0, "E24", (1.0, 1.0)),
        (1000.0 * (1 - 1e-12), "E6", (1000.0, 1000.0)),
    ],
)
def test_neighbours_in_a_series(value: float, series: str, neighbours: tuple[float, float]) -> None:
    assert nearest(value, series) == pytest.approx(neighbours, rel=1e-15)


@pytest.mark.parametrize("value", [0.0, -1.0, math.inf, math.nan])
def test_no_neighbour_of_what_is_no_value(value: float) -> None:
    with pytest.raises(ValueError, match="no preferred value"):
        nearest(value, "E6")


@SAME_EVERY_TIME
@given(value=bench_sized, series=st.sampled_from(("E6", "E12", "E24")))
def test_neighbours_enclose_the_value_closely(value: float, series: str) -> None:
    below, above = nearest(value, series)
    assert below * (1 - 1e-9) <= value <= above * (1 + 1e-9)
    assert above / below < 1.6  # the widest step of E6 is 22 to 33 and 10 to 15: a half more


# --- SI to text


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [  # as case files are written
        (6.8e-07, "F", "680 nF"),
        (220e-6, "F", "220 uF"),
        (0.1, "%", "10 %"),
        (2200.0, "ohm", "2.2 kohm"),
        (470e3, "ohm", "470 kohm"),
        (40.0, "degC", "40 degC"),
        (0.0035, "A", "3.5 mA"),
        (1.3, "W", "1.3 W"),
        (250e-6, "s", "250 us"),
        (5.1, "V", "5.1 V"),
        (0.3, "V", "0.3 V"),
        (0.02, "V", "20 mV"),
        (0.0, "V", "0 V"),
    ],
)
def test_exact_text_is_what_a_person_would_write(value: float, unit: str, text: str) -> None:
    assert exact(value, unit) == text


def test_a_numpy_scalar_is_written_like_a_float() -> None:
    assert exact(np.float64(6.8e-07), "F") == "680 nF"
    assert show(np.float64(6.8e-07), "F", ascii=True) == "680 nF"


@SAME_EVERY_TIME
@given(value=finite | bench_sized, unit=units)
def test_exact_text_reads_back_bit_by_bit(value: float, unit: str) -> None:
    text = exact(value, unit)
    assert parse(text, unit).hex() == value.hex()
    assert text.isascii()


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [  # what a technician expects to read: common practice, no source
        (6.8e-07, "F", "680 nF"),
        (469.99999999999994e-9, "F", "470 nF"),
        (999.6e-9, "F", "1 µF"),
        (0.0022, "F", "2200 µF"),
        (0.0409, "A", "40.9 mA"),
        (2200.0, "ohm", "2.2 kΩ"),
        (0.47, "ohm", "0.47 Ω"),
        (23.3, "V", "23.3 V"),
        (0.246, "V", "0.246 V"),
        (0.08, "V", "80 mV"),
        (358.4, "V", "358 V"),
        (1.74, "s", "1.74 s"),
        (5400.0, "s", "5400 s"),
        (0.7434, "W", "0.743 W"),
        (0.118, "%", "11.8 %"),
        (40.04, "degC", "40 °C"),
        (-0.0, "V", "0 V"),
        (-4.9996, "V", "-5 V"),
        (None, "F", "cannot tell"),
    ],
)
def test_text_for_people(value: float | None, unit: str, text: str) -> None:
    assert show(value, unit) == text
    ascii_text = text.replace("µ", "u").replace("Ω", "ohm").replace("°", "deg")
    assert show(value, unit, ascii=True) == ascii_text


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_not_written(value: float) -> None:
    for write in (show, exact, show_up):
        with pytest.raises(ValueError, match="cannot be written"):
            write(value, "ohm")


@SAME_EVERY_TIME
@given(value=finite | bench_sized, unit=units, digits=st.integers(1, 6), ascii=st.booleans())
def test_shown_figures_are_no_more_than_asked_and_round_the_value(
    value: float, unit: str, digits: int, ascii: bool
) -> None:
    text = show(value, unit, digits=digits, ascii=ascii)
    figures = re.sub("[^0-9]", "", re.split("[e ]", text)[0]).strip("0")
    assert len(figures) <= digits
    if abs(value) < 1e300 and (value == 0.0 or abs(value) > 1e-300):  # outside, rounding can leave the floats
        assert parse(text, unit) == pytest.approx(value, rel=5.0 * 10.0**-digits * (1 + 1e-9), abs=0.0)


def test_a_range_is_written_as_in_the_result() -> None:
    # 680 nF ±10 % and the range of a lost dropper, as `expected_if_healthy` prints them.
    assert show_range(612e-9, 748e-9, "F") == "612 nF to 748 nF"
    assert show_range(68e-9, 578e-9, "F") == "68 nF to 578 nF"
    assert show_range(612e-9, 748e-9, "F", compact=True) == "612 to 748 nF"
    assert show_range(0.9e-6, 1.1e-6, "F", compact=True) == "900 nF to 1.1 µF"
    assert show_range(893e3, 987e3, "ohm", compact=True, ascii=True) == "893 to 987 kohm"


def test_safety_times_are_rounded_up() -> None:
    assert show_up(1.74, "s") == "1.8 s"
    assert show_up(1.8, "s") == "1.8 s"
    assert show_up(1.8000001, "s") == "1.9 s"
    assert show_up(9.91, "s") == "10 s"
    assert show_up(101.0, "s", digits=2) == "110 s"
    assert round_up(1.1, 2) == 1.1  # the float 1.1 lies a hair above 1.1: that is no reason to say 1.2


@SAME_EVERY_TIME
@given(value=bench_sized, digits=st.integers(1, 6))
def test_rounding_up_never_goes_below_nor_further_than_one_digit(value: float, digits: int) -> None:
    assert value <= round_up(value, digits) <= value * (1 + 10.0 ** (1 - digits)) * (1 + 1e-12)
    assert parse(show_up(value, "s", digits=digits), "s") == round_up(value, digits)
