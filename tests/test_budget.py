"""The budget: what flows where in stacked rails by hand, corners, drop-out by the zener's edge, and there and back again."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.board import UNKNOWN, Board, Dropper, Load, Zener
from benchtool.physics.budget import (
    agreed,
    back_solved_capacitance,
    budget_of,
    capacitance_giving,
    chain_current,
    demand,
    dropout_capacitance,
    dropper_tolerance,
    normal_load,
    regulating,
)
from benchtool.physics.mean_value import means
from benchtool.physics.specimens import as_marked, population, take
from benchtool.physics.supply import feed_of, supply_current
from benchtool.physics.waveform import settle
from tests.small_boards import board, coil, draws, rail, stacked

STACK = stacked(18.0, 5.1)
LED = Load(name="lamp", kind="led", rail="logic", forward_voltage=2.1, resistance=1000.0)
TO_LOGIC, TO_COMMON = "logic", "common"


def demand_of(made: Board) -> float | None:
    return demand(made, as_marked(made))


# Demand: counted by hand from the circuit (the case format's rule: what returns into a lower rail is not counted twice) -----


@pytest.mark.parametrize(
    ("loads", "amperes"),
    [
        ((), 0.0),
        # Lower rail alone: its current comes down through the upper zener.
        ((draws(0.0035, "logic"),), 0.0035),
        # 18 V over 810 ohm returns into the lower rail and runs the controller as well: the greater of the two.
        ((coil(810.0, returns_to=TO_LOGIC), draws(0.0035, "logic")), 18.0 / 810.0),
        # A controller that takes more than the coil hands down: the rest comes through the zener.
        ((coil(1800.0, returns_to=TO_LOGIC), draws(0.025, "logic")), 0.025),
        # Straight to common the coil has 23.1 V and bypasses the lower rail: added.
        ((coil(810.0), draws(0.0035, "logic")), 23.1 / 810.0 + 0.0035),
        # One of each: what returns is shared, what bypasses is added.
        ((coil(1800.0, returns_to=TO_LOGIC), draws(0.004, name="fan"), draws(0.0035, "logic")), 0.010 + 0.004),
        # LED: 5.1 V less its 2.1 V over 1 kΩ.
        ((LED,), 0.003),
    ],
)
def test_demand_of_stacked_rails(loads: tuple[Load, ...], amperes: float) -> None:
    assert demand_of(board(rails=STACK, loads=loads)) == pytest.approx(amperes, rel=1e-9)


def test_demand_of_a_rail_behind_a_resistor_is_what_the_resistor_passes() -> None:
    # 24 V less 5.1 V over 1.8 kΩ, whatever the lower rail's loads leave to its zener.
    rails = (rail(), rail("logic", 5.1, fed_by="rail", through="resistor", feed=1800.0))
    assert demand_of(board(rails=rails, loads=(draws(0.0035, "logic"), draws(0.002)))) == pytest.approx(18.9 / 1800.0 + 0.002)


def test_demand_at_a_node_zener_counts_the_rail_a_diode_lower() -> None:
    # half-wave-zener: the rail stands 0.7 V under its zener.
    assert demand_of(board("half-wave-zener", rails=(rail(zener=24.7),), loads=(coil(2400.0),))) == pytest.approx(0.010)


@pytest.mark.parametrize("zener", [None, UNKNOWN])
def test_demand_is_unknown_without_a_nominal_voltage(zener: object) -> None:
    fitted = None if zener is None else Zener(voltage=UNKNOWN)
    made = board(rails=(replace(rail(), zener=fitted),), loads=(draws(0.005),))
    budget = budget_of(made)
    assert (budget.demand, budget.available, budget.margin) == (None, None, None)
    assert normal_load(made) == 0.01


def test_normal_load_is_the_demand() -> None:
    assert normal_load(board(loads=(draws(0.005),))) == pytest.approx(0.005)
    assert normal_load(board()) == 0.01  # no load: a figure to tell faults in, never nil


# Available -----------------------------------------------------------------------------------------------------------------


def test_available_corners_by_charge_balance() -> None:
    # 4·f·C·(crest - V - 1.4 V) at mains and dropper both low, both high: 207 and 253 V (IEC 60038), 10 %.
    budget = budget_of(board())
    low = 4.0 * 50.0 * 0.9 * 0.47e-6 * (np.sqrt(2.0) * 207.0 - 25.4)
    high = 4.0 * 50.0 * 1.1 * 0.47e-6 * (np.sqrt(2.0) * 253.0 - 25.4)
    assert budget.available_low == pytest.approx(low)
    assert budget.available_high == pytest.approx(high)


@pytest.mark.parametrize(("rectifier", "zener"), [("half-wave", 5.0), ("half-wave-zener", 5.7)])
def test_available_of_a_half_wave_by_its_node_s_swing(rectifier: str, zener: float) -> None:
    # f·C·(2·crest - V_hi - V_lo): the node goes from +5.7 V, conducting into a rail of 5 V, to -0.7 V, returning. At 12 V mains
    # the diodes weigh enough to be seen.
    made = board(rectifier, rails=(rail(zener=zener),), volts=12.0)
    wanted = 50.0 * 0.47e-6 * (2.0 * np.sqrt(2.0) * 12.0 - 5.7 - 0.7)
    assert budget_of(made).available == pytest.approx(wanted, rel=1e-9)


def test_available_corners_of_a_resistor_dropper_stand_round_its_mark() -> None:
    budget = budget_of(board(dropper=Dropper(kind="resistor", resistance=10e3)))
    assert budget.available is not None
    assert budget.available_low is not None
    assert budget.available_high is not None
    # A little under a rectified sine's mean of 2/π · crest over R, for the threshold of 25.4 V.
    assert 0.85 * 2.0 / np.pi * 325.3 / 10e3 < budget.available < 2.0 / np.pi * 325.3 / 10e3
    assert budget.available_low < 0.9 * budget.available < 1.1 * budget.available < budget.available_high


@pytest.mark.parametrize(
    ("kind", "stated", "wanted"), [("capacitor", None, 0.10), ("resistor", None, 0.05), ("capacitor", 0.2, 0.2)]
)
def test_dropper_tolerance(kind: str, stated: float | None, wanted: float) -> None:
    # Stated, or 10 % for a capacitor and 5 % for a resistor (the case format's section 4).
    part = Dropper(kind=kind, capacitance=0.47e-6, tolerance=stated)
    assert dropper_tolerance(board(dropper=part)) == wanted


def test_rule_of_thumb_is_told_for_half_wave_capacitors_alone() -> None:
    assert budget_of(board("bridge")).rule_of_thumb is None
    assert budget_of(board("half-wave", dropper=Dropper(kind="resistor", resistance=10e3))).rule_of_thumb is None
    told, true = budget_of(board("half-wave")).rule_of_thumb, budget_of(board("half-wave")).available
    assert told is not None
    assert true is not None
    assert 1.4 < told / true < np.pi / 2.0 + 0.1  # RMS of a half sine over its mean (Microchip AN954 p. 2 against analysis)


def test_margin_is_what_is_left() -> None:
    budget = budget_of(board(loads=(coil(1440.0),)))
    assert budget.available is not None
    assert budget.margin == pytest.approx(budget.available - 24.0 / 1440.0)
    assert budget.on == ("relay",)


def test_unreadable_dropper_leaves_what_the_loads_need() -> None:
    # What it delivers cannot be known; what the loads take, and the least dropper for it, do not depend on the part fitted.
    known = board(loads=(draws(0.005),))
    charred, wanted = budget_of(replace(known, dropper=Dropper(capacitance=UNKNOWN))), budget_of(known)
    assert (charred.available, charred.available_low, charred.available_high, charred.margin) == (None,) * 4
    assert charred.demand == pytest.approx(0.005)
    assert charred.dropout_capacitance == pytest.approx(wanted.dropout_capacitance, rel=1e-3)


def test_agreed_figures() -> None:
    assert agreed(np.array([1.0, 1.01])) == pytest.approx(1.005)
    assert agreed(np.array([1.0, 1.2])) is None
    assert agreed(np.array([1.0, np.nan])) is None
    assert agreed(np.zeros(3)) == 0.0


# Drop-out ------------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("rectifier", ["bridge", "half-wave", "half-wave-zener"])
def test_at_the_drop_out_value_the_zener_carries_a_tenth_of_a_milliampere(rectifier: str) -> None:
    # "A rail regulates while its zener still carries at least 0.1 mA": a little less dropper and it does not.
    made = board(rectifier, loads=(replace(coil(2400.0), switched=False),))
    found = dropout_capacitance(as_marked(made), ())
    at = means(replace(as_marked(made), capacitance=found), ())
    assert float(chain_current(at.zener_current, at.network.specimens.shape, 0)[0]) == pytest.approx(1e-4, rel=0.05)
    for share, holds in ((0.99, False), (1.01, True)):
        state = regulating(settle(replace(as_marked(made), capacitance=share * found), ()), 0)
        assert state is not None
        assert bool(state[0]) is holds


def test_drop_out_by_hand() -> None:
    # 2.4 kΩ at 23.77 V (a zener with 0.1 mA stands 60 mV · ln 50 under its mark), and that 0.1 mA: charge balance turned round.
    volts = 24.0 - 0.060 * np.log(50.0)
    wanted = (volts / 2400.0 + 1e-4) / (4.0 * 50.0 * (np.sqrt(2.0) * 230.0 - volts - 1.4))
    assert budget_of(board(loads=(coil(2400.0),))).dropout_capacitance == pytest.approx(wanted, rel=1e-3)


def test_drop_out_of_a_stack_is_told_by_its_weakest_zener() -> None:
    # The upper zener is starved by its coil while the lower still gets what the coil hands down.
    made = board(capacitance=330e-9, rails=STACK, loads=(replace(coil(810.0, returns_to=TO_LOGIC), switched=False),))
    settled = settle(as_marked(made), ())
    assert settled.zener_current[0, 0] < 1e-4 < settled.zener_current[1, 0]
    upper, lower = regulating(settled, 0), regulating(settled, 1)
    assert upper is not None
    assert lower is not None
    assert (bool(upper[0]), bool(lower[0])) == (False, True)


def test_a_rail_without_a_zener_neither_regulates_nor_lets_go() -> None:
    made = board(rails=(rail(zener=None),), loads=(draws(0.005),))
    assert regulating(settle(as_marked(made), ()), 0) is None
    assert budget_of(made).dropout_capacitance is None


def test_no_load_needs_next_to_no_dropper_and_too_much_load_none_will_do() -> None:
    light = budget_of(board()).dropout_capacitance
    assert light is not None
    assert light < 0.01 * 0.47e-6
    # Half an ampere is out of reach of ten times the marked value.
    assert budget_of(board(loads=(draws(0.5),))).dropout_capacitance is None


def test_capacitance_giving_finds_what_is_asked_for() -> None:
    # The dropper whose line current is that of the marked one is the marked one.
    marked = as_marked(board(inrush=100.0, loads=(draws(0.005),)))
    target = means(marked, ()).line_current
    shifted = replace(marked, capacitance=0.5 * marked.capacitance)
    found = capacitance_giving(shifted, (), False, lambda at: at.line_current, target)
    assert float(found[0]) == pytest.approx(0.47e-6, rel=1e-4)
    # Beyond ten times its own: not a number. What it shows with next to none already: nil.
    assert np.isnan(capacitance_giving(marked, (), False, lambda at: at.line_current, 100.0 * target)[0])
    assert capacitance_giving(marked, (), False, lambda at: at.line_current, 0.0 * target)[0] == 0.0


RAILS = st.floats(0.0, 60.0)


@given(st.floats(20e-9, 4e-6), RAILS, st.sampled_from(["bridge", "half-wave", "half-wave-zener"]))
def test_back_solved_dropper_delivers_the_current_it_was_solved_from(capacitance: float, volts: float, rectifier: str) -> None:
    marked, first = as_marked(board(rectifier, capacitance, inrush=220.0)), np.array([volts])
    current, _ = supply_current(feed_of(marked), first)
    assert float(back_solved_capacitance(marked, current, first)[0]) == pytest.approx(capacitance, rel=1e-6)


@given(st.floats(20e-9, 4e-6), RAILS)
def test_back_solving_is_not_fooled_by_the_bleeder(capacitance: float, volts: float) -> None:
    # 940 kΩ across the dropper carries its share in quadrature: under 0.5 % of what even 20 nF brings.
    marked, first = as_marked(board("bridge", capacitance, bleeder=470e3, in_series=2)), np.array([volts])
    current, _ = supply_current(feed_of(marked), first)
    assert float(back_solved_capacitance(marked, current, first)[0]) == pytest.approx(capacitance, rel=0.02)


def test_supply_falls_with_the_rail_by_the_slope_it_tells() -> None:
    marked = as_marked(board(inrush=100.0))
    volts = np.array([24.0])
    current, slope = supply_current(feed_of(marked), volts)
    higher, _ = supply_current(feed_of(marked), volts + 1.0)
    # Charge balance: 4·f·C amperes less for each volt of the rail.
    assert float(slope[0]) == pytest.approx(-4.0 * 50.0 * 0.47e-6, rel=0.002)
    assert float(higher[0] - current[0]) == pytest.approx(float(slope[0]), rel=1e-3)


def test_vector_equals_scalar() -> None:
    drawn = population(board(inrush=100.0, loads=(draws(0.005),)), 16)
    together = dropout_capacitance(drawn, ())
    alone = [float(dropout_capacitance(take(drawn, np.array([place])), ())[0]) for place in (0, 9)]
    np.testing.assert_allclose(together[[0, 9]], alone, rtol=1e-4)
