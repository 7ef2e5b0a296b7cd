"""The surge at switch-on: against SciPy's integration of the circuit, the published energy, a diode's rating by quadrature."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp

from benchtool.board import Dropper
from benchtool.physics import surge
from benchtool.physics.specimens import Junction, Specimens, as_marked, population, take
from benchtool.physics.surge import Surge, first_surge, worst_surge
from tests.small_boards import board

CREST = np.sqrt(2.0) * 230.0


def marked(rectifier: str = "bridge", **parts: Any) -> Specimens:
    return as_marked(board(rectifier, **({"inrush": 100.0} | parts)))


def with_junction(specimens: Specimens, state: Junction) -> Specimens:
    return replace(specimens, junction=np.full(specimens.count, float(state)))


class Switching:
    """A mains of crest `CREST` and 50 Hz meets 0.47 µF behind `resistance`, a rectifier and an empty 220 µF, by the circuit.

    State: volts on dropper and reservoir, joules in the resistance and amperes squared times seconds through it. Followed while
    the current flows as it began: what comes after it has come to rest is the current the board runs on.
    """

    def __init__(self, resistance: float, held: float, phase: float = 0.0, drops: float = 1.4, seconds: float = 0.0) -> None:
        self.resistance, self.phase, self.drops = resistance, phase, drops
        self.way = np.sign(CREST * np.cos(phase) - held)
        span = seconds or 12.0 * resistance * 0.47e-6
        done = solve_ivp(self._flows, (0.0, span), [held, 0.0, 0.0, 0.0], rtol=1e-8, atol=1e-12, max_step=span / 200.0)
        _, _, self.energy, self.i2t = done.y[:, -1]
        currents = [abs(self._current(*moment)) for moment in zip(done.t, done.y.T, strict=True)]
        self.peak, self.last = max(currents), currents[-1]

    def _current(self, seconds: float, state: Any) -> float:
        across = CREST * np.cos(100.0 * np.pi * seconds + self.phase) - state[0]
        return float(self.way * max(self.way * across - self.drops - state[1], 0.0) / self.resistance)

    def _flows(self, seconds: float, state: Any) -> list[float]:
        current = self._current(seconds, state)
        return [current / 0.47e-6, abs(current) / 220e-6, self.resistance * current**2, current**2]


SURGES = [("first", first_surge, 0.0), ("worst", worst_surge, -CREST)]


@pytest.mark.parametrize(("surge_of", "held"), [row[1:] for row in SURGES], ids=[row[0] for row in SURGES])
@pytest.mark.parametrize("resistance", [10.0, 100.0, 1000.0])
def test_switching_on_at_the_crest(surge_of: Any, held: float, resistance: float) -> None:
    found: Surge = surge_of(marked(inrush=resistance))
    circuit = Switching(resistance, held)
    assert found.peak[0] == pytest.approx(circuit.peak, rel=1e-6)
    # Bounds from above: drops, the reservoir's own volt, and the mains that moves on meanwhile take up to 5 % at 1 kohm.
    assert 0.95 * found.energy[0] < circuit.energy < found.energy[0]
    assert 0.95 * found.i2t[0] < circuit.i2t < found.i2t[0]


def test_the_time_constant_is_when_the_current_has_fallen_to_1_over_e() -> None:
    # The reservoir's own volts and the mains that moves on take a little of it.
    circuit = Switching(100.0, 0.0, seconds=float(first_surge(marked()).time_constant[0]))
    assert circuit.last == pytest.approx(circuit.peak / np.e, rel=0.02)


@pytest.mark.parametrize(("surge_of", "held"), [row[1:] for row in SURGES], ids=[row[0] for row in SURGES])
@pytest.mark.parametrize("resistance", [100.0, 1000.0])
def test_no_phase_is_worse_than_the_crest(surge_of: Any, held: float, resistance: float) -> None:
    found: Surge = surge_of(marked(inrush=resistance))
    for phase in np.linspace(-np.pi, np.pi, 24, endpoint=False):
        circuit = Switching(resistance, held, phase)
        assert circuit.peak <= found.peak[0] * (1.0 + 1e-6)
        assert circuit.energy < found.energy[0]


def test_published_energy() -> None:
    # "Worst-case inrush energy ½·C·(2·Vpk)²: 99.5 mJ for 0.47 µF at 230 V" (published values); a quarter of it when discharged.
    assert worst_surge(marked()).energy[0] == pytest.approx(99.5e-3, rel=0.001)
    assert first_surge(marked()).energy[0] == pytest.approx(99.5e-3 / 4.0, rel=0.001)


def test_heat_and_i2t_are_those_of_the_decaying_current() -> None:
    # i = V/R·exp(-t/RC), integrated; 0.47 µF behind 100 ohm and twice the crest.
    def squared(seconds: float) -> float:
        return float((2.0 * CREST / 100.0 * np.exp(-seconds / 47e-6)) ** 2)

    i2t = quad(squared, 0.0, 30.0 * 47e-6)[0]
    found = worst_surge(marked())
    assert found.i2t[0] == pytest.approx(i2t, rel=1e-6)
    assert found.energy[0] == pytest.approx(100.0 * i2t, rel=1e-6)


def test_the_inrush_resistor_takes_its_share() -> None:
    # 80 ohm of 100 in series take four fifths of the heat: the same current flows through all of it.
    parted = replace(marked(inrush=80.0), fuse=np.array([5.0]), joint=np.array([15.0]))
    found = worst_surge(parted)
    assert found.energy[0] == worst_surge(marked()).energy[0]
    assert found.peak[0] == worst_surge(marked()).peak[0]
    assert found.inrush_energy[0] == pytest.approx(0.8 * found.energy[0])
    assert worst_surge(marked()).inrush_energy[0] == pytest.approx(99.5e-3, rel=0.001)


def test_the_diode_s_rating_is_a_half_sine() -> None:
    # 30 A for a half sine of 8.3 ms (1N4007 class, value from memory), integrated.
    rated = quad(lambda seconds: (30.0 * np.sin(np.pi * seconds / 8.3e-3)) ** 2, 0.0, 8.3e-3)[0]
    assert pytest.approx(rated) == surge.RATED_SURGE_I2T
    found = worst_surge(marked())
    assert found.peak_ratio[0] == pytest.approx((2.0 * CREST - 1.4) / 100.0 / 30.0)
    assert found.i2t_ratio[0] == pytest.approx(99.5e-3 / 100.0 / rated, rel=0.001)


# Limits --------------------------------------------------------------------------------------------------------------------


def test_nothing_in_series_is_unlimited() -> None:
    found = worst_surge(marked(inrush=None))
    assert (found.peak[0], found.i2t[0], found.peak_ratio[0], found.i2t_ratio[0]) == (np.inf, np.inf, np.inf, np.inf)
    # The charge is what it is: the heat has no resistor to stay in, and is over at once.
    assert found.energy[0] == pytest.approx(99.5e-3, rel=0.001)
    assert (found.inrush_energy[0], found.time_constant[0]) == (0.0, 0.0)


def test_towards_no_resistance_the_heat_stays_and_the_peak_grows() -> None:
    less, more = worst_surge(marked(inrush=0.01)), worst_surge(marked(inrush=1.0))
    assert less.inrush_energy[0] == pytest.approx(more.inrush_energy[0])
    assert less.peak[0] == pytest.approx(100.0 * more.peak[0])
    assert less.i2t[0] == pytest.approx(100.0 * more.i2t[0])


def test_towards_no_capacitance_the_heat_goes_and_the_peak_stays() -> None:
    tiny = worst_surge(marked(capacitance=1e-15))
    assert tiny.peak[0] == worst_surge(marked()).peak[0]
    assert tiny.energy[0] < 1e-9
    assert tiny.i2t[0] < 1e-9


@pytest.mark.parametrize("surge_of", [first_surge, worst_surge])
def test_a_resistor_dropper_has_no_surge_beyond_volts_over_ohms(surge_of: Any) -> None:
    found: Surge = surge_of(marked(dropper=Dropper(kind="resistor", resistance=10e3)))
    assert found.peak[0] == pytest.approx((CREST - 1.4) / 10.1e3)
    assert (found.energy[0], found.inrush_energy[0], found.i2t[0], found.time_constant[0]) == (0.0, 0.0, 0.0, 0.0)


def test_an_open_dropper_leaves_its_bleeder() -> None:
    opened = replace(marked(bleeder=1e6), capacitance=np.array([0.0]))
    assert worst_surge(opened).peak[0] == pytest.approx((CREST - 1.4) / 1.0001e6)
    assert worst_surge(replace(marked(), capacitance=np.array([0.0]))).peak[0] == 0.0


@pytest.mark.parametrize("part", ["fuse", "joint", "inrush", "rail_joint"])
def test_an_open_path_takes_nothing(part: str) -> None:
    opened = replace(marked(), **{part: np.full_like(getattr(marked(), part), np.inf)})
    for found in (first_surge(opened), worst_surge(opened)):
        assert [getattr(found, field.name)[0] for field in fields(found)] == [0.0] * 5


def test_a_shorted_dropper_flows_until_something_opens() -> None:
    shorted = replace(marked(), dropper_short=np.array([0.5]))
    found = worst_surge(shorted)
    # It holds no charge, so the crest is all there is to push.
    assert found.peak[0] == pytest.approx((CREST - 1.4) / 100.0)
    assert [figure[0] for figure in (found.energy, found.inrush_energy, found.i2t, found.time_constant)] == [np.inf] * 4
    assert worst_surge(replace(shorted, inrush=np.array([0.0]))).inrush_energy[0] == 0.0


@pytest.mark.parametrize(
    ("rectifier", "state", "drops"),
    [
        # Two junctions of a bridge in turn, one of a half-wave either way; a shorted one drops nothing (Kirchhoff).
        ("bridge", Junction.GOOD, 1.4),
        ("bridge", Junction.SERIES_OPEN, 1.4),
        ("bridge", Junction.SERIES_SHORT, 0.7),
        ("half-wave", Junction.GOOD, 0.7),
        ("half-wave", Junction.RETURN_OPEN, 0.7),
        ("half-wave", Junction.SERIES_SHORT, 0.0),
        ("half-wave", Junction.RETURN_SHORT, 0.0),
        ("half-wave-zener", Junction.GOOD, 0.7),
    ],
)
def test_what_the_path_drops(rectifier: str, state: Junction, drops: float) -> None:
    found = first_surge(with_junction(marked(rectifier), state))
    assert found.peak[0] == pytest.approx((CREST - drops) / 100.0)
    assert found.peak[0] == pytest.approx(Switching(100.0, 0.0, drops=drops).peak)


def test_a_shorted_zener_at_the_node_drops_nothing() -> None:
    shorted = replace(marked("half-wave-zener"), zener_short=np.array([[0.5]]))
    assert first_surge(shorted).peak[0] == pytest.approx(CREST / 100.0)


def mixed() -> Specimens:
    """Fifty boards in tolerance, some of them without a path, without an inrush resistor, shorted or open."""
    many = population(board(inrush=100.0, bleeder=1e6), 50)
    inrush, capacitance, shorted = many.inrush.copy(), many.capacitance.copy(), many.dropper_short.copy()
    inrush[:3], inrush[3:6], capacitance[6:9], shorted[9:12] = np.inf, 0.0, 0.0, 0.5
    junction = many.junction.copy()
    junction[12:15] = float(Junction.SERIES_SHORT)
    return replace(many, inrush=inrush, capacitance=capacitance, dropper_short=shorted, junction=junction)


@pytest.mark.parametrize("surge_of", [first_surge, worst_surge])
def test_many_at_once_are_each_by_itself(surge_of: Any) -> None:
    many = mixed()
    together: Surge = surge_of(many)
    for field in fields(together):
        alone = [getattr(surge_of(take(many, slice(index, index + 1))), field.name)[0] for index in range(many.count)]
        np.testing.assert_array_equal(getattr(together, field.name), alone)
        assert getattr(together, field.name).shape == (50,)
        assert not np.isnan(getattr(together, field.name)).any()
