"""What a reading is foretold from, and what is foretold: the two records every entry of `shows.SHOWS` stands between."""

from __future__ import annotations

from dataclasses import dataclass, field

from benchtool.board import Board
from benchtool.observed import Check, Meter
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, Flags
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens


@dataclass(frozen=True, slots=True)
class Shown:
    """What a reading shows. Numbers: `value`, `error` (one sigma of the physics), (n,), with words by `opened`, `shorted`.

    Words only: `chances`, word → (n,), adding up to one.
    """

    value: Array | None = None
    error: Array | float = 0.0
    opened: Flags | None = None
    shorted: Flags | None = None
    chances: dict[str, Array] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class View:
    """A check as it is made: on which specimens, on what board, by which meter. `where` (n,): those that count, if not all."""

    bench: Bench
    board: Board
    check: Check
    meter: Meter
    where: Flags | None = None

    @property
    def specimens(self) -> Specimens:
        """The specimens on the bench."""
        return self.bench.specimens

    @property
    def warm(self) -> bool:
        """Whether the board has been on for 15 minutes."""
        return self.check.when == "warm"

    @property
    def settled(self) -> Settled:
        """The settled state in which the check is made."""
        return self.bench.settled(self.check.on, warm=self.warm, where=self.where)

    @property
    def rail(self) -> int:
        """Index of the rail, the first where none is named."""
        return self.board.rail_index(self.check.rail or self.board.rails[0].name)

    @property
    def load(self) -> int:
        """Index of the load."""
        return [load.name for load in self.board.loads].index(self.check.load or "")
