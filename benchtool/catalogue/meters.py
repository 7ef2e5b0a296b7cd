"""What a meter makes of what is there: the ways in which the figure on its display is not the quantity itself.

Accuracy is not among them; that is in `observed.Meter` and weighed in the likelihood.
"""

from __future__ import annotations

import numpy as np

from benchtool.catalogue.shown import View
from benchtool.physics.laws import Array

RAMP_SECONDS = 0.3
"""Longest window of meters that ramp at constant current; common practice, no source. Half of all meters do not ramp."""
READS_THROUGH = 600.0
"""Resistance from a rail to common [ohm] under which a junction test in circuit finds a way around the junction, and what it
shows may be taken for a short: the test's 1 mA drops less than a junction does. Ohm's law.
"""
DOUBT_IN_CIRCUIT = 0.25
"""Chance that a whole rectifier is then noted as shorted; common practice, no source."""


def alternating(view: View, true_rms: Array, average: Array) -> Array:
    """An AC reading [V or A] on a meter that responds as this one does, (n,): to the RMS, or to the mean magnitude."""
    return average if view.meter.ac_response == "average" else true_rms


def ramped(capacitance: Array, across: Array, chance: Array) -> Array:
    """A capacitance [F] read across a resistance `across` [ohm], on a meter of which `chance`, 0 to 1, tells how it works; (n,).

    A range that ramps at constant current reads high by x/(1 − e^−x), x = window/RC (published values).
    """
    bridged, window = np.isfinite(across), RAMP_SECONDS * np.maximum(2.0 * chance - 1.0, 0.0)
    x = np.clip(window / np.maximum(np.where(bridged, across, 0.0) * capacitance, 1e-12), 1e-9, 50.0)
    return np.asarray(capacitance * np.where(bridged, x / -np.expm1(-x), 1.0))


def misread_junction(view: View) -> Array:
    """Chance that a whole rectifier looks shorted where it sits, (n,): something on the first rail bridges it."""
    specimens, shape = view.specimens, view.specimens.shape
    bridges = 1.0 / specimens.zener_short[0] + 1.0 / specimens.reservoir_leak[0] + 1.0 / specimens.board_leak[0]
    for index, load in enumerate(shape.loads):
        if load.rail == 0 and load.returns_to < 0 and not load.switched and load.kind in ("coil", "resistor"):
            bridges = bridges + 1.0 / specimens.load_resistance[index]
    return np.where(bridges * READS_THROUGH > 1.0, DOUBT_IN_CIRCUIT, 0.0)
