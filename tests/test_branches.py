"""What each kind of branch draws: at its mark, far from it, and against the root of its own drops that SciPy finds."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from benchtool.physics import branches
from benchtool.physics import constants as known
from benchtool.physics.mean_value import balance_at
from benchtool.physics.network import network_of
from benchtool.physics.specimens import as_marked
from tests.small_boards import board


def test_junction_stands_at_its_mark_and_gains_a_decade_for_its_slope() -> None:
    # Rectifier diode: 0.7 V at 20 mA and 0.1 V a decade (the case format's section 4).
    volts = np.array([0.6, 0.7, 0.8])
    current, _ = branches.junction(volts, known.DIODE_DROP, known.DIODE_CURRENT, known.DIODE_SLOPE)
    np.testing.assert_allclose(current, [0.002, 0.020, 0.200], rtol=1e-9)
    assert branches.junction(np.array([300.0]), np.inf, 0.005, 0.06)[0][0] == 0.0  # a part that is not there


def test_junction_goes_on_as_its_tangent() -> None:
    # Where the exponential ends the current and the slope are continuous, and beyond they stay finite.
    knee = 18.0 + known.ZENER_SLOPE * np.log(branches.STEEP_LIMIT / known.ZENER_CURRENT)
    volts = np.array([knee - 1e-9, knee + 1e-9])
    current, slope = branches.junction(volts, 18.0, known.ZENER_CURRENT, known.ZENER_SLOPE)
    np.testing.assert_allclose(current, branches.STEEP_LIMIT, rtol=1e-6)
    assert slope[0] == pytest.approx(slope[1], rel=1e-6)
    far, _ = branches.junction(np.array([knee + 1.0]), 18.0, known.ZENER_CURRENT, known.ZENER_SLOPE)
    assert float(far[0]) == pytest.approx(branches.STEEP_LIMIT + 1.0 * float(slope[1]), rel=1e-6)


def test_zener_law() -> None:
    # 5 mA at the mark, a factor e for 60 mV, forward like a diode: 20 mA at -0.7 V (the case format's section 4).
    volts = np.array([18.0, 18.06, -0.7])
    current, _ = branches.zener(volts, np.full(3, 18.0))
    np.testing.assert_allclose(current, [0.005, 0.005 * np.e, -0.020], rtol=1e-9)
    # Not fitted: nothing, either way.
    np.testing.assert_allclose(branches.zener(np.array([-50.0, 300.0]), np.full(2, np.inf))[0], 0.0)
    # Shorted by 10 ohm: Ohm's law on top of its own, 200 mA at 2 V beside the meter's 0.2 µA.
    shorted = replace(as_marked(board()), zener_short=np.full((1, 1), 10.0))
    balance = balance_at(network_of(shorted, (), warm=False), np.array([[2.0]]), ())
    np.testing.assert_allclose(balance.surplus[0], -0.2 - 2e-7, rtol=1e-9)


def zener_branch(volts: np.ndarray[Any, Any]) -> branches.Branch:
    return branches.zener(volts, np.full_like(volts, 5.1))


BRANCHES: dict[str, Callable[[Any], branches.Branch]] = {
    "zener": zener_branch,
    "resistor": lambda volts: branches.resistor(volts, np.full_like(volts, 810.0)),
    "constant current": lambda volts: branches.constant_current(volts, np.full_like(volts, 0.0035)),
    "led": lambda volts: branches.led(volts, np.full_like(volts, 2.0), np.full_like(volts, 1e3)),
}


@pytest.mark.parametrize("branch", BRANCHES.values(), ids=BRANCHES.keys())
def test_branches_never_fall_and_their_slopes_are_their_own(branch: Callable[[Any], branches.Branch]) -> None:
    volts = np.linspace(-1.0, 6.5, 3001)
    current, slope = branch(volts)
    assert np.all(np.diff(current) >= -1e-15)
    assert np.all(np.isfinite(slope))
    step = 1e-6
    measured = (branch(volts + step)[0] - branch(volts - step)[0]) / (2.0 * step)
    smooth = np.abs(volts) > 1e-3  # a constant current has its corner at 0 V
    np.testing.assert_allclose(slope[smooth], measured[smooth], rtol=1e-3, atol=1e-7)


def test_constant_current_levels_off_and_draws_nothing_backwards() -> None:
    current, _ = branches.constant_current(np.array([-5.0, 0.0, 0.5, 50.0]), np.full(4, 0.01))
    np.testing.assert_allclose(current, [0.0, 0.0, 0.01 * np.tanh(1.0), 0.01])


def led_by_root(volts: float, forward: float, resistance: float) -> float:
    """Current at which junction and resistor together drop `volts`."""

    def over(logarithm: float) -> float:
        junction = forward + known.LED_SLOPE * (logarithm - float(np.log(known.LED_CURRENT)))
        return junction + float(np.exp(logarithm)) * resistance - volts

    return float(np.exp(brentq(over, -1e4, 20.0, xtol=1e-12)))


@given(st.floats(-1.0, 400.0), st.floats(1.0, 100.0), st.floats(1.0, 1e6))
def test_led_current_is_the_root_of_its_two_drops(volts: float, forward: float, resistance: float) -> None:
    current, _ = branches.led(np.array([volts]), np.array([forward]), np.array([resistance]))
    assert float(current[0]) == pytest.approx(led_by_root(volts, forward, resistance), rel=1e-6, abs=1e-15)


def test_led_special_cases() -> None:
    # 6 mA over 1 kΩ: forward voltage and 6 V. Far below its forward voltage it is dark.
    current, _ = branches.led(np.array([8.0, 0.5]), np.full(2, 2.0), np.full(2, 1e3))
    assert float(current[0]) == pytest.approx(known.LED_CURRENT, rel=1e-9)
    assert 0.0 <= float(current[1]) < 1e-12
