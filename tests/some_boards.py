"""Boards and shortcuts that several tests of the diagnosis share."""

from __future__ import annotations

from functools import cache, lru_cache
from pathlib import Path
from typing import Any

import pytest

from benchtool import assessment, casefile
from benchtool.board import Board
from benchtool.catalogue.readings import READING_KINDS
from benchtool.diagnosis import closer, crowd, effective, posterior
from benchtool.observed import Reading, ReadingValue
from benchtool.physics import budget, mean_value, waveform
from benchtool.physics.cycle import Pace

CONTRACT = casefile.loads((Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8"))
"""The case file of the case format's section 1."""

FULL = casefile.loads("""
format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
[board]
rectifier = "bridge"
fuse = { rated_current = "1 A" }
varistor = { voltage = "275 V" }
dropper = { capacitance = "1 uF", fitted = "470 nF", safety_class = "X2", tolerance = "10 %" }
inrush = { resistance = "100 ohm" }
bleeder = { resistance = "220 kohm", in_series = 2 }
[[board.rail]]
name = "upper"
fed_by = "rectifier"
zener = { voltage = "24 V" }
reservoir = { capacitance = "220 uF" }
[[board.rail]]
name = "lower"
fed_by = "upper"
fed_through = "resistor"
feed_resistance = "1 kohm"
zener = { voltage = "5.1 V" }
reservoir = { capacitance = "100 uF" }
[[board.load]]
name = "controller"
kind = "current"
rail = "lower"
current = "3 mA"
[[board.load]]
name = "relay"
kind = "coil"
rail = "upper"
switched = true
nominal_voltage = "24 V"
resistance = "2.3 kohm"
[[board.load]]
name = "heater"
kind = "resistor"
rail = "upper"
switched = true
resistance = "4.7 kohm"
[[board.load]]
name = "lamp"
kind = "led"
rail = "lower"
switched = true
forward_voltage = "2 V"
resistance = "1 kohm"
""")
"""A board of our own with every part that the faults ask for."""


def read(what: str, value: ReadingValue, **qualifiers: Any) -> Reading:
    """A reading; `on` none unless given, for the kinds that know it."""
    if "on" in READING_KINDS[what].may:
        qualifiers.setdefault("on", ())
    return Reading(what=what, value=value, **qualifiers)


def draw_few(monkeypatch: pytest.MonkeyPatch, count: int, *, coarse: bool = False) -> None:
    """Few specimens, for tests that do not hang on figures.

    `coarse`: many of them are left unsolved as well, and only a hypothesis that leads by far is drawn again.
    """
    for module, name in (
        (crowd, "EACH"), (closer, "REDRAWN"), (effective, "DRAWN"), (assessment, "BAND_DRAWN"),
    ):
        monkeypatch.setattr(module, name, count)
    forget(monkeypatch)
    if coarse:
        monkeypatch.setattr(posterior, "LEADS_FROM", 0.2)
        monkeypatch.setattr(mean_value, "MOST_STEPS", 12)
        monkeypatch.setattr(mean_value, "WARMING_STEPS", 1)
        monkeypatch.setattr(budget, "BISECTIONS", 2)
        rough = waveform.Effort(Pace(8, 3, 0.1), None, most_cycles=2, share=0.01, volts=0.1, charge=1.0)
        monkeypatch.setattr(waveform, "FIGURES", rough)
        monkeypatch.setattr(waveform, "CROWD", rough)


def forget(monkeypatch: pytest.MonkeyPatch) -> None:
    """What is kept for a board, kept for this test only."""
    monkeypatch.setattr(posterior, "crowd_of", lru_cache(crowd.crowd_of.__wrapped__))
    monkeypatch.setattr(assessment, "_yardsticks", lru_cache(assessment._yardsticks.__wrapped__))
    monkeypatch.setattr(assessment, "budget_of", budget.budget_of.__wrapped__)
    monkeypatch.setattr(effective, "_solver", lru_cache(effective._solver.__wrapped__))
    monkeypatch.setattr(closer, "_bench", lru_cache(closer._bench.__wrapped__))


@cache
def samples() -> tuple[Path, ...]:
    """Every sample case."""
    return tuple(sorted((Path(__file__).parent.parent / "sample-cases").glob("*.toml")))


def every_board() -> dict[str, Board]:
    """The boards of the samples, of the contract and the full one, by name."""
    found = {path.stem: casefile.load(path).board for path in samples()}
    return {**found, "contract": CONTRACT.board, "full": FULL.board}
