"""What the physics assumes where a case is silent: every such figure, named, in one place.

Values from the case format's section 4: value from memory or common practice, no source, unless a source stands beside it.
"""

from __future__ import annotations

# Junctions
DIODE_DROP = 0.7
"""Rectifier diode's forward voltage at `DIODE_CURRENT` [V]."""
DIODE_CURRENT = 0.020
"""Current at which a diode drops `DIODE_DROP` [A]."""
DIODE_SLOPE = 0.1 / 2.302585092994046
"""Diode voltage for a current e times as large [V]: 0.1 V a decade."""
ZENER_CURRENT = 0.005
"""Current at which a zener stands at its marked voltage [A]; as in zener-test."""
ZENER_SLOPE = 0.060
"""Zener voltage for a current e times as large [V]."""
LED_CURRENT = 0.006
"""Current at which an LED stands at its forward voltage [A]."""
LED_SLOPE = 0.05
"""LED voltage for a current e times as large [V]; value from memory."""
CURRENT_LOAD_KNEE = 0.5
"""A current load draws I·tanh(V / knee) [V]."""
METER_RESISTANCE = 10e6
"""Input resistance of a voltmeter on DC [ohm]; input > 10 MΩ (Fluke 115 manual)."""
REGULATES_FROM = 1e-4
"""Mean reverse current with which a zener still counts as regulating its rail [A]."""

# Parts
DROPPER_LOSS_TANGENT = 6e-4
"""Loss tangent of an X2 polypropylene capacitor, typical (KEMET R.46 sheet)."""
ESR_NOMINAL = 6e-5
"""Reservoir ESR times its capacitance [ohm·F]."""
ESR_HEALTHY = (1.5e-5, 2e-4)
"""Healthy spread of ESR times capacitance [ohm·F]."""
ESR_LEAST = 0.02
"""Least ESR of a reservoir [ohm]."""
REGULATOR_RESISTANCE = 0.2
"""Output resistance of a regulator [ohm]."""
REGULATOR_DROPOUT = 0.3
"""Dropout of a regulator where none is stated [V]; value from memory: small parts drop 0.2 to 0.5 V at a few milliamperes."""
SHORTED_JUNCTION = 0.5
"""A shorted diode's, or a shorted film capacitor's, resistance [ohm]."""

# Tolerances not stated
DROPPER_TOLERANCE = 0.10
RESISTOR_TOLERANCE = 0.05
COIL_TOLERANCE = 0.10
ZENER_TOLERANCE = 0.05
RESERVOIR_TOLERANCE = 0.20
CURRENT_TOLERANCE = 0.20

# Mains while reading
CREST_FACTOR = (1.36, 1.42)
READING_MAINS_SPREAD = 0.04
"""Mains while reading: nominal ± this share, unless mains-voltage was read."""

# Temperature
COPPER_AT_25 = 0.003853
"""Copper's resistance per kelvin, of its value at 25 °C [1/K] (relay makers' temperature notes, TE, Kilovac, Babcock)."""
ZENER_KELVIN_PER_WATT = (50.0, 130.0)
ZENER_TEMPERATURE_VOLTS = (3.3, 5.1, 6.2, 12.0, 18.0, 24.0)
ZENER_TEMPERATURE_SHARE = (-6e-4, 0.0, 3e-4, 7e-4, 8.5e-4, 9e-4)
"""A zener's voltage per kelvin, as a share of itself [1/K], at `ZENER_TEMPERATURE_VOLTS` [V]."""

# What a part that cannot be read may be: evenly in the logarithm between these
UNKNOWN_DROPPER = (47e-9, 4.7e-6)
UNKNOWN_DROPPER_RESISTANCE = (470.0, 47e3)
UNKNOWN_INRUSH = (4.7, 1000.0)
UNKNOWN_BLEEDER = (100e3, 2.2e6)
UNKNOWN_ZENER = (3.3, 47.0)
UNKNOWN_RESERVOIR = (10e-6, 2200e-6)
UNKNOWN_CURRENT = (0.5e-3, 30e-3)
UNKNOWN_RESISTANCE = (50.0, 10e3)
UNKNOWN_FEED = (10.0, 10e3)

# Limits
PLUG_LIMIT_VOLTS = 34.0
PLUG_LIMIT_SECONDS = 1.0
PLUG_EXEMPT = 0.1e-6
"""Plug pins at most 34 V one second after disconnection at the crest, exempt up to 0.1 µF (IEC 60335-1 22.5)."""
DEAD_VOLTS = 5.0
"""Highest DC volts that count as dead; common practice, no source."""
TYPICAL_PULL_IN = (0.55, 0.72)
"""Share of its nominal voltage at which a coil at bench temperature typically pulls in."""
LIVES_FROM_SHARE = 0.6
LIVES_FROM_VOLTS = 4.0
"""A controller lives when its rail stands above 60 % of its zener, or above 4 V."""
LED_LIGHTS_FROM = 1.15
"""Share of its forward voltage from which an LED load lights."""
