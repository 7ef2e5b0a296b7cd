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

from tests.reference.circuit import COMMON, LOAD_KNEE, Branch, Circuit, Regulator, apply_fault, netlist

Array = npt.NDArray[np.float64]
LAWS = {  # law to how many values it has
    "resistor": 1, "capacitor": 1, "junction": 3, "current": 1, "gate": 2, "supply": 2,
}  # fmt: skip
BENT = ("junction", "current", "gate", "supply")  # the laws that are not straight lines
STRAY = 50e-12  # F at every node
STEEPEST = 12.0  # e-folds above a junction's marked current
LIMIT_KNEE = 1e-3  # V below its voltage limit at which a bench supply leaves its current limit
TARGET_KNEE = 5e-3  # V, how round the corners are between a regulator's regions
PASS_CONDUCTANCE, PASS_KNEE = 20.0, 2e-4  # S, V: a regulator's output resistance; no current backwards


class Network:
    """The matrices of one circuit; voltages are indexed as `nodes`, branches as `names` of their law.

    `firing` (per gate load) is 1 while it draws, 0 between; whoever integrates sets it.
    """

    def __init__(self, circuit: Circuit) -> None:
        """Build from a circuit dictionary, its fault applied."""
        circuit = apply_fault(circuit)
        net, mains = netlist(circuit), circuit["mains"]
        self.crest = 0.0 if "supply" in circuit else math.sqrt(2.0) * mains["voltage"]
        self.omega = 2.0 * math.pi * mains["frequency"]
        self.firing: float | Array = 0.0
        parts: list[Branch | Regulator] = [*net.branches, *net.regulators]
        ends = [node for part in parts for node in (part.plus, part.minus)]
        ordered = dict.fromkeys([net.source[0], "dropped", *ends, net.source[1]])
        self.nodes = [node for node in ordered if node != COMMON]
        self._index = {node: place for place, node in enumerate(self.nodes)}
        self._branches = net.branches
        self.names = {law: [b.name for b in net.branches if b.law == law] for law in LAWS}
        self.incidence = {law: self._incidence(law) for law in LAWS}
        self.values = {law: self._values(law) for law in LAWS}
        self.source_ohms = net.source[2]
        self.drive = self._row(net.source[1], net.source[0])  # where the line current enters and leaves
        self._enter = self._rows([self._row(part.plus, COMMON) for part in net.regulators])
        self._leave = self._rows([self._row(part.minus, COMMON) for part in net.regulators])
        self._regulators = np.array([part.values for part in net.regulators]).reshape(-1, 3).T
        self._assemble()

    def _row(self, plus: str, minus: str) -> Array:
        row = np.zeros(len(self.nodes))
        for node, sign in ((plus, 1.0), (minus, -1.0)):
            if node != COMMON:
                row[self._index[node]] += sign
        return row

    def _rows(self, rows: list[Array]) -> Array:
        return np.array(rows).reshape(len(rows), len(self.nodes))

    def _incidence(self, law: str) -> Array:
        return self._rows([self._row(b.plus, b.minus) for b in self._branches if b.law == law])

    def _values(self, law: str) -> Array:
        values = [b.values for b in self._branches if b.law == law]
        return np.array(values).reshape(len(values), LAWS[law])

    def _assemble(self) -> None:
        caps, ohms = self.incidence["capacitor"], self.incidence["resistor"]
        self.capacitance = caps.T @ (self.values["capacitor"] * caps) + self._strays()
        self._inverse = np.linalg.inv(self.capacitance)
        self._straight = ohms.T @ (ohms / self.values["resistor"])
        self._straight += np.outer(self.drive, self.drive) / self.source_ohms
        self._push = self.drive * (self.crest / self.source_ohms)
        self._bends = np.vstack([self.incidence[law] for law in BENT])
        counts = np.cumsum([len(self.names[law]) for law in BENT])
        self._parts = [slice(low, high) for low, high in zip([0, *counts], counts, strict=False)]
        self._at_unit, self._knee, self._slope = self.values["junction"].T
        self._at_zero = self._at_unit * np.exp(-self._knee / self._slope)

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

    def load_currents(self, law: str, across: Array) -> tuple[Array, Array]:
        """Return currents [A] and conductances [S] of `current` or firing `gate` loads, zero below 0 V."""
        wanted = self.values[law][:, 0].reshape((-1,) + (1,) * (across.ndim - 1))
        bent = np.tanh(np.maximum(across, 0.0) / LOAD_KNEE)
        return wanted * bent, wanted * (1.0 - bent * bent) * (across > 0.0) / LOAD_KNEE

    def _supply_currents(self, across: Array) -> tuple[Array, Array]:
        """Return minus what a bench supply gives [A], and its conductance [S]."""
        amps, volts = self.values["supply"].T
        bent = np.tanh(np.maximum(volts - across, 0.0) / LIMIT_KNEE)
        return -amps * bent, amps * (1.0 - bent * bent) * (across < volts) / LIMIT_KNEE

    def _bent(self, volts: Array) -> tuple[Array, Array]:
        """Return currents [A] and conductances [S] of all branches of the laws in `BENT`."""
        across = self._bends @ volts
        junction, current, gate, supply = (across[part] for part in self._parts)
        gates, stiffness = self.load_currents("gate", gate)
        pairs = (
            self.junction_currents(junction),
            self.load_currents("current", current),
            (self.firing * gates, self.firing * stiffness),
            self._supply_currents(supply),
        )
        return np.concatenate([pair[0] for pair in pairs]), np.concatenate([pair[1] for pair in pairs])

    def regulator_currents(self, volts: Array) -> tuple[Array, Array, Array]:
        """Return currents passed on, ground currents [A], and power lost [W] of the regulators.

        `volts` (nodes, times). The output is driven to min(set voltage, input - dropout), never below zero.
        """
        enter, leave = self._enter @ volts, self._leave @ volts
        passed, ground, *_ = self._regulate(enter, leave, self._regulators[:, :, None])
        return passed, ground, (enter - leave) * passed + enter * ground

    def _regulate(self, enter: Array, leave: Array, values: Array) -> tuple[Array, ...]:
        """Return passed and ground currents [A], d passed / d enter and / d leave, d ground / d enter [S]."""
        volts, dropout, amps = values
        over = (volts - enter + dropout) / TARGET_KNEE
        least = volts / TARGET_KNEE - np.logaddexp(0.0, over)
        target = TARGET_KNEE * np.logaddexp(0.0, least)
        wanting = (target - leave) / PASS_KNEE
        passed = PASS_CONDUCTANCE * PASS_KNEE * np.logaddexp(0.0, wanting)
        by_target = PASS_CONDUCTANCE * _rising(wanting)
        bent = np.tanh(np.maximum(enter, 0.0) / LOAD_KNEE)
        by_enter = amps * (1.0 - bent * bent) * (enter > 0.0) / LOAD_KNEE
        return passed, amps * bent, by_target * _rising(least) * _rising(over), -by_target, by_enter

    def leaving(self, time: float, volts: Array) -> Array:
        """Return the current [A] that leaves every node through all but the capacitors."""
        currents, _ = self._bent(volts)
        leaving = self._straight @ volts + currents @ self._bends + self._push * math.sin(self.omega * time)
        if self._enter.size:
            passed, ground, *_ = self._regulate(self._enter @ volts, self._leave @ volts, self._regulators)
            leaving = leaving + passed @ (self._enter - self._leave) + ground @ self._enter
        return np.asarray(leaving)

    def conductance(self, volts: Array) -> Array:
        """Return the derivative of `leaving` by the node voltages [S]."""
        _, conductances = self._bent(volts)
        found = self._straight + (self._bends.T * conductances) @ self._bends
        if self._enter.size:
            *_, inward, outward, ground = self._regulate(
                self._enter @ volts, self._leave @ volts, self._regulators
            )
            across = (self._enter - self._leave).T
            found = found + (across * inward + self._enter.T * ground) @ self._enter
            found = found + (across * outward) @ self._leave
        return np.asarray(found)

    def slope(self, time: float, volts: Array) -> Array:
        """Return dv/dt [V/s] of every node."""
        return np.asarray(-self._inverse @ self.leaving(time, volts))

    def jacobian(self, time: float, volts: Array) -> Array:
        """Return the derivative of `slope` by the node voltages [1/s]."""
        return np.asarray(-self._inverse @ self.conductance(volts))

    def across(self, law: str, volts: Array) -> Array:
        """Return the voltages [V] (branches, times) over all branches of one law."""
        return np.asarray(self.incidence[law] @ volts)

    def index(self, node: str) -> int:
        """Return the place of a node in the voltages."""
        return self._index[node]


def _rising(folds: Array) -> Array:
    """Return the derivative of log(1 + e^x)."""
    return np.asarray(0.5 * (1.0 + np.tanh(folds / 2.0)))
