"""Ripple by charge: how far a reservoir falls while the rectifier rests. An estimate, within about a third.

Two parts add up. The loads draw the reservoir down while the supply gives less than they take; and a conducting zener goes on
discharging it along its exponential law. The settled cycle gives the figure
itself; this one serves where crowds of specimens are compared with a reading.
"""

from __future__ import annotations

import numpy as np

from benchtool.physics import constants as known
from benchtool.physics.laws import Array, Flags
from benchtool.physics.specimens import Junction, Specimens

UNCERTAIN = 0.35
"""Share by which the estimate may be off."""
RESTS_BRIDGE, RESTS_HALF = 0.15, 0.55
"""Part of a mains cycle during which the rectifier gives less than its mean: charge balance of |sin| and of a half sine."""
SMOOTH = 0.05
"""Ripple under this share of the rail leaves its mean to the balance of mean values."""


def rests(specimens: Specimens) -> Array:
    """Seconds per pulse during which the reservoir stands alone [s], (n,)."""
    part = np.where(full_wave(specimens), RESTS_BRIDGE, RESTS_HALF)
    return np.asarray(part / specimens.frequency)


def full_wave(specimens: Specimens) -> Flags:
    """Where both half cycles charge the first rail; bool (n,)."""
    both = specimens.shape.rectifier == "bridge"
    return np.asarray(both & (specimens.junction == Junction.GOOD))


def ripple_estimate(specimens: Specimens, rails: Array, supply: Array, zener_current: Array) -> Array:
    """Peak-to-peak ripple [V] at every rail's terminals, (rails, n); bounded by the rail itself."""
    ripple = np.zeros_like(rails)
    pulse = np.where(full_wave(specimens), np.pi / 2.0, np.pi) * supply
    seconds = rests(specimens)
    for index, rail in enumerate(specimens.shape.rails):
        capacitance = np.maximum(specimens.reservoir[index], 1e-12)
        into = supply if index == 0 or rail.fed_through == "zener" else np.zeros_like(supply)
        draws = np.maximum(into - zener_current[index], 0.0)
        by_loads = draws * seconds * _deficit(draws, into, specimens) / capacitance
        conducts = np.where(zener_current[index] > known.REGULATES_FROM, pulse, 0.0) * (into > 0.0)
        slope = known.ZENER_SLOPE * _stacked_zeners(specimens, index)
        by_zener = slope * np.log1p(conducts * seconds / (slope * capacitance))
        esr = pulse * np.minimum(specimens.esr[index], 1e3) * (into > 0.0)
        ripple[index] = np.minimum(by_loads + by_zener + np.minimum(esr, by_loads + by_zener), np.maximum(rails[index], 0.0))
    return ripple


def _deficit(draws: Array, into: Array, specimens: Specimens) -> Array:
    """How much of the load's charge the reservoir has to give while the source rests, as a share of draws·rests."""
    loaded = np.clip(draws / np.maximum(into, 1e-12), 0.0, 1.0)
    return np.where(full_wave(specimens), 0.7, 1.0) * np.maximum(loaded, 0.3)


def _stacked_zeners(specimens: Specimens, index: int) -> float:
    count, rail = 1.0, specimens.shape.rails[index]
    while rail.clamps_to >= 0:
        rail = specimens.shape.rails[rail.clamps_to]
        count += 1.0
    return count


def sagged(rails: Array, ripple: Array, zener_current: Array) -> Array:
    """Mean rail voltages [V] once a zener clips the crests of a rail that is not smooth: half the ripple under the crest."""
    share = ripple / np.maximum(np.abs(rails), 1e-9)
    clipped = (share > SMOOTH) & (zener_current > known.REGULATES_FROM)
    return np.where(clipped, rails - (ripple - SMOOTH * np.abs(rails)) / 2.0, rails)
