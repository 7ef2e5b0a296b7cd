"""Which check comes next.

Its gain is held to the mutual information worked out by enumeration, its minutes to the case format.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from benchtool.board import Board
from benchtool.catalogue.accepted import lacking
from benchtool.catalogue.faults import FAULTS_BY_NAME
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shown import Shown
from benchtool.catalogue.strikes import Place
from benchtool.diagnosis import checks, crowd
from benchtool.diagnosis.checks import candidates, minutes_of, next_checks
from benchtool.diagnosis.hypotheses import Hypothesis, Struck
from benchtool.diagnosis.posterior import Posterior, posterior_of
from benchtool.observed import Check, Meter
from tests.some_boards import CONTRACT, FULL, draw_few, every_board, read

BOARDS = every_board()
METER = Meter()
NAMES = ("fuse-open", "diode-short", "dropper-open")


EACH = 2


def known_posterior(probabilities: Sequence[float], monkeypatch: pytest.MonkeyPatch) -> Posterior:
    """Hypotheses of given probabilities on two specimens each, nothing read yet."""
    hypotheses = tuple(
        Hypothesis((Struck(FAULTS_BY_NAME[name], Place()),), 1.0) for name, _ in zip(NAMES, probabilities, strict=False)
    )
    monkeypatch.setattr(crowd, "hypotheses_of", lambda board: hypotheses)
    monkeypatch.setattr(crowd, "EACH", EACH)
    monkeypatch.setattr(checks, "TOLD", 0)
    chances, nothing = np.array(probabilities), np.zeros((0, len(hypotheses), EACH))
    return Posterior(
        crowd=crowd.crowd_of.__wrapped__(FULL.board),
        meter=METER,
        readings=(),
        densities=nothing,
        log_prior=np.log(np.full(nothing.shape[1:], 1.0 / EACH)),
        log_likelihood=np.zeros(len(hypotheses)),
        closer={},
        probabilities=chances,
        unexplained=1.0 - float(chances.sum()),
        uniform=np.zeros(0),
        explained=chances / chances.sum(),
    )


def foretell(monkeypatch: pytest.MonkeyPatch, **shown: Sequence[Shown]) -> None:
    """Lets each check show what is given for it, hypothesis by hypothesis; no other check is there."""
    def joined(parts: Sequence[Shown]) -> Shown:
        def flat(arrays: Sequence[Any]) -> Any:
            return None if arrays[0] is None else np.repeat(np.concatenate(arrays), EACH)

        chances = {word: flat([part.chances[word] for part in parts]) for word in parts[0].chances}
        given, never = any(part.opened is not None for part in parts), np.array([False])
        opened = flat([never if part.opened is None else part.opened for part in parts]) if given else None
        return Shown(flat([part.value for part in parts]), 0.0, opened, None, chances)

    table = {what.replace("_", "-"): (lambda view, parts=parts: joined(parts)) for what, parts in shown.items()}
    monkeypatch.setattr(checks, "SHOWS", table)
    monkeypatch.setattr(crowd, "SHOWS", table)


def mutual_information(prior: Sequence[float], chances: Sequence[Sequence[float]]) -> float:
    """Entropy of the outcome less its mean entropy under each hypothesis [bit]: the other way round than the code's sum."""

    def entropy(values: Sequence[float]) -> float:
        return -math.fsum(value * math.log2(value) for value in values if value > 0.0)

    outcomes = [math.fsum(p * row[k] for p, row in zip(prior, chances, strict=True)) for k in range(len(chances[0]))]
    return entropy(outcomes) - math.fsum(p * entropy(row) for p, row in zip(prior, chances, strict=True))


WORDS = ("good", "open", "short")


@pytest.mark.parametrize(
    ("prior", "chances"),
    [
        ((0.5, 0.3, 0.2), ((0.9, 0.05, 0.05), (0.1, 0.8, 0.1), (0.2, 0.2, 0.6))),
        ((0.7, 0.2, 0.1), ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))),
        ((0.98, 0.015, 0.005), ((0.5, 0.3, 0.2), (0.0, 0.5, 0.5), (0.2, 0.2, 0.6))),
    ],
)
def test_the_gain_is_the_mutual_information(
    prior: tuple[float, ...], chances: tuple[tuple[float, ...], ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    found = known_posterior(prior, monkeypatch)
    shown = [Shown(chances={word: np.array([p]) for word, p in zip(WORDS, row, strict=True)}) for row in chances]
    foretell(monkeypatch, rectifier_test=shown)
    (only,) = next_checks(found, ())
    assert only.gain == pytest.approx(mutual_information(prior, chances), rel=1e-9)


def test_what_remains_unexplained_does_not_dilute_the_gain(monkeypatch: pytest.MonkeyPatch) -> None:
    """Hypotheses of 0.4 and 0.4 with 0.2 unexplained count as a half each: a check that parts them is worth one bit."""
    found = known_posterior((0.4, 0.4), monkeypatch)
    shown = [Shown(chances={word: np.array([float(word == mine)]) for word in WORDS}) for mine in ("good", "open")]
    foretell(monkeypatch, rectifier_test=shown)
    (only,) = next_checks(found, ())
    assert only.gain == pytest.approx(1.0)


def numbers(*values: float) -> list[Shown]:
    return [Shown(np.array([value])) for value in values]


def test_a_number_that_parts_two_hypotheses_tells_one_bit(monkeypatch: pytest.MonkeyPatch) -> None:
    found = known_posterior((0.5, 0.5), monkeypatch)
    foretell(monkeypatch, inrush_voltage=numbers(1.0, 60.0))
    gains = [item.gain for item in next_checks(found, ())]
    assert gains == pytest.approx([1.0, 1.0])  # loads off, loads on


def test_a_number_that_is_the_same_for_all_tells_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    found = known_posterior((0.5, 0.5), monkeypatch)
    foretell(monkeypatch, inrush_voltage=numbers(5.0, 5.0))
    assert next_checks(found, ()) == ()


def test_a_word_in_place_of_a_number_tells_as_much(monkeypatch: pytest.MonkeyPatch) -> None:
    found = known_posterior((0.5, 0.5), monkeypatch)
    yes, no = np.array([True]), np.array([False])
    shown = [Shown(np.array([100.0]), opened=no), Shown(np.array([np.inf]), opened=yes)]
    foretell(monkeypatch, fuse_resistance=shown)
    (only,) = next_checks(found, ())
    assert only.gain > 0.8


def test_no_gain_is_more_than_there_is_to_know(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 48)
    for case in (FULL, replace(CONTRACT, readings=CONTRACT.readings[:2])):
        found = posterior_of(case.board, METER, case.readings)
        share = found.probabilities[found.probabilities > 0.0] / found.probabilities.sum()
        entropy = -float(np.sum(share * np.log2(share)))
        gains = [item.gain for item in next_checks(found, [reading.check for reading in case.readings])]
        assert gains
        assert all(0.0 < gain <= entropy + 0.01 for gain in gains)


def test_all_probability_unexplained_still_gives_an_answer() -> None:
    """Readings far from everything leave nothing to the hypotheses, in floats not even a rest."""
    found = posterior_of(FULL.board, METER, (read("mains-voltage", 0.0),))
    assert next_checks(found, [Check(what="mains-voltage")]) is not None


# --- what is proposed


@pytest.mark.parametrize("name", BOARDS)
def test_only_what_the_board_has_is_proposed(name: str) -> None:
    board = BOARDS[name]
    proposed = list(candidates(board, ()))
    assert len(set(proposed)) == len(proposed)
    for check in proposed:
        kind = READING_KINDS[check.what]
        rail = None if check.rail is None else board.rail(check.rail)
        load = None if check.load is None else next(load for load in board.loads if load.name == check.load)
        assert lacking(kind, board, rail, load) is None, check
        assert (check.rail is None, check.load is None) == ("rail" not in kind.needs, "load" not in kind.needs)
        assert set(check.on or ()) <= set(board.switched_loads())
        assert (check.on is None) == ("on" not in kind.may)


def test_what_was_read_is_not_proposed_again() -> None:
    board = FULL.board
    every = list(candidates(board, ()))
    for taken in every:
        left = list(candidates(board, [taken]))
        assert taken not in left
        # A dropper read with a leg lifted need not be read again across its bleeder, which is the poorer reading.
        assert len(left) == len(every) - (2 if taken.lifted else 1)


def test_what_was_read_with_the_loads_named_in_another_order_is_not_proposed_again() -> None:
    on = FULL.board.switched_loads()
    taken = Check(what="inrush-voltage", on=on[::-1])
    proposed = [check for check in candidates(FULL.board, [taken]) if check.what == "inrush-voltage"]
    assert [set(check.on or ()) for check in proposed] == [set()]


def test_the_dropper_is_proposed_lifted_and_in_place() -> None:
    found = [check.lifted for check in candidates(FULL.board, ()) if check.what == "dropper-capacitance"]
    assert sorted(found) == [False, True]


def test_bleeder_readings_are_left_to_the_safety_findings() -> None:
    assert "bleeder-resistance" not in {check.what for check in candidates(FULL.board, ())}


# --- minutes and order

# source: the case format, section 1: minutes; the first live one costs 5 more, the first dead one after a live one 2 more
MINUTES: tuple[tuple[dict[str, Any], str | None, float], ...] = (
    ({"what": "rail-voltage"}, None, 6), ({"what": "rail-voltage"}, "dead", 6), ({"what": "rail-voltage"}, "live", 1),
    ({"what": "line-current"}, "live", 8), ({"what": "line-current"}, None, 13), ({"what": "inrush-resistance"}, None, 1),
    ({"what": "inrush-resistance"}, "dead", 1), ({"what": "inrush-resistance"}, "live", 3),
    ({"what": "dropper-capacitance"}, "dead", 2), ({"what": "dropper-capacitance", "lifted": True}, "dead", 6),
    ({"what": "dropper-capacitance", "lifted": True}, "live", 8), ({"what": "zener-test"}, "live", 8),
)


@pytest.mark.parametrize(("check", "last", "minutes"), MINUTES)
def test_minutes(check: dict[str, Any], last: str | None, minutes: float) -> None:
    assert minutes_of(Check(**check), last) == minutes


def test_a_dead_check_comes_before_a_live_one_of_like_use(monkeypatch: pytest.MonkeyPatch) -> None:
    """One bit each, two minutes each: across the inrush resistor, live, and the dropper, dead."""
    found = known_posterior((0.5, 0.5), monkeypatch)
    monkeypatch.setattr(checks, "FIRST_LIVE_MINUTES", 0.0)
    foretell(
        monkeypatch,
        inrush_voltage=numbers(1.0, 60.0),
        dropper_capacitance=numbers(1e-9, 1e-6),
    )
    order = [(item.condition, item.check.lifted) for item in next_checks(found, ())]
    assert order == [("dead", False), ("live", False), ("live", False), ("dead", True)]


@pytest.mark.parametrize(("live_minutes", "first"), [(1.1, "dead"), (0.9, "live")])
def test_a_live_check_comes_first_only_if_it_tells_twice_as_much_a_minute(
    live_minutes: float, first: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One bit each; the dead check takes two minutes, the live one a little over and a little under half of that."""
    found = known_posterior((0.5, 0.5), monkeypatch)
    monkeypatch.setattr(checks, "minutes_of", lambda check, last: live_minutes if check.what == "inrush-voltage" else 2.0)
    foretell(
        monkeypatch,
        inrush_voltage=numbers(1.0, 60.0),
        dropper_capacitance=numbers(1e-9, 1e-6),
    )
    assert next_checks(found, ())[0].condition == first


def test_where_the_board_must_not_be_powered_no_live_check_is_proposed(monkeypatch: pytest.MonkeyPatch) -> None:
    found = known_posterior((0.5, 0.5), monkeypatch)
    foretell(
        monkeypatch,
        inrush_voltage=numbers(1.0, 60.0),
        dropper_capacitance=numbers(1e-9, 1e-6),
    )
    assert {item.condition for item in next_checks(found, (), power_allowed=False)} == {"dead"}


def test_of_two_checks_that_cost_the_same_the_one_that_tells_more_comes_first(monkeypatch: pytest.MonkeyPatch) -> None:
    found = known_posterior((0.4, 0.3, 0.3), monkeypatch)
    foretell(
        monkeypatch,
        fuse_resistance=numbers(1.0, 1.0, 900.0),
        inrush_resistance=numbers(1.0, 30.0, 900.0),
    )
    assert [item.check.what for item in next_checks(found, ())] == ["inrush-resistance", "fuse-resistance"]


# source: the published values, near-identical readings: what is read, and a check that parts the suspects left
PARTED_BY = {
    "dead, no line current": (
        (read("rail-voltage", 0.0, rail="upper"), read("line-current", 0.0)),
        {"inrush-resistance", "path-resistance", "fuse-resistance"},
    ),
    "rail is there, relay silent": (
        (read("rail-voltage", 24.6, rail="upper"), read("load-responds", "no", load="relay"), read("look", ("nothing seen",))),
        {"coil-resistance", "switch-test"},
    ),
    "chatters": (
        (read("rail-voltage", 17.0, rail="upper", on=("relay", "heater", "lamp")),),
        {"reservoir-esr", "inrush-voltage", "dropper-capacitance", "rail-ripple-rms"},
    ),
}


@pytest.mark.parametrize(("readings", "wanted"), PARTED_BY.values(), ids=PARTED_BY)
def test_the_trade_s_own_check_is_among_the_first(readings: Any, wanted: set[str], monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 96)
    found = posterior_of(FULL.board, METER, readings)
    first = [item.check.what for item in next_checks(found, [reading.check for reading in readings])[:4]]
    assert set(first) & wanted, first


def test_boards_without_loads_have_checks_too(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    bare: Board = replace(FULL.board, loads=())
    found = next_checks(posterior_of(bare, METER, ()), ())
    assert found
    assert all(item.check.load is None for item in found)


def test_every_state_is_off_or_all_on() -> None:
    assert {frozenset(check.on) for check in candidates(FULL.board, ()) if check.on is not None} == {
        frozenset[str](), frozenset(FULL.board.switched_loads())
    }
