"""Each mistake in a netlist gets one message that points at its cause; compared whole."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read, read_bytes

INV = """.subckt inv a y vdd vss wn=1u
mn y a vss vss nch w=wn l=0.1u
mp y a vdd vdd pch w=2u l=0.1u
.ends
"""

NETS = " ".join(f"n{i}" for i in range(1000))


def mistakes() -> dict[str, tuple[str, str]]:
    """Return the cases of ``mistakes.txt``: text and message by what is wrong."""
    listed = Path(__file__).with_name("mistakes.txt").read_text("utf-8")
    cases = {}
    for case in listed.split("\n== ")[1:]:
        name, _, rest = case.partition("\n")
        text, _, message = f"\n{rest}".partition("\n--\n")
        text = f"{text[1:]}\n" if text else ""
        cases[name] = (text.replace("INV\n", INV).replace("NETS", NETS), message.rstrip("\n"))
    return cases


MISTAKES = mistakes()


@pytest.mark.parametrize("name", MISTAKES)
def test_message(name: str) -> None:
    text, message = MISTAKES[name]
    with pytest.raises(EvenstageError) as caught:
        elaborate(read_bytes(text.encode(), "top.sp", Path("absent")))
    assert str(caught.value) == message


def test_every_case_is_there() -> None:
    assert len(MISTAKES) == 76


def test_a_main_file_that_is_not_there() -> None:
    with pytest.raises(EvenstageError) as caught:
        read(Path("nowhere.sp"))
    assert str(caught.value) == "there is no file 'nowhere.sp' (missing-file)"


def test_a_main_file_that_is_a_folder(tmp_path: Path) -> None:
    with pytest.raises(EvenstageError) as caught:
        read(tmp_path)
    assert str(caught.value) == f"cannot read '{tmp_path}': is a directory (unreadable-file)"


@pytest.mark.parametrize(
    ("top", "hint"),
    [("invv", "; did you mean 'inv'?"), ("adder", "; there are 'inv'")],
)
def test_a_block_that_is_not_there(top: str, hint: str) -> None:
    netlist = read_bytes(INV.encode(), "top.sp", Path())
    with pytest.raises(EvenstageError) as caught:
        elaborate(netlist, top)
    assert str(caught.value) == f"there is no subcircuit '{top}'{hint} (unknown-top)"


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"m1 a\0b", "'top.sp' is not a text file (not-text)"),
        ("r1".encode("utf-16"), "'top.sp' is in UTF-16; save it as UTF-8 (not-text)"),
    ],
)
def test_bytes_that_are_no_text(data: bytes, message: str) -> None:
    with pytest.raises(EvenstageError) as caught:
        read_bytes(data, "top.sp", Path())
    assert str(caught.value) == message


def test_bytes_that_are_not_utf8_can_be_printed() -> None:
    with pytest.raises(EvenstageError) as caught:
        read_bytes(b"* t\nm1 \xff\xfe b\n", "top.sp", Path())
    assert "m1 ?? b" in str(caught.value)
    str(caught.value).encode()
