"""Edits: decided as data, spliced once."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.rewriting.edits import Edit, EditColumns, apply_edits
from evenstage.source import SourceText, Span

if TYPE_CHECKING:
    from random import Random

quick = settings(max_examples=60, deadline=None)


def source_of(data: bytes) -> SourceText:
    return SourceText(Path("a.sp"), data, "a.sp")


@st.composite
def sources_and_edits(draw: st.DrawFn) -> tuple[SourceText, list[Edit]]:
    """Draw any bytes and non-overlapping edits of them, one per start, in text order."""
    source = source_of(draw(st.binary(max_size=60)))
    places = draw(st.lists(st.integers(0, len(source.data)), max_size=8, unique=True).map(sorted))
    pairs = zip(places[::2], places[1::2], strict=False)
    return source, [
        Edit(Span(source, start, end), draw(st.binary(max_size=5))) for start, end in pairs
    ]


def in_columns(source: SourceText, edits: list[Edit]) -> EditColumns:
    starts, ends = ([getattr(e.span, edge) for e in edits] for edge in ("start", "end"))
    texts = [edit.text for edit in edits]
    return EditColumns(source, np.array(starts, np.int64), np.array(ends, np.int64), texts)


class TestApplyEdits:
    @quick
    @given(st.binary())
    def test_no_edit_is_identity_on_any_bytes(self, data: bytes) -> None:
        assert apply_edits(source_of(data), []) == data

    @quick
    @given(sources_and_edits(), st.randoms())
    def test_bytes_outside_the_spans_stay_and_order_is_irrelevant(
        self, drawn: tuple[SourceText, list[Edit]], random: Random
    ) -> None:
        source, edits = drawn
        expected, at = b"", 0
        for edit in edits:
            expected += source.data[at : edit.span.start] + edit.text
            at = edit.span.end
        expected += source.data[at:]
        random.shuffle(edits)
        assert apply_edits(source, edits) == expected
        many = edits[: random.randrange(len(edits) + 1)]
        assert apply_edits(source, [*edits[len(many) :], in_columns(source, many)]) == expected

    def test_insertions_at_one_place_keep_their_order_and_stand_before_a_replacement(self) -> None:
        source = source_of(b"abc")
        edits = [
            Edit(Span(source, 1, 2), b"B"),
            Edit(Span(source, 1, 1), b"1"),
            Edit(Span(source, 1, 1), b"2"),
            Edit(Span(source, 2, 2), b"3"),
        ]
        assert apply_edits(source, edits) == b"a12B3c"

    @pytest.mark.parametrize("second", [(1, 3), (2, 2), (0, 4), (2, 5)])
    def test_an_overlap_is_our_fault(self, second: tuple[int, int]) -> None:
        source = source_of(b"abcdef")
        with pytest.raises(ValueError, match="overlaps"):
            apply_edits(source, [Edit(Span(source, 1, 3), b""), Edit(Span(source, *second), b"")])

    def test_an_edit_of_another_file_is_our_fault(self) -> None:
        other = SourceText(Path("b.sp"), b"abc", "b.sp")
        with pytest.raises(ValueError, match="another file"):
            apply_edits(source_of(b"abc"), [Edit(Span(other, 0, 1), b"")])
