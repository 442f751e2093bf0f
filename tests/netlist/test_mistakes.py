"""Mistakes of elaboration are told together, in the order of the text."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.errors import ElaborationError, MistakesError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.elaboration.mistakes import MOST, Mistakes
from evenstage.netlist.reading.read import read, read_bytes


def told(text: str) -> str:
    with pytest.raises(MistakesError) as caught:
        elaborate(read_bytes(text.encode(), "top.sp", Path("absent")))
    return str(caught.value)


def test_calls_and_values_that_cannot_be_read() -> None:
    text = """* t
x1 a b vdd vss invv
x2 a b vdd vss inv
x3 b c vdd vss norr
x4 b c vdd vss norr
.subckt inv a y vdd vss
mn y a vss vss nch w=1.2.3u l=0.1u
mp y a vdd vdd pch w=2u l=0.1.u
.ends
"""
    assert told(text) == (
        "top.sp:2:16: there is no subcircuit 'invv'; did you mean 'inv'? (unknown-subcircuit)\n"
        "    x1 a b vdd vss invv\n"
        "                   ^^^^\n"
        "\n"
        "top.sp:4:16: there is no subcircuit 'norr' (unknown-subcircuit)\n"
        "    x3 b c vdd vss norr\n"
        "                   ^^^^\n"
        "\n"
        "top.sp:7:22: expected a number, a parameter or an expression, got '1.2.3u' (bad-number)\n"
        "    mn y a vss vss nch w=1.2.3u l=0.1u\n"
        "                         ^^^^^^\n"
        "\n"
        "top.sp:8:27: expected a number, a parameter or an expression, got '0.1.u' (bad-number)\n"
        "    mp y a vdd vdd pch w=2u l=0.1.u\n"
        "                              ^^^^^"
    )


def test_parameters_pins_and_models() -> None:
    text = """* t
x1 a b vdd inv
x2 a b vdd vss inv w=k
m1 a b 0 net1 zork w=q l=1u
m2 a b 0 net1 zork w=1u l=1u
.subckt inv a y vdd vss w=1u
mn y a vss vss nch w='w*j' l=0.1u
.ends
"""
    lines = [line for line in told(text).splitlines() if "top.sp" in line]
    assert [line.partition(": ")[0] for line in lines] == [
        "top.sp:2:1",
        "'inv' begins at top.sp:6:1",
        "top.sp:3:22",
        "top.sp:4:15",
        "top.sp:4:22",
    ]


def test_sizes_that_are_not_positive() -> None:
    text = "* t\nm1 a b 0 0 nch w=0 l=-1u m=0\nm2 a b 0 0 nch l=1u nf=0\n"
    codes = [line.rpartition("(")[2] for line in told(text).splitlines() if "top.sp" in line]
    assert codes == [
        "bad-width)",
        "bad-length)",
        "bad-multiplier)",
        "missing-width)",
        "bad-fingers)",
    ]


def test_of_many_the_first_twenty_are_told() -> None:
    cards = "".join(f"x{i} a b vdd vss lost{i}\n" for i in range(25))
    text = told(f"* t\n{cards}")
    assert text.count("unknown-subcircuit") == 20
    assert text.endswith("\n\nand 5 more")


def test_a_mistake_in_a_definition_called_in_many_ways_is_told_once() -> None:
    text = """* t
x1 a b 0 s w=1u
x2 a b 0 s w=2u
.subckt s a y vss w=1u
mn y a vss vss nch w='w*j' l=0.1u
.ends
"""
    with pytest.raises(ElaborationError) as caught:
        elaborate(read_bytes(text.encode(), "top.sp", Path("absent")))
    assert (caught.value.code, type(caught.value)) == ("undefined-parameter", ElaborationError)


def test_files_come_in_the_order_they_are_read(tmp_path: Path) -> None:
    (tmp_path / "a.sp").write_text("x1 a b lost\n")
    (tmp_path / "top.sp").write_text("* t\n.include a.sp\nx2 a b lost2\n")
    with pytest.raises(MistakesError) as caught:
        elaborate(read(tmp_path / "top.sp"))
    assert caught.value.code == "unknown-subcircuit"
    assert [error.span and error.span.text for error in caught.value.errors] == ["lost2", "lost"]


def test_more_than_anybody_reads_are_not_collected() -> None:
    cards = "".join(f"m{i} a b 0 0 nch w=0 l=1u\n" for i in range(MOST + 5))
    with pytest.raises(MistakesError) as caught:
        elaborate(read_bytes(f"* t\n{cards}".encode(), "top.sp", Path("absent")))
    assert len(caught.value.errors) == MOST


def test_one_error_is_raised_as_it_is() -> None:
    mistakes = Mistakes()
    error = ElaborationError("x", code="y")
    mistakes.check()
    mistakes.add(error)
    mistakes.add(ElaborationError("x", code="y"))
    with pytest.raises(ElaborationError) as caught:
        mistakes.check()
    assert caught.value is error
