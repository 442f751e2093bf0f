"""Names and paragraphs that fit."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.report.paper import Paper, cells

ANY_TEXT = st.text(st.characters(), max_size=60)


class TestPaper:
    @pytest.mark.parametrize(("asked", "given_"), [(10, 80), (80, 80), (97, 97), (999, 160)])
    def test_width_stays_between_80_and_160(self, asked: int, given_: int) -> None:
        assert Paper(asked).width == given_


class TestShown:
    def test_what_cannot_be_printed_is_replaced_sign_by_sign(self) -> None:
        name = b"a\xffb\n\xc3\xa9".decode("utf-8", "surrogateescape")
        assert Paper().shown(name) == "a?b??"
        assert Paper(unicode=True).shown(name) == "a\ufffdb\ufffdé"

    @given(ANY_TEXT, st.booleans())
    @settings(max_examples=60, deadline=None)
    def test_result_can_always_be_written(self, text: str, unicode: bool) -> None:  # noqa: FBT001
        shown = Paper(unicode=unicode).shown(text)
        assert shown.isprintable()
        assert len(shown.encode("utf-8" if unicode else "ascii")) >= len(text)


class TestShorten:
    @pytest.mark.parametrize(
        ("room", "text"),
        [
            (17, "xrow[63].xdrv.xi1"),
            (16, "xrow[63..drv.xi1"),
            (9, "xrow..xi1"),
            (3, "x.."),
        ],
    )
    def test_middle_gives_way(self, room: int, text: str) -> None:
        assert Paper().shorten("xrow[63].xdrv.xi1", room) == text

    @given(ANY_TEXT, st.integers(1, 40), st.booleans())
    @settings(max_examples=100, deadline=None)
    def test_result_fits_and_keeps_both_ends(
        self,
        text: str,
        room: int,
        unicode: bool,  # noqa: FBT001
    ) -> None:
        paper = Paper(unicode=unicode)
        shown, short = paper.shown(text), paper.shorten(text, room)
        assert cells(short) <= room
        head, mark, tail = short.partition(paper.gap_mark)
        if cells(shown) <= room:
            assert short == shown
        elif mark and paper.gap_mark not in shown:
            assert shown.startswith(head)
            assert shown.endswith(tail)


class TestParagraph:
    def test_number_and_unit_stay_together(self) -> None:
        text = "x" * 70 + " takes 612 ps and 3 % more"
        assert Paper(80).paragraph(text) == ["x" * 70 + " takes", "612 ps and 3 % more"]

    def test_later_lines_hang(self) -> None:
        lines = Paper(80).paragraph("word " * 20 + "end", indent=2, hanging=4)
        assert [len(line) - len(line.lstrip()) for line in lines] == [2, 4]

    @given(st.lists(ANY_TEXT, max_size=20), st.integers(0, 12))
    @settings(max_examples=60, deadline=None)
    def test_no_line_is_too_long(self, words: list[str], indent: int) -> None:
        lines = Paper(80).paragraph(" ".join(words), indent=indent, hanging=4)
        assert all(cells(line) <= 80 for line in lines)
        assert all(line == line.rstrip() for line in lines[1:])


class TestCells:
    def test_wide_letters_take_two_and_marks_none(self) -> None:
        assert [cells("wl"), cells("語語"), cells("e\u0301")] == [2, 4, 1]
