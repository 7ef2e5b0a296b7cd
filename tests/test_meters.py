"""What a meter makes of what is there, against published factors and the waveforms they were worked out for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from benchtool.board import Board, Dropper, Load
from benchtool.catalogue.meters import ramped
from benchtool.catalogue.shown import View
from benchtool.catalogue.shows import SHOWS
from benchtool.observed import Check, Meter
from benchtool.physics.bench import Bench
from benchtool.physics.specimens import Specimens, as_marked
from tests.small_boards import board, draws, rail

AVERAGE = Meter(ac_response="average")
HEATER = Load(name="heater", kind="resistor", rail="rail", resistance=1e3)


def read(specimens: Specimens, made: Board, what: str, meter: Meter) -> float:
    """What `meter` shows on the one specimen, on its first rail, the loads off."""
    value = SHOWS[what](View(Bench(specimens), made, Check(what=what, on=()), meter)).value
    assert value is not None
    return float(value[0])


@pytest.mark.parametrize(("rectifier", "true", "average"), [("bridge", 0.435, 0.421), ("half-wave", 0.771, 0.779)])
def test_an_average_responding_meter_on_a_rectified_sine(rectifier: str, true: float, average: float) -> None:
    # "on a full-wave rectified 1 V-rms sine, AC part: 0.421 instead of 0.435; half-wave 0.779 instead of 0.771" (published
    # values, meters): of the rectified waveform's whole RMS. 230 V through 1 Ω into 1 kΩ, no reservoir and no zener; the diodes'
    # drops are 0.4 % of the crest.
    bare = replace(rail(zener=None, reservoir=None), name="rail")
    made = board(rectifier, dropper=Dropper(kind="resistor", resistance=1.0), inrush=0.1, rails=(bare,), loads=(HEATER,))
    specimens = as_marked(made)
    rms = read(specimens, made, "rail-ripple-rms", Meter())
    mean = read(specimens, made, "rail-ripple-rms", AVERAGE)
    whole = float(np.hypot(rms, read(specimens, made, "rail-voltage", Meter())))
    assert rms / whole == pytest.approx(true, rel=0.015)
    assert mean / whole == pytest.approx(average, rel=0.015)


def test_both_kinds_of_meter_agree_on_a_sine() -> None:
    # An open rectifier's bleeder apart, a dropper straight at the mains carries a sine: zener shorted, no drops to speak of.
    made = board("bridge", loads=(draws(0.004),), inrush=100.0)
    shorted = replace(as_marked(made), zener_short=np.full((1, 1), 0.3))
    for what in ("line-current", "dropper-voltage", "inrush-voltage"):
        assert read(shorted, made, what, AVERAGE) == pytest.approx(read(shorted, made, what, Meter()), rel=0.005)


def test_a_range_that_ramps_reads_high_across_the_bleeder() -> None:
    # x/(1 − e^−x), x = window/RC (published values, meters): the charge that a constant current brings in the window over the
    # voltage it leaves, integrated here. 470 nF, 940 kΩ, 0.3 s.
    time_constant, window = 470e-9 * 940e3, 0.3
    volts, _ = quad(lambda when: np.exp(-(window - when) / time_constant) / 470e-9, 0.0, window)
    found = ramped(np.full(2, 470e-9), np.full(2, 940e3), np.array([1.0, 0.3]))
    np.testing.assert_allclose(found, [window / volts, 470e-9], rtol=1e-9)  # half of all meters do not ramp
    assert ramped(np.full(1, 470e-9), np.full(1, np.inf), np.ones(1))[0] == 470e-9


def test_a_short_across_the_rail_makes_a_whole_rectifier_look_shorted_where_it_sits() -> None:
    made = board("bridge", loads=(draws(0.004),))
    whole, bridged = as_marked(made), replace(as_marked(made), zener_short=np.full((1, 1), 2.0))
    check = Check(what="rectifier-test")
    chances = [SHOWS["rectifier-test"](View(Bench(specimens), made, check, Meter())).chances for specimens in (whole, bridged)]
    assert chances[1]["short"][0] > 5.0 * chances[0]["short"][0]
    assert chances[1]["good"][0] > chances[1]["short"][0]  # it is a doubt, not a rule
