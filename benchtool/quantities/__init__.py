"""The only door between what a person types and the SI floats of the core.

Why a grammar of our own: a general unit parser takes expressions, and on a bench that is silent and wrong.
There `100k` is Boltzmann's constant, `100 ma` a milliyear, `3,3V` thirty-three volts. So one anchored grammar
(`entry`) decides what a text means, and Pint (`units`) is handed only a number and a unit that is known here.
On the way out `text` writes the numbers itself, because 470 nF must not come back as 469.99999999999994 nF.

Units are "V", "A", "F", "ohm", "W", "Hz", "s", "degC" and "%" (a fraction inside: 10 % is 0.10).
"""

from benchtool.quantities.entry import parse, parse_accuracy, parse_mark, parse_tolerance
from benchtool.quantities.series import SERIES, nearest
from benchtool.quantities.text import exact, round_up, show, show_range, show_up

__all__ = [
    "SERIES",
    "exact",
    "nearest",
    "parse",
    "parse_accuracy",
    "parse_mark",
    "parse_tolerance",
    "round_up",
    "show",
    "show_range",
    "show_up",
]
