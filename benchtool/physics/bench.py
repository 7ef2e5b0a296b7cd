"""Specimens on the bench: settled on demand, each switched state once."""

from __future__ import annotations

from benchtool.physics.laws import Array
from benchtool.physics.mean_value import settle
from benchtool.physics.sequence import points
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens


class Bench:
    """Holds `specimens` and remembers what they settled to in each state asked for."""

    def __init__(self, specimens: Specimens) -> None:
        self.specimens = specimens
        self._settled: dict[tuple[frozenset[str], bool], Settled] = {}

    def settled(self, on: tuple[str, ...] | None = (), *, warm: bool = False) -> Settled:
        """The settled state with the switched loads `on` commanded on; `warm` after 15 minutes on."""
        key = (frozenset(on or ()), warm)
        if key not in self._settled:
            self._settled[key] = settle(self.specimens, tuple(on or ()), warm=warm)
        return self._settled[key]

    def chance(self) -> Array:
        """A coordinate evenly over 0 to 1 for what depends on the meter and not on the specimen, (n,)."""
        return points(1, self.specimens.count)[0]
