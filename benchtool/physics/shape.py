"""A board's shape: what is connected to what, by index. Every specimen of a board shares it.

The one value in it is the length of a gate pulse, which no tolerance touches.
"""

from __future__ import annotations

from dataclasses import dataclass

from benchtool.board import COMMON, Board, Load, Rail

TO_COMMON = -1
"""Index that stands for common where a rail's index could stand."""


@dataclass(frozen=True, slots=True)
class RailShape:
    """One rail: `parent` and `fed_through` tell its feed (the rectifier's rail has neither), `clamps_to` its zener's foot."""

    parent: int
    fed_through: str | None
    has_zener: bool
    clamps_to: int


@dataclass(frozen=True, slots=True)
class LoadShape:
    """One load between the rails `rail` and `returns_to`; `pulse` is the length of a gate pulse [s]."""

    name: str
    kind: str
    rail: int
    returns_to: int
    switched: bool
    pulse: float


@dataclass(frozen=True, slots=True)
class Shape:
    """The circuit."""

    rectifier: str
    dropper: str
    rails: tuple[RailShape, ...]
    loads: tuple[LoadShape, ...]

    @property
    def zener_at_node(self) -> bool:
        """Whether the first rail's zener stands at the dropper node, before the series diode."""
        return self.rectifier == "half-wave-zener"

    def commanded(self, on: tuple[str, ...]) -> tuple[bool, ...]:
        """For each load, whether it is meant to draw when the switched loads named in `on` are commanded on."""
        return tuple(not load.switched or load.name in on for load in self.loads)


def shape_of(board: Board) -> Shape:
    """The shape of `board`, whose references have been checked."""

    def node(name: str) -> int:
        return TO_COMMON if name == COMMON else board.rail_index(name)

    def rail_shape(index: int, rail: Rail) -> RailShape:
        parent = TO_COMMON if index == 0 else board.rail_index(rail.fed_by)
        foot = TO_COMMON if rail.zener is None else node(rail.zener.clamps_to)
        return RailShape(parent, rail.fed_through, rail.zener is not None, foot)

    def load_shape(load: Load) -> LoadShape:
        return LoadShape(load.name, load.kind, node(load.rail), node(load.returns_to), load.switched, load.pulse or 0.0)

    return Shape(
        rectifier=board.rectifier,
        dropper=board.dropper.kind,
        rails=tuple(rail_shape(index, rail) for index, rail in enumerate(board.rails)),
        loads=tuple(load_shape(load) for load in board.loads),
    )
