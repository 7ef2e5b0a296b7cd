"""Every rectifier that a case file may name is known to all that tells rectifiers apart, in figures that kill too."""

from __future__ import annotations

from typing import get_type_hints

import pytest

from benchtool.board import Board, Choice
from benchtool.physics.discharge import worst_voltage
from benchtool.physics.rectifier import LEGS
from benchtool.physics.specimens import Junction
from tests.compared import stored
from tests.small_boards import board

(CHOICE,) = [note for note in get_type_hints(Board, include_extras=True)["rectifier"].__metadata__ if isinstance(note, Choice)]

CLIMBS = {"bridge": 1.0, "half-wave": 2.0, "half-wave-zener": 1.0}
"""How many crests a rail climbs to without its zener (published values, supply formulas: zener open)."""


def test_each_has_its_legs_and_circuits_of_the_reference() -> None:
    circuits = {circuit["board"]["rectifier"] for circuit in stored("wide_circuits.json")}
    assert set(LEGS) == set(CHOICE.words) == circuits
    assert all(Junction.GOOD in rows and Junction.SERIES_OPEN in rows for rows in LEGS.values())


@pytest.mark.parametrize("rectifier", CHOICE.words)
def test_each_climbs_without_its_zener_as_published(rectifier: str) -> None:
    made = board(rectifier, volts=230.0, variation=0.10)
    assert worst_voltage(made, made.rails[0]) == pytest.approx(CLIMBS[rectifier] * 2.0**0.5 * 253.0)
