"""Whatever is done to a case file, it ends in a verdict or in an error in words; never in a traceback, a warning or a hang.

Two thousand mutants, always the same. The number of specimens, Newton steps and halvings is cut to next to nothing here, as the
verdicts' figures do not count: every line of the diagnosis still runs, and boards that are left unsolved come up more often.
"""

from __future__ import annotations

import json
import tomllib
from collections import Counter

import pytest

from benchtool import assess, casefile
from benchtool.errors import BenchtoolError
from tests.fuzz import mutant
from tests.some_boards import draw_few

MUTANTS = 2000
PART = 200


def outcome(content: bytes) -> str:
    """What becomes of a file with these bytes: refused before it is TOML, refused as a case, or a verdict."""
    try:
        found = assess(casefile.loads(casefile.decode(content, "mutant"), "mutant")).as_dict()
    except BenchtoolError as refusal:
        refused = str(refusal)
    else:
        json.dumps(found, allow_nan=False)
        return "verdict"
    assert all(line.startswith("mutant: ") for line in refused.split("\n"))
    return "no case" if is_toml(content) else "no TOML"


def is_toml(content: bytes) -> bool:
    """Whether these bytes get past the TOML parser."""
    try:
        tomllib.loads(content.decode("utf-8"))
    except (ValueError, RecursionError):
        return False
    return True


@pytest.fixture(scope="module")
def counts() -> Counter[str]:
    return Counter()


@pytest.mark.parametrize("start", range(0, MUTANTS, PART))
def test_every_mutant_ends_in_an_answer_or_in_words(start: int, counts: Counter[str], monkeypatch: pytest.MonkeyPatch) -> None:
    draw_few(monkeypatch, 6, coarse=True)
    for number in range(start, start + PART):
        print("mutant", number)  # the last one printed is the one that failed
        counts[outcome(mutant(number))] += 1


def test_the_mutants_reach_every_depth(counts: Counter[str]) -> None:
    print(dict(counts))
    total = counts.total()
    assert total - counts["no TOML"] >= total / 3
    assert counts["verdict"] >= total / 6


def test_a_mutant_is_the_same_every_time() -> None:
    assert mutant(7) == mutant(7)
    assert len({mutant(number) for number in range(200)}) > 150
