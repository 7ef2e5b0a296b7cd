"""The closed forms against waveforms that SciPy integrates, roots that it finds and the supply integrated in time.

Every law is held four ways: a published figure (`test_published.py`), limiting cases with their reason, a hand-reduced
special case, and vector equals scalar. The waveforms are written here from the circuit, not from the law under test.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq

from benchtool.physics import laws

CREST = 325.27  # of 230 V
HERTZ = 50.0
OMEGA = 2.0 * np.pi * HERTZ
DROPPER = 0.47e-6

# Vector equals scalar ------------------------------------------------------------------------------------------------------

VECTORS: dict[Callable[..., Any], tuple[list[float], ...]] = {
    laws.reactance: ([1e-9, 1e-6], [50.0, 60.0]),
    laws.crest_factor_k: ([0.0, 1e3], [1e-7, 1e-6], [50.0, 60.0]),
    laws.capacitor_current: ([325.0, 170.0], [50.0, 60.0], [1e-7, 1e-6], [0.0, 1e3], [6.0, 25.0]),
    laws.capacitance_for: ([0.01, 0.02], [325.0, 170.0], [50.0, 60.0], [0.0, 100.0], [6.0, 25.0]),
    laws.resistor_current: ([325.0, 20.0], [1e4, 1e5], [6.0, 25.0]),
    laws.conduction_start: ([325.0, 20.0], [6.0, 25.0]),
    laws.capacitor_line_current: ([325.0, 170.0], [50.0, 60.0], [1e-7, 1e-6], [6.0, 25.0]),
    laws.capacitor_voltage: ([325.0, 20.0], [6.0, 25.0]),
    laws.resistor_line_current: ([325.0, 20.0], [1e4, 1e5], [6.0, 25.0]),
    laws.rule_of_thumb_current: ([230.0, 120.0], [50.0, 60.0], [1e-7, 1e-6], [0.0, 470.0], [5.1, 24.0]),
    laws.discharge_voltage: ([325.0, 170.0], [1e6, 2e6], [1e-7, 1e-6], [0.0, 1.0]),
    laws.discharge_time: ([325.0, 20.0], [1e6, 2e6], [1e-7, 1e-6], [34.0, 60.0]),
    laws.copper_ratio: ([-25.0, 85.0],),
    laws.zener_temperature_share: ([3.3, 30.0],),
    laws.two_sigma: ([100.0, 10.0], [0.01, 0.02], [0.1, 0.2]),
}


@pytest.mark.parametrize("law", VECTORS, ids=lambda law: law.__name__)
def test_vector_equals_scalar(law: Callable[..., Any]) -> None:
    columns = VECTORS[law]
    together = law(*(np.array(column) for column in columns))
    alone = [float(law(*row)) for row in zip(*columns, strict=True)]
    assert together.shape == (2,)
    np.testing.assert_allclose(together, alone, rtol=1e-12)


# A capacitor dropper -------------------------------------------------------------------------------------------------------


def capacitor_voltage_at(theta: float, crest: float, half_swing: float) -> float:
    """Over the capacitor, from the mains crest (θ = 0) to the next (θ = π): held until the input is at -half_swing."""
    return min(crest - half_swing, crest * float(np.cos(theta)) + half_swing)


def swung_over(crest: float, half_swing: float) -> float:
    """θ at which the mains has fallen by the whole swing, found as a root."""
    return float(brentq(lambda theta: crest * (1.0 - np.cos(theta)) - 2.0 * half_swing, 0.0, np.pi))


SWINGS = [0.0, 1.4, 25.4, 100.0, 160.0, 250.0, 320.0]


@pytest.mark.parametrize("half_swing", SWINGS)
def test_capacitor_line_current_is_the_rms_of_its_waveform(half_swing: float) -> None:
    start = swung_over(CREST, half_swing)
    square, _ = quad(lambda theta: (OMEGA * DROPPER * CREST * np.sin(theta)) ** 2, start, np.pi)
    found = laws.capacitor_line_current(CREST, HERTZ, DROPPER, half_swing)
    assert float(found) == pytest.approx(np.sqrt(square / np.pi), rel=1e-7)


@pytest.mark.parametrize("half_swing", SWINGS)
def test_capacitor_current_is_the_mean_of_its_waveform(half_swing: float) -> None:
    start = swung_over(CREST, half_swing)
    charge, _ = quad(lambda theta: OMEGA * DROPPER * CREST * np.sin(theta), start, np.pi)
    assert float(laws.capacitor_current(CREST, HERTZ, DROPPER, 0.0, half_swing)) == pytest.approx(charge / np.pi, rel=1e-7)


@pytest.mark.parametrize("half_swing", SWINGS)
def test_capacitor_voltage_is_the_rms_of_its_waveform(half_swing: float) -> None:
    start = swung_over(CREST, half_swing)
    square, _ = quad(lambda theta: capacitor_voltage_at(theta, CREST, half_swing) ** 2, 0.0, np.pi, points=[start])
    assert float(laws.capacitor_voltage(CREST, half_swing)) == pytest.approx(np.sqrt(square / np.pi), rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("half_swing", SWINGS)
def test_conduction_starts_where_the_mains_has_swung_over(half_swing: float) -> None:
    assert float(laws.conduction_start(CREST, half_swing)) == pytest.approx(swung_over(CREST, half_swing), abs=1e-7)


def test_conduction_start_special_cases() -> None:
    # Nothing to swing over: at the crest already. Half the crest: after a quarter. The crest or more: never.
    np.testing.assert_allclose(laws.conduction_start(100.0, np.array([0.0, 50.0, 100.0, 150.0])), [0.0, np.pi / 2, np.pi, np.pi])


def simulated_current(capacitance: float, resistance: float, half_swing: float) -> float:
    """Mean rectified current [A] of source, resistor and capacitor into a node clamped at ±half_swing, by integration in time."""

    def slopes(time: float, state: NDArray[np.float64]) -> list[float]:
        node = CREST * np.sin(OMEGA * time) - state[0]
        current = (node - np.clip(node, -half_swing, half_swing)) / resistance
        return [current / capacitance, abs(current)]

    cycle, tau = 1.0 / HERTZ, resistance * capacitance
    settled = 6.0 * cycle
    ends, step = [settled, settled + cycle], min(tau, cycle / 40.0)
    found = solve_ivp(slopes, (0.0, ends[1]), np.zeros(2), "LSODA", ends, max_step=step, rtol=1e-8, atol=1e-12)
    return float((found.y[1, 1] - found.y[1, 0]) / cycle)


@pytest.mark.parametrize(
    ("capacitance", "resistance", "within"),
    [(0.47e-6, 100.0, 0.001), (0.47e-6, 1e3, 0.001), (1e-6, 1e3, 0.003), (0.68e-6, 3e3, 0.01), (0.68e-6, 15e3, 0.03)],
)
def test_series_resistance_against_integration_in_time(capacitance: float, resistance: float, within: float) -> None:
    # k alone holds within 0.02 % up to 1 kΩ and falls 16 % short at 15 kΩ with 680 nF (charge balance against simulation);
    # there the law's own docstring claims 3 %.
    found = float(laws.capacitor_current(CREST, HERTZ, capacitance, resistance, 25.4))
    assert found == pytest.approx(simulated_current(capacitance, resistance, 25.4), rel=within)


def test_series_resistance_takes_from_the_crest_by_the_impedance_triangle() -> None:
    # R = Xc: the crest over the capacitor is 1/√2 of the mains' (voltage divider of an RC circuit).
    xc = float(laws.reactance(DROPPER, HERTZ))
    assert float(laws.crest_factor_k(xc, DROPPER, HERTZ)) == pytest.approx(1.0 / np.sqrt(2.0))
    # R → 0 leaves all of it, R → ∞ nothing.
    assert float(laws.crest_factor_k(0.0, DROPPER, HERTZ)) == 1.0
    assert float(laws.crest_factor_k(1e12, DROPPER, HERTZ)) == pytest.approx(0.0, abs=1e-7)


def test_capacitor_current_limits() -> None:
    # The node has to swing over the whole crest or more: the rectifier never conducts.
    assert float(laws.capacitor_current(CREST, HERTZ, DROPPER, 0.0, CREST)) == 0.0
    assert float(laws.capacitor_current(CREST, HERTZ, DROPPER, 0.0, 2.0 * CREST)) == 0.0
    # C → 0: no path.
    assert float(laws.capacitor_current(CREST, HERTZ, 0.0, 100.0, 25.4)) == 0.0
    # C → ∞ behind a resistance: the resistance alone limits. Its mean into no voltage at all is 2/π of crest over R.
    assert float(laws.capacitor_current(CREST, HERTZ, 1.0, 1e3, 0.0)) == pytest.approx(2.0 / np.pi * CREST / 1e3, rel=1e-4)
    # V → 0: the mean of a full-wave rectified sine is 2√2/π of its RMS.
    rms = CREST / np.sqrt(2.0) / float(laws.reactance(DROPPER, HERTZ))
    assert float(laws.capacitor_current(CREST, HERTZ, DROPPER, 0.0, 0.0)) == pytest.approx(2.0 * np.sqrt(2.0) / np.pi * rms)


def test_capacitor_line_current_and_voltage_limits() -> None:
    # No swing: the bare capacitor across the mains, by Ohm's law with its reactance; all of the mains stands over it.
    rms = CREST / np.sqrt(2.0)
    assert float(laws.capacitor_line_current(CREST, HERTZ, DROPPER, 0.0)) == pytest.approx(rms / laws.reactance(DROPPER, HERTZ))
    assert float(laws.capacitor_voltage(CREST, 0.0)) == pytest.approx(rms)
    # Swing beyond the crest: the rectifier never conducts, nothing flows, the capacitor never charges.
    assert float(laws.capacitor_line_current(CREST, HERTZ, DROPPER, 2.0 * CREST)) == pytest.approx(0.0, abs=1e-9)
    assert float(laws.capacitor_voltage(CREST, 2.0 * CREST)) == pytest.approx(0.0, abs=1e-6)


DRIVES = st.tuples(
    st.floats(10e-9, 4.7e-6),  # dropper
    st.floats(0.0, 1e3),  # series resistance
    st.floats(0.0, 60.0),  # half the swing
    st.sampled_from([(169.7, 60.0), (325.27, 50.0)]),  # crest and frequency
)


@given(DRIVES)
def test_capacitance_for_turns_capacitor_current_round(drive: tuple[float, float, float, tuple[float, float]]) -> None:
    capacitance, resistance, half_swing, (crest, hertz) = drive
    assume(2.0 * np.pi * hertz * resistance * capacitance <= 0.7)  # beyond, the published k itself no longer holds; next test
    current = laws.capacitor_current(crest, hertz, capacitance, resistance, half_swing)
    assert float(laws.capacitance_for(current, crest, hertz, resistance, half_swing)) == pytest.approx(capacitance, rel=1e-6)


@pytest.mark.parametrize(("capacitance", "resistance"), [(0.68e-6, 3e3), (1e-6, 5e3), (0.68e-6, 15e3), (2e-6, 10e3)])
def test_capacitance_for_turns_it_round_behind_a_large_resistance_too(capacitance: float, resistance: float) -> None:
    current = laws.capacitor_current(CREST, HERTZ, capacitance, resistance, 25.4)
    assert float(laws.capacitance_for(current, CREST, HERTZ, resistance, 25.4)) == pytest.approx(capacitance, rel=1e-3)


def test_capacitance_for_limits() -> None:
    # No current needs no dropper; a rail over the crest is reached by none.
    assert float(laws.capacitance_for(0.0, CREST, HERTZ, 100.0, 25.4)) == 0.0
    assert np.isnan(laws.capacitance_for(0.01, CREST, HERTZ, 100.0, 2.0 * CREST))


def test_no_dropper_gives_more_than_its_resistance_lets_through() -> None:
    # 10 kΩ alone across the mains carries 2/π of 32.5 mA: no capacitance makes it an ampere.
    assert np.isnan(laws.capacitance_for(1.0, CREST, HERTZ, 10e3, 25.4))


@given(st.floats(1e-9, 1e-5), st.floats(1e-9, 1e-5))
def test_more_dropper_is_more_current(first: float, second: float) -> None:
    low, high = sorted((first, second))
    less, more = laws.capacitor_current(CREST, HERTZ, np.array([low, high]), 100.0, 25.4)
    assert less <= more


# A resistor dropper --------------------------------------------------------------------------------------------------------

THRESHOLDS = [0.0, 6.5, 25.4, 160.0, 325.0]


def resistor_at(theta: float, threshold: float) -> float:
    """Current of 10 kΩ behind a full-wave rectifier that conducts above `threshold`."""
    return max(CREST * float(np.sin(theta)) - threshold, 0.0) / 10e3


@pytest.mark.parametrize("threshold", THRESHOLDS)
def test_resistor_currents_are_mean_and_rms_of_their_waveform(threshold: float) -> None:
    opens = float(np.arcsin(threshold / CREST))
    charge, _ = quad(lambda theta: resistor_at(theta, threshold), opens, np.pi - opens)
    square, _ = quad(lambda theta: resistor_at(theta, threshold) ** 2, opens, np.pi - opens)
    assert float(laws.resistor_current(CREST, 10e3, threshold)) == pytest.approx(charge / np.pi, rel=1e-6)
    assert float(laws.resistor_line_current(CREST, 10e3, threshold)) == pytest.approx(np.sqrt(square / np.pi), rel=1e-6)


def test_resistor_limits() -> None:
    # No threshold: a rectified sine, mean 2/π and RMS 1/√2 of the crest, over R.
    assert float(laws.resistor_current(CREST, 10e3, 0.0)) == pytest.approx(2.0 / np.pi * CREST / 10e3)
    assert float(laws.resistor_line_current(CREST, 10e3, 0.0)) == pytest.approx(CREST / np.sqrt(2.0) / 10e3)
    # Threshold at or over the crest: it never conducts. No mains: neither.
    for crest, threshold in ((CREST, CREST), (CREST, 1000.0), (0.0, 10.0)):
        assert float(laws.resistor_current(crest, 10e3, threshold)) == pytest.approx(0.0, abs=1e-12)
        assert float(laws.resistor_line_current(crest, 10e3, threshold)) == pytest.approx(0.0, abs=1e-12)
    # An open resistor: nothing.
    assert float(laws.resistor_current(CREST, np.inf, 6.5)) == 0.0


# Paper figures, discharge, temperature, meters -----------------------------------------------------------------------------


def test_rule_of_thumb_is_half_pi_too_high_as_the_resistance_goes() -> None:
    # With R → 0 the note's figure is the RMS of a half sine; the mean is 2/π of it (analytic; Microchip AN954 p. 2).
    half_swing = 0.0
    true = 0.5 * laws.capacitor_current(np.sqrt(2.0) * 230.0, HERTZ, DROPPER, 0.0, half_swing)
    told = laws.rule_of_thumb_current(230.0, HERTZ, DROPPER, 0.0, 0.0)
    assert float(told / true) == pytest.approx(np.pi / 2.0)


def test_reactance_limits() -> None:
    # Twice the frequency or twice the capacitance: half the reactance.
    one = laws.reactance(DROPPER, HERTZ)
    assert float(laws.reactance(2.0 * DROPPER, HERTZ)) == pytest.approx(0.5 * one)
    assert float(laws.reactance(DROPPER, 2.0 * HERTZ)) == pytest.approx(0.5 * one)


def test_discharge_limits() -> None:
    # At once nothing has gone; after one time constant 1/e is left; after very long nothing; without a bleeder it stays.
    seconds = np.array([0.0, 0.47, 1e6])
    np.testing.assert_allclose(laws.discharge_voltage(325.0, 1e6, 0.47e-6, seconds), [325.0, 325.0 / np.e, 0.0])
    assert float(laws.discharge_voltage(325.0, np.inf, 0.47e-6, 3600.0)) == 325.0
    # Under the limit from the start: no wait, never a negative one.
    assert float(laws.discharge_time(20.0, 1e6, 0.47e-6, 34.0)) == 0.0
    # A fall by e takes one time constant.
    assert float(laws.discharge_time(34.0 * np.e, 1e6, 0.47e-6, 34.0)) == pytest.approx(0.47)


@given(st.floats(35.0, 1000.0), st.floats(1e5, 1e7), st.floats(1e-8, 1e-5))
def test_after_the_discharge_time_the_limit_is_what_is_left(start: float, resistance: float, capacitance: float) -> None:
    seconds = laws.discharge_time(start, resistance, capacitance, 34.0)
    assert float(laws.discharge_voltage(start, resistance, capacitance, seconds)) == pytest.approx(34.0)


def test_copper_at_its_reference_is_itself() -> None:
    assert float(laws.copper_ratio(25.0)) == 1.0
    # A straight line that leads to nothing at about -234.5 °C: copper's inferred zero (value from memory).
    assert float(laws.copper_ratio(-234.5)) == pytest.approx(0.0, abs=0.005)


def test_zener_temperature_share_follows_the_format_s_table() -> None:
    # Per kelvin: -0.06 % at 3.3 V, 0 at 5.1 V, 0.03 % at 6.2 V, 0.07 % at 12 V, 0.085 % at 18 V, 0.09 % at 24 V.
    volts = np.array([3.3, 5.1, 6.2, 12.0, 18.0, 24.0])
    np.testing.assert_allclose(laws.zener_temperature_share(volts), [-6e-4, 0.0, 3e-4, 7e-4, 8.5e-4, 9e-4], atol=1e-12)
    # Half way from 12 to 18 V; beyond the table its last figure, as avalanche parts level off.
    np.testing.assert_allclose(laws.zener_temperature_share(np.array([15.0, 2.0, 200.0])), [7.75e-4, -6e-4, 9e-4])


def test_two_sigma_adds_as_root_sum_of_squares() -> None:
    # 3 % of 100 V with 4 V: the 3-4-5 triangle. A short circuit leaves the floor, no floor leaves the share.
    assert float(laws.two_sigma(100.0, 0.03, 4.0)) == pytest.approx(5.0)
    assert float(laws.two_sigma(0.0, 0.03, 4.0)) == 4.0
    assert float(laws.two_sigma(-100.0, 0.03, 0.0)) == pytest.approx(3.0)


def test_accuracy_band_of_a_negative_reading_is_not_turned_round() -> None:
    assert laws.accuracy_band(-100.0, 0.01, 0.2) == pytest.approx((-101.2, -98.8))


def test_string_shares_evenly() -> None:
    assert laws.string_share(240.0, 1) == 240.0
    assert laws.string_share(240.0, 3) == pytest.approx(80.0)
