"""The values parts are made in, because a computed value is no use until it is one that can be bought."""

from __future__ import annotations

import math

_E6 = (10, 15, 22, 33, 47, 68)
_E12 = tuple(sorted((*_E6, 12, 18, 27, 39, 56, 82)))
_E24 = tuple(sorted((*_E12, 11, 13, 16, 20, 24, 30, 36, 43, 51, 62, 75, 91)))
SERIES: dict[str, tuple[int, ...]] = {"E6": _E6, "E12": _E12, "E24": _E24}
"""Preferred values of one decade, as two figures (IEC 60063)."""


def nearest(value: float, series: str) -> tuple[float, float]:
    """The preferred values next below and next above a value [unit of value]; the same twice if it is one.

    series: "E6", "E12" or "E24". Raises ValueError for a value that is not positive and finite.
    """
    if not 0.0 < value < math.inf:
        raise ValueError(f"no preferred value is near {value!r}")
    decade = math.floor(math.log10(value)) - 1
    members = [float(f"{figures}e{decade + step}") for step in (-1, 0, 1) for figures in SERIES[series]]
    slack = 1e-9 * value  # a computed 6.8000000000000005e-07 is still 680 nF
    return max(m for m in members if m <= value + slack), min(m for m in members if m >= value - slack)
