"""What must fit together on a board, and a board with its readings. Rules: the case format, section 1."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import pytest

from benchtool import casefile
from benchtool.board import Board
from benchtool.casefile.check import part_names
from benchtool.catalogue.accepted import accepted, lacking
from benchtool.catalogue.readings import READING_KINDS, READINGS
from benchtool.errors import CaseError, Problem

CONTRACT = (Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8")
HEAD = """format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
[board]
rectifier = "bridge"
"""
DROPPER = '[board.dropper]\ncapacitance = "680 nF"\n'
RAIL = '[[board.rail]]\nname = "rail"\nfed_by = "rectifier"\n'


def problems(text: str) -> tuple[Problem, ...]:
    with pytest.raises(CaseError) as caught:
        casefile.loads(text)
    return caught.value.problems


def places(text: str) -> list[tuple[str, str]]:
    return [(problem.table, problem.key) for problem in problems(text)]


def board(text: str = CONTRACT) -> Board:
    return casefile.loads(text).board


# --- droppers ---

GOOD_DROPPERS = [
    'capacitance = "680 nF"\nfitted = "470 nF"',
    'kind = "resistor"\nresistance = "8k2"\nrated_power = "7 W"',
    'kind = "resistor"\nresistance = "unknown"',
    'kind = "divider"\ncapacitance = "680 nF"\nshunt_capacitance = "1 uF"',
]


@pytest.mark.parametrize("keys", GOOD_DROPPERS)
def test_each_kind_of_dropper_with_its_own_keys(keys: str) -> None:
    assert casefile.loads(f"{HEAD}[board.dropper]\n{keys}\n{RAIL}").board.rails


@pytest.mark.parametrize(
    ("keys", "wrong"),
    [
        ("", ["capacitance"]),
        ('kind = "capacitor"\nresistance = "8k2"', ["capacitance", "resistance"]),
        ('kind = "resistor"\ncapacitance = "680 nF"', ["resistance", "capacitance"]),
        ('kind = "resistor"\nresistance = "8k2"\nshunt_capacitance = "1 uF"', ["shunt_capacitance"]),
        ('kind = "divider"\ncapacitance = "680 nF"', ["shunt_capacitance"]),
        (
            'kind = "divider"\ncapacitance = "680 nF"\nshunt_capacitance = "1 uF"\nrated_power = "1 W"',
            ["rated_power"],
        ),
        ('kind = "inductor"\nresistance = "8k2"', ["kind"]),
        ('capacitance = "oops"', ["capacitance"]),
    ],
)
def test_keys_a_dropper_lacks_or_cannot_have(keys: str, wrong: list[str]) -> None:
    found = places(f"{HEAD}[board.dropper]\n{keys}\n{RAIL}")
    assert sorted(found) == sorted(("[board.dropper]", key) for key in wrong)


# --- rails ---


def rails(*bodies: str) -> str:
    return HEAD + DROPPER + "".join(f"[[board.rail]]\n{body}\n" for body in bodies)


TOP = 'name = "top"\nfed_by = "rectifier"'
STACKED_TOP = TOP + '\nzener = { voltage = "18 V", clamps_to = "low" }'
PLAIN_TOP = TOP + '\nzener = { voltage = "24 V" }'
STACKED = 'name = "low"\nfed_by = "top"\nfed_through = "zener"\nzener = { voltage = "5.1 V" }'


def fed(name: str, by: str) -> str:
    return f'name = "{name}"\nfed_by = "{by}"\nfed_through = "resistor"\nfeed_resistance = "1k"'


@pytest.mark.parametrize(
    "bodies",
    [
        (TOP,),
        (STACKED_TOP, STACKED),
        (PLAIN_TOP, fed("low", "top")),
        (PLAIN_TOP, fed("b", "a"), fed("a", "top")),  # fed by a rail that stands further down
        (
            PLAIN_TOP,
            'name = "low"\nfed_by = "top"\nfed_through = "regulator"\nregulated_voltage = "5 V"',
        ),
    ],
)
def test_trees_of_rails_that_can_be_built(bodies: tuple[str, ...]) -> None:
    assert len(casefile.loads(rails(*bodies)).board.rails) == len(bodies)


FIRST, SECOND, THIRD = '[[board.rail]] 1 "top"', '[[board.rail]] 2 "low"', '[[board.rail]] 3 "b"'


@pytest.mark.parametrize(
    ("bodies", "expected"),
    [
        ((TOP.replace("rectifier", "mains"),), [(FIRST, "fed_by")]),
        ((TOP + '\nfed_through = "zener"',), [(FIRST, "fed_through")]),
        ((TOP + '\nfeed_resistance = "1k"',), [(FIRST, "feed_resistance")]),
        (
            (TOP, fed("top", "top")),
            [('[[board.rail]] 2 "top"', "name"), ('[[board.rail]] 2 "top"', "fed_by")],
        ),
        ((PLAIN_TOP, fed("low", "rectifier")), [(SECOND, "fed_by")]),
        ((PLAIN_TOP, fed("low", "nowhere")), [(SECOND, "fed_by")]),
        ((PLAIN_TOP, fed("low", "low")), [(SECOND, "fed_by")]),
        ((PLAIN_TOP, fed("low", "b"), fed("b", "low")), [(SECOND, "fed_by"), (THIRD, "fed_by")]),
        ((PLAIN_TOP, 'name = "low"\nfed_by = "top"'), [(SECOND, "fed_through")]),
        (
            (PLAIN_TOP, 'name = "low"\nfed_by = "top"\nfed_through = "resistor"'),
            [(SECOND, "feed_resistance")],
        ),
        (
            (PLAIN_TOP, 'name = "low"\nfed_by = "top"\nfed_through = "regulator"'),
            [(SECOND, "regulated_voltage")],
        ),
        ((PLAIN_TOP, fed("low", "top") + '\ndropout = "1 V"'), [(SECOND, "dropout")]),
        ((STACKED_TOP,), [(FIRST, "zener.clamps_to")]),
        ((STACKED_TOP, fed("low", "top")), [(FIRST, "zener.clamps_to")]),
        ((PLAIN_TOP, STACKED), [(SECOND, "fed_through")]),
        ((TOP, STACKED), [(SECOND, "fed_through")]),
        ((TOP.replace("top", "common"),), [('[[board.rail]] 1 "common"', "name")]),
        ((TOP.replace("top", "a\\u0007b"),), [('[[board.rail]] 1 "a\\u0007b"', "name")]),
        ((TOP.replace("top", ""),), [("[[board.rail]] 1", "name")]),
    ],
)
def test_rails_that_cannot_be_built(bodies: tuple[str, ...], expected: list[tuple[str, str]]) -> None:
    assert places(rails(*bodies)) == expected


def test_a_half_wave_zener_board_needs_its_first_zener() -> None:
    text = rails(TOP).replace('"bridge"', '"half-wave-zener"')
    assert places(text) == [(FIRST, "zener")]
    assert casefile.loads(rails(PLAIN_TOP).replace('"bridge"', '"half-wave-zener"')).board.rails


@pytest.mark.parametrize(
    "wrong", ["name = 5", 'name = ""', 'fed_by = ""', "zener = 5", 'fed_through = "wire"']
)
def test_what_follows_from_a_refused_value_is_not_told_again(wrong: str) -> None:
    key = wrong.split()[0]
    lines = [line for line in STACKED_TOP.splitlines() if not line.startswith(key)]
    text = rails("\n".join([*lines, wrong]), STACKED)
    text += '[[board.load]]\nname = "x"\nkind = "current"\nrail = "top"\ncurrent = "1 mA"\n'
    text += '[[reading]]\nwhat = "zener-test"\nrail = "top"\nvalue = "18 V"\n'
    assert [found[1] for found in places(text)] == [key]


# --- loads ---


def loads(*bodies: str, name: str = "load") -> str:
    start = rails(STACKED_TOP, STACKED, fed("side", "top"))
    return start + "".join(f'[[board.load]]\nname = "{name}"\n{body}\n' for body in bodies)


COIL = 'kind = "coil"\nrail = "top"\nnominal_voltage = "18 V"\n'
GOOD_LOADS = [
    'kind = "current"\nrail = "low"\ncurrent = "3.5 mA"',
    'kind = "current"\nrail = "low"\ncurrent = "unknown"',
    'kind = "gate"\nrail = "low"\ncurrent = "20 mA"\npulse = "250 us"',
    'kind = "led"\nrail = "low"\nforward_voltage = "2 V"\nresistance = "1k"',
    'kind = "resistor"\nrail = "low"\nresistance = "1k"',
    COIL + 'resistance = "810 ohm"\nreturns_to = "low"',
    COIL + 'power = "400 mW"\npull_in = "75 %"\ndrop_out = "10 %"',
    COIL + 'resistance = "unknown"',
]


@pytest.mark.parametrize("body", GOOD_LOADS)
def test_each_kind_of_load_with_its_own_keys(body: str) -> None:
    assert casefile.loads(loads(body)).board.loads


@pytest.mark.parametrize(
    ("body", "wrong"),
    [
        ('kind = "current"\nrail = "low"', ["current"]),
        ('kind = "gate"\nrail = "low"\ncurrent = "20 mA"', ["pulse"]),
        ('kind = "led"\nrail = "low"', ["forward_voltage", "resistance"]),
        ('kind = "resistor"\nrail = "low"', ["resistance"]),
        ('kind = "resistor"\nrail = "low"\npower = "1 W"', ["resistance"]),
        (COIL, ["resistance"]),
        ('kind = "coil"\nrail = "top"\npower = "400 mW"', ["resistance"]),
        ('kind = "current"\nrail = "low"\ncurrent = "1 mA"\npull_in = "70 %"', ["pull_in"]),
        (COIL + 'resistance = "810 ohm"\npulse = "1 ms"', ["pulse"]),
        (COIL + 'resistance = "810 ohm"\npull_in = "5 %"', ["pull_in"]),
        (COIL + 'resistance = "810 ohm"\ndrop_out = "80 %"', ["drop_out"]),
        ('kind = "motor"\nrail = "low"', ["kind"]),
        ('kind = "current"\nrail = "none"\ncurrent = "1 mA"', ["rail"]),
        ('kind = "current"\nrail = "low"\ncurrent = "0 A"', ["current"]),
        ('kind = "current"\nrail = "low"\ncurrent = "-1 mA"', ["current"]),
        ('kind = "current"\nrail = "low"\nreturns_to = "low"\ncurrent = "1 mA"', ["returns_to"]),
        ('kind = "current"\nrail = "low"\nreturns_to = "top"\ncurrent = "1 mA"', ["returns_to"]),
        ('kind = "current"\nrail = "low"\nreturns_to = "side"\ncurrent = "1 mA"', ["returns_to"]),
        ('kind = "current"\nrail = "low"\nreturns_to = "none"\ncurrent = "1 mA"', ["returns_to"]),
    ],
)
def test_keys_a_load_lacks_or_cannot_have(body: str, wrong: list[str]) -> None:
    found = places(loads(body))
    assert sorted(found) == sorted(('[[board.load]] 1 "load"', key) for key in wrong)


def test_a_coil_with_its_resistance_needs_no_nominal_voltage() -> None:
    assert board(loads('kind = "coil"\nrail = "top"\nresistance = "810 ohm"')).loads[0].nominal_voltage is None


def test_names_of_loads_are_unique_and_none_is_reserved() -> None:
    assert places(loads(GOOD_LOADS[0], GOOD_LOADS[4])) == [('[[board.load]] 2 "load"', "name")]
    assert places(loads(GOOD_LOADS[0], name="common")) == [('[[board.load]] 1 "common"', "name")]


# --- readings and the board ---

BARE = rails(TOP, fed("low", "top")) + (
    '[[board.load]]\nname = "controller"\nkind = "current"\nrail = "low"\ncurrent = "1 mA"\n'
)


@pytest.mark.parametrize(
    "reading",
    [
        'what = "inrush-voltage"',
        'what = "inrush-resistance"',
        'what = "fuse-resistance"',
        'what = "varistor-resistance"',
        'what = "bleeder-resistance"',
        'what = "shunt-capacitance"',
        'what = "zener-test"\nrail = "top"',
        'what = "reservoir-esr"\nrail = "top"',
        'what = "reservoir-capacitance"\nrail = "top"',
        'what = "reservoir-leakage"\nrail = "top"',
        'what = "feed-resistance"\nrail = "top"',
        'what = "coil-resistance"\nload = "controller"',
        'what = "switch-test"\nload = "controller"',
    ],
)
def test_a_reading_for_a_part_the_board_lacks_is_refused_with_the_part_s_name(reading: str) -> None:
    name = reading.split('"')[1]
    unit = READING_KINDS[name].unit
    value = f"1 n{unit}" if unit else "good"
    (problem,) = problems(f'{BARE}[[reading]]\n{reading}\nvalue = "{value}"\n')
    assert problem.table == f'[[reading]] 1 "{name}"'
    assert "this board" in problem.allowed or "this rail" in problem.allowed or "this load" in problem.allowed


def test_a_resistor_dropper_has_no_capacitance_to_read() -> None:
    text = BARE.replace(DROPPER, '[board.dropper]\nkind = "resistor"\nresistance = "8k2"\n')
    assert places(f'{text}[[reading]]\nwhat = "dropper-capacitance"\nvalue = "1 nF"\n') == [
        ('[[reading]] 1 "dropper-capacitance"', "what")
    ]


@pytest.mark.parametrize(
    ("keys", "wrong"),
    [
        ('what = "rail-voltage"', "rail"),
        ('what = "rail-voltage"\nrail = "none"', "rail"),
        ('what = "load-current"', "load"),
        ('what = "load-current"\nload = "none"', "load"),
        ('what = "mains-voltage"\non = []', "on"),
        ('what = "mains-voltage"\nlifted = false', "lifted"),
        ('what = "rail-voltage"\nrail = "top"\nclamp = "20 mA"', "clamp"),
        ('what = "rail-voltage"\nrail = "top"\nload = "controller"', "load"),
        ('what = "rail-voltage"\nrail = "top"\non = ["controller"]', "on"),
        ('what = "mains-voltage"\nwhy = "curious"', "why"),
        ("", "what"),
    ],
)
def test_qualifiers_are_those_of_the_kind(keys: str, wrong: str) -> None:
    assert [found[1] for found in places(f'{BARE}[[reading]]\n{keys}\nvalue = "1"\n')] == [wrong]


def test_words_of_a_look() -> None:
    for value in ("[]", '["residue", "residue"]', '["nothing seen", "residue"]', '"shiny"', "5", "[5]"):
        assert [found[1] for found in places(f'{BARE}[[reading]]\nwhat = "look"\nvalue = {value}\n')] == [
            "value"
        ]


def test_bounds_follow_the_mains_of_the_board() -> None:
    # case format, section 4: 2.2 x the highest crest, twice it, 1.6 x the nominal mains; 230 V +10 % here
    crest = 230.0 * 1.1 * math.sqrt(2.0)
    expected = {
        "rail-voltage": (-5.0, 2.2 * crest),
        "rail-ripple": (0.0, 2.2 * crest),
        "rail-ripple-rms": (0.0, 2.2 * crest),
        "rail-injection": (-5.0, 2.2 * crest),
        "dropper-dc-voltage": (0.0, 2.0 * crest),
        "dropper-voltage": (0.0, 368.0),
        "inrush-voltage": (0.0, 368.0),
        "mains-voltage": (0.0, 368.0),
    }
    for name, bounds in expected.items():
        assert accepted(READING_KINDS[name], board()) == pytest.approx(bounds, rel=1e-12)


def test_every_kind_that_reads_numbers_has_bounds_and_takes_zero() -> None:
    for kind in READINGS:
        if kind.unit is not None:
            low, high = accepted(kind, board())
            assert low <= 0.0 < high < math.inf


def test_lacking_says_nothing_where_the_reading_can_be_taken() -> None:
    whole = board()
    relay = whole.loads[1]
    free = [kind.name for kind in READINGS if lacking(kind, whole, whole.rails[1], relay) is None]
    assert sorted({kind.name for kind in READINGS} - set(free)) == ["feed-resistance", "shunt-capacitance"]
    assert lacking(READING_KINDS["bleeder-resistance"], replace(whole, bleeder=None)) is not None


def test_every_part_has_the_name_that_the_format_gives_it() -> None:
    assert part_names(board()) == (
        "dropper", "shunt", "inrush", "bleeder", "fuse", "varistor", "rectifier",
        "zener:relay rail", "reservoir:relay rail", "feed:relay rail",
        "zener:logic rail", "reservoir:logic rail", "feed:logic rail",
        "load:controller", "load:heater relay",
    )  # fmt: skip
