"""How a mistake is shown."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.errors import EvenstageError, NetlistError, Notice, SettingsError, excerpt
from evenstage.source import SourceText, Span


def span_of(data: bytes, part: bytes) -> Span:
    start = data.index(part)
    return Span(SourceText(Path("inv.sp"), data, "inv.sp"), start, start + len(part))


class TestEvenstageError:
    def test_place_line_and_caret(self) -> None:
        span = span_of(b".subckt inv a z\nmn z a 0 0 n w=0 l=0.1u\n", b"0 l")
        span = Span(span.source, span.start, span.start + 1)
        error = NetlistError(
            "width must be a positive length, got '0'",
            code="bad-width",
            span=span,
            notes=("inside subcircuit 'inv', which begins at inv.sp:1:1",),
        )
        assert str(error) == (
            "inv.sp:2:16: width must be a positive length, got '0' (bad-width)\n"
            "    mn z a 0 0 n w=0 l=0.1u\n"
            "                   ^\n"
            "inside subcircuit 'inv', which begins at inv.sp:1:1"
        )

    def test_without_a_place(self) -> None:
        error = SettingsError("cannot read b.toml", code="unreadable-file", notes=("a note",))
        assert str(error) == "cannot read b.toml (unreadable-file)\na note"

    def test_all_mistakes_are_one_family(self) -> None:
        assert all(issubclass(kind, EvenstageError) for kind in (NetlistError, SettingsError))


class TestExcerpt:
    @pytest.mark.parametrize(
        ("data", "part", "shown", "carets"),
        [
            (b"\tw=5", b"5", "        w=5", " " * 10 + "^"),
            (b"w=\t5 l=1", b"\t5", "w=      5 l=1", "  " + "^" * 7),
            ("µ w=5".encode(), b"5", "µ w=5", "    ^"),
            (b"\xff w=5", b"5", "? w=5", "    ^"),
            (b"abc\n+ def", b"bc\n+ d", "abc", " ^^"),
            (b"abc\r\ndef", b"c\r\nd", "abc", "  ^"),
        ],
    )
    def test_carets_stand_under_the_cause(
        self, data: bytes, part: bytes, shown: str, carets: str
    ) -> None:
        assert excerpt(span_of(data, part)) == [f"    {shown}", f"    {carets}"]

    def test_an_empty_span_at_the_end_gets_one_caret(self) -> None:
        source = SourceText(Path("b.toml"), b"a = ", "b.toml")
        assert excerpt(Span(source, 4, 4)) == ["    a = ", "        ^"]


class TestNotice:
    def test_place_comes_first(self) -> None:
        assert str(Notice("resistor-joined", "R1 joins a and b", "x.sp:3:1")) == (
            "x.sp:3:1: R1 joins a and b"
        )
        assert str(Notice("resistor-joined", "R1 joins a and b")) == "R1 joins a and b"


class TestLongLines:
    @pytest.mark.parametrize(
        ("before", "after", "shown", "caret"),
        [
            (0, 300, "here" + "b" * 96 + "...", 0),
            (20, 300, "a" * 20 + "here" + "b" * 76 + "...", 20),
            (200, 300, "..." + "a" * 40 + "here" + "b" * 56 + "...", 43),
            (300, 0, "..." + "a" * 96 + "here", 99),
        ],
    )
    def test_only_the_part_around_the_cause_is_shown(
        self, before: int, after: int, shown: str, caret: int
    ) -> None:
        data = b"a" * before + b"here" + b"b" * after
        span = Span(SourceText(Path("t"), data, "t"), before, before + 4)
        assert excerpt(span) == [f"    {shown}", f"    {' ' * caret}^^^^"]

    def test_a_cause_longer_than_the_part_shown_is_marked_as_far_as_it_is_seen(self) -> None:
        span = Span(SourceText(Path("t"), b"a" * 500, "t"), 0, 500)
        assert [len(line) for line in excerpt(span)] == [107, 107]
