"""The node equations of a netlist, as SciPy's stiff integrators want them.

C dv/dt = -i(v, t): every node has a stray capacitance, so that the capacitance matrix can be inverted and
the equations are an ODE without algebraic part. The stray of 50 pF moves at most 2 * V * 50 pF of charge
each half cycle (under 1 uA on a 100 V rail at 50 Hz). Exponentials go on as straight lines above `STEEPEST`
e-folds, far beyond any current of these boards, so that nothing overflows while the integrator tries a
step.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt

from tests.reference.circuit import COMMON, LOAD_KNEE, STRAY, Circuit, apply_fault, netlist

Array = npt.NDArray[np.float64]
LAWS = {"resistor": 1, "capacitor": 1, "junction": 3, "current": 1}  # law to how many values it has
STEEPEST = 12.0  # e-folds above a junction's marked current


class Network:
    """The matrices of one circuit; voltages are indexed as `nodes`, branches as `names` of their law."""

    def __init__(self, circuit: Circuit) -> None:
        """Build from a circuit dictionary, its fault applied."""
        circuit = apply_fault(circuit)
        net, mains = netlist(circuit), circuit["mains"]
        self.crest = math.sqrt(2.0) * mains["voltage"]
        self.omega = 2.0 * math.pi * mains["frequency"]
        ends = [node for branch in net.branches for node in (branch.plus, branch.minus)]
        ordered = dict.fromkeys([net.source[0], *ends, net.source[1]])
        self.nodes = [node for node in ordered if node != COMMON]
        self._index = {node: place for place, node in enumerate(self.nodes)}
        self._branches = net.branches
        self.names = {law: [b.name for b in net.branches if b.law == law] for law in LAWS}
        self.incidence = {law: self._incidence(law) for law in LAWS}
        self.values = {law: self._values(law) for law in LAWS}
        self.source_ohms = net.source[2]
        self.drive = self._row(net.source[1], net.source[0])  # where the line current enters and leaves
        self._assemble()

    def _row(self, plus: str, minus: str) -> Array:
        row = np.zeros(len(self.nodes))
        for node, sign in ((plus, 1.0), (minus, -1.0)):
            if node != COMMON:
                row[self._index[node]] += sign
        return row

    def _incidence(self, law: str) -> Array:
        rows = [self._row(b.plus, b.minus) for b in self._branches if b.law == law]
        return np.array(rows).reshape(len(rows), len(self.nodes))

    def _values(self, law: str) -> Array:
        values = [b.values for b in self._branches if b.law == law]
        return np.array(values).reshape(len(values), LAWS[law])

    def _assemble(self) -> None:
        caps, ohms = self.incidence["capacitor"], self.incidence["resistor"]
        capacitance = caps.T @ (self.values["capacitor"] * caps) + self._strays()
        conductance = ohms.T @ (ohms / self.values["resistor"])
        conductance += np.outer(self.drive, self.drive) / self.source_ohms
        self._inverse = np.linalg.inv(capacitance)
        self._linear = -self._inverse @ conductance
        self._push = -self._inverse @ self.drive * (self.crest / self.source_ohms)
        bends = np.vstack([self.incidence["junction"], self.incidence["current"]])
        self._bends, self._inject = bends, -self._inverse @ bends.T
        self._diodes = len(self.names["junction"])
        self._at_unit, self._knee, self._slope = self.values["junction"].T
        self._at_zero = self._at_unit * np.exp(-self._knee / self._slope)
        self._wanted = self.values["current"][:, 0]

    def _strays(self) -> Array:
        """Return a stray from every node to common, but from before the dropper to behind it."""
        rows = np.eye(len(self.nodes))
        rows[self._index["limited"], self._index["dropped"]] = -1.0
        return np.asarray(STRAY * rows.T @ rows)

    def mains(self, time: Any) -> Any:
        """Return the mains voltage [V] at `time` [s], line over the return line."""
        return self.crest * np.sin(self.omega * time)

    def line_current(self, time: Array, volts: Array) -> Array:
        """Return the current [A] through the inrush resistor; `volts` (nodes, times)."""
        return np.asarray((self.mains(time) + self.drive @ volts) / self.source_ohms)

    def junction_currents(self, across: Array) -> tuple[Array, Array]:
        """Return currents [A], conductances [S]; `across` (junctions,) or (junctions, times) [V]."""
        shape = (-1,) + (1,) * (across.ndim - 1)
        unit, knee, slope = (part.reshape(shape) for part in (self._at_unit, self._knee, self._slope))
        folds = (across - knee) / slope
        steep = unit * np.exp(np.minimum(folds, STEEPEST))
        current = steep * (1.0 + np.maximum(folds - STEEPEST, 0.0)) - self._at_zero.reshape(shape)
        return current, steep / slope

    def load_currents(self, across: Array) -> tuple[Array, Array]:
        """Return currents [A] and conductances [S] of the current loads, zero below 0 V."""
        wanted = self._wanted.reshape((-1,) + (1,) * (across.ndim - 1))
        bent = np.tanh(np.maximum(across, 0.0) / LOAD_KNEE)
        return wanted * bent, wanted * (1.0 - bent * bent) * (across > 0.0) / LOAD_KNEE

    def slope(self, time: float, volts: Array) -> Array:
        """Return dv/dt [V/s] of every node."""
        across = self._bends @ volts
        junctions, _ = self.junction_currents(across[: self._diodes])
        loads, _ = self.load_currents(across[self._diodes :])
        bent = self._inject @ np.concatenate([junctions, loads])
        return np.asarray(self._linear @ volts + bent + self._push * math.sin(self.omega * time))

    def jacobian(self, time: float, volts: Array) -> Array:
        """Return the derivative of `slope` by the node voltages [1/s]."""
        across = self._bends @ volts
        _, junctions = self.junction_currents(across[: self._diodes])
        _, loads = self.load_currents(across[self._diodes :])
        return np.asarray(self._linear + (self._inject * np.concatenate([junctions, loads])) @ self._bends)

    def across(self, law: str, volts: Array) -> Array:
        """Return the voltages [V] (branches, times) over all branches of one law."""
        return np.asarray(self.incidence[law] @ volts)

    def index(self, node: str) -> int:
        """Return the place of a node in the voltages."""
        return self._index[node]
