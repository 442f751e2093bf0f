"""Which widths the text lets follow, and why others stay."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.handles import WidthHandles
from evenstage.netlist.rewriting.sized_block import Slot
from support.sized import assert_reads_back, planned, process, rewritten, sized, slot_name

if TYPE_CHECKING:
    from pathlib import Path

INVERTER = b"""\
.subckt inv a y vdd vss
mn y a vss vss nch w=0.6u l=60n
mp y a vdd vdd pch w=1.2u l=60n
.ends inv
"""


def reasons(handles: WidthHandles) -> dict[str, str]:
    return {slot_name(handles, slot): why for slot, why in handles.cannot_change().items()}


def ways(handles: WidthHandles) -> dict[str, list[str]]:
    """Return how each width is changed: way and number."""
    return {
        slot_name(handles, slot): [f"{o.way} {o.parameter.name}={o.model}" for o in handle.origins]
        for slot, handle in handles.items()
    }


class TestOrigins:
    def test_literals(self) -> None:
        text = b"t\n" + INVERTER + b"x1 a b vdd vss inv\nm1 c b vss vss nch w='1u' l=60n\n"
        assert ways(sized(text, leaves={"inv"})) == {
            "x1.mn": ["leaf w=0.6u"],
            "x1.mp": ["leaf w=1.2u"],
            "m1": ["shared w='1u'"],
        }

    def test_parameters_of_a_leaf(self) -> None:
        leaf = (
            b".subckt inv a y vdd vss wn=0.6u\n.param wp=1.2u\nmn y a vss vss nch w=wn l=60n\n"
            b"mp y a vdd vdd pch w='wp*1.5' l=60n\n.ends\n"
        )
        text = b"t\n" + leaf + b"x1 a b vdd vss inv\nx2 b c vdd vss inv wn='2u'\n"
        assert ways(sized(text, leaves={"inv"})) == {
            "x1.mn": ["default wn=0.6u"],
            "x1.mp": ["leaf wp=1.2u"],
            "x2.mn": ["shared wn='2u'"],
            "x2.mp": ["leaf wp=1.2u"],
        }

    def test_a_ratio_beside_a_length_stays(self) -> None:
        text = b"t\n.param wu=1u beta=2\nm1 y a vdd vdd pch w='wu*beta' l=60n\n"
        assert ways(sized(text)) == {"m1": ["shared wu=1u"]}

    def test_a_sum_of_lengths_scales_together(self) -> None:
        text = b"t\n.param wu=1u wx=0.2u\nm1 y a vdd vdd pch w='wu+2*wx' l=60n\n"
        assert ways(sized(text)) == {"m1": ["shared wu=1u", "shared wx=0.2u"]}

    def test_a_number_may_serve_widths_areas_and_edges_of_one_variable(self) -> None:
        text = (
            b"t\n.param wu=1u\nm1 y a vss vss nch w=wu l=60n ad='wu*0.3u' pd='wu*2+0.6u'\n"
            b"m2 y a vdd vdd pch w='2*wu' l=60n\n"
        )
        assert reasons(sized(text)) == {}

    def test_a_name_defined_by_itself_is_the_top_levels(self) -> None:
        text = (
            b"t\n.param w=1u\n.subckt two a y vss w=w\nm1 b a vss vss nch w=w l=60n\n"
            b"m2 y b vss vss nch w=2u l=60n\n.ends\nx1 a y vss two\n"
        )
        assert ways(sized(text))["m1"] == ["shared w=1u"]


SHARED = "its width wu comes from a parameter that sets other things too"


class TestReasons:
    @pytest.mark.parametrize(
        ("other", "apart"),
        [
            (b"m2 y a vss vss nch w=wu l=60n", {"m2"}),
            (b"m2 y a vss vss nch w=2u l=wu", set()),
            (b"r1 y a r='wu*1e9'", set()),
            (b"c1 y vss 'wu*1n'", set()),
            (b"x1 y a vss row w1=wu", set()),
            (b".param wv='2*wu'\nm2 y a vss vss nch w=wv l=60n", {"m2"}),
        ],
    )
    def test_a_number_that_sets_other_things_too(self, other: bytes, apart: set[str]) -> None:
        row = b".subckt row a y vss w1=1u\nm5 b a vss vss nch w=1u l=60n\nc5 b vss 'w1*1n'\n.ends\n"
        text = b"t\n.param wu=1u\n" + row + b"m1 y a vss vss nch w=wu l=60n\n" + other + b"\n"
        assert reasons(sized(text, apart=apart))["m1"] == SHARED

    @pytest.mark.parametrize(
        ("parameters", "width"),
        [
            (b"wu=1u", b"'wu+0.2u'"),
            (b"wu=1u", b"'max(wu, 0.5u)-wu/2+0.1u'"),
            (b"wu=1u", b"'sqrt(wu*1u)'"),
            (b"wu=1u", b"'2*0.3u'"),
        ],
    )
    def test_a_width_out_of_proportion(self, parameters: bytes, width: bytes) -> None:
        text = b"t\n.param " + parameters + b"\nm1 y a vss vss nch w=" + width + b" l=60n\n"
        expected = f"its width {width.decode()} is not in proportion to parameters"
        assert reasons(sized(text)) == {"m1": expected}

    def test_where_no_copies_are_allowed_all_callers_must_move_together(self) -> None:
        text = b"t\n" + INVERTER + b"x1 a b vdd vss inv\nx2 b c vdd vss inv\n"
        assert set(reasons(sized(text, leaves={"inv"}, copies=0)).values()) == {
            "callers of 'inv' share one size, and not all of them may change"
        }
        block = sized(text, leaves={"inv"}, copies=0).block
        together = replace(block, variable_of=dict.fromkeys(block.variable_of, 0))
        assert WidthHandles(together).cannot_change() == {}

    def test_a_leaf_that_holds_definitions_is_not_copied(self) -> None:
        inner = b".subckt nfet d g s b w=1u l=60n\nm0 d g s b nch w=w l=l\n.ends\n"
        leaf = (
            b".subckt inv a y vdd vss\n" + inner + b"xn y a vss vss nfet w=0.6u\n"
            b"mp y a vdd vdd pch w=1.2u l=60n\n.ends\n"
        )
        text = b"t\n" + leaf + b"x1 a b vdd vss inv\nx2 b c vdd vss inv\n"
        why = set(reasons(sized(text, leaves={"inv"})).values())
        assert why == {"'inv' holds further definitions and cannot be copied"}
        assert reasons(sized(text.replace(b"x2", b"*x2"), leaves={"inv"})) == {}

    def test_a_width_deeper_inside_a_leaf_has_the_leafs_size(self) -> None:
        text = (
            b"t\n" + INVERTER + b".subckt buf a y vdd vss\nx1 a b vdd vss inv\n"
            b"x2 b y vdd vss inv\n.ends\nxb a y vdd vss buf\nxc y z vdd vss inv\n"
        )
        block = sized(text).block
        number = {block.netlist.card(n).name: n for n in range(len(block.netlist))}
        mn = number["mn"]
        inside, beside = Slot(mn, number["xb"]), Slot(mn, number["xc"])
        handles = WidthHandles(replace(block, variable_of={inside: 0, beside: 1}))
        assert handles.cannot_change() == {}
        assert [origin.way for origin in handles[inside].origins] == ["leaf"]

    def test_cards_that_a_leaf_calls_and_others_size_keep_their_widths(self) -> None:
        """The subcircuit stands in the leaf, and in the block as well."""
        text = (
            b"t\n" + INVERTER + b".subckt one a y vdd vss\nx1 a y vdd vss inv\n.ends\n"
            b".subckt buf a y vdd vss\nx1 a b vdd vss one\nx2 b y vdd vss one\n.ends\n"
            b"xb a y vdd vss buf\nxc y z vdd vss one\n"
        )
        block = sized(text).block
        number = {block.netlist.card(n).name: n for n in range(len(block.netlist))}
        one = block.netlist.subcircuits["one"].cards[0]
        inside, beside = Slot(number["mn"], number["xb"]), Slot(number["mn"], one)
        handles = WidthHandles(replace(block, variable_of={inside: 0, beside: 1}))
        assert handles.cannot_change() == {
            beside: "'one' stands in the leaf 'buf' too, which has sizes of its own"
        }

    def test_a_subcircuit_defined_twice_alike_stays(self) -> None:
        text = b"t\n" + INVERTER + INVERTER + b"x1 a b vdd vss inv\n"
        assert set(reasons(sized(text, leaves={"inv"})).values()) == {
            "'inv' is defined again at a.sp:7:1"
        }

    def test_of_two_different_definitions_the_later_is_changed(self) -> None:
        text = b"t\n" + INVERTER + INVERTER.replace(b"0.6u", b"0.7u") + b"x1 a b vdd vss inv\n"
        handles = sized(text, leaves={"inv"})
        plan = planned(handles, {"x1": 2})
        assert_reads_back(handles, plan)
        assert b"w=0.6u" in rewritten(handles, plan)

    def test_one_notice_per_reason(self) -> None:
        text = (
            b"t\n.param wu=1u\nm1 y a vss vss nch w=wu l=60n\nm2 z a vss vss nch w=wu l=wu\n"
            b"m3 q a vss vss nch w='wu+1u' l=60n\n"
        )
        first, second = sized(text).notices()
        assert (first.code, first.names, first.place) == ("width-fixed", ("m1", "m2"), "a.sp:3:1")
        assert first.message == f"m1 keeps its width: {SHARED}"
        assert second.names == ("m3",)


class TestFiles:
    @pytest.fixture
    def main(self, tmp_path: Path) -> Path:
        """Return a main file with a leaf beside it and one outside its folder."""
        folder = tmp_path / "design"
        (folder / "cells").mkdir(parents=True)
        (folder / "cells" / "inv.sp").write_bytes(INVERTER)
        (tmp_path / "buf.sp").write_bytes(INVERTER.replace(b"inv", b"buf"))
        (folder / "main.sp").write_bytes(
            b"title\n.include cells/inv.sp\n.inc '../buf.sp'\n"
            b"x1 a b vdd vss inv\nx2 b c vdd vss inv\nx3 c d vdd vss buf\n"
        )
        return folder / "main.sp"

    def test_files_outside_the_folder_of_the_main_file_stay(self, main: Path) -> None:
        handles = sized(read(main), leaves={"inv", "buf"})
        outside = f"'{main.parents[1] / 'buf.sp'}' lies outside the folder of the main file"
        assert reasons(handles) == {"x3.mn": outside, "x3.mp": outside}

    def test_files_included_by_their_full_path_stay(self, main: Path) -> None:
        cell = main.parent / "cells" / "inv.sp"
        main.write_bytes(f"title\n.include {cell}\nx1 a b vdd vss inv\n".encode())
        why = f"'{cell}' is included by its full path, which leads to it for ever"
        assert reasons(sized(read(main))) == {"mn": why, "mp": why}

    def test_an_included_file_gets_its_own_edits(self, main: Path) -> None:
        handles = sized(read(main), leaves={"inv", "buf"})
        texts = rewrite(handles.block.netlist, planned(handles, {"x1": 2, "x3": 2}).edits)
        assert list(texts) == [main, main.parent / "cells" / "inv.sp"]
        assert texts[main].count(b"\n") == main.read_bytes().count(b"\n") + 1
        assert texts[main.parent / "cells" / "inv.sp"].startswith(INVERTER + b"* evenstage: inv ->")

    def test_cards_included_into_several_subcircuits_stay(self, main: Path) -> None:
        (main.parent / "cells" / "drive.sp").write_bytes(b"m1 y a vss vss nch w=1u l=60n\n")
        include = b"\n.include cells/drive.sp\nm2 y a vss vss nch w=1u l=60n\n.ends\n"
        main.write_bytes(
            b"title\n.subckt one a y vss"
            + include
            + b".subckt two a y vss"
            + include
            + b"x1 a b vss one\nx2 b c vss two\n"
        )
        why = "its file is included more than once, and one change would make several"
        assert reasons(sized(read(main))) == {"m1": why}
        main.write_bytes(
            main.read_bytes().replace(include, b"\nm2 y a vss vss nch w=1u l=60n\n.ends\n", 1)
        )
        assert reasons(sized(read(main))) == {}

    def test_a_file_included_twice_is_one_text(self, main: Path) -> None:
        main.write_bytes(main.read_bytes() + b".include cells/inv.sp\n")
        handles = sized(read(main), leaves={"inv", "buf"})
        assert set(reasons(handles)) == {"x3.mn", "x3.mp"}

    def test_a_caller_outside_cannot_be_sent_to_a_copy(self, main: Path) -> None:
        (main.parents[1] / "buf.sp").write_bytes(
            b".subckt buf a y vdd vss\nx9 a y vdd vss inv\n.ends\n"
        )
        handles = sized(read(main), leaves={"inv"})
        assert set(reasons(handles)) == {"x9.mn", "x9.mp"}
        outside = f"'{main.parents[1] / 'buf.sp'}' lies outside the folder of the main file"
        assert set(reasons(handles).values()) == {outside}


class TestDrawable:
    def test_rounds_to_the_grid_of_the_process(self) -> None:
        handles = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n\n", using=process(width_step=5e-9))
        (handle,) = handles.values()
        assert handle.drawable(1.2374e-6) == pytest.approx(1.235e-6, rel=1e-12)
        assert handle.drawable(1.2374e-6, 1e-7) == pytest.approx(1.2e-6, rel=1e-12)
        assert handle.drawable(1e-10) == pytest.approx(5e-9, rel=1e-12)
        assert handle.width_max is None

    def test_without_a_grid_any_width_goes(self) -> None:
        (handle,) = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n\n").values()
        assert handle.drawable(1.23741e-6) == 1.23741e-6
        assert handle.smallest_step(1e-9) == 1e-9

    def test_fingers_have_a_grid_each(self) -> None:
        using = process(
            width_step=5e-9, width_is="finger", fingers_parameter="nf", finger_width_max=1e-6
        )
        (handle,) = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n nf=2\n", using=using).values()
        assert handle.drawable(2.503e-6) == pytest.approx(3 * 0.835e-6, rel=1e-12)
        assert handle.smallest_step(1e-9) == pytest.approx(10e-9, rel=1e-12)

    def test_fins_come_whole(self) -> None:
        using = process(width_parameter="nfin", width_is="fins", width_unit=50e-9, width_step=5e-9)
        (handle,) = sized(b"t\nx1 y a vss vss nch nfin=4 l=60n\n", using=using).values()
        assert handle.drawable(285e-9) == pytest.approx(300e-9, rel=1e-12)
        assert handle.smallest_step(1e-9) == pytest.approx(50e-9, rel=1e-12)


class TestMapping:
    def test_knows_its_slots(self) -> None:
        handles = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n\n")
        assert (len(handles), list(handles), Slot(0) in handles) == (1, [Slot(0)], True)
        assert handles[Slot(0)] is handles[Slot(0)]
        with pytest.raises(KeyError):
            handles[Slot(7)]
