"""Small texts that mean something enormous, and files that are none, are refused at once."""

from __future__ import annotations

import os
import tracemalloc
from contextlib import suppress
from pathlib import Path
from time import process_time

import pytest

from evenstage.errors import ElaborationError, NetlistError
from evenstage.netlist.elaboration import extent
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read, read_bytes

LAST = ".subckt s%d a b w=1u\nm1 a b 0 0 nch w=w l=1u\n.ends\nx1 a b s0\n"


def levels(count: int, calls: list[str]) -> str:
    """Return definitions that each make some calls of the next, and a call of the first."""
    text = "* t\n"
    for level in range(count):
        cards = "".join(f"x{k} a b s{level + 1} {call}\n" for k, call in enumerate(calls))
        text += f".subckt s{level} a b w=1u\n{cards}.ends\n"
    return text + LAST % count


def refusal(text: str) -> str:
    with pytest.raises(ElaborationError) as caught:
        elaborate(read_bytes(text.encode(), "top.sp", Path()))
    return str(caught.value)


def test_ten_levels_of_a_hundred_calls() -> None:
    assert refusal(levels(10, [""] * 100)) == (
        "the block has endlessly many transistors; at most 50000000 can be laid out (too-large)"
    )


def test_a_little_more_than_can_be_laid_out(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(extent, "MOST", 99)
    assert refusal(levels(2, [""] * 10)) == (
        "the block has 100 transistors; at most 99 can be laid out (too-large)"
    )
    monkeypatch.setattr(extent, "MOST", 110)
    assert "the block has 112 instances" in refusal(levels(2, [""] * 10))


def test_values_that_differ_from_call_to_call(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(extent, "MOST_TEMPLATES", 1000)
    text = levels(12, ["w='w*2'", "w='w*3'", "w='w*5'", "w='w*7'"])
    assert refusal(text) == (
        "the calls in this block give their subcircuits more than 1000 different sets of values; "
        "is there a parameter that grows from level to level? (too-large)"
    )


@pytest.mark.parametrize(
    "text",
    [
        "r1 a b 1\nx1" + " a" * 600_000,
        "m1 a b 0 0 nch w='" + "1+" * 600_000,
        ".foo " + "a " * 600_000,
    ],
)
def test_cards_nobody_drew(text: str) -> None:
    with pytest.raises(NetlistError) as caught:
        read_bytes(f"* t\n{text}\n".encode(), "top.sp", Path())
    assert "this card is longer than 1048576 bytes (too-large)" in str(caught.value)


@pytest.mark.parametrize(
    "text",
    [
        "a word " * 400_000,
        "* t\n* " + "c" * 3_000_000,
        "* t\n" + "\n" * 3_000_000,
        "* t\n.control\n" + "a b\n" * 500_000 + ".endc",
        "* t\nr1 a b 1 $" + " $" * 900_000,
    ],
)
def test_long_lines_that_are_no_cards(text: str) -> None:
    assert len(read_bytes(text.encode(), "top.sp", Path())) <= 1


def test_a_long_word_is_told_in_part() -> None:
    message = refusal("* t\nm1 a b 0 0 nch l=1u w=" + "1" * 5000 + "\n")
    assert len(message) < 2000


def test_definitions_inside_each_other_without_end() -> None:
    text = "* t\n" + "".join(f".subckt s{k} a\n" for k in range(101))
    with pytest.raises(NetlistError) as caught:
        read_bytes(text.encode(), "top.sp", Path())
    assert str(caught.value).startswith(
        "top.sp:102:1: subcircuits are defined inside each other more than 100 deep"
    )


def test_a_thousand_wrappers_around_one_transistor() -> None:
    assert refusal(levels(1100, ["w=w"])) == "wrapped transistors are nested too deeply (too-large)"


def test_more_than_a_thousand_levels() -> None:
    assert len(elaborate(read_bytes(levels(1100, [""]).encode(), "top.sp", Path()))) == 1


@pytest.mark.parametrize(
    "formula", ["(" * 5000 + "1u" + ")" * 5000, "-" * 5000 + "1u", "2**" * 5000 + "1", "1?" * 5000]
)
def test_deep_expressions(formula: str) -> None:
    text = f"* t\nm1 a b 0 0 nch w='{formula}' l=1u\n"
    with suppress(ElaborationError):
        assert len(elaborate(read_bytes(text.encode(), "top.sp", Path()))) == 1


def test_a_pipe_is_no_file(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.sp")
    with pytest.raises(NetlistError) as caught:
        read(tmp_path / "pipe.sp")
    assert "pipe.sp': not a regular file (unreadable-file)" in str(caught.value)
    (tmp_path / "top.sp").write_text("* t\n.include pipe.sp\n")
    with pytest.raises(NetlistError, match="not a regular file"):
        read(tmp_path / "top.sp")


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="the system has no such device")
def test_a_device_that_never_ends_is_no_file() -> None:
    with pytest.raises(NetlistError, match="not a regular file"):
        read(Path("/dev/zero"))


def test_links_to_one_file_are_one_file(tmp_path: Path) -> None:
    (tmp_path / "a.sp").write_text(".subckt inv a y\n.ends\n")
    (tmp_path / "b.sp").symlink_to("a.sp")
    (tmp_path / "top.sp").write_text("* t\n.include a.sp\n.include b.sp\n.include ./x/../a.sp\n")
    assert len(read(tmp_path / "top.sp").sources) == 2


def test_links_that_lead_nowhere(tmp_path: Path) -> None:
    (tmp_path / "a.sp").symlink_to("b.sp")
    (tmp_path / "b.sp").symlink_to("a.sp")
    (tmp_path / "top.sp").write_text("* t\n.include a.sp\n")
    for name in ("a.sp", "top.sp"):
        with pytest.raises(NetlistError) as caught:
            read(tmp_path / name)
        assert caught.value.code == "unreadable-file"


@pytest.mark.parametrize("name", ["x" * 5000, "a\0b"])
def test_names_no_file_can_have(tmp_path: Path, name: str) -> None:
    with pytest.raises(NetlistError) as caught:
        read(tmp_path / name)
    assert caught.value.code == "unreadable-file"


def test_a_file_nobody_may_read(tmp_path: Path) -> None:
    if os.geteuid() == 0:
        pytest.skip("the superuser may read everything")
    (tmp_path / "a.sp").write_text("* t\n")
    (tmp_path / "a.sp").chmod(0)
    with pytest.raises(NetlistError, match="permission denied"):
        read(tmp_path / "a.sp")


def test_one_line_of_many_megabytes_takes_little_more_memory_than_itself(tmp_path: Path) -> None:
    (tmp_path / "top.sp").write_bytes(b"* t\nx1 a" + b" net" * (1 << 22) + b"\n")
    tracemalloc.start()
    try:
        with pytest.raises(NetlistError) as caught:
            read(tmp_path / "top.sp")
        assert len(str(caught.value)) < 1000
        assert tracemalloc.get_traced_memory()[1] < 3 << 24
    finally:
        tracemalloc.stop()


def test_files_that_include_each_other_without_end(tmp_path: Path) -> None:
    for level in range(102):
        (tmp_path / f"f{level}.sp").write_text(f".include f{level + 1}.sp\n")
    with pytest.raises(NetlistError, match="files are included more than 100 deep"):
        read(tmp_path / "f0.sp")


@pytest.mark.parametrize("data", [b"\x7fELF\0\0", b"\xff\xfem\x001\x00", b"* t\nm1 \0 b 0 0 nch\n"])
def test_files_that_are_no_text(data: bytes) -> None:
    with pytest.raises(NetlistError) as caught:
        read_bytes(data, "top.sp", Path())
    assert caught.value.code == "not-text"


@pytest.mark.parametrize(
    "size", ["w=" + "9" * 400, "w=1e999", "w='1e300*1e300'", "w='2**9**9**9'", "w=1u m=1e400"]
)
def test_numbers_beyond_all_measure(size: str) -> None:
    message = refusal(f"* t\nm1 a b 0 0 nch l=1u {size}\n")
    assert message.startswith("top.sp:2:") or "bad-multiplier" in message


def test_a_chain_of_definitions_takes_time_in_proportion() -> None:
    """Ten times as many take no more than some twenty times as long."""

    def seconds(count: int) -> float:
        level = ".subckt s{} a b\nm1 a b 0 0 nch w=1u l=1u\nx1 a b s{}\n.ends\n"
        chain = "".join(level.format(k, k + 1) for k in range(count))
        text = f"* t\n{chain}.subckt s{count} a b\nm1 a b 0 0 nch w=1u l=1u\n.ends\nx1 a b s0\n"
        began = process_time()
        assert len(elaborate(read_bytes(text.encode(), "top.sp", Path()))) == count + 1
        return process_time() - began

    short = min(seconds(100) for _ in range(3))
    assert seconds(1000) < 20 * short + 0.2
