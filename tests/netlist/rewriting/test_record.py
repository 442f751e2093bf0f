"""The record at the head of a rewritten netlist."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.record import (
    CornerRecord,
    Record,
    digest,
    find_record,
    record_edit,
    record_lines,
    without_record,
)
from evenstage.source import SourceText

quick = settings(max_examples=50, deadline=None)

RECORD = Record(
    key="0123456789abcdef",
    delay_before=612.3456789e-12,
    delay_after=498.1e-12,
    least_delay=487e-12,
    total_width=35.2e-6,
    switched_cap=123.4e-15,
    transition=120e-12,
    bound=486.9e-12,
    bound_on="delay",
    gap=1.25e-7,
    rounding_loss=0.0,
    ceilings={"a<3>": 12.3e-15, "a<4>": 12.3e-15, "sel": 4e-15},
    smallest={"nch": 420e-9},
)

LINES = b"""\
* evenstage record: limits and figures of the netlist as first drawn; keep these lines
* evenstage record: worst delay before = 612.3456789 ps
* evenstage record: worst delay after = 498.1 ps
* evenstage record: least charged delay within the limits = 487 ps
* evenstage record: total width before = 35.2 um
* evenstage record: switched capacitance before = 123.4 fF
* evenstage record: slowest transition = 120 ps
* evenstage record: gap to the bound = 1.25e-07
* evenstage record: loss by rounding = 0
* evenstage record: bound on delay = 486.9 ps
* evenstage record: input a<3> a<4> = 12.3 fF
* evenstage record: input sel = 4 fF
* evenstage record: smallest nch = 420 nm
* evenstage record: key = 0123456789abcdef
"""

CARD = b"m1 y a vss vss nch w=0.6u l=60n\n"


def source_of(data: bytes) -> SourceText:
    return SourceText(Path("a.sp"), data, "a.sp")


def with_record(data: bytes, record: Record = RECORD) -> bytes:
    netlist = read_bytes(data, "a.sp", Path())
    return rewrite(netlist, [record_edit(netlist, record)])[netlist.sources[0].path]


class TestRecordLines:
    def test_reads_well(self) -> None:
        assert record_lines(RECORD) == LINES

    def test_takes_the_line_end_of_the_file(self) -> None:
        assert record_lines(RECORD, b"\r\n") == LINES.replace(b"\n", b"\r\n")


positive = st.floats(1e-17, 1e-3)


def _solid(name: str) -> str:
    return name.replace(" ", "_")


class TestFindRecord:
    @quick
    @given(
        st.builds(
            Record,
            key=st.text("0123456789abcdef", min_size=1),
            bound_on=st.sampled_from(["delay", "width", "energy"]),
            gap=st.floats(0, 1),
            rounding_loss=st.floats(0, 1),
            ceilings=st.dictionaries(st.text("abc<3>/=!", min_size=1), positive, max_size=3),
            smallest=st.dictionaries(st.text("npch_", min_size=1), positive, max_size=3),
            corners=st.dictionaries(
                st.text(min_size=1).filter(lambda name: name.isprintable()),
                st.builds(
                    CornerRecord,
                    transition=positive,
                    ceilings=st.dictionaries(st.text("ab =1", min_size=1).map(_solid), positive),
                ),
                max_size=3,
            ),
            **dict.fromkeys(
                (
                    "delay_before",
                    "delay_after",
                    "least_delay",
                    "total_width",
                    "switched_cap",
                    "transition",
                    "bound",
                ),
                positive,
            ),
        )
    )
    def test_finds_what_was_written(self, record: Record) -> None:
        found = find_record(source_of(b"title\n" + record_lines(record) + CARD))
        assert found is not None
        assert (found.key, found.bound_on) == (record.key, record.bound_on)
        for name in ("delay_before", "total_width", "switched_cap", "bound", "gap"):
            assert getattr(found, name) == pytest.approx(getattr(record, name), rel=1e-11, abs=0)
        assert found.ceilings == pytest.approx(record.ceilings, rel=1e-11, abs=0)
        assert found.smallest == pytest.approx(record.smallest, rel=1e-11, abs=0)
        assert list(found.corners) == list(record.corners)
        for name, kept in record.corners.items():
            assert found.corners[name].transition == pytest.approx(kept.transition, rel=1e-11)
            assert found.corners[name].ceilings == pytest.approx(kept.ceilings, rel=1e-11, abs=0)

    def test_passes_over_what_it_does_not_know(self) -> None:
        lines = LINES.replace(
            b"* evenstage record: key",
            b"* evenstage record: mood = 7\n" * 2 + b"* evenstage record: key",
        )
        assert find_record(source_of(lines)) == RECORD

    @pytest.mark.parametrize(
        "text",
        [
            CARD,
            b"* evenstage record: \xff\xfe = \x00\n",
            LINES.replace(b"key =", b"kee ="),
            LINES.replace(b"= 35.2 um", b"= 35.2 V"),
            LINES.replace(b"bound on delay", b"bound on luck"),
        ],
    )
    def test_garbage_is_no_record(self, text: bytes) -> None:
        assert find_record(source_of(text)) is None

    @quick
    @given(st.binary(max_size=200))
    def test_any_bytes_are_survived(self, data: bytes) -> None:
        find_record(source_of(b"* evenstage record: " + data))
        assert without_record(data) == data or b"evenstage" in data


class TestRecordEdit:
    @pytest.mark.parametrize(
        ("before", "after"),
        [
            (b"row decoder\n", CARD),
            (b"* row decoder\n", CARD),
            (b"", CARD),
            (b"", b".subckt inv a y\n.ends\n"),
            (b"", b"*.GLOBAL vdd\n*.pininfo a:I\n" + CARD),
            (b"", b"* evenstage: w 1u -> 2u: path\n" + CARD),
            (b"\xef\xbb\xbf", CARD),
            (b"\xef\xbb\xbfrow decoder\n", CARD),
        ],
    )
    def test_stands_after_a_title_and_before_the_first_card(
        self, before: bytes, after: bytes
    ) -> None:
        assert with_record(before + after) == before + LINES + after

    def test_takes_the_line_end_of_the_file(self) -> None:
        data = b"title\r\n" + CARD.replace(b"\n", b"\r\n")
        assert with_record(data) == b"title\r\n" + LINES.replace(b"\n", b"\r\n") + data[7:]

    def test_survives_a_title_without_line_end(self) -> None:
        assert with_record(b"title alone") == b"title alone\n" + LINES[:-1]

    def test_replaces_an_earlier_record(self) -> None:
        later = replace(RECORD, key="f00d", delay_after=1e-12)
        once = with_record(b"title\n" + CARD)
        assert with_record(once, later) == b"title\n" + record_lines(later) + CARD
        assert with_record(with_record(once, later)) == once

    def test_is_taken_out_without_a_trace(self) -> None:
        for data in (b"title\n" + CARD, CARD, b"* t\r\n" + CARD):
            assert without_record(with_record(data)) == data


class TestDigest:
    def test_does_not_see_the_record(self) -> None:
        plain = read_bytes(b"title\n" + CARD, "a.sp", Path())
        marked = read_bytes(with_record(b"title\n" + CARD), "b.sp", Path())
        assert digest(plain, "fastest") == digest(marked, "fastest")

    def test_sees_wishes_and_every_other_byte(self) -> None:
        plain = read_bytes(b"title\n" + CARD, "a.sp", Path())
        other = read_bytes(b"title\n" + CARD.replace(b"0.6u", b"0.60u"), "a.sp", Path())
        keys = {digest(plain, "fastest"), digest(plain, "least width"), digest(other, "fastest")}
        assert len(keys) == 3

    def test_foresees_the_key_of_the_rewritten_file(self) -> None:
        plain = read_bytes(b"title\n" + CARD, "a.sp", Path())
        new = plain.sources[0].data.replace(b"0.6u", b"1.2u")
        written = read_bytes(with_record(new), "a.sp", Path())
        assert digest(plain, "x", {plain.sources[0].path: new}) == digest(written, "x")
