"""Sized copies of leaves from file to file: written, read again, found again by the next run."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
import pytest

from evenstage import flow
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.families import find_families

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.sizing.results import Sizing

TRANSISTOR: Final = """
[[transistor]]
models = "{polarity}ch"
polarity = "{polarity}"
length = "0.1u"
r_w = "{r_w}"
c_gate = "1.2n"
c_drain = "1n"
width_step = "{step}"
"""
INV: Final = """\
.subckt inv a y
mn y a vss vss nch w=1u l=0.1u
mp y a vdd vdd pch w=2u l=0.1u
.ends
"""
NAND: Final = """\
.subckt nand a b y
m1 y a vdd vdd pch w=2u l=0.1u
m2 y b vdd vdd pch w=2u l=0.1u
m3 y a m vss nch w=2u l=0.1u
m4 m b vss vss nch w=2u l=0.1u
.ends
"""
ROW: Final = ".subckt row a y\nx1 a m inv\nx2 m y inv\n.ends\n"
CHAIN: Final = "x1 a b inv\nx2 b c inv\nx3 c d inv\nx4 d e inv\nx5 e f inv\nx6 f y inv\n"


@dataclass
class Desk:
    """A folder with a netlist, a process and a brief, in which runs follow each other."""

    folder: Path

    def write(self, text: str, brief: str = "") -> None:
        """Begin with a netlist whose block is called top."""
        kinds = (("n", "2m", "10n"), ("p", "4m", "20n"))
        tables = "".join(
            TRANSISTOR.format(polarity=kind, r_w=r_w, step=step) for kind, r_w, step in kinds
        )
        (self.folder / "p.toml").write_text(f'name = "invented"\nsupply = 1.1\n{tables}')
        (self.folder / "run0.sp").write_text(f"* t\n.global vdd vss\n{text}")
        self.tell(brief)

    def tell(self, brief: str) -> None:
        """Say what later runs know, beside the load of the output."""
        out = '[[output]]\nnets = ["y"]\nload = "200f"\n'
        (self.folder / "b.toml").write_text(f'top = "top"\n{brief}\n{out}')

    def resize(self, run: int, wishes: flow.Wishes | None = None) -> Sizing:
        """Resize the outcome of the run before; what was written must be what was promised."""
        question = flow.Question(process=self.folder / "p.toml", brief=self.folder / "b.toml")
        before, after = (self.folder / f"run{k}.sp" for k in (run - 1, run))
        wishes = wishes or flow.Wishes(margin=0.005, scope="block")
        sizing = flow.resize(before, question, wishes, after)
        assert sizing.after.timing is not None
        circuit = sizing.after.timing.circuit
        written = elaborate(read(after), "top", circuit.process)
        np.testing.assert_allclose(written.width, circuit.devices.width, rtol=1e-9, atol=0)
        return sizing

    def text(self, run: int) -> str:
        return (self.folder / f"run{run}.sp").read_text()

    def calls(self, run: int) -> dict[str, str]:
        """Return what each call of a run's text calls, by the names of its subcircuit and card."""
        netlist = read(self.folder / f"run{run}.sp")
        cards = (netlist.card(number) for number in range(len(netlist)))
        return {f"{c.scope}.{c.name}": c.target for c in cards if c.letter == "x"}

    def copies(self, run: int, leaf: str = "inv") -> tuple[str, ...]:
        """Return the copies of a leaf that a run's text has."""
        families = find_families(read(self.folder / f"run{run}.sp"))
        return families[leaf].copies if leaf in families else ()


@pytest.fixture
def desk(tmp_path: Path) -> Desk:
    return Desk(tmp_path)


#: Makes everything as small as it is allowed to be: as first drawn.
SMALL: Final = flow.Wishes(delay=1e-6, scope="block", reclaim=True)


class TestOneLevel:
    @pytest.mark.parametrize("most", [2, 3, 4])
    def test_at_most_as_many_copies_as_allowed(self, desk: Desk, most: int) -> None:
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n", f"copies_per_leaf = {most}")
        assert desk.resize(1).changes
        assert len(desk.copies(1)) == most
        assert set(desk.calls(1).values()) <= {"inv", *desk.copies(1)}

    def test_without_copies_all_calls_change_together(self, desk: Desk) -> None:
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n", "copies_per_leaf = 0")
        desk.resize(1, flow.Wishes(scope="block", margin=0, width=2.0))
        assert desk.text(1).count(".subckt") == 2
        assert set(desk.calls(1).values()) == {"inv"}

    def test_names_that_are_taken_are_left_alone(self, desk: Desk) -> None:
        """A subcircuit, a model and a name that is only called have the names we would give."""
        taken = INV.replace("inv", "INV_S1") + ".model inv_s2 nmos level=1\n"
        other = ".subckt other a\nx1 a inv_s3\n.ends\n"
        desk.write(f"{INV}{taken}{other}.subckt top a y\n{CHAIN}.ends\n")
        desk.resize(1)
        assert desk.copies(1) == ("inv_s4", "inv_s5", "inv_s6", "inv_s7")
        assert INV.replace("inv", "INV_S1") in desk.text(1)

    def test_calls_of_one_size_share_a_copy(self, desk: Desk) -> None:
        tied = '[[same_size]]\ncards = ["x3", "x5"]'
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n", tied)
        desk.resize(1)
        calls = desk.calls(1)
        assert calls["top.x3"] == calls["top.x5"] != "inv"

    def test_other_blocks_of_the_text_keep_their_sizes(self, desk: Desk) -> None:
        other = f".subckt other a y\n{CHAIN}.ends\n"
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n{other}")
        desk.resize(1)
        assert other in desk.text(1)
        assert INV in desk.text(1)


class TestTheNextRun:
    def test_changes_nothing_with_the_same_wishes(self, desk: Desk) -> None:
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n")
        desk.resize(1)
        assert desk.resize(2).already_done
        assert desk.text(2) == desk.text(1)

    def test_takes_a_leaf_and_its_copies_as_one_family(self, desk: Desk) -> None:
        """With other wishes there are still no more copies than allowed in all."""
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n", "copies_per_leaf = 2")
        desk.resize(1)
        desk.resize(2, flow.Wishes(width=1.5, scope="block", reclaim=True))
        desk.resize(3, flow.Wishes(width=2.5, scope="block", reclaim=True))
        assert 1 <= len(desk.copies(3)) <= 2
        assert set(desk.calls(3).values()) <= {"inv", *desk.copies(3)}

    def test_removes_copies_that_nobody_calls_any_more(self, desk: Desk) -> None:
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n")
        desk.resize(1)
        assert len(desk.copies(1)) == 4
        desk.resize(2, SMALL)
        assert desk.copies(2) == ()
        assert set(desk.calls(2).values()) == {"inv"}
        assert re.sub(r"(?m)^\* evenstage.*\n", "", desk.text(2)) == desk.text(0)

    def test_keeps_the_copies_that_another_block_calls(self, desk: Desk) -> None:
        desk.write(f"{INV}.subckt top a y\n{CHAIN}.ends\n.subckt other a y\nx1 a y inv\n.ends\n")
        desk.resize(1)
        text = desk.text(1).replace("x1 a y inv\n", f"x1 a y {desk.copies(1)[0]}\n")
        (desk.folder / "run1.sp").write_text(text)
        desk.resize(2, SMALL)
        assert desk.copies(2) == desk.copies(1)[:1]

    def test_of_a_second_block_counts_its_own_copies(self, desk: Desk) -> None:
        """The copies that one block has do not keep the next one from having as many."""
        two = f".subckt top a y\n{CHAIN}.ends\n.subckt other a y\n{CHAIN}.ends\n"
        desk.write(INV + two)
        desk.resize(1)
        swapped = (
            desk.text(1).replace("top", "none").replace("other", "top").replace("none", "other")
        )
        (desk.folder / "run1.sp").write_text(swapped)
        desk.tell('[[input]]\nnets = ["a"]\ndrive = "200"\n')
        desk.resize(2)
        called = {
            k: {t for n, t in desk.calls(2).items() if n.startswith(k)} for k in ("top", "oth")
        }
        assert 1 <= len(called["top"] - {"inv"}) <= 4
        assert called["oth"] == {t for n, t in desk.calls(1).items() if n.startswith("oth")}


class TestDepth:
    TIED = (
        'leaves = ["row"]\n[[same_size]]\ncards = ["xa", "xb"]\n'
        '[[input]]\nnets = ["a"]\ncapacitance_max = "100f"\n'
    )
    TWO_ROWS = f"{INV}{ROW}.subckt top a y\nxa a b row\nxb b y row\n.ends\n"

    def test_a_leaf_in_a_subcircuit_has_one_set_of_sizes_for_all_its_calls(
        self, desk: Desk
    ) -> None:
        desk.write(self.TWO_ROWS)
        desk.resize(1)
        calls = desk.calls(1)
        assert calls["top.xa"] == calls["top.xb"] == "row"
        assert calls["row.x1"] != calls["row.x2"]
        assert desk.resize(2).already_done

    def test_a_leaf_that_calls_subcircuits_is_copied_with_what_it_calls(self, desk: Desk) -> None:
        desk.write(self.TWO_ROWS, 'leaves = ["row"]')
        sizing = desk.resize(1)
        assert "width-fixed" not in {notice.code for notice in sizing.notices}
        calls = desk.calls(1)
        row = calls["top.xb"]
        assert row in desk.copies(1, "row")
        assert calls[f"{row}.x1"] == calls[f"{row}.x2"] in desk.copies(1)
        assert f"{INV}* ev" in desk.text(1)
        assert f"{ROW}* ev" in desk.text(1)

    def test_its_copies_are_a_family_and_go_with_what_they_call(self, desk: Desk) -> None:
        desk.write(self.TWO_ROWS, 'leaves = ["row"]')
        desk.resize(1)
        desk.resize(2, flow.Wishes(width=1.5, scope="block", reclaim=True))
        assert len(desk.copies(2, "row")) <= 2
        assert len(desk.copies(2)) == len(desk.copies(2, "row"))
        desk.resize(3, SMALL)
        assert desk.copies(3) == desk.copies(3, "row") == ()
        assert re.sub(r"(?m)^\* evenstage.*\n", "", desk.text(3)) == desk.text(0)

    def test_calls_that_agree_change_it_where_it_stands(self, desk: Desk) -> None:
        desk.write(self.TWO_ROWS, self.TIED)
        desk.resize(1, flow.Wishes(scope="block", margin=0, width=2.0))
        assert desk.text(1).count(".subckt") == 3
        assert "nch w=1u" not in desk.text(1)

    def test_what_others_call_too_is_copied_all_the_same(self, desk: Desk) -> None:
        """All calls of the row agree, but another block calls the inverter."""
        other = ".subckt other a y\nx1 a y inv\n.ends\n"
        desk.write(self.TWO_ROWS + other, self.TIED)
        desk.resize(1, flow.Wishes(scope="block", margin=0, width=2.0))
        (copy,) = desk.copies(1)
        calls = desk.calls(1)
        assert calls["row.x1"] == calls["row.x2"] == copy
        assert (calls["top.xa"], calls["other.x1"]) == ("row", "inv")

    def test_three_levels_with_another_leaf_beside_it(self, desk: Desk) -> None:
        text = (
            f"{INV}{NAND}{ROW}.subckt two a y\nx1 a m row\nx2 m vdd y nand\n.ends\n"
            ".subckt top a y\nxa a b two\nxb b c two\nxc c d inv\nxd d vdd y nand\n.ends\n"
        )
        desk.write(text, 'leaves = ["two"]\ncopies_per_leaf = 2')
        desk.resize(1)
        calls = desk.calls(1)
        two = calls["top.xb"]
        assert two in desk.copies(1, "two")
        row, nand = calls[f"{two}.x1"], calls[f"{two}.x2"]
        assert (row in desk.copies(1, "row"), nand in desk.copies(1, "nand")) == (True, True)
        assert calls[f"{row}.x1"] == calls[f"{row}.x2"] in desk.copies(1)
        for definition in (INV, NAND, ROW):
            assert definition in desk.text(1)
        assert desk.resize(2).already_done
        desk.resize(3, SMALL)
        assert re.sub(r"(?m)^\* evenstage.*\n", "", desk.text(3)) == desk.text(0)

    def test_widths_that_its_call_passes_down_are_passed_anew(self, desk: Desk) -> None:
        inv = (
            INV.replace("a y", "a y w=1u", 1)
            .replace("w=1u l", "w=w l")
            .replace("w=2u l", "w='2*w' l")
        )
        row = ".subckt row a y wr=1u\nx1 a m inv w=wr\nx2 m y inv w=wr\n.ends\n"
        top = ".subckt top a y\nxa a b row\nxb b y row wr=2u\n.ends\n"
        desk.write(inv + row + top, 'leaves = ["row"]')
        desk.resize(1)
        assert desk.text(1).count(".subckt") == 3
        assert re.search(r"xb b y row wr=(?!2u)\S+u\n", desk.text(1))

    def test_a_leaf_with_definitions_inside_says_why_it_stays(self, desk: Desk) -> None:
        row = f".subckt row a y\n{INV}x1 a m inv\nx2 m y inv\n.ends row\n"
        top = ".subckt top a y\nxa a b row\nxb b y row\n.ends\n"
        desk.write(row.replace(".ends\nx1", ".ends inv\nx1") + top, 'leaves = ["row"]')
        sizing = desk.resize(1)
        assert [n.message for n in sizing.notices if n.code == "width-fixed"] == [
            "mn keeps its width: 'row' holds further definitions and cannot be copied"
        ]

    def test_a_gate_of_wrapped_transistors_is_a_leaf_like_any_other(self, desk: Desk) -> None:
        """The transistors stand in subcircuits of their own that the leaf calls."""
        wrapped = (
            ".subckt nmw d g s\nm0 d g s vss nch w=1u l=0.1u\n.ends\n"
            ".subckt pmw d g s\nm0 d g s vdd pch w=2u l=0.1u\n.ends\n"
            ".subckt inv a y\nxn y a vss nmw\nxp y a vdd pmw\n.ends\n"
        )
        desk.write(f"{wrapped}.subckt top a y\n{CHAIN}.ends\n", "copies_per_leaf = 2")
        sizing = desk.resize(1)
        assert "width-fixed" not in {notice.code for notice in sizing.notices}
        assert len(desk.copies(1)) == len(desk.copies(1, "nmw")) == 2
        assert wrapped in re.sub(r"(?s)\* evenstage: \w+ -> \w+: .*?\.ends\n", "", desk.text(1))
