"""Measures a circuit over one whole mains cycle of its periodic steady state.

The figures are keyed as the result of the case format, so that they can be laid beside the product's.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from tests.reference.circuit import Circuit, esr_of, junctions
from tests.reference.network import Array, Network
from tests.reference.periodic import TOLERANCE, Runner, Search

__all__ = ["REGULATING", "TOLERANCE", "Figures", "simulate"]

SAMPLES = 4000  # per cycle
SETTLED = 1e-3  # of a rail's voltage, or volts
REGULATING = 1e-4  # A, mean reverse current of a zener that still regulates
Figures = dict[str, Any]


def simulate(circuit: Circuit, tolerance: float = TOLERANCE) -> Figures:
    """Return the steady-state figures of a circuit in SI units, keyed as the result of the case format.

    `settled` says whether the slow voltages stand still within 1e-3; `balance` is the energy found in the
    parts over the energy taken from the mains.  ArithmeticError if the integrator gives up.
    """
    runner = Runner(circuit, tolerance)
    volts, remaining, cycles = Search(runner).steady()
    times, path = runner.cycle(volts, SAMPLES + 1)
    first, last = runner.slow @ path[:, 0], runner.slow @ path[:, -1]
    drift = np.max(np.abs(last - first) / np.maximum(1.0, np.abs(first)), initial=0.0)
    figures = _mains_figures(runner, times, path)
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


def _mains_figures(runner: Runner, times: Array, path: Array) -> Figures:
    network = runner.network
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
        "balance": (_dissipated(runner, times, path) + line * line * network.source_ohms) / max(real, 1e-9),
    }


def _dissipated(runner: Runner, times: Array, path: Array) -> float:
    """Return the mean power [W] turned to heat in every part but the inrush resistor."""
    network = runner.network
    ohms, bent, loads, gates = (
        network.across(law, path) for law in ("resistor", "junction", "current", "gate")
    )
    power = (ohms * ohms / network.values["resistor"]).sum(axis=0)
    power = power + (bent * network.junction_currents(bent)[0]).sum(axis=0)
    power = power + (loads * network.load_currents("current", loads)[0]).sum(axis=0)
    power = power + (gates * _gate_currents(runner, times, gates)).sum(axis=0)
    return mean(power + network.regulator_currents(path)[2].sum(axis=0))


def _gate_currents(runner: Runner, times: Array, across: Array) -> Array:
    """Return the gate loads' currents [A] (gates, times); half at the edges of a pulse, for the mean's sake."""
    near, firing = 1e-9, np.zeros_like(across)
    for begin, end, fired in runner.edges:
        inside = (times > begin - near) & (times < end + near)
        at_edge = (abs(times - begin) < near) | (abs(times - end) < near)
        weight = np.where(at_edge & (times > times[0]) & (times < times[-1]), 0.5, 1.0) * inside
        firing += np.outer(fired, weight)
    return np.asarray(firing * runner.network.load_currents("gate", across)[0])


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
        "regulating": _regulating(runner, rail, path, reverse),
        "esr_ohm": esr_of(rail["reservoir"]) if "reservoir" in rail else None,
    }


def _regulating(runner: Runner, rail: dict[str, Any], path: Array, reverse: float) -> bool | None:
    """Whether a zener still carries current or a regulator has its input; None for a rail with neither."""
    if rail.get("fed_through") == "regulator":
        least = rail["regulated_voltage"] + rail["dropout"]
        return bool(mean(path[runner.network.index(rail["fed_by"])]) >= least)
    return bool(reverse >= REGULATING) if "zener" in rail else None


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
