"""What each kind of branch draws at a given voltage: current and slope, vectorised.

Exponentials go on as their tangent above `STEEP_LIMIT`, where no supply of this kind can push them; so Newton's method comes
down on the solution from above instead of overflowing.
"""

from __future__ import annotations

import numpy as np

from benchtool.physics import constants as known
from benchtool.physics.laws import Array

STEEP_LIMIT = 5.0
"""Current from which a junction's law is continued as a straight line [A]."""

Branch = tuple[Array, Array]
"""Current [A] and its slope against the branch voltage [S]."""


def junction(voltage: Array, at_voltage: Array | float, at_current: float, slope: float) -> Branch:
    """Current [A] and slope [S] of at_current·exp((voltage − at_voltage) / slope), all in volts and amperes; (n,).

    Diode, zener in reverse, LED junction. Infinite `at_voltage`: nothing.
    """
    steep = slope * np.log(STEEP_LIMIT / at_current)
    over = np.asarray(voltage - at_voltage)
    current = at_current * np.exp(np.minimum(over, steep) * (1.0 / slope))
    conductance = current * (1.0 / slope)
    if np.any(over > steep):
        current = current + conductance * np.maximum(over - steep, 0.0)
    return current, conductance


def zener(voltage: Array, marked: Array) -> Branch:
    """A zener of `marked` [V] at 5 mA; forward it conducts like a diode."""
    reverse, slope = junction(voltage, marked, known.ZENER_CURRENT, known.ZENER_SLOPE)
    if not np.any(voltage < 0.0):
        return reverse, slope
    forward, forward_slope = junction(-voltage, known.DIODE_DROP, known.DIODE_CURRENT, known.DIODE_SLOPE)
    turned = np.isfinite(marked) & (voltage < 0.0)
    return reverse - np.where(turned, forward, 0.0), slope + np.where(turned, forward_slope, 0.0)


def resistor(voltage: Array, resistance: Array) -> Branch:
    """Ohm's law: current [A] and slope [S] at `voltage` [V] over `resistance` [ohm]; infinite resistance draws nothing."""
    conductance = 1.0 / resistance
    return voltage * conductance, conductance


def constant_current(voltage: Array, current: Array) -> Branch:
    """I·tanh(V / 0.5 V) [A] and its slope [S], zero below 0 V: a controller that draws less as its rail collapses."""
    level = np.tanh(np.maximum(voltage, 0.0) / known.CURRENT_LOAD_KNEE)
    slope = np.where(voltage >= 0.0, current * (1.0 - level**2) / known.CURRENT_LOAD_KNEE, 0.0)
    return current * level, slope


def led(voltage: Array, forward: Array, resistance: Array) -> Branch:
    """An LED with `forward` [V] at 6 mA and `resistance` [ohm] in series, solved for its current.

    With w = i·R/slope the two drops add up to w + ln w = x; w is found by Newton's method from both asymptotes.
    """
    slope = known.LED_SLOPE
    x = (voltage - forward) / slope + np.log(known.LED_CURRENT * resistance / slope)
    x = np.clip(x, -60.0, 1e6)
    w = np.where(x > 1.0, x - np.log(np.maximum(x, 1.0)) + 1e-12, np.exp(np.minimum(x, 1.0)))
    for _ in range(6):
        step = (w + np.log(w) - x) / (1.0 + 1.0 / w)
        w = np.maximum(w - step, 0.1 * w)
    return w * slope / resistance, w / (1.0 + w) / resistance
