"""Comments above cards, and the places of lines they depend on."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.rewriting.comments import card_line, comment_above, line_end, line_start
from evenstage.netlist.rewriting.edits import apply_edits
from evenstage.source import SourceText

quick = settings(max_examples=60, deadline=None)
texts = st.text(st.sampled_from("ab +*\r\n"), max_size=30).map(str.encode)


def commented(data: bytes, offset: int, text: str = "why") -> bytes:
    source = SourceText(Path("a.sp"), data, "a.sp")
    return apply_edits(source, [comment_above(source, offset, text)])


class TestLineStart:
    @quick
    @given(texts, st.integers(0, 30))
    def test_agrees_with_the_line_numbers_of_messages(self, data: bytes, offset: int) -> None:
        offset = min(offset, len(data))
        source = SourceText(Path("a.sp"), data, "a.sp")
        start = line_start(data, offset)
        # Between the two bytes of a CR LF the line that they end goes on.
        assert start <= offset
        assert data[start:offset].replace(b"\r\n", b"").count(b"\n") == 0
        assert start == 0 or source.line_number(start) == source.line_number(start - 1) + 1

    def test_a_byte_order_mark_is_no_part_of_the_first_line(self) -> None:
        assert line_start(b"\xef\xbb\xbfm1", 4) == 3


class TestLineEnd:
    @pytest.mark.parametrize(
        ("data", "offset", "expected"),
        [
            (b"ab\r\ncd\n", 1, b"\r\n"),
            (b"ab\r\ncd\n", 5, b"\n"),
            (b"ab\rcd", 1, b"\r"),
            (b"ab\r\ncd", 5, b"\r\n"),
            (b"ab", 1, b"\n"),
        ],
    )
    def test_is_that_of_the_line_or_of_the_one_before(
        self, data: bytes, offset: int, expected: bytes
    ) -> None:
        assert line_end(data, offset) == expected


class TestCardLine:
    @pytest.mark.parametrize(
        ("data", "line"),
        [
            (b"m1 a\n+ w=1\n", b"m1"),
            (b"x\nm1 a\n* c\n\n \t\n$ d\n; e\n  + b\n+ w=1", b"m1"),
            (b"+ w=1\n", b"+"),
            (b"\xef\xbb\xbf+ w=1\n", b"+"),
            (b"m1 a\r\n*\r\n+ w=1\r\n", b"m1"),
            (b"m1 a\r+ w=1", b"m1"),
            (b"m0 b\nm1 w=1\n", b"m1"),
        ],
    )
    def test_climbs_over_continuations_and_what_stands_between(
        self, data: bytes, line: bytes
    ) -> None:
        assert data[card_line(data, data.index(b"w=") if b"w=" in data else 0) :].startswith(line)


class TestCommentAbove:
    def test_stands_on_a_line_of_its_own(self) -> None:
        assert commented(b"m0\n m1 a\n+ b", 10) == b"m0\n* evenstage: why\n m1 a\n+ b"

    def test_all_our_comments_directly_above_give_way(self) -> None:
        data = b"* evenstage: 1\nx\n* evenstage: 2\r\n* evenstage: 3\nm1"
        assert commented(data, len(data)) == b"* evenstage: 1\nx\n* evenstage: why\nm1"

    def test_at_the_very_beginning(self) -> None:
        assert commented(b"* evenstage: old\nm1", 18) == b"* evenstage: why\nm1"
        assert (
            commented(b"\xef\xbb\xbf* evenstage: old\nm1", 21)
            == b"\xef\xbb\xbf* evenstage: why\nm1"
        )

    def test_a_record_is_no_comment_of_this_kind(self) -> None:
        data = b"* evenstage record: key = 7\nm1"
        assert commented(data, len(data)) == b"* evenstage record: key = 7\n* evenstage: why\nm1"
