"""The settled cycle at the edges of what a case file admits: numbers or a plain "cannot tell", and the limits that laws give.

A board at an edge is met when somebody types a wrong unit, and when a fault makes an extreme of a common part; neither may end
in a number that is none, or in a warning. Every fault of the catalogue strikes every board here, at both ends of its severity.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from scipy.integrate import quad

from benchtool.board import UNKNOWN, Board, Dropper, Rail, Reservoir, Zener
from benchtool.catalogue.faults import FAULTS
from benchtool.catalogue.strikes import scene_of
from benchtool.physics.settled import Settled
from benchtool.physics.specimens import Specimens, as_marked, concatenate, population, take
from benchtool.physics.stress import mains_power
from benchtool.physics.waveform import CROWD, FIGURES, Effort, settle
from tests.made_cases import boards
from tests.small_boards import board, coil, draws, rail, three_rails

TOLD = tuple(name for name in Settled.__dataclass_fields__ if name not in ("specimens", "converged"))
BRIEF = replace(FIGURES, most_cycles=4)
"""The steps of figures, but no patience: what has not come to be a non-number in four cycles settles or says that it does not."""
EFFORTS = pytest.mark.parametrize("effort", [FIGURES, CROWD], ids=["figures", "crowd"])
RECTIFIERS = ("bridge", "half-wave", "half-wave-zener")
DROPPERS = {
    "capacitor": Dropper(capacitance=0.47e-6),
    "resistor": Dropper(kind="resistor", resistance=10e3),
    "divider": Dropper(kind="divider", capacitance=1e-6, shunt_capacitance=4.7e-6),
}
VALUES = {
    "capacitor": ("capacitance",),
    "resistor": ("resistance",),
    "divider": ("capacitance", "shunt_capacitance"),
}
"""What a dropper of each kind is marked with."""
ENDS = {"capacitance": (1e-12, 1e-4), "shunt_capacitance": (1e-12, 1e-4), "resistance": (1e-3, 1e7)}
"""The least and the most that a case file accepts for it [F, ohm]."""
RAIL = rail(reservoir=220e-6)
LOADS = (draws(0.004), coil(2400.0))


def dropper(kind: str, end: int) -> Dropper:
    """A dropper whose every value is the least, or the most, that is accepted."""
    values: dict[str, Any] = {name: ENDS[name][end] for name in VALUES[kind]}
    return replace(DROPPERS[kind], **values)


def rail_with(**parts: Any) -> tuple[Rail, ...]:
    return (replace(RAIL, **parts),)


def unreadable(kind: str) -> dict[str, Any]:
    """Nothing on the board can be read."""
    faded = rail_with(zener=Zener(voltage=UNKNOWN), reservoir=Reservoir(capacitance=UNKNOWN))
    values: dict[str, Any] = dict.fromkeys(VALUES[kind], UNKNOWN)
    part = replace(DROPPERS[kind], **values)
    loads = (replace(LOADS[0], current=UNKNOWN), replace(LOADS[1], resistance=UNKNOWN))
    return {"dropper": part, "inrush": UNKNOWN, "bleeder": UNKNOWN, "rails": faded, "loads": loads}


def edges(kind: str) -> dict[str, dict[str, Any]]:
    """What each edge changes on the usual board."""
    return {
        "least dropper": {"dropper": dropper(kind, 0)},
        "most dropper": {"dropper": dropper(kind, 1)},
        "inrush 1 mΩ": {"inrush": 1e-3},
        "inrush 10 MΩ": {"inrush": 1e7},
        "no inrush": {"inrush": None},
        "bleeder 1 mΩ": {"bleeder": 1e-3},
        "bleeder 10 MΩ": {"bleeder": 1e7},
        "bleeder only": {"dropper": dropper(kind, 0 if kind != "resistor" else 1), "bleeder": 1e6},
        "no load": {"loads": ()},
        "load 10 A": {"loads": (draws(10.0), LOADS[1])},
        "coil 1 mΩ": {"loads": (LOADS[0], coil(1e-3))},
        "no zener": {"rails": rail_with(zener=None)},
        "no zener, no load": {"rails": rail_with(zener=None), "loads": ()},
        "no reservoir": {"rails": rail_with(reservoir=None)},
        "reservoir 1 pF": {"rails": rail_with(reservoir=Reservoir(capacitance=1e-12))},
        "reservoir 1 F": {"rails": rail_with(reservoir=Reservoir(capacitance=1.0))},
        "neither zener, reservoir nor load": {"rails": rail_with(zener=None, reservoir=None), "loads": ()},
        "zener over the crest": {"rails": rail_with(zener=Zener(voltage=400.0)), "volts": 12.0},
        "10 V, 10 Hz": {"volts": 10.0, "hertz": 10.0},
        "1000 V, 1 kHz": {"volts": 1000.0, "hertz": 1000.0},
        "1000 V, 1 kHz, most dropper": {"volts": 1000.0, "hertz": 1000.0, "dropper": dropper(kind, 1)},
        "nothing can be read": unreadable(kind),
    }


UNKNOWN_DRAWN = 4
"""Specimens of a board that cannot be read."""


@cache
def boards_at(rectifier: str, kind: str) -> dict[str, Board]:
    """The boards at the edges, by name; some on more than one rail."""
    usual: dict[str, Any] = {"dropper": DROPPERS[kind], "inrush": 100.0, "rails": (RAIL,), "loads": LOADS}
    made = {name: board(rectifier, **{**usual, **changes}) for name, changes in edges(kind).items()}
    fed = (RAIL, rail("logic", 5.1, fed_by="rail", through="resistor", feed=1e3, reservoir=1e-12))
    made["two rails"] = board(rectifier, **{**usual, "rails": fed, "loads": (*LOADS, draws(0.003, "logic", name="sensor"))})
    if rectifier != "half-wave-zener":  # zeners are stacked on the rail's side of a rectifier
        made["three rails"] = board(rectifier, **{**usual, "rails": three_rails()})
    return made


@dataclass(frozen=True)
class Crowd:
    """Specimens of one shape, each with the names of its edge and its fault."""

    specimens: Specimens
    names: list[tuple[str, str]]
    on: tuple[str, ...]


def struck(name: str, made: Board) -> Iterator[tuple[Specimens, tuple[str, str]]]:
    """The board as marked, within its tolerances, and with every fault at both ends of its severity."""
    marked = as_marked(made, UNKNOWN_DRAWN)
    yield marked, (name, "as marked")
    yield population(made, UNKNOWN_DRAWN), (name, "within tolerances")
    for fault in FAULTS:
        for place in fault.places(made):
            for end in (0.0, 1.0):
                severity = np.full(marked.count, end)
                yield fault.strike(marked, scene_of(made, place, severity, severity)), (name, f"{fault.name} {place.name} {end}")


@cache
def crowds(rectifier: str, kind: str) -> list[Crowd]:
    """All of them, those of one shape and frequency together so that they are solved in one pass."""
    together: dict[Any, tuple[list[Specimens], list[tuple[str, str]], tuple[str, ...]]] = {}
    for name, made in boards_at(rectifier, kind).items():
        for specimens, names in struck(name, made):
            key = (specimens.shape, specimens.frequency)
            parts, labels, _ = together.setdefault(key, ([], [], made.switched_loads()))
            parts.append(specimens)
            labels += [names] * specimens.count
    return [Crowd(concatenate(parts), labels, on) for parts, labels, on in together.values()]


def strictly(specimens: Specimens, on: tuple[str, ...], effort: Effort) -> Settled:
    """Settled with every floating-point error raised but underflow: an exponential far below its knee is nil, and rightly so.

    The settings of pytest make an error of every warning.
    """
    with np.errstate(all="raise", under="ignore"):
        return settle(specimens, on, effort=effort)


def no_numbers(settled: Settled) -> set[int]:
    """Specimens with a figure that is no number, among what is told and the powers worked out from it."""
    power, bad = mains_power(settled), np.zeros(settled.specimens.count, dtype=bool)
    figures = [getattr(settled, name) for name in TOLD] + [getattr(power, name) for name in power.__dataclass_fields__]
    for figure in figures:
        bad |= ~np.isfinite(np.atleast_2d(figure)).all(axis=0)
    return set(np.flatnonzero(bad))


@pytest.mark.parametrize("effort", [BRIEF, CROWD], ids=["figures", "crowd"])
@pytest.mark.parametrize("kind", DROPPERS)
@pytest.mark.parametrize("rectifier", RECTIFIERS)
def test_every_fault_at_every_edge_gives_numbers(rectifier: str, kind: str, effort: Effort) -> None:
    for crowd in crowds(rectifier, kind):
        settled = strictly(crowd.specimens, crowd.on, effort)
        assert not [crowd.names[index] for index in sorted(no_numbers(settled))]


CANNOT_TELL = {
    # Hundreds of amperes: no board, and whatever becomes of it is no figure.
    *((kind, "1000 V, 1 kHz, most dropper") for kind in DROPPERS),
    # A divider that hardly reaches its rail: the charge on its capacitors finds no way out but through what leaks.
    *(("divider", name) for name in ("no zener, no load", "10 V, 10 Hz", "zener over the crest")),
    # The dropper's charge finds its place through 10 MΩ, the resistor's or the meter's: hundreds of cycles.
    *((kind, name) for kind in DROPPERS for name in ("inrush 10 MΩ", "neither zener, reservoir nor load")),
}
"""By dropper and edge: it is enough that these say so."""


@pytest.mark.parametrize("kind", DROPPERS)
@pytest.mark.parametrize("rectifier", RECTIFIERS)
def test_every_other_board_at_an_edge_settles_as_marked(rectifier: str, kind: str) -> None:
    unsettled = []
    for name, made in boards_at(rectifier, kind).items():
        settled = strictly(as_marked(made, UNKNOWN_DRAWN), made.switched_loads(), FIGURES)
        assert not no_numbers(settled), name
        if (kind, name) not in CANNOT_TELL and not settled.converged.all():
            unsettled.append(name)
    assert not unsettled


@settings(max_examples=30, deadline=None)
@given(boards())
def test_whatever_a_file_accepts_gives_numbers_in_a_crowd(made: Board) -> None:
    assert not no_numbers(strictly(as_marked(made, 4), made.switched_loads(), CROWD))


@settings(max_examples=8, deadline=None)
@given(boards())
def test_whatever_a_file_accepts_gives_numbers_as_figures(made: Board) -> None:
    assert not no_numbers(strictly(as_marked(made, 2), (), FIGURES))


# Vector equals scalar ------------------------------------------------------------------------------------------------------


@EFFORTS
@pytest.mark.parametrize("rectifier", RECTIFIERS)
def test_a_specimen_settles_alone_to_what_it_settles_to_among_others(rectifier: str, effort: Effort) -> None:
    # What each settles to hangs on no other but by the last digits of the means that it starts from: closer by far than what
    # counts as a repeat.
    fed = (RAIL, rail("logic", 5.1, fed_by="rail", through="resistor", feed=1e3, reservoir=100e-6))
    crowd = population(board(rectifier, rails=fed, loads=(*LOADS, draws(0.003, "logic", name="sensor")), inrush=100.0), 64)
    together = settle(crowd, ("relay",), effort=effort)
    for number in (0, 7, 63):
        alone = settle(take(crowd, np.array([number])), ("relay",), effort=effort)
        assert alone.converged[0] == together.converged[number]
        for name in TOLD:
            figure, among = np.atleast_2d(getattr(alone, name))[:, 0], np.atleast_2d(getattr(together, name))[:, number]
            np.testing.assert_allclose(figure, among, rtol=1e-6, atol=1e-9, err_msg=name)


# Limits --------------------------------------------------------------------------------------------------------------------

CREST = np.sqrt(2.0) * 230.0


@EFFORTS
def test_without_resistance_the_dropper_s_charge_balance_is_met(effort: Effort) -> None:
    # R → 0: I = 4·f·C·(crest − V − 2·Vf) (TI SBVS343A §8.2.1), with the rail that the cycle itself came to and diodes that drop
    # 0.725 V at the 30 mA they carry.
    settled = settle(as_marked(board(loads=(coil(400.0, switched=False),), inrush=0.001)), (), effort=effort)
    volts = float(settled.rail_voltage[0, 0])
    assert float(settled.supply_current[0]) == pytest.approx(4.0 * 50.0 * 0.47e-6 * (CREST - volts - 1.45), rel=0.01)


@EFFORTS
@pytest.mark.parametrize("rectifier", RECTIFIERS)
def test_as_the_resistance_goes_to_nothing_its_figures_go_on_into_those_without(rectifier: str, effort: Effort) -> None:
    least = settle(as_marked(board(rectifier, inrush=1e-3, loads=LOADS)), (), effort=effort)
    none = settle(as_marked(board(rectifier, loads=LOADS)), (), effort=effort)
    for name in TOLD:
        np.testing.assert_allclose(getattr(least, name), getattr(none, name), rtol=2.0 * effort.share, atol=1e-6, err_msg=name)


PATIENT = replace(FIGURES, most_cycles=3000, share=1e-7, volts=1e-6)
"""For a dropper and a resistance whose product is a second: fifty cycles, before the dropper's charge has found its place."""


@pytest.mark.parametrize(("rectifier", "ways"), [("bridge", 1.0), ("half-wave", 0.5)])
def test_a_very_large_dropper_becomes_the_mains_itself(rectifier: str, ways: float) -> None:
    # C → ∞: 100 µF (32 Ω) before 10 kΩ drops nothing, and the current is limited by the resistance: the mean and the RMS of what
    # a sine over 10 kΩ passes beyond the rail and the diodes, by quadrature. A capacitor passes no direct current, so it levels
    # a half-wave's halves, one before the rail and one before nothing: it stands at half the rail.
    made = board(rectifier, 100e-6, (rail(zener=None),), (coil(1e3, switched=False),), inrush=10e3)
    settled = settle(as_marked(made), (), effort=PATIENT)
    assert settled.converged.all()
    volts = float(settled.rail_voltage[0, 0])
    threshold = ways * (volts + 1.4)
    start = float(np.arcsin(threshold / CREST))

    def mean(power: int) -> float:
        """Mean over half a cycle of the current, or of its square."""
        whole, _ = quad(lambda angle: ((CREST * np.sin(angle) - threshold) / 10e3) ** power, start, np.pi - start)
        return whole / np.pi

    assert settled.supply_current[0] == pytest.approx(ways * mean(1), rel=0.005)
    assert settled.line_current[0] == pytest.approx(np.sqrt(mean(2)), rel=0.005)


@EFFORTS
def test_what_counts_as_settled_leaves_no_direct_voltage_on_a_bridge_s_dropper(effort: Effort) -> None:
    # A bridge takes both halves alike, so by symmetry the dropper of 1 µF holds no DC, behind a resistor that has risen to 100 kΩ
    # too: five cycles to get rid of what it was started with. Half a volt is the default meter's share of the crest.
    settled = settle(as_marked(board("bridge", 1e-6, (rail(),), (coil(1e3, switched=False),), inrush=100e3)), (), effort=effort)
    assert not settled.converged[0] or settled.dropper_dc[0] < 0.005 * CREST


@EFFORTS
@pytest.mark.parametrize("rectifier", RECTIFIERS)
def test_without_a_load_the_zener_takes_everything_that_the_meter_leaves(rectifier: str, effort: Effort) -> None:
    # Load → 0: all that comes goes through the zener; at the dropper node only the meter's 2.4 µA gets past it, and the charge
    # balance says what comes: I = f·C·(2·crest − V_hi − V_lo), or 4·f·C·(crest − V − 2·Vf) through a bridge.
    settled = settle(as_marked(board(rectifier, inrush=1.0)), (), effort=effort)
    volts, zener = float(settled.rail_voltage[0, 0]), float(settled.zener_current[0, 0])
    charge = 4.0 * (CREST - volts - 1.4) if rectifier == "bridge" else 2.0 * CREST - volts - 1.4
    # A crowd's rail repeats to 0.1 % and so its zener, e-fold in 60 mV, to some percent.
    assert zener == pytest.approx(50.0 * 0.47e-6 * charge, rel=0.01 if effort is FIGURES else 0.03)
    # What is left for the meter is told to a small share of what is divided.
    left = 0.0 if rectifier == "half-wave-zener" else zener
    assert settled.supply_current[0] - left == pytest.approx(volts / 10e6, abs=(1e-3 if effort is FIGURES else 0.03) * zener)


@EFFORTS
@pytest.mark.parametrize(("rectifier", "wanted"), [("bridge", 0.9003), ("half-wave", 0.4502)])
def test_dc_over_rms_of_a_rail_at_nothing(rectifier: str, wanted: float, effort: Effort) -> None:
    # Rail → 0, a zener shorted by next to nothing: 2√2/π through a bridge and √2/π through a half-wave (published values, row 8,
    # analytic). At 1000 V the diodes' drops are a thousandth of the crest.
    shorted = replace(as_marked(board(rectifier, volts=1000.0)), zener_short=np.full((1, 1), 1e-3))
    settled = settle(shorted, (), effort=effort)
    assert settled.rail_voltage[0, 0] < 1e-3
    assert settled.supply_current[0] / settled.line_current[0] == pytest.approx(wanted, rel=0.002)
