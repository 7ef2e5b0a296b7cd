"""The case file: what a save keeps, and what it never does to the file that was there."""

from __future__ import annotations

import os
import stat
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings

from benchtool import casefile
from benchtool.case import Case
from benchtool.errors import CaseError, FileError
from benchtool.observed import Reading
from tests.made_cases import cases

CONTRACT = (Path(__file__).parent / "data" / "contract.toml").read_text(encoding="utf-8")
ESR = Reading(what="reservoir-esr", rail="relay rail", value=0.5)
MINIMAL = """format = 1
mains = { voltage = "230 V", frequency = "50 Hz" }
board.rectifier = "half-wave"
board.dropper.capacitance = "0u33"
[[board.rail]]
name = "rail"
fed_by = "rectifier"
"""
MAINS_READ = Reading(what="mains-voltage", value=231.0)
SLOW = settings(
    max_examples=60,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large],
)


def contract() -> Case:
    return casefile.loads(CONTRACT)


def swapped(old: str, new: str) -> str:
    assert old in CONTRACT
    return CONTRACT.replace(old, new, 1)


def test_an_unchanged_case_keeps_its_text_to_the_letter() -> None:
    assert casefile.dumps(contract()) == CONTRACT


def test_a_case_without_a_text_is_written_afresh_and_reads_back() -> None:
    bare = replace(contract(), text=None)
    assert casefile.loads(casefile.dumps(bare)) == bare


@SLOW
@given(cases())
def test_every_case_reads_back_equal(case: Case) -> None:
    text = casefile.dumps(case)
    again = casefile.loads(text)
    assert again == case
    assert casefile.dumps(again) == text


@SLOW
@given(cases())
def test_any_text_can_be_edited_into_any_case(case: Case) -> None:
    assert casefile.loads(casefile.dumps(replace(case, text=CONTRACT))) == case


def lines_changed(case: Case) -> tuple[list[str], list[str]]:
    """Lines of the contract's example that a save takes away, and lines that it adds."""
    old, new = CONTRACT.splitlines(), casefile.dumps(case).splitlines()
    assert casefile.loads("\n".join(new)) == case
    return [line for line in old if line not in new], [line for line in new if line not in old]


def with_rail(case: Case, **changes: Any) -> Case:
    first, *others = case.board.rails
    return replace(case, board=replace(case.board, rails=(replace(first, **changes), *others)))


def test_only_the_changed_value_is_rewritten() -> None:
    case = contract()
    changed = replace(
        case, board=replace(case.board, dropper=replace(case.board.dropper, capacitance=470e-9))
    )
    gone, come = lines_changed(changed)
    assert [line.split("#")[0].strip() for line in gone] == ['capacitance = "680 nF"']
    assert come == [gone[0].replace("680 nF", "470 nF")]


def test_a_value_inside_an_inline_table_is_rewritten_in_place() -> None:
    zener = contract().board.rails[0].zener
    assert zener is not None
    gone, come = lines_changed(with_rail(contract(), zener=replace(zener, voltage=16.0)))
    assert come == [gone[0].replace('"18 V"', '"16 V"')]


@pytest.mark.parametrize("place", [0, 1, 2, 3])
def test_a_new_reading_is_added_and_nothing_else_moves(place: int) -> None:
    case = contract()
    readings = [*case.readings[:place], ESR, *case.readings[place:]]
    gone, come = lines_changed(replace(case, readings=tuple(readings)))
    assert gone == []
    assert come == ['what = "reservoir-esr"', 'value = "0.5 ohm"']


def test_a_new_reading_stands_before_what_heads_the_next_table() -> None:
    text = swapped("[repair]  ", "# --- after the repair ---\n[repair]  ")
    case = casefile.loads(text)
    saved = casefile.dumps(replace(case, readings=(*case.readings, ESR)))
    assert saved.index("reservoir-esr") < saved.index("# --- after the repair ---\n[repair]")


def test_a_reading_taken_out_leaves_the_comments_of_the_others() -> None:
    text = swapped(
        'what = "dropper-capacitance"', 'what = "dropper-capacitance" # lifted for this\n# good contact'
    )
    text = text.replace('[[reading]]\nwhat = "dropper', '# now dead\n[[reading]]\nwhat = "dropper')
    case = casefile.loads(text)
    saved = casefile.dumps(replace(case, readings=(case.readings[0], case.readings[2])))
    assert "14.2 V" not in saved
    assert '# now dead\n[[reading]]\nwhat = "dropper-capacitance" # lifted for this\n# good contact' in saved
    assert casefile.dumps(replace(case, readings=())).count("[[reading]]") == 1  # in a comment of [repair]


def test_a_first_reading_a_cleared_key_and_a_new_table() -> None:
    case = casefile.loads(MINIMAL)
    case = replace(case, readings=(MAINS_READ,), ticket=replace(case.ticket, number="R-1", minutes=5))
    again = casefile.loads(casefile.dumps(case))
    assert again == case
    cleared = replace(again, ticket=replace(again.ticket, minutes=None))
    assert "minutes" not in casefile.dumps(cleared)
    assert 'number = "R-1"' in casefile.dumps(cleared)


SCATTERED = """# bench 2's sheet
format = 1
[board]
rectifier = "half-wave"  # one diode to the rail
[[board.rail]]
name = "rail # 1"
fed_by = "rectifier"
[mains]
voltage = "230 V"
frequency = "50 Hz"
[[board.load]]
name = "timer"
kind = "current"
rail = "rail # 1"
current = "2 mA"
[board.dropper]
capacitance = "0u33"  # marked 334
"""


def test_no_comment_is_lost_where_tables_stand_in_an_unusual_order() -> None:
    case = casefile.loads(SCATTERED)
    load = replace(case.board.loads[0], name="lamp")
    saved = casefile.dumps(
        replace(case, board=replace(case.board, loads=(load, *case.board.loads), inrush=None))
    )
    assert casefile.loads(saved).board.loads[0] == load
    assert [
        text for text in ("# bench 2's sheet", "# one diode to the rail", "# marked 334") if text not in saved
    ] == []
    assert casefile.dumps(replace(case, readings=(MAINS_READ,))).startswith(SCATTERED)


def test_line_ends_stay_as_the_file_has_them() -> None:
    case = casefile.loads(CONTRACT.replace("\n", "\r\n"))
    saved = casefile.dumps(replace(case, readings=(*case.readings, ESR)))
    assert saved.count("\r\n") == saved.count("\n") > 100


@pytest.mark.parametrize(
    "wrong",
    [
        replace(contract(), readings=(Reading(what="shunt-capacitance", value=1e-9),)),
        replace(contract(), readings=(Reading(what="tea-leaves", value=1.0),)),
        replace(contract(), readings=(Reading(what="mains-voltage", value=float("nan")),)),
        with_rail(contract(), name="common"),
        with_rail(contract(), fed_by="nowhere"),
    ],
)
def test_a_case_that_would_not_read_back_is_not_saved(wrong: Case, tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_text(CONTRACT, encoding="utf-8")
    with pytest.raises(CaseError):
        casefile.dump(wrong, path)
    assert path.read_text(encoding="utf-8") == CONTRACT
    assert [each.name for each in tmp_path.iterdir()] == ["case.toml"]


# --- the file on the disk ---


def test_saving_keeps_the_previous_content_and_the_permissions(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_text(CONTRACT, encoding="utf-8")
    path.chmod(0o640)
    case = casefile.load(path)
    casefile.dump(replace(case, readings=(*case.readings, ESR)), path)
    assert casefile.load(path).readings[-1] == ESR
    assert (tmp_path / "case.toml.bak").read_text(encoding="utf-8") == CONTRACT
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert sorted(each.name for each in tmp_path.iterdir()) == ["case.toml", "case.toml.bak"]


def test_saving_what_stands_there_already_leaves_the_backup_alone(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    casefile.dump(contract(), path)
    casefile.dump(contract(), path)
    assert [each.name for each in tmp_path.iterdir()] == ["case.toml"]


def test_a_link_is_followed_not_replaced(tmp_path: Path) -> None:
    (tmp_path / "shelf").mkdir()
    target, link = tmp_path / "shelf" / "case.toml", tmp_path / "link.toml"
    target.write_text(CONTRACT, encoding="utf-8")
    link.symlink_to(target)
    casefile.dump(replace(contract(), readings=()), link)
    assert link.is_symlink()
    assert casefile.load(target).readings == ()


@pytest.mark.parametrize("broken", ["replace", "fsync"])
def test_a_save_that_fails_leaves_the_file_as_it_was(
    broken: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "case.toml"
    path.write_text(CONTRACT, encoding="utf-8")

    def fail(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, broken, fail)
    with pytest.raises(FileError, match="No space left on device"):
        casefile.dump(replace(contract(), readings=()), path)
    assert path.read_text(encoding="utf-8") == CONTRACT
    assert [each.name for each in tmp_path.iterdir()] == ["case.toml"]


def test_places_where_nothing_can_be_saved(tmp_path: Path) -> None:
    loop = tmp_path / "loop.toml"
    loop.symlink_to(loop)
    for path in (
        tmp_path,
        tmp_path / "no" / "such" / "case.toml",
        loop,
        tmp_path / "a\0b",
        tmp_path / ("x" * 300),
    ):
        with pytest.raises(FileError, match="cannot be saved"):
            casefile.dump(contract(), path)
    assert [each.name for each in tmp_path.iterdir()] == ["loop.toml"]
