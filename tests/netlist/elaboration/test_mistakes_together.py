"""All mistakes of a netlist at once, in the order of its files and lines."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import pytest

from evenstage.errors import MistakesError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read

if TYPE_CHECKING:
    from pathlib import Path

MAIN: Final = """\
* a block with mistakes of every step
.param width=1u
.subckt top a y vdd vss
.include cells.sp
x1 a b vdd vss inv
x2 b c vdd inv
x3 c d vdd vss invv
\tm1 d b vss vss nch w='2*widht' l=0.1u  $ note
m2 y d vss vss nch w=0 l=0.1u
m3 y d x x zork l=0.1u w=1u
m4 y d vss vss nch l=0.1u w='width*'
.ends
"""
CELLS: Final = """\
.subckt inv a y vdd vss
mn y a vss vss nch w=-1u l=0.1u
mp y a vdd vdd pch w=1u l='0.1u/0'
+ m=0
.ends
"""
TOLD: Final = """\
main.sp:6:1: 'inv' has 4 ports, but 'x2' gives 3 nets (pin-count)
    x2 b c vdd inv
    ^^^^^^^^^^^^^^
'inv' begins at cells.sp:1:1

main.sp:7:16: there is no subcircuit 'invv'; did you mean 'inv'? (unknown-subcircuit)
    x3 c d vdd vss invv
                   ^^^^

main.sp:8:23: the parameter 'widht' is not defined; did you mean 'width'? (undefined-parameter)
            m1 d b vss vss nch w='2*widht' l=0.1u  $ note
                                 ^^^^^^^^^

main.sp:9:22: width must be a positive length, got '0' (bad-width)
    m2 y d vss vss nch w=0 l=0.1u
                         ^

main.sp:10:12: no transistor type covers the model 'zork', and nothing says whether it is n or p; \
add it to the process file (unknown-model)
    m3 y d x x zork l=0.1u w=1u
               ^^^^

main.sp:11:29: the expression 'width*' ends too early (bad-expression)
    m4 y d vss vss nch l=0.1u w='width*'
                                ^^^^^^^^

cells.sp:2:22: width must be a positive length, got '-1u' (bad-width)
    mn y a vss vss nch w=-1u l=0.1u
                         ^^^

cells.sp:3:27: the expression '0.1u/0' divides by zero (bad-expression)
    mp y a vdd vdd pch w=1u l='0.1u/0'
                              ^^^^^^^^

cells.sp:4:5: a multiplier must be positive, got '0' (bad-multiplier)
    + m=0
        ^"""


def told(folder: Path, main: str) -> str:
    """Return what is said to a netlist of two files."""
    (folder / "main.sp").write_text(main)
    (folder / "cells.sp").write_text(CELLS)
    with pytest.raises(MistakesError) as caught:
        elaborate(read(folder / "main.sp"), "top")
    return str(caught.value).replace(f"{folder}/", "")


def test_all_are_told_with_place_cause_and_hint(tmp_path: Path) -> None:
    assert told(tmp_path, MAIN) == TOLD


def test_a_definition_that_calls_itself_is_told_before_all_else(tmp_path: Path) -> None:
    """Nothing can be laid out then; what was noticed up to there is told with it."""
    text = told(tmp_path, MAIN.replace("x1 a b vdd vss inv", "x1 a b vdd vss top"))
    assert [line.rpartition("(")[2] for line in text.split("\n") if line.startswith("main")] == [
        "recursive-subcircuit)",
        "unknown-subcircuit)",
        "bad-expression)",
    ]


def test_a_width_that_is_wrong_is_not_told_as_missing_too(tmp_path: Path) -> None:
    text = told(tmp_path, MAIN.replace("m2 y d vss vss nch w=0 l=0.1u", "m2 y d vss vss nch l=1u"))
    assert text.count("(missing-width)") == 1
    assert text.count("main.sp:8:") == text.count("main.sp:11:") == 1
