"""Specimens on the bench: settled on demand, each switched state once."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np

from benchtool.physics import mean_value, waveform
from benchtool.physics.laws import Array
from benchtool.physics.sequence import METER_WINDOW, coordinate
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens, take

SETTLED_ARRAYS = tuple(field.name for field in fields(Settled) if field.name != "specimens")


class Bench:
    """Holds `specimens` and remembers what they settled to in each state asked for.

    A part of a bench takes its share of what the whole settled to, so that many hypotheses are solved in one pass. A crowd is
    settled no better than a meter reads it.
    """

    def __init__(
        self, specimens: Specimens, whole: Bench | None = None, where: slice = slice(None), *, crowd: bool = False
    ) -> None:
        self.specimens, self._crowd = specimens, crowd
        self._whole, self._where = whole, where
        self._settled: dict[tuple[frozenset[str], bool], Settled] = {}
        self._injected: dict[tuple[frozenset[str], int, float, float], Array] = {}

    def part(self, where: slice) -> Bench:
        """Some of the specimens, as a bench of their own."""
        return Bench(take(self.specimens, where), self, where)

    def settled(self, on: tuple[str, ...] | None = (), *, warm: bool = False) -> Settled:
        """The settled state with the switched loads `on` commanded on; `warm` after 15 minutes on."""
        key = (frozenset(on or ()), warm)
        if key not in self._settled:
            self._settled[key] = self._settle(tuple(on or ()), warm)
        return self._settled[key]

    def _settle(self, on: tuple[str, ...], warm: bool) -> Settled:
        if self._whole is None:
            effort = waveform.CROWD if self._crowd else waveform.FIGURES
            return waveform.settle(self.specimens, on, warm=warm, effort=effort)
        whole = self._whole.settled(on, warm=warm)
        arrays = {name: getattr(whole, name)[..., self._where] for name in SETTLED_ARRAYS}
        return replace(whole, specimens=self.specimens, **arrays)

    def injected(self, on: tuple[str, ...], rail: int, clamp: float, limit: float) -> Array:
        """Volts [V] on `rail` fed by a bench supply of `clamp` [A] and `limit` [V], unplugged; (n,), NaN where not solved."""
        key = (frozenset(on), rail, clamp, limit)
        if key not in self._injected:
            if self._whole is None:
                volts, solved = mean_value.injected(self.specimens, on, rail, clamp, limit)
                self._injected[key] = np.where(solved, volts, np.nan)
            else:
                self._injected[key] = self._whole.injected(on, rail, clamp, limit)[self._where]
        return self._injected[key]

    def chance(self) -> Array:
        """A coordinate evenly over 0 to 1 for what depends on the meter and not on the specimen, (n,)."""
        return coordinate(METER_WINDOW, self.specimens.count)
