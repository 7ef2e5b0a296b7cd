"""Whether a load runs: what `load-responds` shows, and what a complaint is about."""

from __future__ import annotations

import numpy as np

from benchtool.board import Board, Unknown, nominal_voltage
from benchtool.physics import constants as known
from benchtool.physics.bench import Bench
from benchtool.physics.laws import Array, Flags, copper_ratio
from benchtool.physics.network import COIL_WARM_KELVIN
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Switch


def runs(
    bench: Bench, board: Board, load: int, on: tuple[str, ...], *, warm: bool = False, where: Flags | None = None
) -> tuple[Array, Array]:
    """Chance that load `load` runs with the loads `on` commanded on, itself among them, and that it runs unasked, each (n,).

    A switched load needs the controller alive, its transistor and voltage enough; see the case format's section 4. `where` (n,):
    the specimens that count.
    """
    specimens, record, settled = bench.specimens, board.loads[load], bench.settled(on, warm=warm, where=where)
    enough_on = _enough(settled, board, load, warm)
    if not record.switched:
        return enough_on, np.zeros(specimens.count)
    switch = specimens.switch[load]
    lives = _controller_lives(settled, board)
    stuck = switch == Switch.STUCK
    meant_chance = np.where(stuck, enough_on, np.where(switch == Switch.OPEN, 0.0, enough_on * lives))
    asleep = stuck if where is None else stuck & where
    if not asleep.any():
        return meant_chance, np.zeros(specimens.count)
    unasked = _enough(bench.settled((), warm=warm, where=asleep), board, load, warm)
    return meant_chance, np.where(stuck, unasked, 0.0)


def _enough(settled: Settled, board: Board, load: int, warm: bool) -> Array:
    """Whether the load gets voltage enough to act in the troughs of the ripple too, 0 or 1, (n,)."""
    specimens, record = settled.specimens, board.loads[load]
    voltage = settled.load_voltage[load] - settled.ripple_pp[board.rail_index(record.rail)] / 2.0
    intact = specimens.load_open[load] == 0.0
    if record.kind == "coil":
        nominal = record.nominal_voltage or float(nominal_voltage(board, board.rail(record.rail)) or 0.0)
        pull_in = specimens.pull_in[load] * nominal * (float(copper_ratio(25.0 + COIL_WARM_KELVIN)) if warm else 1.0)
        return np.asarray(intact & (voltage >= pull_in), dtype=float)
    if record.kind == "led":
        return np.asarray(intact & (voltage >= known.LED_LIGHTS_FROM * specimens.load_forward[load]), dtype=float)
    return np.asarray(intact & (voltage >= _alive_from(board, board.rail_index(record.rail))), dtype=float)


def _alive_from(board: Board, rail: int) -> float:
    """Volts on rail `rail` above which a controller lives: 60 % of its zener, or of what its regulator holds, or 4 V."""
    zener, regulated = board.rails[rail].zener, board.rails[rail].regulated_voltage
    held = regulated if zener is None else zener.voltage
    if held is None or isinstance(held, Unknown):
        return known.LIVES_FROM_VOLTS
    return min(known.LIVES_FROM_SHARE * held, known.LIVES_FROM_VOLTS)


def _controller_lives(settled: Settled, board: Board) -> Array:
    controllers = [load for load in board.loads if load.kind == "current"]
    if not controllers:
        return np.ones(settled.specimens.count)
    index = board.rail_index(controllers[0].rail)
    return np.asarray(settled.rail_voltage[index] >= _alive_from(board, index), dtype=float)
