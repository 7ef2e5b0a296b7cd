"""Finds the periodic steady state of a circuit: the voltages that come back after one mains cycle.

The integrator is SciPy's Radau (implicit, fifth order) with an analytic Jacobian. Only the reservoirs and
the capacitors of the dropper remember anything from cycle to cycle; the map from their voltages at one
crossing to those at the next is solved for its fixed point by Newton's method. Its derivative comes from
the variational equation along the path, so that slow rails need no hundreds of cycles, and the last step,
being what is still missing, says whether the answer stands still.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from scipy.integrate import solve_ivp

from tests.reference.circuit import COMMON, OPEN, Circuit, apply_fault
from tests.reference.network import Array, Network

TOLERANCE = 1e-6  # relative, and in volts
COARSE = 1e-4  # likewise, while the steady state is far
NEAR = 2e-3  # of a voltage, or volts: what may be missing where the search goes on in earnest
ENOUGH = 2e-6  # likewise, where the search ends
ROUNDS = 60  # mains cycles at most
STRIDE = 50.0  # cycles ahead, where a reservoir changes at a constant rate
NOISE = 1e-5  # V in a cycle, under which it is not told whether a rail fills or empties
NARROW = 2e-3  # of a voltage, or volts: fill and empty that near may be owed to another rail
STALLED = 8  # cycles without getting nearer, after which a near search is at the integrator's noise


class Runner:
    """Integrates one network cycle by cycle from a phase at which its rectifier surely conducts."""

    def __init__(self, circuit: Circuit, tolerance: float = TOLERANCE) -> None:
        """Prepare the network, the slow coordinates and how each is shifted."""
        self.circuit = apply_fault(circuit)
        self.network = Network(self.circuit)
        self.tolerance = tolerance
        self.period = 2.0 * np.pi / self.network.omega
        names = self.network.names["capacitor"]
        self.start = 0.0 if "dropper" in names else self.period / 4.0  # where the line current has its crest
        self.slow = self.network.incidence["capacitor"]
        self.slow_names = [name.removeprefix("reservoir:") for name in names]
        self.lift = np.array([self._lift(name) for name in names]).reshape(len(names), -1).T
        self.edges = self._edges()

    def _lift(self, name: str) -> Array:
        """Return by what all nodes shift when one capacitor's voltage is raised by one volt."""
        rail = name.removeprefix("reservoir:")
        nodes = {"dropper": ["limited"], "shunt": ["limited", "dropped"]}.get(name, [rail, f"inside {rail}"])
        return np.array([float(node in nodes) for node in self.network.nodes])

    def _edges(self) -> list[tuple[float, float, Array]]:
        """Return begin, end [s] and firing (gates,) of the pieces between the edges of the gate pulses.

        A pulse begins at each zero crossing of the mains.
        """
        pulses, half = self.network.values["gate"][:, 1], self.period / 2.0
        marks = [k * half + late for k in range(4) for late in (0.0, *pulses)] if pulses.size else []
        inner = {round(t - self.start, 12) for t in marks if 1e-9 < t - self.start < self.period - 1e-9}
        times = self.start + np.array([0.0, *sorted(inner), self.period])
        middles = (times[1:] + times[:-1]) / 2.0 % half
        fired = [np.asarray(middle < pulses, dtype=np.float64) for middle in middles]
        return list(zip(times[:-1], times[1:], fired, strict=True))

    def guess(self) -> Array:
        """Return node voltages [V] near a loaded, regulating board."""
        volts = np.zeros(len(self.network.nodes))
        if self.network.source_ohms >= OPEN:
            return volts  # nothing feeds the board: its reservoirs are empty
        for place, node in enumerate(self.network.nodes):
            volts[place] = 0.95 * self.regulated(node.removeprefix("inside "))
        return volts

    def regulated(self, rail: str) -> float:
        """Return the voltage [V] a rail is held at, zero where nothing holds it."""
        found = {r["name"]: r for r in self.circuit["board"]["rail"]}.get(rail, {})
        zener = found.get("zener")
        below = self.regulated(zener.get("clamps_to", COMMON)) if zener else 0.0
        return zener["voltage"] + below if zener else float(found.get("regulated_voltage", 0.0))

    def pieces(self, volts: Array, tolerance: float, times: Array | None = None) -> Iterator[Any]:
        """Integrate one cycle; yield SciPy's result for each piece, at `times` [s] or at every step."""
        for begin, end, fired in self.edges:
            self.network.firing = fired
            wanted = None if times is None else _within(times, begin, end)
            done = solve_ivp(
                self.network.slope, (begin, end), volts, method="Radau", t_eval=wanted,
                jac=self.network.jacobian, rtol=tolerance, atol=tolerance, max_step=self.period / 100.0,
            )  # fmt: skip
            if not done.success:
                raise ArithmeticError(done.message)
            volts = done.y[:, -1]
            yield done

    def cycle(self, volts: Array, samples: int) -> tuple[Array, Array]:
        """Integrate one cycle; return times (samples,) [s] and node voltages (nodes, samples) [V]."""
        times = self.start + np.linspace(0.0, self.period, samples)
        paths = [done.y for done in self.pieces(volts, self.tolerance, times)]
        return times, np.hstack([*(path[:, :-1] for path in paths), paths[-1][:, -1:]])

    def sensitive(self, volts: Array, tolerance: float) -> tuple[Array, Array]:
        """Return node voltages one cycle later, and their derivative (nodes, slow) by the slow coordinates.

        The derivative goes by backward Euler on the integrator's own steps: its error costs iterations of
        the search, never accuracy.
        """
        moves, unit = self.lift, np.eye(len(volts))
        for done in self.pieces(volts, tolerance):
            volts = done.y[:, -1]
            for step, time, now in zip(np.diff(done.t), done.t[1:], done.y.T[1:], strict=True):
                moves = np.linalg.solve(unit - step * self.network.jacobian(time, now), moves)
        return volts, moves


def _within(times: Array, begin: float, end: float) -> Array:
    """Return the times from `begin` on and before `end` [s], and `end` itself."""
    near = 1e-9
    inside = times[(times > begin - near) & (times < end - near)]
    return np.append(np.clip(inside, begin, end), end)


class Search:
    """Newton's method for the fixed point of one circuit's cycle."""

    def __init__(self, runner: Runner) -> None:
        """Begin with two cycles from the guess, which settle everything fast."""
        self.runner, self.used = runner, 0
        volts = runner.guess()
        for _ in range(2):
            *_, done = runner.pieces(volts, COARSE)
            volts = done.y[:, -1]
        self.volts = volts
        self.top = self._top()
        count = len(runner.slow_names)
        self.rail = np.array([name not in ("dropper", "shunt") for name in runner.slow_names], dtype=bool)
        self.fills, self.empties = np.full(count, -np.inf), np.full(count, np.inf)

    def steady(self) -> tuple[Array, float, int]:
        """Return steady node voltages [V], what a next step would move (relative), cycles used."""
        tolerance, share, before = max(COARSE, self.runner.tolerance), 1.0, np.inf
        best, best_volts, waited = np.inf, self.volts, 0
        while self.used < ROUNDS and (waited < STALLED or best > NEAR):
            state = self.runner.slow @ self.volts
            come, moves = self.runner.sensitive(self.volts, tolerance)
            self.used += 1
            step = self.step(state, self.runner.slow @ come - state, self.runner.slow @ moves)
            missing = float(np.max(np.abs(step) / np.maximum(1.0, np.abs(state)), initial=0.0))
            if missing < NEAR and tolerance > self.runner.tolerance:
                tolerance, best, waited = self.runner.tolerance, np.inf, 0
            best, best_volts, waited = min((best, best_volts, waited + 1), (missing, come, 0), key=_first)
            if missing < ENOUGH and tolerance == self.runner.tolerance:
                break
            share = 0.5 * share if missing > 2.0 * before else min(1.0, 1.5 * share)
            before = missing
            self.volts = come + self.runner.lift @ (state + share * step - self.runner.slow @ come)
        return best_volts, best, self.used

    def step(self, state: Array, residual: Array, moves: Array) -> Array:
        """Return Newton's step, kept within a sane reach and, for rails, between where they fill and empty."""
        self._remember(state, residual)
        held = np.eye(len(state)) - moves
        step, *_ = np.linalg.lstsq(held, residual, rcond=1e-9)
        steady = np.abs(held @ step - residual) > np.abs(residual) / 2.0  # no voltage would stop it yet
        step = np.where(steady, STRIDE * residual, step)
        reach = np.where(self.rail, 0.3, 0.5) * max(self.runner.network.crest, 1.0)
        low = np.where(self.rail, np.clip(-1.0 - state, -reach, 0.0), -reach)
        step = np.clip(step, low, np.clip(self.top - state, 0.0, reach))
        step = np.where(state + step > self.empties, (self.empties - state) / 2.0, step)
        return np.asarray(np.where(state + step < self.fills, (self.fills - state) / 2.0, step))

    def _remember(self, state: Array, residual: Array) -> None:
        """Keep the last voltages at which each rail filled and emptied, while they do not contradict.

        At a zener's knee or a diode's threshold Newton's step overshoots from both sides; the two voltages
        shut it in.
        """
        sure = self.rail & (np.abs(residual) > NOISE)
        self.fills = np.where(sure & (residual > 0.0), state, self.fills)
        self.empties = np.where(sure & (residual < 0.0), state, self.empties)
        shut = self.empties - self.fills < NARROW * np.maximum(1.0, np.abs(state))
        self.fills, self.empties = np.where(shut, -np.inf, self.fills), np.where(shut, np.inf, self.empties)

    def _top(self) -> Array:
        """Return what the slow coordinates cannot exceed [V]: a rail its zeners, at currents no board has."""
        tops = [self.runner.regulated(name) + 0.3 for name in self.runner.slow_names]
        return np.where([self._held(name) for name in self.runner.slow_names], np.array(tops), np.inf)

    def _held(self, rail: str) -> bool:
        """Whether zeners stand from a rail down to common without a gap."""
        if rail == COMMON:
            return True
        found = {part["name"]: part for part in self.runner.circuit["board"]["rail"]}.get(rail, {})
        sound = "zener" in found and f"zener:{rail}" not in self.runner.circuit["removed"]
        return sound and self._held(found["zener"].get("clamps_to", COMMON))


def _first(item: tuple[float, Any, int]) -> float:
    return item[0]
