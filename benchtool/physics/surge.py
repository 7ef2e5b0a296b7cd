"""The moment of switching on, when the dropper meets the mains at a crest and only what stands in series holds the current back.

A resistor that scorches or opens at switch-on, a rectifier that dies of it: this is what a replacement inrush resistor or diode
must stand. Everything is a bound from above: the worst phase, an empty first reservoir taken as a short (it stands some ten to
a thousand times the dropper's capacitance), the diodes at the drop they have at a small current, no resistance but what is
stated. It ends where its current comes to rest; what follows is the current the board runs on. Arrays (n,), one entry a
specimen, at the specimen's own crest.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchtool.physics import constants as known
from benchtool.physics.laws import Array, Flags
from benchtool.physics.specimens import Junction, Specimens

RATED_SURGE = 30.0
"""One-cycle surge of a 1 A rectifier diode, the 1N4007's class: the crest of one half sine [A]; value from memory."""
RATED_SURGE_SECONDS = 8.3e-3
"""Length of that half sine [s]: half a cycle of 60 Hz; value from memory."""
RATED_SURGE_I2T = RATED_SURGE**2 * RATED_SURGE_SECONDS / 2.0
"""What it lets through [A²s]: the square of a half sine is on average half its crest's. Analytic."""


@dataclass(frozen=True, slots=True)
class Surge:
    """One switch-on, each (n,): current's peak [A], time constant [s], energy [J] in all that stands in series and in the inrush
    resistor alone, and the I²t that the fuse and the rectifier see [A²s].

    Infinite is unlimited: the peak and I²t where nothing is stated in series, and everything but the peak where the dropper is
    shorted, so that current flows until something opens. All nil where the path is open.
    """

    peak: Array
    time_constant: Array
    energy: Array
    inrush_energy: Array
    i2t: Array

    @property
    def peak_ratio(self) -> Array:
        """Peak as a share of the diode's rated one [1], shape (n,). Hard on the diode: this surge is far shorter."""
        return self.peak / RATED_SURGE

    @property
    def i2t_ratio(self) -> Array:
        """I²t as a share of the diode's rated one [1], shape (n,). Kind to it: a junction heats sooner than its surroundings.

        The truth lies between the two: under 1 in both, the diode stands the surge; common practice, no source.
        """
        return self.i2t / RATED_SURGE_I2T


def first_surge(specimens: Specimens) -> Surge:
    """Switched on at the crest, the dropper discharged: the crest over everything in series [A, J, s], shape (n,)."""
    return _surge(specimens, specimens.crest)


def worst_surge(specimens: Specimens) -> Surge:
    """Switched on again at the crest while the dropper is charged to it the wrong way: twice the crest [A, J, s], shape (n,).

    ½·C·(2·crest)², as the published values take the worst inrush energy. Where nothing can hold a charge it is the first surge.
    """
    return _surge(specimens, np.where(_holds_charge(specimens), 2.0, 1.0) * specimens.crest)


def _surge(specimens: Specimens, volts: Array) -> Surge:
    """The RC switch-on: i = V/R·exp(−t/RC), its heat ½·C·V² whatever R is, its I²t that heat over R. Analytic."""
    connected = _connected(specimens)
    series = np.where(connected, specimens.series_resistance, 0.0)
    inrush = np.where(connected, specimens.inrush, 0.0)
    lasting = connected & np.isfinite(specimens.dropper_short)
    charged = np.where(connected, specimens.capacitance, 0.0)
    energy = np.where(lasting, np.inf, 0.5 * charged * volts**2)
    i2t = _over(energy, series)
    return Surge(
        peak=np.where(connected, _peak(specimens, volts), 0.0),
        time_constant=np.where(lasting, np.inf, series * charged),
        energy=energy,
        inrush_energy=np.multiply(inrush, i2t, out=np.zeros_like(i2t), where=inrush > 0.0),
        i2t=i2t,
    )


def _peak(specimens: Specimens, volts: Array) -> Array:
    """Current as the contact closes [A]: a capacitor is a short then, what stands across it carries only where there is none."""
    beyond = np.where(specimens.capacitance > 0.0, 0.0, specimens.parallel_resistance)
    drive = np.maximum(volts - known.DIODE_DROP * _junctions(specimens), 0.0)
    return _over(drive, specimens.series_resistance + beyond)


def _junctions(specimens: Specimens) -> Array:
    """How many junctions the surge passes at least, shape (n,): in a bridge two, else one; a shorted one drops nothing."""
    state = specimens.junction
    if specimens.shape.rectifier == "bridge":
        return np.where(state == Junction.SERIES_SHORT, 1.0, 2.0)
    shorted = (state == Junction.SERIES_SHORT) | (state == Junction.RETURN_SHORT)
    if specimens.shape.zener_at_node:
        shorted = shorted | np.isfinite(specimens.zener_short[0])
    return np.where(shorted, 0.0, 1.0)


def _connected(specimens: Specimens) -> Flags:
    return np.asarray(np.isfinite(specimens.series_resistance) & np.isfinite(specimens.rail_joint[0]))


def _holds_charge(specimens: Specimens) -> Flags:
    return np.asarray((specimens.capacitance > 0.0) & np.isinf(specimens.dropper_short))


def _over(value: Array, resistance: Array) -> Array:
    """`value` over `resistance`: nil of nothing, without a limit where there is no resistance."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(value > 0.0, value / resistance, 0.0)
