"""Runs a circuit to its periodic steady state and measures it over one whole mains cycle.

The integrator is SciPy's Radau (implicit, fifth order) with an analytic Jacobian. Only the reservoirs and
the dropper remember anything from cycle to cycle; the map from their voltages at one crossing to those at
the next is solved for its fixed point (a secant Jacobian updated by Broyden's rule), so that slow rails
need no hundreds of cycles. Whether the answer stands still is judged by how far the last step would still
have moved it.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.integrate import solve_ivp

from tests.reference.circuit import OPEN, Circuit, apply_fault, esr_of, junctions
from tests.reference.network import Array, Network

SAMPLES = 4000  # per cycle
TOLERANCE = 1e-6  # relative, and in volts
SETTLED = 1e-3  # of a rail's voltage, or volts
ENOUGH = 2e-5  # likewise, where the search for the steady state ends
ROUNDS = 90  # mains cycles at most while seeking the steady state
STRIDE = 50.0  # cycles ahead, where a reservoir changes at a constant rate
REGULATING = 1e-4  # A, mean reverse current of a zener that still regulates
Figures = dict[str, Any]


class Runner:
    """Integrates one network cycle by cycle from a phase at which its rectifier surely conducts."""

    def __init__(self, circuit: Circuit, tolerance: float = TOLERANCE) -> None:
        """Prepare the network, the slow coordinates and a first guess."""
        self.circuit = apply_fault(circuit)
        self.network = Network(self.circuit)
        self.tolerance = tolerance
        self.period = 2.0 * np.pi / self.network.omega
        capacitor = "dropper" in self.network.names["capacitor"]
        self.start = 0.0 if capacitor else self.period / 4.0  # where the dropper's current has its crest
        names = self.network.names["capacitor"]
        slow = [place for place, name in enumerate(names) if name.startswith(("reservoir:", "dropper"))]
        self.slow = self.network.incidence["capacitor"][slow]
        self.slow_names = [names[place].removeprefix("reservoir:") for place in slow]

    def guess(self) -> Array:
        """Return node voltages [V] near a loaded, regulating board."""
        volts = np.zeros(len(self.network.nodes))
        if self.network.source_ohms >= OPEN:
            return volts  # nothing feeds the board: its reservoirs are empty
        for place, node in enumerate(self.network.nodes):
            volts[place] = 0.95 * self._zener_sum(node.removeprefix("inside "))
        return volts

    def _zener_sum(self, rail: str) -> float:
        zeners = {r["name"]: r.get("zener") for r in self.circuit["board"]["rail"]}
        zener = zeners.get(rail)
        return zener["voltage"] + self._zener_sum(zener.get("clamps_to", "common")) if zener else 0.0

    def cycle(self, volts: Array, samples: int = 2) -> tuple[Array, Array]:
        """Integrate one cycle; return times (samples,) [s] and node voltages (nodes, samples) [V]."""
        times = self.start + np.linspace(0.0, self.period, samples)
        done = solve_ivp(
            self.network.slope, (times[0], times[-1]), volts, method="Radau", t_eval=times,
            jac=self.network.jacobian, rtol=self.tolerance, atol=self.tolerance, max_step=self.period / 100.0,
        )  # fmt: skip
        if not done.success:
            raise ArithmeticError(done.message)
        return times, np.asarray(done.y)

    def moved(self, volts: Array, state: Array) -> Array:
        """Return `volts` with the slow coordinates put to `state`, every other branch left as it is."""
        for row, name, value in zip(self.slow, self.slow_names, state, strict=True):
            change = value - row @ volts
            ends = ["limited"] if name == "dropper" else [name, f"inside {name}"]
            volts = volts.copy()
            volts[[self.network.index(node) for node in ends]] += change
        return volts

    def after(self, volts: Array, state: Array) -> tuple[Array, Array]:
        """Return the slow coordinates and all node voltages one cycle later."""
        _, path = self.cycle(self.moved(volts, state))
        return self.slow @ path[:, -1], path[:, -1]

    def steady(self) -> tuple[Array, float, int]:
        """Return steady node voltages [V], what a next step would move (relative), cycles used."""
        volts = self.guess()
        for _ in range(2):
            _, path = self.cycle(volts)
            volts = path[:, -1]
        state = self.slow @ volts
        come, volts = self.after(volts, state)
        slope, used = self._secants(volts, state, come), 3 + len(state)
        while True:
            step = self._step(slope, state, come - state)
            remaining = float(np.max(np.abs(step) / np.maximum(1.0, np.abs(come)), initial=0.0))
            if remaining < ENOUGH or used >= ROUNDS:
                return self.moved(volts, come), remaining, used
            new_come, volts = self.after(volts, state + step)
            slope = _broyden(slope, step, (new_come - state - step) - (come - state))
            slow = np.linalg.norm(new_come - state - step) > 0.3 * np.linalg.norm(come - state)
            state, come, used = state + step, new_come, used + 1
            if slow:  # a knee was crossed: what the old secants knew is of no use here
                slope, used = self._secants(volts, state, come), used + len(state)

    def _secants(self, volts: Array, state: Array, come: Array) -> Array:
        """Return d(come - state)/d(state) from one cycle for each slow coordinate."""
        columns = []
        for place in range(len(state)):
            nudge = np.zeros(len(state))
            nudge[place] = 0.5 if self.slow_names[place] == "dropper" else -0.01  # away from a zener's knee
            columns.append((self.after(volts, state + nudge)[0] - come) / nudge[place])
        return np.array(columns).T.reshape(len(state), len(state)) - np.eye(len(state))

    def _step(self, slope: Array, state: Array, residual: Array) -> Array:
        """Return the secant step, kept within a sane reach, rails from zero up to their zeners."""
        step, *_ = np.linalg.lstsq(-slope, residual, rcond=1e-6)
        flat = np.abs(slope @ step + residual) > np.abs(residual) / 2.0  # filling at a constant rate
        step = np.where(flat, STRIDE * residual, step)
        reach = np.array([3.0 if name == "dropper" else 0.2 for name in self.slow_names]) * self.network.crest
        floor = np.array([-np.inf if name == "dropper" else 0.0 for name in self.slow_names])
        lowest = np.clip(floor - state, -reach, 0.0)
        return np.asarray(np.clip(step, lowest, np.clip(self._ceiling() - state, 0.0, reach)))

    def _ceiling(self) -> Array:
        """Return what the slow coordinates cannot exceed [V]: a rail its zeners, at currents no board has."""
        removed = {name.removeprefix("zener:") for name in self.circuit["removed"]}
        tops = [self._zener_sum(name) + 0.25 for name in self.slow_names]
        free = [name in removed or top < 1.0 for name, top in zip(self.slow_names, tops, strict=True)]
        behind = self.circuit["board"]["rectifier"] == "half-wave-zener"  # its series diode
        first = self.circuit["board"]["rail"][0]["name"]
        drops = [0.6 if behind and name == first else 0.0 for name in self.slow_names]
        return np.where(free, np.inf, np.array(tops) - drops)


def _broyden(slope: Array, moved: Array, changed: Array) -> Array:
    """Return the secant matrix corrected so that it maps `moved` to `changed`."""
    size = float(moved @ moved)
    return slope + np.outer(changed - slope @ moved, moved) / size if size > 0.0 else slope


# ---- measuring -----------------------------------------------------------------------------------


def simulate(circuit: Circuit, tolerance: float = TOLERANCE) -> Figures:
    """Return the steady-state figures of a circuit in SI units, keyed as the result of the case format.

    `settled` says whether the slow voltages stand still within 1e-3; `balance` is the energy found in the
    parts over the energy taken from the mains.  ArithmeticError if the integrator gives up.
    """
    runner = Runner(circuit, tolerance)
    volts, remaining, cycles = runner.steady()
    times, path = runner.cycle(volts, SAMPLES + 1)
    first, last = runner.slow @ path[:, 0], runner.slow @ path[:, -1]
    drift = np.max(np.abs(last - first) / np.maximum(1.0, np.abs(first)), initial=0.0)
    figures = _mains_figures(runner.network, times, path)
    figures["rails"] = [_rail_figures(runner, rail, path) for rail in runner.circuit["board"]["rail"]]
    figures["supply_current_A"] = _supply_current(runner, path)
    figures |= {"settled": bool(remaining < SETTLED and drift < SETTLED), "cycles": cycles}
    return figures | {"remaining": remaining}


def mean(wave: Array) -> float:
    """Return the mean over one cycle of samples whose first and last are the same phase."""
    return float(np.trapezoid(wave) / (wave.size - 1))


def rms(wave: Array) -> float:
    """Return the RMS over one cycle."""
    return float(np.sqrt(mean(wave * wave)))


def _mains_figures(network: Network, times: Array, path: Array) -> Figures:
    current, mains = network.line_current(times, path), network.mains(times)
    dropped = path[network.index("limited")] - path[network.index("dropped")]
    real, line = mean(mains * current), rms(current)
    return {
        "line_current_A": line,
        "inrush_voltage_V": line * network.source_ohms,
        "inrush_power_W": line * line * network.source_ohms,
        "dropper_voltage_V": rms(dropped - mean(dropped)),
        "dropper_dc_V": abs(mean(dropped)),
        "real_power_W": real,
        "apparent_power_VA": rms(mains) * line,
        "balance": (_dissipated(network, path) + line * line * network.source_ohms) / max(real, 1e-9),
    }


def _dissipated(network: Network, path: Array) -> float:
    """Return the mean power [W] turned to heat in every part but the inrush resistor."""
    ohms, bent, loads = (network.across(law, path) for law in ("resistor", "junction", "current"))
    power = (ohms * ohms / network.values["resistor"]).sum(axis=0)
    power = power + (bent * network.junction_currents(bent)[0]).sum(axis=0)
    return mean(power + (loads * network.load_currents(loads)[0]).sum(axis=0))


def _junction_waves(network: Network, path: Array, name: str) -> list[tuple[Array, Array]]:
    """Return voltage and current waves of all junctions called `name`, in the order they were built."""
    across = network.across("junction", path)
    current, _ = network.junction_currents(across)
    return [(across[n], current[n]) for n, called in enumerate(network.names["junction"]) if called == name]


def _rail_figures(runner: Runner, rail: dict[str, Any], path: Array) -> Figures:
    name, network = rail["name"], runner.network
    wave = path[network.index(name)] if name in network.nodes else np.zeros(SAMPLES + 1)
    waves = _junction_waves(network, path, f"zener:{name}")
    reverse = mean(waves[0][1]) if waves else 0.0
    return {
        "name": name,
        "voltage_V": mean(wave),
        "ripple_pp_V": float(np.ptp(wave)),
        "ripple_rms_V": rms(wave - mean(wave)),
        "zener_current_A": reverse,
        "zener_power_W": sum(mean(across * current) for across, current in waves),
        "regulating": bool(reverse >= REGULATING) if waves else None,
        "esr_ohm": esr_of(rail["reservoir"]) if "reservoir" in rail else None,
    }


def _supply_current(runner: Runner, path: Array) -> float:
    """Return the mean current [A] through the diodes that end on the first rail."""
    first = runner.circuit["board"]["rail"][0]["name"]
    into = [name for name, (_, cathode) in junctions(runner.circuit).items() if cathode == first]
    waves = [wave for name in into for wave in _junction_waves(runner.network, path, name)]
    shorted = [s for s in runner.circuit["shunts"] if s[1] == first]
    through = [mean(current) for _, current in waves]
    return sum(through + [_shunt_current(runner.network, shunt, path) for shunt in shorted])


def _shunt_current(network: Network, shunt: list[Any], path: Array) -> float:
    plus, minus, ohms = shunt
    return mean(path[network.index(plus)] - path[network.index(minus)]) / float(ohms)
