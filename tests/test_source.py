"""Bytes, lines and columns."""

from __future__ import annotations

import re
from pathlib import Path
from unittest.mock import patch

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.source import SourceText, Span


def text(data: bytes) -> SourceText:
    return SourceText(Path("inv.sp"), data, "inv.sp")


class TestLines:
    @pytest.mark.parametrize(
        ("data", "offset", "line", "column"),
        [
            (b"", 0, 1, 1),
            (b"ab\ncd", 4, 2, 2),
            (b"ab\r\ncd", 4, 2, 1),
            (b"ab\rcd", 3, 2, 1),
            (b"ab\n", 3, 2, 1),
            ("µm x".encode(), 4, 1, 4),
            (b"\xff\xfe x", 3, 1, 4),
            (b"a\x0bb\x85c\xc2\x85", 5, 1, 6),
        ],
    )
    def test_line_and_column(self, data: bytes, offset: int, line: int, column: int) -> None:
        assert text(data).line_number(offset) == line
        assert text(data).column(offset) == column

    def test_a_line_has_no_line_end(self) -> None:
        source = text(b"one\r\ntwo\rthree\n")
        assert [source.line(offset) for offset in (0, 5, 15)] == ["one", "two", ""]
        assert [source.line(offset) for offset in (3, 4, 8)] == ["one", "one", "two"]

    @pytest.mark.parametrize("part", [1, 2, 3, 1000])
    @settings(max_examples=100, deadline=None)
    @given(data=st.text("a\r\n", max_size=30).map(str.encode))
    def test_each_place_lies_in_the_line_that_splitting_gives(self, data: bytes, part: int) -> None:
        pieces = re.split(rb"(\r\n|\n|\r)", data)
        lines = list(zip(pieces[::2], [*pieces[1::2], b"$"], strict=True))
        with patch("evenstage.source._PART", part):
            source, offset = text(data), 0
            for number, (line, end) in enumerate(lines, 1):
                for _ in line + end:
                    assert source.line_number(offset) == number
                    assert source.line(offset) == line.decode()
                    offset += 1


class TestSpan:
    def test_place_and_text(self) -> None:
        span = Span(text(b"* inv\nm1 d g s b n w=1u\n"), 21, 23)
        assert (span.place, span.text) == ("inv.sp:2:16", "1u")

    def test_odd_bytes_survive(self) -> None:
        span = Span(text(b"a\xffb"), 0, 3)
        assert span.text.encode("utf-8", "surrogateescape") == b"a\xffb"
