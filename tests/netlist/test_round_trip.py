"""Read, plan, rewrite, read again: the widths wished for, the same circuit, no other byte moved."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from evenstage.netlist.reading.read import read, read_bytes
from evenstage.pattern import Pattern
from support.sized import (
    assert_reads_back,
    planned,
    process,
    rewritten,
    sized,
    slot_name,
    wish_list,
)

quick = settings(max_examples=30, deadline=None)

FACTORS = (1.0, 1.5, 2.5)
WIDTHS = ["0.6u", "600n", "6e-07", "'0.60u'", "{0.6U}", "0.6um"]
#: Definitions of a leaf: N width, P width, parameters on the first line, a line inside.
STYLES = {
    "literal": ("{w}", "{w}", "", ""),
    "default": ("wn", "'2*wn'", " wn={w}", ""),
    "two": ("wn", "wp", " wn={w} wp={w}", ""),
    "inside": ("wn", "'2*wn'", "", ".param wn = {w}"),
    "mixed": ("{w}", "wp", " wp={w}", ""),
    "global": ("wg", "'2*wg'", "", ""),
}
#: Lines that say nothing to us.
NOISE = ["", "* \xe9\xff \x85 caf\xe9", "\t", "*", ".tran 1n 10n", "$ note; more"]


@dataclass(frozen=True)
class Design:
    """A netlist, its leaves, and wished factors by call or card."""

    text: bytes
    leaves: frozenset[str]
    factors: dict[str, float]


@st.composite
def designs(draw: st.DrawFn) -> Design:
    """Draw a design of leaves, rows of them, and cards of its own."""
    styles = draw(st.lists(st.sampled_from(sorted(STYLES)), min_size=1, max_size=3))
    leaves = {f"inv{i}": style for i, style in enumerate(styles)}
    definitions = [leaf for name in leaves for leaf in draw(leaf_lines(name, leaves[name]))]
    factors = {}

    def call(name: str) -> str:
        leaf = draw(st.sampled_from(sorted(leaves)))
        factors[name] = draw(st.sampled_from(FACTORS))
        given_width = leaves[leaf] in {"default", "two"} and draw(st.booleans())
        passed = f" wn={draw(st.sampled_from(WIDTHS))}" if given_width else ""
        slash = " /" if draw(st.booleans()) else ""
        return f"{name} a b vdd vss{slash} {leaf}{passed}"

    def card(name: str) -> str:
        factors[name] = draw(st.sampled_from(FACTORS))
        lines = "\n+ " if draw(st.booleans()) else " "
        return f"{name} b a vss vss{lines}nch w={draw(st.sampled_from(WIDTHS))} l=60n ad=0.2p pd=2u"

    row = [".subckt row a b vdd vss", call("x1"), card("m1"), call("x2"), ".ends row"]
    top = [".param wg=1u", "xr1 a b vdd vss row", "xr2 b c vdd vss row", call("x3"), card("m3")]
    blocks = [definitions, row, top]
    lines = [line for block in draw(st.permutations(blocks)) for line in block]
    lines = [
        part
        for line in lines
        for part in (line, *draw(st.lists(st.sampled_from(NOISE), max_size=1)))
    ]
    end = draw(st.sampled_from(["\n", "\r\n"]))
    text = end.join(["title", *lines]).replace("\n", end).replace("\r\r", "\r")
    text += end if draw(st.booleans()) else ""
    return Design(text.encode("latin-1"), frozenset(leaves), factors)


@st.composite
def leaf_lines(draw: st.DrawFn, name: str, style: str) -> list[str]:
    """Draw the lines of a leaf."""
    n, p, defaults, inside = (
        part.replace("{w}", draw(st.sampled_from(WIDTHS))) for part in STYLES[style]
    )
    gap = draw(st.sampled_from([" ", "\t", "  "]))
    return [
        f".subckt {name} a y vdd vss{defaults}",
        *([inside] if inside else []),
        f"mn y a vss vss nch{gap}w{gap}={gap}{n} l=60n as=0.3p",
        f"Mp y a vdd vdd pch W={p} l=60n  $ P",
        draw(st.sampled_from([".ends", f".ends {name}", f".ENDS\t{name.upper()}"])),
    ]


def has_all_lines(before: bytes, after: bytes, touched: set[int]) -> bool:
    """Tell whether the lines of a text but for some occur in another one in their order."""
    rest = iter(after.splitlines(keepends=True))
    return all(
        line in rest
        for number, line in enumerate(before.splitlines(keepends=True), 1)
        if number not in touched
    )


class TestRoundTrip:
    @quick
    @given(designs())
    def test_the_same_circuit_with_the_widths_wished_for(self, design: Design) -> None:
        handles = sized(design.text, leaves=design.leaves)
        plan = planned(handles, design.factors)
        assert plan.refused == ()
        assert_reads_back(handles, plan)
        wished = {
            (w.card, w.caller): w.new
            for w in wish_list(handles, design.factors)
            if w.new != pytest.approx(w.old, rel=1e-9, abs=0)
        }
        written = {(w.card, w.caller): w.new for w in plan.written}
        assert written == pytest.approx(wished, rel=1e-9, abs=0)

    @quick
    @given(designs())
    def test_no_line_but_those_said_to_change_does(self, design: Design) -> None:
        handles = sized(design.text, leaves=design.leaves)
        plan = planned(handles, design.factors)
        assume(plan.edits)
        source = handles.block.netlist.sources[0]
        starts = {0, *(i + 1 for i, byte in enumerate(source.data) if byte in b"\r\n")}
        touched = {
            source.line_number(edit.span.start)
            for edit in plan.edits
            if edit.span.start not in starts or edit.span.end > edit.span.start
        }
        assert has_all_lines(source.data, rewritten(handles, plan), touched)

    @quick
    @given(designs())
    def test_callers_that_want_the_same_share_a_copy(self, design: Design) -> None:
        handles = sized(design.text, leaves=design.leaves)
        after = read_bytes(rewritten(handles, planned(handles, design.factors)), "a.sp", Path())
        # Two factors other than 1, so at most two copies of each leaf.
        for leaf in design.leaves:
            copies = [name for name in after.subcircuits if name.startswith(f"{leaf}_s")]
            assert len(copies) <= 2

    @quick
    @given(designs(), st.sampled_from([1.2, 0.8]))
    def test_a_later_run_replaces_the_comments(self, design: Design, factor: float) -> None:
        handles = sized(design.text, leaves=design.leaves)
        once = rewritten(handles, planned(handles, design.factors))
        again = sized(once, leaves=set(read_bytes(once, "a.sp", Path()).subcircuits) - {"row"})
        plan = planned(again, dict.fromkeys(design.factors, factor))
        assert_reads_back(again, plan)
        lines = rewritten(again, plan).splitlines()
        ours = [line.startswith(b"* evenstage: ") for line in lines]
        assert not any(first and second for first, second in pairwise(ours))

    @quick
    @given(designs())
    def test_widths_as_drawn_change_nothing(self, design: Design) -> None:
        handles = sized(design.text, leaves=design.leaves)
        assert planned(handles, {}).edits == ()
        assert {slot_name(handles, slot).split(".")[0] for slot in handles} == set(design.factors)


DATA = Path(__file__).parents[3] / "shared" / "data" / "ihp_sg13g2"


@pytest.mark.skipif(not DATA.is_dir(), reason="the folder of open cells is absent")
@pytest.mark.parametrize("file", ["sg13g2_stdcell.spice", "sg13g2_stdcell.cdl"])
def test_cells_of_an_open_library(file: str) -> None:
    """Every width of some cells of the IHP Open PDK (Apache-2.0) can be written and read back."""
    netlist = read(DATA / file)
    using = process()
    kinds = zip(using.transistors, ("sg13_lv_nmos", "sg13_lv_pmos"), strict=True)
    types = tuple(replace(kind, models=(Pattern(name),)) for kind, name in kinds)
    for cell in list(netlist.subcircuits)[::8]:
        handles = sized(netlist, using=replace(using, transistors=types), top=cell)
        names = {slot_name(handles, slot) for slot in handles}
        plan = planned(handles, dict.fromkeys(names, 1.5))
        assert len(plan.written) == len(handles)
        assert_reads_back(handles, plan)
