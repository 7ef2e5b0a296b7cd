"""Puts a dead board on a bench supply: what its rails come to rest at, with the mains unplugged.

Nothing changes in time here, so the node equations are followed to rest by backward Euler with ever longer
steps; at the last of them the capacitors carry nothing any more.
"""

from __future__ import annotations

import numpy as np

from tests.reference.circuit import Circuit, apply_fault
from tests.reference.network import Array, Network

STEPS = 2.0 ** np.arange(-20, 15)  # s, each step's length
TRIALS, REACH = 300, 0.5  # Newton's rounds in a step; V, the most in one
CLOSE, DRY = 1e-8, 1e-14  # V, A: a step ends where nothing moves, or no current is unaccounted for


def inject(circuit: Circuit, rail: str, clamp: float, limit: float) -> float:
    """Return the DC voltage [V] of `rail` on a bench supply of `clamp` [A] and `limit` [V], mains unplugged.

    The loads in `on` are on; gate loads rest, for there are no zero crossings. ArithmeticError where a step
    finds no end.
    """
    network = Network(apply_fault(circuit) | {"supply": (rail, clamp, limit)})
    volts = np.zeros(len(network.nodes))
    for step in STEPS:
        volts = _stepped(network, volts, float(step))
    return float(volts[network.index(rail)])


def _stepped(network: Network, before: Array, step: float) -> Array:
    """Return the node voltages [V] one backward step of `step` [s] after `before`.

    A node that turns back may go only half as far next time: the knees of a supply's limit and of
    a regulator are too sharp for Newton's method alone.
    """
    volts, inert = before, network.capacitance / step
    reach, last = np.full(len(before), REACH), np.zeros(len(before))
    for _ in range(TRIALS):
        missing = network.leaving(0.0, volts) + inert @ (volts - before)
        change = np.clip(np.linalg.solve(network.conductance(volts) + inert, -missing), -reach, reach)
        volts = volts + change
        if np.max(np.abs(change)) < CLOSE or np.max(np.abs(missing)) < DRY:
            return np.asarray(volts)
        reach = np.where(change * last < 0.0, 0.5 * reach, np.minimum(REACH, 1.3 * reach))
        last = change
    raise ArithmeticError(f"the board does not come to rest on the bench supply: a step of {step:g} s")
