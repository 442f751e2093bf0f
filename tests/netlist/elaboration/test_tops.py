"""Which subcircuit is meant where nobody says."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.netlist.elaboration.tops import AmbiguousTopError, choose_top
from evenstage.netlist.reading.read import read_bytes

LEAF = ".subckt {name} a y\nmn y a 0 0 nx w=1u l=0.1u\n.ends\n"
TOP = ".subckt block a y\nx1 a y {called}\n.ends\n"


def chosen(text: str) -> str:
    return choose_top(read_bytes(f"* t\n{text}".encode(), "t.sp", Path()), None, None)


class TestLeavesReplacedByCopies:
    def test_are_no_blocks_of_their_own(self) -> None:
        """After every caller was given a sized copy, nobody calls the leaf it was made of."""
        text = LEAF.format(name="inv") + LEAF.format(name="inv_s2") + TOP.format(called="inv_s2")
        assert chosen(text) == "block"

    def test_other_uncalled_subcircuits_still_are(self) -> None:
        text = LEAF.format(name="buf") + LEAF.format(name="inv_s2") + TOP.format(called="inv_s2")
        with pytest.raises(AmbiguousTopError, match="'buf', 'block'"):
            chosen(text)
