"""The case file that `benchtool new` writes: a whole board of our own, every key explained where it stands.

Why a running example and not an empty form: it can be judged before a word is changed, and changing a value that is
there is easier than finding out which one is missing. Keys behind a `#` without a space are the optional ones.
"""

from __future__ import annotations

import os

from benchtool.casefile import file_name, reason_of
from benchtool.errors import FileError

TEMPLATE = """\
# A case for benchtool: one board on the bench. Judge it with: benchtool assess THIS-FILE
#
# THIS BOARD IS NOT ISOLATED FROM THE MAINS. Power it on the bench only through an isolating transformer.
# Its capacitors stay charged after unplugging: discharge them, then measure, before every dead reading.
#
# It describes an invented board and can be judged as it stands. Put in what is printed on your parts,
# as it is printed: "560 nF", "0u56", "2k2", "4R7". A part that cannot be read has the value "unknown".
# Lines behind a "#" without a space are optional keys: take the "#" away to use them.
format = 1

[ticket]                          # the job; every key may be left out
#number = "R-0001"
appliance = "greenhouse window opener"
complaint = "window stays shut on hot days"
#technician = "bench 1"
#received = 2026-05-11            # a date, without quotation marks

[mains]
voltage = "230 V"                 # what the appliance is made for
frequency = "50 Hz"
variation = "10 %"                # how far the mains may be off, both ways

[board]
name = "window opener control"
#made = 2011                      # year
rectifier = "bridge"              # bridge, half-wave (two diodes), or half-wave-zener (one diode and a zener before it)
connected_by = "plug"             # plug, or fixed for an appliance without one
#ambient = "40 degC"              # how warm it gets inside the appliance

#[board.fuse]
#rated_current = "1 A"

#[board.varistor]                 # the surge arrester across the input
#voltage = "275 V"

[board.dropper]                   # the capacitor (or power resistor) that the mains current comes through
kind = "capacitor"                # or resistor, with resistance and rated_power in place of capacitance
capacitance = "560 nF"            # the value the board wants
tolerance = "10 %"
safety_class = "X2"
rated_voltage = "305 V"           # AC
#fitted = "470 nF"                # only if the part found in place is marked otherwise
#in_parallel = 1                  # equal parts side by side; capacitance is the total
#dielectric = "polypropylene"

[board.inrush]                    # the resistor in series with the dropper
resistance = "82 ohm"
#tolerance = "5 %"
rated_power = "2 W"
#fusible = true

[board.bleeder]                   # the resistors across the dropper; take this table out if there are none
resistance = "270 kohm"           # each of them
in_series = 2
#tolerance = "5 %"
rated_voltage = "250 V"           # each of them

[[board.rail]]                    # the first rail is the one the rectifier feeds; add a table for each further rail
name = "12 V rail"
fed_by = "rectifier"
#short = "12 V"                   # for narrow screens
zener = { voltage = "12 V", tolerance = "5 %", rated_power = "1.3 W" }
reservoir = { capacitance = "330 uF", tolerance = "20 %", rated_voltage = "25 V" }

# A second rail, fed by the first through a resistor:
#[[board.rail]]
#name = "logic rail"
#fed_by = "12 V rail"
#fed_through = "resistor"
#feed_resistance = "2k2"
#zener = { voltage = "5.1 V", rated_power = "0.5 W" }
#reservoir = { capacitance = "100 uF", rated_voltage = "16 V" }

[[board.load]]                    # what a rail runs; one table each
name = "controller"
kind = "current"                  # current, coil, resistor or led
rail = "12 V rail"
current = "4 mA"
#tolerance = "20 %"

[[board.load]]
name = "motor relay"
kind = "coil"
rail = "12 V rail"
switched = true                   # the appliance turns it on and off
nominal_voltage = "12 V"
resistance = "600 ohm"            # or power = "240 mW", as relays are printed
#pull_in = "75 %"                 # of the nominal voltage, from the relay's sheet
#drop_out = "10 %"

# Readings: live ones only through the isolating transformer, dead ones after unplugging, discharging and measuring.
# Common, where the meter's black lead goes, is the minus of the first rail's reservoir.

#[[reading]]
#what = "rail-voltage"
#rail = "12 V rail"
#on = []                          # switched loads that are on while reading: none
#value = "12.4 V"

#[[reading]]
#what = "rail-voltage"
#rail = "12 V rail"
#on = ["motor relay"]
#value = "8.6 V"

#[[reading]]
#what = "dropper-capacitance"
#lifted = true                    # one leg free of the board; across the bleeder many meters read high
#value = "231 nF"
"""


def write_template(path: str | os.PathLike[str]) -> None:
    """Write the template to a new file; FileError where one stands there already or none can be made."""
    name = file_name(path)
    try:
        with open(path, "x", encoding="utf-8") as stream:
            stream.write(TEMPLATE)
    except FileExistsError:
        raise FileError(name, "stands there already and was left as it is; give another name") from None
    except (OSError, ValueError) as failure:
        raise FileError(name, f"cannot be written: {reason_of(failure)}") from failure
