"""The settled cycle: the periodic steady state of every specimen, from which everything a meter shows is taken.

Cycles are stepped from the means until they repeat. What a rail still drifts by in a cycle is charge that its loads and zeners
would take many cycles to settle, so the rail is moved by where that charge will lead, by the slopes of the means; two or three
cycles do for most. Those that do not repeat within the most cycles are said not to have converged.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from benchtool.physics import constants as known
from benchtool.physics.cycle import Centre, Cycle, Measured, Pace, first_guess
from benchtool.physics.laws import AVERAGE_RESPONDING, Array, Flags
from benchtool.physics.mean_value import Means, mean_pulses, means
from benchtool.physics.network import Balance, Network, add_loads, add_regulators, load_figures
from benchtool.physics.rectifier import Rectifier
from benchtool.physics.settled import Settled
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Specimens
from benchtool.physics.supply import feed_of, supply_current


@dataclass(frozen=True, slots=True)
class Effort:
    """What a settled cycle may cost: `fine` steps, if any, are for specimens whose current comes in short pulses or whose rail is
    rough; a cycle repeats when no rail has further to go than `share` of itself, or `volts`, and its reservoir gained or lost no
    more than the share `charge` of the supply.
    """

    coarse: Pace
    fine: Pace | None
    most_cycles: int
    share: float
    volts: float
    charge: float


FIGURES = Effort(Pace(64, 13, 2e-3), Pace(256, 13, 5e-4), most_cycles=32, share=5e-5, volts=3e-4, charge=0.005)
"""For what is shown as a figure."""
CROWD = Effort(Pace(32, 5, 1e-2), None, most_cycles=8, share=1e-3, volts=5e-3, charge=0.05)
"""For many specimens that are compared with a meter."""
PULSED, ROUGH = 1.8, 0.05
"""RMS over mean of the line current (1.11 for a sine), and ripple over mean of a rail, from which the fine steps are taken."""
CHUNK = 4096
"""Specimens stepped together: as many as a processor's cache holds."""
SOLVED_VOLTS = 0.05
"""Worst move left in a step's last round with which the step still counts as solved [V]."""
LEAST_CURRENT = 1e-6
"""Current that a reservoir may gain or lose however little is supplied [A]."""
FARTHEST, CLOSER, FARTHER = 0.3, 0.35, 1.5
"""Share of itself, and volts, by which a rail is moved ahead at most; times that when it turns back, and when it goes on."""


def settle(specimens: Specimens, on: tuple[str, ...], *, warm: bool = False, effort: Effort = FIGURES) -> Settled:
    """The settled cycle of every specimen with the switched loads `on` commanded on; `warm` after 15 minutes on."""
    start = means(specimens, on, warm=warm)
    figures = _Figures(len(start.rails), specimens.count)
    for index in _alike(specimens):
        part = _settle_alike(start.network.part(index), start.rails[:, index], effort.coarse, effort)
        figures.take_over(index, part)
        if effort.fine is None:
            continue
        fine = np.flatnonzero(part.needs_fine_steps())
        if fine.size:
            again = index[fine]
            rails = part.rails["mean"][:, fine]
            figures.take_over(again, _settle_alike(start.network.part(again), rails, effort.fine, effort))
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
        self.rails = {name: np.zeros((rails, count)) for name in ("mean", "square", "magnitude", "pp", "zener", "power")}
        names = ("supply", "line", "line_square", "real", "dropper", "dropper_square", "dropper_magnitude")
        self.singles = {name: np.zeros(count) for name in names}
        self.converged: Flags = np.zeros(count, dtype=bool)

    def keep(self, index: NDArray[np.intp], cycle: Cycle, measured: Measured, converged: Flags) -> None:
        """The figures of the specimens at `index`, unless an earlier cycle of theirs repeated already."""
        new, steps = ~self.converged[index], cycle.steps
        here = index[new]

        def rails(name: str, sums: Array) -> None:
            self.rails[name][:, here] = sums[:, new] / steps

        def single(name: str, sums: Array) -> None:
            self.singles[name][here] = sums[new] / steps

        rails("mean", measured.rail)
        rails("square", measured.rail_square)
        rails("magnitude", measured.rail_magnitude)
        rails("zener", measured.zener)
        rails("power", measured.zener_power)
        self.rails["pp"][:, here] = (measured.highest - measured.lowest)[:, new]
        single("supply", measured.supply)
        single("line", measured.line)
        single("line_square", measured.line_square)
        single("real", measured.real)
        single("dropper", measured.dropper)
        single("dropper_square", measured.dropper_square)
        single("dropper_magnitude", measured.dropper_magnitude)
        self.converged[here] = converged[new]

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


def _settle_alike(network: Network, rails: Array, pace: Pace, effort: Effort) -> _Figures:
    """Steps specimens of one junction state until they repeat; those that do drop out."""
    count = network.specimens.count
    figures, rest = _Figures(len(rails), count), np.arange(count)
    cycle = Cycle(network, Rectifier(network.specimens), pace)
    held, centre = first_guess(cycle, rails), Centre(rails, np.zeros(count))
    reach, before = FARTHEST * np.abs(rails) + FARTHEST, np.zeros_like(rails)
    for number in range(effort.most_cycles):
        started = held
        held, measured = cycle.run(held, centre)
        drift = held.reservoirs - started.reservoirs
        charged = np.abs(held.dropper - started.dropper) <= effort.share * cycle.specimens.crest + effort.volts
        ahead = np.clip(_ahead(cycle.network, measured, pace.steps, drift), -reach, reach)
        to_go = np.maximum(np.abs(ahead), np.abs(drift)).max(axis=0)
        allowed = effort.share * np.abs(measured.rail / pace.steps).max(axis=0) + effort.volts
        gained = (np.abs(drift) * cycle.specimens.reservoir).max(axis=0) * cycle.specimens.frequency
        charged &= gained <= effort.charge * np.abs(measured.supply) / pace.steps + LEAST_CURRENT
        repeats = (to_go <= allowed) & charged & (measured.moved <= SOLVED_VOLTS) & (number > 0)
        figures.keep(rest, cycle, measured, repeats)
        centre = Centre(measured.rail / pace.steps, measured.dropper / pace.steps)
        if repeats.all():
            break
        held = replace(held, reservoirs=held.reservoirs + ahead, rails=held.rails + ahead)
        reach, before = reach * np.where(ahead * before < 0.0, CLOSER, FARTHER), ahead
        if number > 1 and repeats.mean() > 0.5:
            going = np.flatnonzero(~repeats)
            cycle, held, rest = cycle.part(going), held.part(going), rest[going]
            centre, reach, before = centre.part(going), reach[:, going], before[:, going]
    return figures


def _ahead(network: Network, measured: Measured, steps: int, drift: Array) -> Array:
    """How far the charge that a cycle left over will still lead each rail [V], (rails, n).

    By the slopes of rails and loads at their means, and by the mean slopes over the cycle of zeners, which are current over
    knee, and of the supply.
    """
    specimens, rails = network.specimens, measured.rail / steps
    balance = Balance(network.straight, rails)
    for index, rail in enumerate(specimens.shape.rails):
        at_node = index == 0 and specimens.shape.zener_at_node
        if rail.has_zener and not at_node:
            slope = measured.zener[index] / steps / known.ZENER_SLOPE
            balance.branch(index, rail.clamps_to, (np.zeros_like(slope), slope))
    add_regulators(balance, specimens, rails)
    add_loads(balance, network, rails, mean_pulses(specimens))
    balance.inject(0, measured.supply / steps, _supply_slope(specimens, rails[0], measured.supply_slope / steps))
    far = balance.relaxed(specimens.reservoir * specimens.frequency, drift)
    return np.where(specimens.reservoir > 0.0, far, 0.0)


def _supply_slope(specimens: Specimens, first_rail: Array, stepped: Array) -> Array:
    """By how much less the supply gives a rail that stands higher [S], (n,): by the means, where the `stepped` slope within a
    cycle says more, for the dropper makes up in the next half cycle what it could not give in this one. Not with a zener at
    the node.
    """
    if specimens.shape.zener_at_node:
        return stepped
    _, mean = supply_current(feed_of(specimens), np.maximum(first_rail, 0.0))
    return np.where(mean < 0.0, np.maximum(stepped, mean), stepped)


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
        line_average=AVERAGE_RESPONDING * single["line"],
        dropper_average=AVERAGE_RESPONDING * single["dropper_magnitude"],
        ripple_average=AVERAGE_RESPONDING * rails["magnitude"],
        load_voltage=voltages,
        load_current=currents,
        converged=figures.converged & start.solved & _is_netted(specimens),
    )


def _is_netted(specimens: Specimens) -> bool:
    """A zener at the dropper node that stands on another one has its way back through a rail that cannot give it: not netted."""
    return not specimens.shape.zener_at_node or specimens.shape.rails[0].clamps_to == TO_COMMON
