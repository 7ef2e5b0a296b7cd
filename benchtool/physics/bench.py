"""Specimens on the bench: settled on demand, each switched state once, and no more of them than somebody asks about."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import mean_value, waveform
from benchtool.physics.laws import Array, Flags
from benchtool.physics.sequence import METER_WINDOW, coordinate
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens, concatenate, take

SETTLED_ARRAYS = tuple(field.name for field in fields(Settled) if field.name != "specimens")


class Bench:
    """Holds `specimens` and remembers what they settled to in each state asked for.

    A crowd is settled no better than a meter reads it. Where only some specimens are asked about (`where`, (n,)), the others'
    figures are nil and not converged until somebody asks about them; what each settles to hangs on no other.
    """

    def __init__(self, specimens: Specimens, *, crowd: bool = False) -> None:
        self.specimens, self._crowd = specimens, crowd
        self._settled: dict[tuple[frozenset[str], bool], Settled] = {}
        self._injected: dict[tuple[frozenset[str], int, float, float], Array] = {}
        self._done: dict[object, Flags] = {}

    def settled(self, on: tuple[str, ...] | None = (), *, warm: bool = False, where: Flags | None = None) -> Settled:
        """The settled state with the switched loads `on` commanded on; `warm` after 15 minutes on."""
        key = (frozenset(on or ()), warm)
        index = self._missing(key, where)
        if index.size:
            effort = waveform.CROWD if self._crowd else waveform.FIGURES
            part = waveform.settle(self._those(index), tuple(on or ()), warm=warm, effort=effort)
            arrays: dict[str, Any] = {name: getattr(part, name) for name in SETTLED_ARRAYS}
            kept = self._settled.get(key)
            if kept is None:
                blank = {name: self._blank(array) for name, array in arrays.items()}
                kept = self._settled[key] = replace(part, specimens=self.specimens, **blank)
            for name, array in arrays.items():
                getattr(kept, name)[..., index] = array
        return self._settled[key]

    def injected(
        self, on: tuple[str, ...], rail: int, clamp: float, limit: float, *, where: Flags | None = None
    ) -> Array:
        """Volts [V] on `rail` fed by a bench supply of `clamp` [A] and `limit` [V], unplugged; (n,), NaN where not solved."""
        key = (frozenset(on), rail, clamp, limit)
        index = self._missing(key, where)
        if index.size:
            volts, solved = mean_value.injected(self._those(index), on, rail, clamp, limit)
            kept = self._injected.setdefault(key, np.full(self.specimens.count, np.nan))
            kept[index] = np.where(solved, volts, np.nan)
        return self._injected[key]

    def extended(self, more: Specimens) -> Bench:
        """A bench with `more` specimens behind these, of which it knows what this one has found out by now."""
        longer = Bench(concatenate([self.specimens, more]), crowd=self._crowd)

        def padded(array: NDArray[Any]) -> NDArray[Any]:
            return np.concatenate([array, np.zeros((*array.shape[:-1], more.count), dtype=array.dtype)], axis=-1)

        for key, settled in self._settled.items():
            arrays: dict[str, Any] = {name: padded(getattr(settled, name)) for name in SETTLED_ARRAYS}
            longer._settled[key] = replace(settled, specimens=longer.specimens, **arrays)
        longer._injected = {key: padded(volts) for key, volts in self._injected.items()}
        longer._done = {key: padded(done) for key, done in self._done.items()}
        return longer

    def chance(self) -> Array:
        """A coordinate evenly over 0 to 1 for what depends on the meter and not on the specimen, (n,)."""
        return coordinate(METER_WINDOW, self.specimens.count)

    def _missing(self, key: object, where: Flags | None) -> NDArray[np.intp]:
        """Those asked about that are not yet known; from now on they count as known."""
        done = self._done.setdefault(key, np.zeros(self.specimens.count, dtype=bool))
        index = np.flatnonzero(~done if where is None else where & ~done)
        done[index] = True
        return index

    def _those(self, index: NDArray[np.intp]) -> Specimens:
        return self.specimens if index.size == self.specimens.count else take(self.specimens, index)

    def _blank(self, like: NDArray[Any]) -> NDArray[Any]:
        return np.zeros((*like.shape[:-1], self.specimens.count), dtype=like.dtype)
