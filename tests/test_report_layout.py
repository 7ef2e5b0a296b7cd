"""Wrapping, hanging, ASCII and tables: lines that fit whatever stands in them."""

from __future__ import annotations

from benchtool.report.layout import Page, cells, glued, padded, paragraph, table, wrapped


def test_wrapping_keeps_values_and_ranges_whole() -> None:
    assert wrapped("it reads 14.14 V on the rail", 14) == ["it reads", "14.14 V on the", "rail"]
    assert wrapped("between 612 to 748 nF", 16) == ["between", "612 to 748 nF"]
    assert wrapped("through 10 kΩ", 10) == ["through", "10 kΩ"]
    assert glued("5 amps") == "5 amps"


def test_wrapping_counts_cells_and_cuts_only_what_is_longer_than_a_line() -> None:
    assert wrapped("電源 電源", 6) == ["電源", "電源"]
    assert wrapped("abcdefgh", 3) == ["abc", "def", "gh"]
    assert wrapped("ab cdefgh", 4, 3) == ["ab", "cde", "fgh"]
    assert wrapped("", 10) == [""]
    assert cells("e\u0301") == 1
    assert cells(padded("電", 5)) == 5


def test_paragraphs_hang_under_their_heading() -> None:
    page = Page(20)
    assert [line.text for line in paragraph(page, "a caution in full words", first="NOTE  ")] == [
        "NOTE  a caution in", "      full words",
    ]
    assert [line.text for line in paragraph(page, "a caution in full words", rest="  ")] == ["a caution in full", "  words"]


def test_ascii_spells_what_it_cannot_draw() -> None:
    page = Page(80, ascii=True)
    assert page.plain("10 kΩ ± 5 %, 4.7 µF, 4.7 μF, 40 °C") == "10 kohm +- 5 %, 4.7 uF, 4.7 uF, 40 degC"
    assert page.plain("Kühlgerät 電") == "Kuhlgerat ?"


def test_a_table_gives_its_first_column_the_room_that_is_left() -> None:
    lines = [line.text for line in table(Page(24), [("reading", "read"), ("a very long name indeed", "14.1 V")])]
    assert lines == [" reading          read", " a very long      14.1 V", "   name indeed"]


def test_the_first_heading_of_a_table_is_never_broken() -> None:
    wide = "x" * 18
    rows = [("reading", *("y" * 18,) * 3, "says"), ("relay rail, all off", *(wide,) * 3, "against")]
    lines = [line.text for line in table(Page(76), rows)]
    assert lines[0].startswith(" reading  y")
    assert max(map(cells, lines)) <= 76
    assert table(Page(80), [("reading", "read"), ("fuse", "0.4 Ω")])[0].text == " reading  read"


def test_a_heading_as_wide_as_the_page_stands_alone() -> None:
    lines = paragraph(Page(32), "97 %", first="THIS SUPPLY DOES WHAT IT SHOULD  ", rest="  ", role="headline")
    assert [line.text for line in lines] == ["THIS SUPPLY DOES WHAT IT SHOULD", "  97 %"]
    assert {line.role for line in lines} == {"headline"}
    assert [line.text for line in paragraph(Page(32), "", first="NO READINGS YET, SO NO SUSPECT  ")] == [
        "NO READINGS YET, SO NO SUSPECT",
    ]
