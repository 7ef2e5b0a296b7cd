"""Energy and charge of the settled cycle, added up anew from the values of the parts: nothing may come from nowhere or get lost.

The cycle is the very one that the figures were taken from, watched step by step. What each part takes is written here from the
case format's section 4 and not taken from the product's branches, so a part left out, counted twice or turned round shows.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import wrightomega

from benchtool.physics import waveform
from benchtool.physics.cycle import Cycle, Held, Measured
from benchtool.physics.settled import Settled
from benchtool.physics.shape import TO_COMMON
from benchtool.physics.specimens import Junction, Specimens
from tests.compared import specimen_of, stored

Array = NDArray[np.float64]
CIRCUITS: list[dict[str, Any]] = stored("circuits.json") + stored("wide_circuits.json")
METER = 10e6
"""A voltmeter of 10 MΩ stands on each rail, as a reading is taken."""
WITHIN = 0.01
LEAST_WATTS, LEAST_AMPERES = 2e-5, 1e-6
"""What a board that takes next to nothing may be off by: a hundredth of what the default meter resolves."""


class Watched(Cycle):
    """A cycle that keeps what was held before and after every step of the last one run, and the current supplied by then."""

    last: ClassVar[Watched]
    held: list[Held]
    supplied: list[float]

    def _step(self, step: int, held: Held, measured: Measured) -> Held:
        if step == 1:
            self.held, self.supplied, Watched.last = [held], [0.0], self
        held = super()._step(step, held, measured)
        self.held.append(held)
        self.supplied.append(float(measured.supply[0]))
        return held


class Ledger:
    """What every part of one specimen took over one cycle, in mean watts, and what was drawn from the first rail [A].

    All arrays hold the ends of the steps; `before` is where each began. Rails and reservoirs: (rails, steps).
    """

    def __init__(self, specimens: Specimens, on: tuple[str, ...], watched: Watched) -> None:
        self.specimens, self.on = specimens, on
        self.steps, self.seconds = watched.steps, 1.0 / (specimens.frequency * watched.steps)
        held = watched.held
        dropper, self.input_all = np.array([each.dropper[0] for each in held]), np.array([each.input[0] for each in held])
        self.dropper, self.dropper_before, self.input = dropper[1:], dropper[:-1], self.input_all[1:]
        reservoirs = np.array([each.reservoirs[:, 0] for each in held]).T
        self.reservoirs, self.reservoirs_before = reservoirs[:, 1:], reservoirs[:, :-1]
        self.rails = np.array([each.rails[:, 0] for each in held]).T[:, 1:]
        self.supplied = np.diff(watched.supplied)
        self.watts: dict[str, float] = {}
        self.stored = 0.0
        self.drawn = np.zeros(self.steps)
        self._mains_side()
        self._rails()
        self._loads()

    def value(self, name: str, index: int | None = None) -> float:
        """A part's value, of a rail or load where `index` is given."""
        array = getattr(self.specimens, name)
        return float(array[0] if index is None else array[index, 0])

    def takes(self, name: str, power: Array) -> None:
        """Put a part's power at every step [W] into the book."""
        self.watts[name] = self.watts.get(name, 0.0) + float(np.mean(power))

    def keeps(self, farads: float, after: Array, before: Array) -> None:
        """Put a capacitor's energy into the book: ½CV², after less before."""
        self.stored += 0.5 * farads * float(after[-1] ** 2 - before[0] ** 2) / (self.steps * self.seconds)

    # Before the rails ------------------------------------------------------------------------------------------------------

    def _mains_side(self) -> None:
        farads, across = self.value("capacitance"), float(self.specimens.parallel_resistance[0])
        through_capacitor = farads * (self.dropper - self.dropper_before) / self.seconds
        self.capacitor_mean = float(np.mean(through_capacitor))
        self.line = through_capacitor + self.dropper / across
        series = float(self.specimens.series_resistance[0])
        if np.isfinite(series):
            self.takes("series resistance", series * self.line**2)
        self.takes("across the dropper", self.dropper**2 / across)
        self.keeps(farads, self.dropper, self.dropper_before)
        before = self.input_all[:-1]
        shunt, short = self.value("shunt"), self.value("shunt_short")
        self.keeps(shunt, self.input, before)
        self.takes("shunt shorted", self.input**2 / short)
        self.into_rectifier = self.line - shunt * (self.input - before) / self.seconds - self.input / short
        self.takes("rectifier", self.input * self.into_rectifier - self.rails[0] * self.supplied)

    # Rails -----------------------------------------------------------------------------------------------------------------

    def between(self, name: str, start: int, end: int, current: Array) -> None:
        """A branch between two rails, or a rail and common, that takes `current` [A]."""
        self.takes(name, self.voltage(start, end) * current)
        self.drawn += current * (float(start == 0) - float(end == 0))

    def voltage(self, start: int, end: int) -> Array:
        """Volts between two rails, or a rail and common."""
        return np.asarray(self.rails[start] - (self.rails[end] if end != TO_COMMON else 0.0))

    def _rails(self) -> None:
        for index, rail in enumerate(self.specimens.shape.rails):
            leaks = 1.0 / self.value("reservoir_leak", index) + 1.0 / self.value("board_leak", index)
            self.between("leaks", index, TO_COMMON, leaks * self.rails[index])
            self.between("meter", index, TO_COMMON, self.rails[index] / METER)
            self._reservoir(index)
            if index > 0 or not self.specimens.shape.zener_at_node:
                volts = self.voltage(index, rail.clamps_to)
                self.between("shorted zener", index, rail.clamps_to, volts / self.value("zener_short", index))
                if rail.has_zener:
                    self.between("zener", index, rail.clamps_to, zener(volts, self.value("zener", index)))
            self._feed(index, rail.parent, rail.fed_through)

    def _reservoir(self, index: int) -> None:
        farads = self.value("reservoir", index)
        current = farads * (self.reservoirs[index] - self.reservoirs_before[index]) / self.seconds
        self.takes("ESR", self.value("esr", index) * current**2 if farads > 0.0 else 0.0 * current)
        self.keeps(farads, self.reservoirs[index], self.reservoirs_before[index])

    def _feed(self, index: int, parent: int, through: str | None) -> None:
        if through not in ("resistor", "regulator"):
            return
        ohms = self.value("feed", index) + self.value("rail_joint", index)
        if through == "resistor":
            self.between("feed", parent, index, self.voltage(parent, index) / ohms)
            return
        # A regulator: its voltage, or its input less the dropout, behind a little resistance; never backwards.
        holds = np.minimum(self.value("regulated", index), self.rails[parent] - self.value("dropout", index))
        self.between("regulator", parent, index, np.maximum(holds - self.rails[index], 0.0) / ohms)
        self.between("regulator", parent, TO_COMMON, levels_off(self.rails[parent], self.value("ground_current", index)))

    def _loads(self) -> None:
        for index, load in enumerate(self.specimens.shape.loads):
            if load.switched and load.name not in self.on:
                continue
            volts = self.voltage(load.rail, load.returns_to)
            current = self.value("load_excess", index) * volts
            if load.kind in ("coil", "resistor"):
                current = current + volts / self.value("load_resistance", index)
            elif load.kind == "led":
                current = current + led(volts, self.value("load_forward", index), self.value("load_resistance", index))
            else:
                share = self._pulsed(load.pulse) if load.kind == "gate" else 1.0
                current = current + levels_off(volts, self.value("load_current", index)) * share
            self.between(load.name, load.rail, load.returns_to, current)

    def _pulsed(self, pulse: float) -> Array:
        """Share of each step in which a gate pulse flows, that starts where the mains cross zero, twice a cycle."""
        cycle, end = self.steps * self.seconds, np.arange(1, self.steps + 1) * self.seconds
        share = np.zeros(self.steps)
        for crossing in (-0.25 * cycle, 0.25 * cycle, 0.75 * cycle):
            share += np.maximum(np.minimum(end, crossing + pulse) - np.maximum(end - self.seconds, crossing), 0.0) / self.seconds
        return share


def zener(volts: Array, marked: float) -> Array:
    """5 mA at the mark, e-fold in 60 mV; forward like a diode, 20 mA at 0.7 V and 0.1 V a decade."""
    if not np.isfinite(marked):
        return np.zeros_like(volts)
    return 0.005 * np.exp((volts - marked) / 0.060) - 0.020 * 10.0 ** ((-volts - 0.7) / 0.1)


def levels_off(volts: Array, amperes: float) -> Array:
    """I·tanh(V / 0.5 V), nothing backwards."""
    return amperes * np.tanh(np.maximum(volts, 0.0) / 0.5)


def led(volts: Array, forward: float, ohms: float) -> Array:
    """`forward` at 6 mA, e-fold in 50 mV, behind its resistor: i·R/s + ln(i·R/s) = x, by SciPy's function for that."""
    return np.asarray(wrightomega((volts - forward) / 0.05 + np.log(0.006 * ohms / 0.05)).real) * 0.05 / ohms


@dataclass(frozen=True)
class Booked:
    """A circuit with what is told of it and its ledger."""

    name: str
    settled: Settled
    ledger: Ledger

    def off(self, found: float, wanted: float, least: float) -> str | None:
        """What to say where `found` is not `wanted` within `WITHIN` or `least`."""
        if abs(found - wanted) <= max(WITHIN * abs(wanted), least):
            return None
        return f"{self.name}: {found:.6g} instead of {wanted:.6g}, {100.0 * (found - wanted) / (wanted or np.inf):+.2f} %"


def booked_of(circuit: dict[str, Any]) -> Booked:
    specimens, on = specimen_of(circuit)
    settled = waveform.settle(specimens, on)
    return Booked(circuit["name"], settled, Ledger(specimens, on, Watched.last))


def is_sound(each: Booked) -> bool:
    return int(each.settled.specimens.junction[0]) == Junction.GOOD


@pytest.fixture(scope="module")
def book() -> list[Booked]:
    """Every circuit of the reference."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(waveform, "Cycle", Watched)
        return [booked_of(circuit) for circuit in CIRCUITS]


def agrees(seen: list[str | None]) -> None:
    """All of them do; those that do not are listed."""
    found = [each for each in seen if each is not None]
    assert not found, "\n".join(["", *found])


def test_the_cycle_watched_is_the_one_that_figures_are_taken_from(book: list[Booked]) -> None:
    for each in book:
        rms = float(np.sqrt(np.mean(each.ledger.line**2)))
        assert float(each.settled.line_current[0]) == pytest.approx(rms, rel=1e-9, abs=1e-12), each.name


def test_the_energy_told_is_what_the_parts_take(book: list[Booked]) -> None:
    # Mains energy in = series resistance, resistances across the dropper, rectifier (between its terminals), zeners, loads,
    # leaks, meter, feeds, ESR; what is stored is nil over a settled cycle and is counted with its sign. The half step over each
    # capacitor that implicit steps add (`cycle.py`) is no part's, so what is told has to be free of it.
    seen = [
        each.off(float(each.settled.real_power[0]), sum(each.ledger.watts.values()) + each.ledger.stored, LEAST_WATTS)
        for each in book
    ]
    agrees(seen)


def test_nothing_is_stored_over_a_settled_cycle(book: list[Booked]) -> None:
    told = [float(each.settled.real_power[0]) for each in book]
    agrees([each.off(watts + each.ledger.stored, watts, LEAST_WATTS) for each, watts in zip(book, told, strict=True)])


def test_the_charge_that_the_rectifier_gives_is_what_is_drawn_from_the_first_rail(book: list[Booked]) -> None:
    # Reservoirs give back what they took, so they are not among what draws. Where a shorted diode lets everything back again, the
    # little that stays is told to within a small share of what goes to and fro.
    seen = []
    for each in book:
        least = LEAST_AMPERES + (0.0 if is_sound(each) else 1e-4 * float(each.settled.line_current[0]))
        seen.append(each.off(float(each.settled.supply_current[0]), float(np.mean(each.ledger.drawn)), least))
    agrees(seen)


def test_no_direct_current_passes_the_dropper_s_capacitor(book: list[Booked]) -> None:
    for each in book:
        assert abs(each.ledger.capacitor_mean) < WITHIN * float(each.settled.line_current[0]) + LEAST_AMPERES, each.name


def test_the_rectifier_takes_what_its_diodes_drop(book: list[Booked]) -> None:
    # 0.7 V at 20 mA and 0.1 V a decade, two at a time in a bridge and one each way in a half-wave. Within 10 %: the half-wave's
    # return diode, which no rail sees, counts as 0.7 V at every current.
    for each in book:
        rectifier = each.settled.specimens.shape.rectifier
        if is_sound(each) and rectifier != "half-wave-zener":
            amperes = np.abs(each.ledger.into_rectifier) + 1e-12
            diodes = 2.0 if rectifier == "bridge" else 1.0
            heat = float(np.mean(diodes * amperes * (0.7 + 0.1 * np.log10(amperes / 0.020))))
            assert each.ledger.watts["rectifier"] == pytest.approx(heat, rel=0.1, abs=1e-4), each.name


def test_zeners_take_what_is_told_of_them(book: list[Booked]) -> None:
    # At the dropper node the rest of what the rectifier takes is the series diode's: its drop times what it passes, which is
    # 0.7 V within a tenth at these currents.
    seen = []
    for each in book:
        told, taken = each.settled.zener_power[:, 0], each.ledger.watts
        if each.settled.specimens.shape.zener_at_node and is_sound(each):
            diode = 0.7 * float(each.settled.supply_current[0])
            rest = taken["rectifier"] - diode
            seen.append(each.off(float(told[0]), rest, 0.1 * diode + LEAST_WATTS))
            told = told[1:]
        if not each.settled.specimens.shape.zener_at_node or len(told):
            seen.append(each.off(float(np.sum(told)), taken.get("zener", 0.0) + taken.get("shorted zener", 0.0), LEAST_WATTS))
    agrees(seen)
