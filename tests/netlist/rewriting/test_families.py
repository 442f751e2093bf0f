"""A leaf and the copies earlier runs made of it, as text before and after a further run."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.families import Family, find_families
from evenstage.netlist.rewriting.widths import plan_widths
from support.sized import assert_reads_back, planned, rewritten, sized, wish_list

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping

INVERTER = b"""\
.subckt inv a y vdd vss
mn y a vss vss nch w=0.6u l=60n
mp y a vdd vdd pch w=1.2u l=60n
.ends inv
"""


def leaf(name: bytes, scale: int, callers: bytes, parent: bytes = b"inv") -> bytes:
    """Return a copy of the inverter as a run writes it."""
    note = b"* evenstage: %b -> %b: called by %b\n.subckt %b a y vdd vss\n"
    cards = (
        b"* evenstage: w 0.6u -> %b: reason\nmn y a vss vss nch w=%b l=60n\n"
        b"* evenstage: w 1.2u -> %b: reason\nmp y a vdd vdd pch w=%b l=60n\n.ends %b\n"
    )
    wn, wp = (b"%.1fu" % (w * scale) for w in (0.6, 1.2))
    return note % (parent, name, callers, name) + cards % (wn, wn, wp, wp, name)


CALLS = b"x1 a b vdd vss inv\nx2 b c vdd vss inv_s1\nx3 c d vdd vss inv_s1\n"
LEAVES = {"inv", "inv_s1", "inv_s2", "inv_s3"}


def after(
    before: bytes,
    factors: Mapping[str, float],
    *,
    leaves: Collection[str] = LEAVES,
    copies: int = 4,
) -> str:
    """Return the rewritten text, which must read back with the widths said to be written."""
    handles = sized(before, leaves=leaves, copies=copies)
    plan = planned(handles, factors)
    assert plan.refused == ()
    assert_reads_back(handles, plan)
    return rewritten(handles, plan).decode("latin-1")


def moved(old: bytes, new: bytes, *widths: tuple[bytes, bytes]) -> bytes:
    """Return the comment above a card that calls another definition now."""
    (n0, n1), (p0, p1) = widths
    return b"* evenstage: %b -> %b (mn w %b -> %b, mp w %b -> %b): reason\n" % (
        *(old, new),
        *(n0, n1, p0, p1),
    )


class TestFinding:
    def test_a_copy_is_known_by_its_name_and_the_comment_above(self) -> None:
        text = INVERTER + leaf(b"inv_s1", 3, b"x2") + leaf(b"inv_s2", 2, b"x3", b"inv_s1")
        netlist = read_bytes(b"t\n" + text, "a.sp", Path("/design"))
        family = Family("inv", ("inv_s1", "inv_s2"))
        assert find_families(netlist) == dict.fromkeys(["inv", "inv_s1", "inv_s2"], family)

    def test_a_copy_of_a_copy_that_is_gone_is_the_leafs(self) -> None:
        text = INVERTER + leaf(b"inv_s2", 2, b"x3", b"inv_s1")
        netlist = read_bytes(b"t\n" + text, "a.sp", Path("/design"))
        assert find_families(netlist)["inv_s2"] == Family("inv", ("inv_s2",))

    @pytest.mark.parametrize(
        "text",
        [
            INVERTER + INVERTER.replace(b"inv", b"inv_s1"),
            INVERTER + leaf(b"inv_fast", 2, b"x2"),
            INVERTER.replace(b"inv", b"nand") + leaf(b"inv_s1", 2, b"x2"),
            INVERTER + leaf(b"inv_s1", 2, b"x2").replace(b".subckt", b"* mine\n.subckt"),
            leaf(b"inv_s1", 2, b"x2", b"inv_s2") + leaf(b"inv_s2", 2, b"x2", b"inv_s1"),
            leaf(b"inv_s2", 2, b"x2", b"inv_s1"),
            leaf(b"inv_s1", 2, b"x2", b"inv_s1"),
        ],
    )
    def test_anything_else_is_no_copy(self, text: bytes) -> None:
        assert find_families(read_bytes(b"* t\n" + text, "a.sp", Path("/design"))) == {}


class TestCopiesOfEarlierRuns:
    def test_all_callers_of_a_copy_change_it_where_it_stands(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3") + CALLS
        changed = (
            before.replace(b"w=1.2u l=60n\n* ev", b"w=1.8u l=60n\n* ev")
            .replace(b"w=2.4u", b"w=3.6u")
            .replace(b"w 0.6u -> 1.2u", b"w 1.2u -> 1.8u")
            .replace(b"w 1.2u -> 2.4u", b"w 2.4u -> 3.6u")
        )
        assert after(before, {"x2": 1.5, "x3": 1.5}) == changed.decode()

    def test_one_caller_leaves_for_a_copy_of_the_copy(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3")
        further = (
            leaf(b"inv_s2", 6, b"x3", b"inv_s1")
            .replace(b"w 0.6u", b"w 1.2u", 1)
            .replace(b"w 1.2u -> 7.2u", b"w 2.4u -> 7.2u")
        )
        note = moved(b"inv_s1", b"inv_s2", (b"1.2u", b"3.6u"), (b"2.4u", b"7.2u"))
        calls = CALLS.replace(b"x3 c d vdd vss inv_s1", note + b"x3 c d vdd vss inv_s2")
        assert after(before + CALLS, {"x3": 3}) == (before + further + calls).decode()

    def test_a_caller_moves_to_a_copy_that_is_there(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3") + CALLS
        note = moved(b"inv", b"inv_s1", (b"0.6u", b"1.2u"), (b"1.2u", b"2.4u"))
        changed = before.replace(b"by x2, x3", b"by x1, x2, x3").replace(
            b"x1 a b vdd vss inv\n", note + b"x1 a b vdd vss inv_s1\n"
        )
        assert after(before, {"x1": 2}) == changed.decode()

    def test_a_copy_nobody_calls_any_more_goes(self) -> None:
        copy = leaf(b"inv_s1", 2, b"x2, x3")
        before = b"t\n" + INVERTER + copy + leaf(b"inv_s2", 3, b"x4") + CALLS
        before += b"x4 d e vdd vss inv_s2\n"
        note = moved(b"inv_s1", b"inv_s2", (b"1.2u", b"1.8u"), (b"2.4u", b"3.6u"))
        changed = before.replace(copy, b"").replace(b"by x4", b"by x2, x3, x4")
        for call in (b"x2 b c vdd vss inv_s", b"x3 c d vdd vss inv_s"):
            changed = changed.replace(call + b"1", note + call + b"2")
        assert after(before, {"x2": 1.5, "x3": 1.5}) == changed.decode()

    def test_callers_go_home_to_the_leaf(self) -> None:
        copy = leaf(b"inv_s1", 2, b"x2, x3")
        before = b"t\n" + INVERTER + copy + CALLS
        note = moved(b"inv_s1", b"inv", (b"1.2u", b"0.6u"), (b"2.4u", b"1.2u"))
        changed = before.replace(copy, b"")
        for call in (b"x2 b c vdd vss inv", b"x3 c d vdd vss inv"):
            changed = changed.replace(call + b"_s1", note + call)
        assert after(before, {"x2": 0.5, "x3": 0.5}) == changed.decode()

    def test_equal_wishes_of_different_members_share_a_copy(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3") + CALLS
        before += b"x4 d e vdd vss inv\n"
        text = after(before, {"x1": 6, "x2": 3})
        calls = [line.split()[-1] for line in text.splitlines() if line.startswith("x")]
        assert calls == ["inv_s2", "inv_s2", "inv_s1", "inv"]
        assert text.count(".subckt") == 3
        assert "inv -> inv_s2: called by x1, x2" in text

    def test_spelling_and_layout_make_no_difference(self) -> None:
        copy = leaf(b"inv_s1", 2, b"x2, x3").replace(b" l=60n", b"   L=60n $ note")
        before = b"t\n" + INVERTER + copy + CALLS
        text = after(before, {"x2": 0.5, "x3": 0.5})
        assert ".subckt inv_s1" not in text

    def test_without_wishes_even_an_unused_copy_stays(self) -> None:
        handles = sized(b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x9") + CALLS, leaves=LEAVES)
        assert planned(handles, {}).edits == ()

    def test_no_more_copies_than_allowed_in_all(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3") + CALLS
        handles = sized(before, leaves=LEAVES, copies=1)
        wishes = wish_list(handles, {"x3": 3})
        with pytest.raises(ValueError, match="2 copies of inv, 1 allowed"):
            plan_widths(handles, wishes)

    def test_again_nothing_changes(self) -> None:
        before = b"t\n" + INVERTER + leaf(b"inv_s1", 2, b"x2, x3") + CALLS
        once = after(before, {"x1": 2, "x3": 3})
        assert after(once.encode(), {}) == once

    def test_a_default_of_a_copy_changes_below_the_comment_that_tells_it(self) -> None:
        parts = leaf(b"inv_s1", 2, b"x2, x3")
        parts = parts.replace(b"vdd vss\n", b"vdd vss wp=2.4u\n").replace(b"w=2.4u", b"w=wp")
        original = INVERTER.replace(b"vdd vss\n", b"vdd vss wp=1.2u\n").replace(b"w=1.2u", b"w=wp")
        before = b"t\n" + original + parts + CALLS
        text = after(before, {"x2": 2, "x3": 2})
        assert (
            "* evenstage: inv -> inv_s1: called by x2, x3\n"
            "* evenstage: wp 2.4u -> 4.8u: reason\n"
            ".subckt inv_s1 a y vdd vss wp=4.8u\n"
        ) in text
