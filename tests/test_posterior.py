"""Bayes' rule over the specimens: against a sum done on paper, and what must not change a verdict.

Densities are held to SciPy's quadrature: a likelihood that does not add up to one is no likelihood.
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import norm

from benchtool import assess
from benchtool.board import Board
from benchtool.case import Case
from benchtool.catalogue.faults import FAULTS_BY_NAME
from benchtool.catalogue.readings import READING_KINDS
from benchtool.catalogue.shown import Shown, View
from benchtool.catalogue.strikes import Place
from benchtool.diagnosis import crowd, posterior
from benchtool.diagnosis.hypotheses import Hypothesis, Struck, hypotheses_of
from benchtool.diagnosis.likelihood import effective_number, log_density, log_sum, log_uniform_density, look_log_chance
from benchtool.diagnosis.posterior import Posterior, posterior_of
from benchtool.observed import Meter, Reading
from tests.some_boards import CONTRACT, FULL, draw_few, read
from tests.test_samples import ranked

SOUND = Hypothesis((), 80.0)
FUSE = Hypothesis((Struck(FAULTS_BY_NAME["fuse-open"], Place()),), 10.0)
METER = Meter()


# --- Bayes' rule on paper


def test_the_logarithm_of_a_sum() -> None:
    assert log_sum(np.log([0.1, 0.2, 0.3])) == pytest.approx(math.log(0.6))
    assert log_sum(np.array([-1e5, -1e5])) == pytest.approx(-1e5 + math.log(2.0))  # without underflow
    assert log_sum(np.array([1e5, 0.0])) == pytest.approx(1e5)


def test_the_likelihood_is_the_mean_over_the_specimens(monkeypatch: pytest.MonkeyPatch) -> None:
    """Two specimens, three readings: (0.9·0.5·0.2 + 0.1·0.5·0.8) / 2 = 0.065; the first has 0.09 of the 0.13 in it."""
    densities = np.log(np.array([[0.9, 0.1], [0.5, 0.5], [0.2, 0.8]]))[:, None]
    monkeypatch.setattr(posterior, "SPREAD_OVER", 1.0)
    found = bare(densities)
    assert math.exp(float(log_sum(found.densities.sum(axis=0) + found.log_prior)[0])) == pytest.approx(0.065)
    assert found.shares()[0] == pytest.approx([0.09 / 0.13, 0.04 / 0.13])


def bare(densities: Any) -> Posterior:
    """Nothing but log densities (readings, hypotheses, each) on specimens that count alike."""
    _, hypotheses, each = densities.shape
    level, nothing = np.log(np.full((hypotheses, each), 1.0 / each)), np.zeros(hypotheses)
    return Posterior(
        crowd=crowd.crowd_of(FULL.board), meter=METER, readings=(), densities=densities, log_prior=level, log_likelihood=nothing,
        closer={}, probabilities=nothing, unexplained=1.0, uniform=nothing, explained=nothing,
    )


def test_specimens_are_worth_as_many_as_their_weights_are_even() -> None:
    """(Σw)²/Σw² (Kish, Survey Sampling, 1965; value from memory): 3, 1, 1, 1 are worth 36/12 = 3; one alone is worth one."""
    assert effective_number(np.log([3.0, 1.0, 1.0, 1.0])) == pytest.approx(3.0)
    assert effective_number(np.array([0.0, -900.0])) == pytest.approx(1.0)


def test_where_a_reading_leaves_a_handful_what_is_foretold_is_spread_over_more() -> None:
    densities = np.full((1, 1, 200), -30.0)
    densities[0, 0, 0] = 0.0
    shares = bare(densities).shares()[0]
    assert shares.sum() == pytest.approx(1.0)
    assert effective_number(np.log(shares)) >= posterior.SPREAD_OVER
    assert shares[0] == shares.max()


CHANCES = {"rectifier-test": (0.8, 0.3), "tap-test": (0.9, 0.5), "switch-test": (0.6, 0.6)}
"""Chance of the word that was read: on a sound board, and with the fuse open."""
WORD = {"rectifier-test": "good", "tap-test": "no change", "switch-test": "good"}
THREE = tuple(read(what, word, load="relay" if what == "switch-test" else None) for what, word in WORD.items())


def shows_chances(what: str) -> Any:
    def shows(view: View) -> Shown:
        sound, fused = CHANCES[what]
        chance = np.where(np.isinf(view.specimens.fuse), fused, sound)
        others = [word for word in READING_KINDS[what].words if word != WORD[what]]
        return Shown(chances={WORD[what]: chance, **dict.fromkeys(others, (1.0 - chance) / 2.0)})

    return shows


def test_two_hypotheses_and_three_readings_on_paper(monkeypatch: pytest.MonkeyPatch) -> None:
    """80·0.8·0.9·0.6 = 34.56; 10·0.3·0.5·0.6 = 0.9; a mistake, one of three words each: 12/27 = 0.4444."""
    draw_few(monkeypatch, 32)
    monkeypatch.setattr(crowd, "hypotheses_of", lambda board: (SOUND, FUSE))
    monkeypatch.setattr(crowd, "SHOWS", {what: shows_chances(what) for what in CHANCES})
    found = posterior_of(FULL.board, METER, THREE)
    total = 34.56 + 0.9 + 12.0 / 27.0
    assert found.probabilities == pytest.approx([34.56 / total, 0.9 / total], rel=1e-9)
    assert found.unexplained == pytest.approx(12.0 / 27.0 / total, rel=1e-9)


# --- densities add up to one

SPECIMEN = np.ones(1)


def density(what: str, shown: Shown, value: float) -> float:
    reading = read(what, value, rail="upper", load="relay")
    return float(np.exp(log_density(shown, reading, METER)[0]))


@pytest.mark.parametrize(("centre", "error"), [(23.3, 0.2), (0.5, 0.05), (300.0, 3.0)])
def test_a_density_in_volts_adds_up_to_one(centre: float, error: float) -> None:
    shown = Shown(centre * SPECIMEN, error)
    span = (centre - 8.0 * (error + 0.03 * centre), centre + 8.0 * (error + 0.03 * centre))
    total, _ = quad(lambda value: density("rail-voltage", shown, value), *span, points=[centre], limit=200)
    assert total == pytest.approx(1.0, abs=1e-4)


@pytest.mark.parametrize(
    ("what", "centre"), [("dropper-capacitance", 182e-9), ("inrush-resistance", 100.0), ("line-current", 0.048)]
)
def test_a_density_of_ohms_farads_and_amperes_adds_up_to_one_in_the_logarithm(what: str, centre: float) -> None:
    shown = Shown(centre * SPECIMEN, 0.01 * centre)
    middle = math.log(centre)
    total, _ = quad(
        lambda log: density(what, shown, math.exp(log)), middle - 0.3, middle + 0.3, points=[middle], limit=200
    )
    assert total == pytest.approx(1.0, abs=1e-4)


def test_a_density_in_volts_is_the_normal_one_of_meter_and_physics() -> None:
    """Meter 0.5 % + 20 mV as a two-sigma root sum of squares, physics 0.2 V, specimens 1.2 %: at 20 V 0.3164 V together."""
    sigma = math.sqrt((math.hypot(0.1, 0.02) / 2.0) ** 2 + 0.2**2 + 0.24**2)
    assert density("rail-voltage", Shown(20.0 * SPECIMEN, 0.2), 20.5) == pytest.approx(norm.pdf(0.5, scale=sigma), rel=1e-6)


@pytest.mark.parametrize("what", ["rail-voltage", "mains-voltage", "dropper-dc-voltage"])
def test_a_mistake_in_volts_is_anywhere_a_file_accepts(what: str) -> None:
    chance = math.exp(log_uniform_density(read(what, 1.0, rail="upper"), FULL.board))
    crest = 253.0 * 2.0**0.5  # 230 V + 10 %
    width = {"rail-voltage": 2.2 * crest + 5.0, "mains-voltage": 1.6 * 230.0, "dropper-dc-voltage": 2.0 * crest}[what]
    assert chance * width == pytest.approx(1.0)


def test_a_mistaken_word_is_any_of_its_words() -> None:
    assert log_uniform_density(read("rectifier-test", "good"), FULL.board) == pytest.approx(-math.log(3.0))
    assert log_uniform_density(read("load-responds", "no", load="relay"), FULL.board) == pytest.approx(-math.log(5.0))


def test_a_gross_mistake_is_never_quite_impossible() -> None:
    assert density("rail-voltage", Shown(23.0 * SPECIMEN, 0.1), 500.0) > 0.0


def test_a_look_shows_the_sign_of_the_fault_as_often_as_published() -> None:
    """Scorched inrush: an open inrush resistor shows it in 50 %; a browned board is seen on a sound one in a third of cases."""
    inrush = Hypothesis((Struck(FAULTS_BY_NAME["inrush-open"], Place()),), 55.0)
    ratio = look_log_chance(inrush, ("scorched inrush",)) - look_log_chance(inrush, ("nothing seen",))
    assert math.exp(ratio) == pytest.approx(0.505 / 0.495, rel=1e-6)  # 1 − 0.5·0.99
    browned = look_log_chance(SOUND, ("browned board",)) - look_log_chance(SOUND, ("nothing seen",))
    assert math.exp(browned) == pytest.approx(0.5)  # 1/3 against 2/3


# --- priors


def weights(board: Board) -> dict[tuple[str, ...], float]:
    """Summed over the places, by the faults' names; a sound board is ()."""
    found: dict[tuple[str, ...], float] = {}
    for item in hypotheses_of(board):
        key = tuple(struck.fault.name for struck in item.faults)
        found[key] = found.get(key, 0.0) + item.weight
    return found


def test_without_readings_the_priors_stand(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 16)
    found = posterior_of(FULL.board, METER, ())
    prior = weights(FULL.board)
    total = math.fsum(prior.values()) + 12.0
    assert found.unexplained == pytest.approx(12.0 / total, rel=1e-9)
    for hypothesis, probability in zip(found.hypotheses, found.probabilities, strict=True):
        assert probability == pytest.approx(hypothesis.weight / total, rel=1e-9)


def test_places_share_the_published_weight_of_their_fault() -> None:
    """Published values, priors: also of pairs, a tenth of the rarer part's weight."""
    prior = weights(FULL.board)
    assert prior[()] == 80.0
    assert prior["dropper-capacitance-lost",] == pytest.approx(500.0)
    assert prior["zener-short",] == pytest.approx(35.0)  # two places
    assert prior["load-excess",] == pytest.approx(15.0)  # four places
    assert prior["dropper-capacitance-lost", "reservoir-dried"] == pytest.approx(9.5)
    assert prior["zener-open", "reservoir-leaky"] == pytest.approx(0.5)
    assert prior["zener-open", "load-excess"] == pytest.approx(0.5)


def test_seldom_alone_means_four_times_in_five_with_its_pair() -> None:
    prior = weights(FULL.board)
    assert prior["dropper-short",] == pytest.approx(1.0)
    pairs = [weight for key, weight in prior.items() if len(key) == 2 and key[0] == "dropper-short"]
    assert len(pairs) == 3
    assert math.fsum(pairs) == pytest.approx(4.0)
    assert prior["varistor-short",] == pytest.approx(1.6)
    assert prior["varistor-short", "fuse-open"] == pytest.approx(6.4)


def test_absent_parts_drop_out() -> None:
    bare = replace(FULL.board, fuse=None, varistor=None, inrush=None, loads=())
    names = {name for key in weights(bare) for name in key}
    assert not names & {"fuse-open", "varistor-short", "inrush-open", "inrush-high", "load-excess", "coil-open", "switch-open"}
    assert weights(bare)["dropper-short",] == pytest.approx(1.0)  # its other pairs are gone, that with the zener is left


# --- what must not change a verdict


def verdict(case: Case) -> dict[tuple[Any, ...], float]:
    found: Any = assess(case).as_dict()["suspects"]
    return {(each["fault"], each["part"], str(each["with"])): each["probability"] for each in found}


def check_same(one: dict[tuple[Any, ...], float], other: dict[tuple[Any, ...], float]) -> None:
    assert one.keys() == other.keys()
    assert [other[key] for key in one] == pytest.approx(list(one.values()), abs=1e-9)


ON = ("relay", "heater")
MANY = replace(FULL, readings=(
    read("mains-voltage", 226.0),
    read("rail-voltage", 24.6, rail="upper"),
    read("rail-voltage", 13.0, rail="upper", on=ON),
    read("inrush-voltage", 2.9, on=ON),
    read("load-responds", "chatters", load="relay"),
    read("look", ("browned board", "earlier repair")),
))


def test_the_order_of_the_readings_does_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    check_same(verdict(MANY), verdict(replace(MANY, readings=MANY.readings[::-1])))


def test_the_order_of_two_mains_readings_does_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    twice = replace(MANY, readings=(*MANY.readings[1:3], read("mains-voltage", 240.0), read("mains-voltage", 221.0)))
    check_same(verdict(twice), verdict(replace(twice, readings=twice.readings[::-1])))


def test_the_order_within_on_does_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    turned = tuple(replace(reading, on=reading.on and reading.on[::-1]) for reading in MANY.readings)
    check_same(verdict(MANY), verdict(replace(MANY, readings=turned)))


@pytest.mark.parametrize("turned", [False, True])
def test_the_same_reading_twice_counts_once(turned: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    last = MANY.readings[2]
    again = replace(last, on=last.on[::-1]) if turned and last.on else last
    check_same(verdict(MANY), verdict(replace(MANY, readings=(*MANY.readings, again))))


RENAMED = {"upper": "Z rail", "lower": "A rail", "controller": "zz", "relay": "K1", "heater": "aa", "lamp": "upper lamp"}


def renamed(case: Case) -> Case:
    """The same case with other names everywhere."""

    def new(name: str | None) -> Any:
        return None if name is None else RENAMED.get(name, name)

    board = case.board
    rails = tuple(replace(rail, name=new(rail.name), fed_by=new(rail.fed_by)) for rail in board.rails)
    loads = tuple(replace(load, name=new(load.name), rail=new(load.rail)) for load in board.loads)
    readings = tuple(
        replace(r, rail=new(r.rail), load=new(r.load), on=None if r.on is None else tuple(map(new, r.on))) for r in case.readings
    )
    return replace(case, board=replace(board, rails=rails, loads=loads), readings=readings)


def test_names_do_not_matter(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    one = verdict(MANY)
    other = verdict(renamed(MANY))
    assert sorted(other.values()) == pytest.approx(sorted(one.values()), abs=1e-9)
    assert {key[0] for key in one} == {key[0] for key in other}


def test_the_same_case_gives_the_same_bits(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    assert verdict(MANY) == verdict(MANY)


# --- what the readings do


def suspects(case: Case) -> dict[str, Any]:
    return assess(case).as_dict()


@pytest.mark.parametrize(
    "readings",
    [
        (read("dropper-capacitance", 5e-6, lifted=True), read("inrush-resistance", 21.0)),  # no part grows fivefold
        (read("rail-voltage", 480.0, rail="lower"), read("rail-voltage", 2.0, rail="upper")),  # the lower one hangs on the upper
    ],
    ids=["parts", "rails"],
)
def test_readings_that_nothing_accounts_for_are_unexplained(
    readings: tuple[Reading, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    draw_few(monkeypatch, 128)
    assert ranked(suspects(replace(FULL, readings=readings))) == ("unexplained", None, None)


@pytest.mark.parametrize(
    ("readings", "wanted"),
    [  # each the check that parts this fault from its likes: published values, near-identical readings
        ((read("fuse-resistance", "open"), read("rail-voltage", 0.01, rail="upper")), ("fuse-open", None, None)),
        ((read("zener-test", "short", rail="lower"),), ("zener-short", "lower", None)),
        ((read("coil-resistance", "open", load="relay"),), ("coil-open", None, "relay")),
        ((read("rectifier-test", "short"),), ("diode-short", None, None)),
        ((read("feed-resistance", 12e3, rail="lower"),), ("feed-high", "lower", None)),
        ((read("inrush-resistance", 2.2e3),), ("inrush-high", None, None)),
        ((read("reservoir-esr", 6.0, rail="upper"), read("reservoir-capacitance", 20e-6, rail="upper")),
         ("reservoir-dried", "upper", None)),
        ((read("dropper-capacitance", "open", lifted=True),), ("dropper-open", None, None)),
        ((read("dropper-capacitance", 1e-9, lifted=True),), ("dropper-open", None, None)),  # near zero counts like the word
    ],
    ids=lambda value: str(value[0]) if isinstance(value[0], str) else "",
)
def test_a_telling_check_names_its_fault(
    readings: tuple[Reading, ...], wanted: tuple[Any, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    draw_few(monkeypatch, 96)
    assert ranked(suspects(replace(FULL, readings=readings))) == wanted


def test_bleeder_readings_leave_the_suspects_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 32)
    more = replace(MANY, readings=(*MANY.readings, read("bleeder-resistance", "open")))
    check_same(verdict(MANY), verdict(more))


def test_readings_sharpen_the_posterior_of_the_contract(monkeypatch: pytest.MonkeyPatch) -> None:
    """Each of its three readings speaks for a lost dropper: the first one weakly."""
    draw_few(monkeypatch, 128)

    def lost(count: int) -> float:
        found: Posterior = posterior_of(CONTRACT.board, METER, CONTRACT.readings[:count])
        names = [[struck.fault.name for struck in hypothesis.faults] for hypothesis in found.hypotheses]
        return float(found.probabilities[names.index(["dropper-capacitance-lost"])])

    assert lost(1) < lost(2) < lost(3)
