"""What is a transistor, wrapped or not, and of which channel."""

from __future__ import annotations

from dataclasses import replace

import pytest

from evenstage.pattern import Pattern
from evenstage.process.generic import generic
from support.laid_out import INVERTER, block, microns, paths, pins


class TestWrappedTransistors:
    WRAPPER = ".subckt nwrap d s g b w=1u l=0.1u\nm1 s g d b nch w=w l=l nf=2\n.ends\n"

    def test_a_call_nobody_defines(self) -> None:
        devices = block(
            "XM1 d g s b my_nfet_lv w=2u l=0.1u nf=2 m=3 ad=1p sa=0.1 topography=normal"
        )
        assert pins(devices) == [("d", "g", "s", "b")]
        assert paths(devices) == ["XM1"]
        assert (microns(devices), devices.multiplier.tolist()) == ([2], [3])
        assert devices.models[0].name == "my_nfet_lv"
        assert devices.models[0].polarity == "n"

    def test_a_wrapper_that_passes_its_width_on_is_the_callers_card(self) -> None:
        devices = block(self.WRAPPER + ".subckt t a b c e\nx1 a b c e nwrap w=3u m=2\n.ends", "t")
        assert paths(devices) == ["x1"]
        assert pins(devices) == [("b", "c", "a", "e")]
        assert (microns(devices), devices.multiplier.tolist()) == ([3], [2])
        assert len(devices.instance_parent) == 1

    def test_a_wrapper_whose_width_is_its_own_is_an_instance(self) -> None:
        devices = block(self.WRAPPER + ".subckt t a b c e\nx1 a b c e nwrap\n.ends", "t")
        assert paths(devices) == ["x1.m1"]
        assert len(devices.instance_parent) == 2

    def test_a_wrapper_of_a_wrapper(self) -> None:
        outer = ".subckt outer d s g b w=1u\nx0 s d g b nwrap w='w*2'\n.ends\n"
        devices = block(self.WRAPPER + outer + "x1 a b c e outer w=3u")
        assert (paths(devices), microns(devices)) == (["x1"], [6])
        assert pins(devices) == [("a", "c", "b", "e")]

    @pytest.mark.parametrize("inside", ["m1 d g s b nch w=w l=l", "x1 d g s b nch w=w l=l"])
    def test_a_wrapper_named_like_what_it_wraps(self, inside: str) -> None:
        text = f".subckt nch d g s b w=1u l=0.1u\n{inside}\n.ends\n"
        devices = block(text + ".subckt t a b c e\nx1 a b c e nch w=3u\n.ends", "t")
        assert (paths(devices), microns(devices)) == (["x1"], [3])

    def test_a_wrapper_known_to_the_process_by_its_own_name_only(self) -> None:
        known = generic()
        zz = replace(known.first("p"), models=(Pattern("zz*"),))
        process = replace(known, transistors=(zz, known.first("n")))
        text = (
            ".subckt zzwrap d g s b w=1u\nm1 d g s b inner w=w l=1u\n.ends\nx1 a b c e zzwrap w=2u"
        )
        assert [model.polarity for model in block(text, None, process).models] == ["p"]

    def test_other_things_drawn_as_calls_are_left_out_with_a_notice(self) -> None:
        devices = block(
            INVERTER + ".subckt t a b v g\nx1 a b v g inv\nxd g a zdio w=1u l=1u\n.ends"
        )
        assert len(devices) == 2
        assert [(n.code, n.names) for n in devices.notices] == [("not-understood", ("t.xd",))]


class TestPolarity:
    @pytest.mark.parametrize(
        ("model", "card", "bulk", "polarity"),
        [
            ("nch", "", "x", "n"),
            ("p", "", "x", "p"),
            ("modp", "", "x", "p"),
            ("zork", ".model zork pmos level=54", "vss", "p"),
            ("zork", "", "vss", "n"),
            ("zork", "", "VDD!", "p"),
            ("zork", "", "0", "n"),
        ],
    )
    def test_card_name_or_bulk_tell(self, model: str, card: str, bulk: str, polarity: str) -> None:
        devices = block(f"{card}\nm1 a b c {bulk} {model} w=1u l=0.1u")
        assert [m.polarity for m in devices.models] == [polarity]

    def test_an_assumption_is_told(self) -> None:
        notices = block("m1 a b c vss zork w=1u l=0.1u").notices
        assert [(n.code, n.names) for n in notices] == [("type-assumed", ("zork",))]
