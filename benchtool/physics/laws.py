"""The closed forms of a capacitor-fed supply: what a technician could work out on paper, as functions of arrays.

All arguments may be floats or arrays that broadcast, in SI units. `half_swing` is half the voltage by which the rectifier's
input has to swing from one conduction to the next [V]: bridge V + 2·Vf; half-wave (V_hi + V_lo) / 2.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import constants as known

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
Number = float | Array

AVERAGE_RESPONDING = float(np.pi / (2.0 * np.sqrt(2.0)))
"""What a meter that responds to the mean magnitude multiplies it by: RMS over mean magnitude of a sine [1]. Definition."""


def reactance(capacitance: Number, frequency: Number) -> Array:
    """Reactance 1/(2πfC) [ohm] of `capacitance` [F] at `frequency` [Hz]. Definition."""
    return np.asarray(1.0 / (2.0 * np.pi * np.asarray(frequency) * np.asarray(capacitance, dtype=float)))


def crest_factor_k(resistance: Number, capacitance: Number, frequency: Number) -> Array:
    """Share of the crest left behind a series `resistance` [ohm]: k = 1/√(1 + (2πfRC)²). Charge balance."""
    omega_tau = 2.0 * np.pi * np.asarray(frequency) * np.asarray(resistance) * np.asarray(capacitance)
    return np.asarray(1.0 / np.sqrt(1.0 + omega_tau**2))


def capacitor_current(
    crest: Number, frequency: Number, capacitance: Number, resistance: Number, half_swing: Number
) -> Array:
    """Mean current [A] that a capacitor dropper drives through a full-wave rectifier; half of it through a half-wave one.

    I = 4·f·C·(k·crest − half_swing), charge balance per half cycle; the identity stands in TI SBVS343A §8.2.1. Beyond
    ωRC = 0.7 the swing is answered through the resistance as well, added to the capacitor's as a root sum of squares: within
    3 % of a time-step simulation at 15 kΩ and 680 nF. Never negative. `crest` [V], `resistance` [ohm] in series.
    """
    conductance = 4.0 * np.asarray(frequency) * np.asarray(capacitance, dtype=float)
    k = crest_factor_k(resistance, capacitance, frequency)
    answered = conductance / np.hypot(1.0, conductance * np.asarray(resistance))
    return np.asarray(np.maximum(conductance * k * np.asarray(crest) - answered * np.asarray(half_swing), 0.0))


def capacitance_for(current: Number, crest: Number, frequency: Number, resistance: Number, half_swing: Number) -> Array:
    """The dropper [F] that drives the mean `current` [A] through a full-wave rectifier: `capacitor_current` turned round.

    Bisection in the logarithm, as the current rises with the dropper; nil for no current, NaN where no capacitance from 1 pF
    to 1 mF gives that much.
    """
    wanted = np.asarray(current, dtype=float)
    shape = np.broadcast(wanted, crest, half_swing, resistance).shape
    low, high = np.full(shape, np.log(1e-12)), np.full(shape, np.log(1e-3))
    for _ in range(60):
        middle = 0.5 * (low + high)
        enough = capacitor_current(crest, frequency, np.exp(middle), resistance, half_swing) >= wanted
        low, high = np.where(enough, low, middle), np.where(enough, middle, high)
    found = np.where(wanted > 0.0, np.exp(0.5 * (low + high)), 0.0)
    return np.where(high < np.log(1e-3), found, np.nan)


def resistor_current(crest: Number, resistance: Number, threshold: Number) -> Array:
    """Mean current [A] that a resistor dropper drives through a full-wave rectifier; half of it through a half-wave one.

    I = 2/(πR)·[crest·cos a − V'·(π/2 − a)], a = asin(V'/crest): the mean over the conduction angle, analytic.
    `threshold` V' is the voltage at which it starts to conduct [V]. Zero where the crest does not reach it.
    """
    crest = np.maximum(np.asarray(crest, dtype=float), 1e-9)
    ratio = np.clip(np.asarray(threshold) / crest, -1.0, 1.0)
    angle = np.arcsin(ratio)
    drive = crest * (np.cos(angle) - ratio * (np.pi / 2.0 - angle))
    return np.asarray(2.0 / (np.pi * np.asarray(resistance)) * drive)


def conduction_start(crest: Number, half_swing: Number) -> Array:
    """Phase after the mains crest at which a capacitor dropper's rectifier conducts again [rad]; π where it never does."""
    ratio = np.asarray(half_swing) / np.maximum(np.asarray(crest, dtype=float), 1e-9)
    return np.asarray(np.arccos(np.clip(1.0 - 2.0 * ratio, -1.0, 1.0)))


def capacitor_line_current(crest: Number, frequency: Number, capacitance: Number, half_swing: Number) -> Array:
    """RMS current [A] in the mains lead of a capacitor dropper; `crest` [V] is the crest that reaches it (k·crest).

    From the crest the current rests until the node has swung over, then follows ωC·crest·sin θ to the next crest: analytic.
    """
    start = conduction_start(crest, half_swing)
    peak = 2.0 * np.pi * np.asarray(frequency) * np.asarray(capacitance) * np.asarray(crest)
    return np.asarray(peak * np.sqrt(np.maximum((np.pi - start) / 2.0 + np.sin(2.0 * start) / 4.0, 0.0) / np.pi))


def capacitor_voltage(crest: Number, half_swing: Number) -> Array:
    """RMS voltage [V] over a capacitor dropper without its standing DC: at rest for a while, then with the mains. Analytic."""
    crest, half_swing = np.asarray(crest, dtype=float), np.minimum(np.asarray(half_swing, dtype=float), crest)
    start = conduction_start(crest, half_swing)
    rest = start * (crest - half_swing) ** 2
    moving = crest**2 * ((np.pi - start) / 2.0 - np.sin(2.0 * start) / 4.0)
    cross = -2.0 * crest * half_swing * np.sin(start) + half_swing**2 * (np.pi - start)
    return np.asarray(np.sqrt(np.maximum(rest + moving + cross, 0.0) / np.pi))


def resistor_line_current(crest: Number, resistance: Number, threshold: Number) -> Array:
    """RMS current [A] in the mains lead of a resistor dropper that conducts above `threshold` [V] both ways. Analytic."""
    crest = np.maximum(np.asarray(crest, dtype=float), 1e-9)
    ratio = np.clip(np.asarray(threshold) / crest, 0.0, 1.0)
    angle = np.arcsin(ratio)
    span = np.pi / 2.0 - angle
    square = span / 2.0 + np.sin(2.0 * angle) / 4.0 - 2.0 * ratio * np.cos(angle) + ratio**2 * span
    return np.asarray(crest / np.asarray(resistance) * np.sqrt(np.maximum(square, 0.0) * 2.0 / np.pi))


def rule_of_thumb_current(
    mains: Number, frequency: Number, capacitance: Number, resistance: Number, zener: Number
) -> Array:
    """The half-wave current [A] as application notes state it: (√2·V − Vz) / [2·(Xc + R)], Microchip AN954 p. 2.

    It is the RMS of a half sine, not the mean, and adds Xc and R arithmetically: up to π/2 too high. Shown beside the budget so
    that a designer's figure on paper and this tool's can be reconciled, never used to judge.
    """
    drive = np.sqrt(2.0) * np.asarray(mains) - np.asarray(zener)
    return np.asarray(drive / (2.0 * (reactance(capacitance, frequency) + np.asarray(resistance))))


def discharge_voltage(start: Number, resistance: Number, capacitance: Number, seconds: Number) -> Array:
    """Voltage [V] left after `seconds` [s] on `capacitance` [F] through `resistance` [ohm]: V0·exp(−t/RC)."""
    return np.asarray(start * np.exp(-np.asarray(seconds) / (np.asarray(resistance) * np.asarray(capacitance))))


def discharge_time(start: Number, resistance: Number, capacitance: Number, limit: Number) -> Array:
    """Seconds [s] until `capacitance` [F] has fallen from `start` to `limit` [V] through `resistance` [ohm]: RC·ln(V0/Vlim)."""
    ratio = np.maximum(np.asarray(start) / np.asarray(limit), 1.0)
    return np.asarray(np.asarray(resistance) * np.asarray(capacitance) * np.log(ratio))


def copper_ratio(celsius: Number) -> Array:
    """Resistance, and pull-in voltage, of a copper coil at `celsius` [degC] as a share of its value at 25 degC.

    0.003853 per kelvin at the 25 degC reference (relay makers' temperature notes).
    """
    return np.asarray(1.0 + known.COPPER_AT_25 * (np.asarray(celsius, dtype=float) - 25.0))


def zener_temperature_share(voltage: Number) -> Array:
    """Change of a zener's voltage per kelvin as a share of itself [1/K], between the table's volts by straight lines."""
    return np.asarray(np.interp(np.asarray(voltage, dtype=float), known.ZENER_TEMPERATURE_VOLTS, known.ZENER_TEMPERATURE_SHARE))


def accuracy_band(value: float, relative: float, floor: float) -> tuple[float, float]:
    """What a meter's data sheet guarantees for a reading: value ± (relative·value + floor), the two terms added."""
    limit = relative * abs(value) + floor
    return value - limit, value + limit


def two_sigma(value: Number, relative: float, floor: float) -> Array:
    """A meter's two-sigma limit for `value`, its share and floor as a root sum of squares: they seldom fail together."""
    return np.hypot(relative * np.asarray(value, dtype=float), floor)


def string_share(voltage: float, in_series: int) -> float:
    """Voltage [V] over each of `in_series` equal resistors in a string across `voltage` [V]."""
    return voltage / in_series
