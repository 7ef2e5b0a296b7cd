"""What the mains, the dropper and the rectifier deliver into the first rail standing at a given voltage: mean values.

Charge balance per half cycle (see `laws`). Everything resistive across the dropper carries its share in quadrature, so an open
dropper leaves its bleeder feeding the board, and a resistor dropper is the case without a capacitor.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchtool.physics import constants as known
from benchtool.physics import laws
from benchtool.physics.laws import Array, Flags
from benchtool.physics.specimens import Junction, Specimens

STEP = 1e-3
"""Voltage step for the supply's slope [V]."""


@dataclass(frozen=True, slots=True)
class Feed:
    """What reaches the rectifier, independent of the rail: kept once per solution. Arrays (n,); `share`: of full-wave current.

    `crest` [V], `capacitance` [F] and `series` [ohm] are those of a divider's equivalent where the dropper is one.
    """

    specimens: Specimens
    crest: Array
    capacitance: Array
    series: Array
    parallel: Array
    connected: Flags
    share: Array
    blocked_by_dc: Flags


def feed_of(specimens: Specimens) -> Feed:
    """The mains side of `specimens`."""
    series = specimens.series_resistance
    connected = np.isfinite(series) & np.isfinite(specimens.rail_joint[0])
    both = specimens.capacitance + specimens.shunt
    divides = np.where(specimens.shunt > 0.0, specimens.capacitance / np.maximum(both, 1e-18), 1.0)
    shorted = np.isfinite(specimens.shunt_short)
    return Feed(
        specimens=specimens,
        crest=np.where(shorted, 0.0, specimens.crest * divides),
        capacitance=both,
        series=np.where(connected, series, 1.0) * divides**2,
        parallel=specimens.parallel_resistance,
        connected=connected,
        share=_share(specimens),
        blocked_by_dc=_blocked(specimens),
    )


def _share(specimens: Specimens) -> Array:
    """Share of a full-wave supply's current that the rectifier, in its state, passes on to the first rail."""
    state = specimens.junction
    if specimens.shape.rectifier == "bridge":
        return np.select([state == Junction.GOOD, state == Junction.SERIES_SHORT], [1.0, 0.5], 0.0)
    good = state == Junction.GOOD
    if specimens.shape.zener_at_node:
        good = good & np.isfinite(specimens.zener[0]) & ~np.isfinite(specimens.zener_short[0])
    return np.where(good, 0.5, 0.0)


def _blocked(specimens: Specimens) -> Flags:
    """Where current can pass one way only, so that the dropper charges to the crest and blocks; bool (n,)."""
    state = specimens.junction
    if specimens.shape.rectifier == "bridge":
        return np.asarray(state == Junction.SERIES_OPEN)
    if specimens.shape.zener_at_node:
        no_return = np.isinf(specimens.zener[0]) & np.isinf(specimens.zener_short[0])
        return np.asarray(no_return & (state == Junction.GOOD))
    return np.asarray(state == Junction.RETURN_OPEN)


def half_swing(specimens: Specimens, rail: Array) -> Array:
    """Half the swing of the rectifier's input with the first rail at `rail` [V]; shape (n,)."""
    drop = known.DIODE_DROP
    if specimens.shape.rectifier != "bridge":
        return (rail + 2.0 * drop) / 2.0
    return np.where(specimens.junction == Junction.SERIES_SHORT, (rail + 2.0 * drop) / 2.0, rail + 2.0 * drop)


def _threshold(specimens: Specimens, rail: Array) -> Array:
    """Voltage from which a resistive path conducts into the first rail [V]."""
    drops = 2.0 if specimens.shape.rectifier == "bridge" else 1.0
    return rail + drops * known.DIODE_DROP


def supply_current(feed: Feed, rail: Array) -> tuple[Array, Array]:
    """Mean current [A] into the first rail standing at `rail` [V], and its slope [S]; both (n,)."""
    current = _current(feed, rail)
    return current, (_current(feed, rail + STEP) - current) / STEP


def _current(feed: Feed, rail: Array) -> Array:
    specimens = feed.specimens
    swing, threshold = half_swing(specimens, rail), _threshold(specimens, rail)
    capacitive = laws.capacitor_current(
        feed.crest, specimens.frequency, feed.capacitance, feed.series, np.maximum(swing, 0.0)
    )
    resistance = feed.parallel + feed.series
    resistive = laws.resistor_current(feed.crest, resistance, np.maximum(threshold, 0.0))
    blocked = np.maximum(feed.crest - threshold, 0.0) / resistance
    alternating = feed.share * np.hypot(capacitive, resistive)
    return np.where(feed.connected, np.where(feed.blocked_by_dc, blocked, alternating), 0.0)


def line_current(feed: Feed, rail: Array) -> Array:
    """Current in the mains lead [A RMS] with the first rail at `rail` [V]; (n,)."""
    specimens = feed.specimens
    swing = np.maximum(half_swing(specimens, rail), 0.0)
    crest = laws.crest_factor_k(feed.series, feed.capacitance, specimens.frequency) * feed.crest
    capacitive = laws.capacitor_line_current(crest, specimens.frequency, feed.capacitance, swing)
    resistive = laws.resistor_line_current(feed.crest, feed.parallel + feed.series, swing)
    return np.where(feed.connected & ~feed.blocked_by_dc, np.hypot(capacitive, resistive), 0.0)
