"""The settled cycle: the periodic steady state of every specimen, from which everything a meter shows is taken.

Cycles are stepped from the means until they repeat. What a rail still drifts by in a cycle is charge that its loads and zeners
would take many cycles to settle, so the rail is moved by where that charge will lead, by the slopes of the means; two or three
cycles do for most. Those that do not repeat within `MOST_CYCLES` are said not to have converged.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import constants as known
from benchtool.physics.cycle import Cycle, Held, Measured, first_guess
from benchtool.physics.laws import Array, Flags
from benchtool.physics.mean_value import Means, mean_pulses, means
from benchtool.physics.network import Balance, Network, add_loads, add_rails, load_figures
from benchtool.physics.rectifier import Rectifier
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens

STEPS, FINE_STEPS = 64, 256
"""Steps a cycle, and for specimens whose current comes in short pulses or whose rail is rough."""
PULSED, ROUGH = 1.8, 0.05
"""RMS over mean of the line current (1.11 for a sine), and ripple over mean of a rail, from which the fine steps are taken."""
MOST_CYCLES = 24
CHUNK = 4096
"""Specimens stepped together: as many as a processor's cache holds."""
REPEATS_SHARE, REPEATS_VOLTS = 5e-5, 3e-4
"""A cycle repeats when no rail has further to go than this share of itself, or these volts."""
SOLVED_VOLTS = 0.05
"""Worst move left in a step's last round with which the step still counts as solved [V]."""
FARTHEST = 0.3
"""Share of itself by which a rail is moved ahead at most."""


def settle(specimens: Specimens, on: tuple[str, ...], *, warm: bool = False) -> Settled:
    """The settled cycle of every specimen with the switched loads `on` commanded on; `warm` after 15 minutes on."""
    start = means(specimens, on, warm=warm)
    figures = _Figures(len(start.rails), specimens.count)
    for index in _alike(specimens):
        part = _settle_alike(start.network.part(index), start.rails[:, index], STEPS)
        figures.take_over(index, part)
        fine = np.flatnonzero(part.needs_fine_steps())
        if fine.size:
            again = index[fine]
            figures.take_over(again, _settle_alike(start.network.part(again), part.rails["mean"][:, fine], FINE_STEPS))
    return _assembled(specimens, start, figures)


def _alike(specimens: Specimens) -> list[NDArray[np.intp]]:
    """Specimens of one junction state, in chunks."""
    found = []
    for state in np.unique(specimens.junction):
        members = np.flatnonzero(specimens.junction == state)
        found += [members[begin : begin + CHUNK] for begin in range(0, members.size, CHUNK)]
    return found


class _Figures:
    """What is kept of a settled cycle, filled in as specimens settle."""

    def __init__(self, rails: int, count: int) -> None:
        self.rails = {name: np.zeros((rails, count)) for name in ("mean", "square", "pp", "zener", "power")}
        names = ("supply", "line", "line_square", "real", "dropper", "dropper_square")
        self.singles = {name: np.zeros(count) for name in names}
        self.converged: Flags = np.zeros(count, dtype=bool)

    def keep(self, index: NDArray[np.intp], cycle: Cycle, measured: Measured, converged: Flags) -> None:
        """The figures of the specimens at `index`."""
        rails, single, steps = self.rails, self.singles, cycle.steps
        rails["mean"][:, index] = measured.rail / steps
        rails["square"][:, index] = measured.rail_square / steps
        rails["pp"][:, index] = measured.highest - measured.lowest
        rails["zener"][:, index] = measured.zener / steps
        rails["power"][:, index] = measured.zener_power / steps
        single["supply"][index] = measured.supply / steps
        single["line"][index] = measured.line / steps
        single["line_square"][index] = measured.line_square / steps
        single["real"][index] = (measured.real - cycle.added * measured.line_square) / steps
        single["dropper"][index] = measured.dropper / steps
        single["dropper_square"][index] = measured.dropper_square / steps
        self.converged[index] = converged


    def take_over(self, index: NDArray[np.intp], other: _Figures) -> None:
        """All figures of `other`, which are those of the specimens at `index`."""
        for name, array in other.rails.items():
            self.rails[name][:, index] = array
        for name, single in other.singles.items():
            self.singles[name][index] = single
        self.converged[index] = other.converged

    def needs_fine_steps(self) -> Flags:
        """Where the line current comes in short pulses, or a rail is rough; (n,)."""
        pulsed = np.sqrt(self.singles["line_square"]) > PULSED * self.singles["line"]
        rough = (self.rails["pp"] > ROUGH * np.abs(self.rails["mean"]) + ROUGH).any(axis=0)
        return np.asarray(pulsed | rough)


def _settle_alike(network: Network, rails: Array, steps: int) -> _Figures:
    """Steps specimens of one junction state until they repeat; those that do drop out."""
    count = network.specimens.count
    figures, rest = _Figures(len(rails), count), np.arange(count)
    rectifier, cycle = Rectifier(network.specimens), Cycle(network, steps)
    held = first_guess(cycle, rails, rectifier)
    for number in range(MOST_CYCLES):
        before = held.reservoirs
        held, measured = cycle.run(held, rectifier)
        ahead = _ahead(network, measured, steps, held.reservoirs - before)
        to_go = np.maximum(np.abs(ahead), np.abs(held.reservoirs - before)).max(axis=0)
        allowed = REPEATS_SHARE * np.abs(measured.rail / steps).max(axis=0) + REPEATS_VOLTS
        repeats = (to_go <= allowed) & (measured.moved <= SOLVED_VOLTS) & (number > 0)
        figures.keep(rest, cycle, measured, repeats)
        if repeats.all():
            break
        held = replace(held, reservoirs=held.reservoirs + ahead, rails=held.rails + ahead)
        if number > 1 and repeats.mean() > 0.5:
            network, rectifier, cycle, held, rest = _left(network, rectifier, held, rest, ~repeats, steps)
    return figures


def _left(
    network: Network, rectifier: Rectifier, held: Held, rest: NDArray[np.intp], going: Flags, steps: int
) -> tuple[Network, Rectifier, Cycle, Held, NDArray[np.intp]]:
    """Everything for the specimens that go on."""
    index = np.flatnonzero(going)
    part = network.part(index)
    kept = Held(held.dropper[index], held.input[index], held.reservoirs[:, index], held.rails[:, index])
    return part, rectifier.part(part.specimens, index), Cycle(part, steps), kept, rest[index]


def _ahead(network: Network, measured: Measured, steps: int, drift: Array) -> Array:
    """How far the charge that a cycle left over will still lead each rail [V], (rails, n).

    By the slopes of rails and loads at their means, and by the mean slopes over the cycle of zeners, which are current over
    knee, and of the supply.
    """
    specimens, rails = network.specimens, measured.rail / steps
    balance = Balance(len(rails))
    for index, rail in enumerate(specimens.shape.rails):
        at_node = index == 0 and specimens.shape.zener_at_node
        reverse = 0.0 if at_node else measured.zener[index] / steps / known.ZENER_SLOPE
        slope = reverse + 1.0 / specimens.zener_short[index]
        balance.branch(index, rail.clamps_to, (np.zeros_like(slope), slope))
    add_rails(balance, network, rails)
    add_loads(balance, network, rails, mean_pulses(specimens))
    balance.inject(0, measured.supply / steps, measured.supply_slope / steps)
    far = balance.relaxed(specimens.reservoir * specimens.frequency, drift)
    reach = FARTHEST * np.abs(rails) + 1.0
    return np.where(specimens.reservoir > 0.0, np.clip(far, -reach, reach), 0.0)


def _assembled(specimens: Specimens, start: Means, figures: _Figures) -> Settled:
    rails, single = figures.rails, figures.singles
    voltages, currents = load_figures(start.network, rails["mean"], mean_pulses(specimens))
    return Settled(
        specimens=specimens,
        rail_voltage=rails["mean"],
        ripple_pp=rails["pp"],
        ripple_rms=np.sqrt(np.maximum(rails["square"] - rails["mean"] ** 2, 0.0)),
        zener_current=rails["zener"],
        zener_power=rails["power"],
        supply_current=single["supply"],
        line_current=np.sqrt(single["line_square"]),
        real_power=single["real"],
        dropper_voltage=np.sqrt(np.maximum(single["dropper_square"] - single["dropper"] ** 2, 0.0)),
        dropper_dc=np.abs(single["dropper"]),
        load_voltage=voltages,
        load_current=currents,
        converged=figures.converged & start.solved,
    )
