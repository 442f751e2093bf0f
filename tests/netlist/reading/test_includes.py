"""Files that include files: where they are looked for, sections, cycles."""

from __future__ import annotations

import errno
import os
from typing import TYPE_CHECKING

import pytest

from evenstage.errors import NetlistError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading import includes
from evenstage.netlist.reading.read import read

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.netlist.netlist import Netlist

LEAF = ".subckt inv a y v g\nmn y a g g nch w=1u l=1u\n.ends\n"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def written(folder: Path, **files: str) -> Netlist:
    """Write files (``__`` in a name stands for a slash) and read ``top.sp``."""
    for name, text in files.items():
        path = folder / f"{name.replace('__', '/')}.sp"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text.encode())
    return read("top.sp")


def complaint(folder: Path, **files: str) -> str:
    with pytest.raises(NetlistError) as caught:
        written(folder, **files)
    return str(caught.value)


def test_a_file_is_looked_for_beside_the_one_that_includes_it(folder: Path) -> None:
    netlist = written(
        folder,
        top="* t\n.include 'lib/all.sp'\nx1 a b v g inv\n",
        lib__all=".INC cells/inv.sp\n",
        lib__cells__inv=LEAF,
    )
    assert [source.label for source in netlist.sources] == [
        "top.sp",
        "lib/all.sp",
        "lib/cells/inv.sp",
    ]
    assert netlist.card(0).span.place == "lib/cells/inv.sp:2:1"
    assert len(elaborate(netlist)) == 1


@pytest.mark.parametrize(
    "written_as", ["'leaf.sp'", '"leaf.sp"', "leaf.sp", "./sub/../leaf.sp $ x"]
)
def test_spellings_of_a_file_name(folder: Path, written_as: str) -> None:
    netlist = written(folder, top=f"* t\n.include {written_as}\n", leaf=LEAF, sub__x="")
    assert list(netlist.subcircuits) == ["inv"]


def test_an_included_file_has_no_title(folder: Path) -> None:
    assert len(written(folder, top="Title\n.include a.sp\n", a="R1 a b 1\n")) == 1


def test_inside_a_subcircuit_the_cards_belong_to_it(folder: Path) -> None:
    netlist = written(
        folder,
        top="* t\n.subckt t a b\nr1 a b 1\n.include inner.sp\nr3 a b 1\n.ends\nr4 a b 1\n",
        inner="r2 a b 1\n.param k=1\n",
    )
    names = [netlist.card(number).name for number in netlist.subcircuits["t"].cards]
    assert names == ["r1", "r2", "r3"]
    assert [netlist.card(i).scope for i in range(4)] == ["t", "t", "t", ""]
    assert [p.name for p in netlist.subcircuits["t"].assignments] == ["k"]
    assert list(netlist.top.cards) == [3]


def test_a_file_included_twice_is_kept_once_and_read_twice(folder: Path) -> None:
    netlist = written(folder, top="* t\n.include a.sp\n.include a.sp\n", a=LEAF)
    assert len(netlist.sources) == 2
    assert (len(netlist), netlist.notices) == (2, ())


def test_the_end_of_an_included_file_is_not_the_end_of_all(folder: Path) -> None:
    netlist = written(
        folder, top="* t\n.include a.sp\nr2 a b 1\n.end\nr3 a b 1\n", a="r1 a b 1\n.end\nr9 a b 1\n"
    )
    assert [netlist.card(i).name for i in range(len(netlist))] == ["r1", "r2"]


LIBRARY = """* corners
.lib slow
.param k=1
.lib 'lib.sp' common
.endl slow
.lib FAST $ remark
.param k=2
.endl
.lib common
r1 a b k
.endl
"""


@pytest.mark.parametrize(
    ("section", "k"), [("slow", "1"), ("SLOW", "1"), ("fast", "2"), ("'fast'", "2")]
)
def test_a_section_of_a_library(folder: Path, section: str, k: str) -> None:
    netlist = written(folder, top=f"* t\n.lib 'lib.sp' {section}\n", lib=LIBRARY)
    assert [p.text for p in netlist.top.assignments] == [k]
    assert len(netlist) == (k == "1")


def test_sections_nobody_asks_for_are_skipped(folder: Path) -> None:
    netlist = written(folder, top="* t\n.include lib.sp\n", lib=LIBRARY)
    assert (len(netlist), netlist.top.assignments) == (0, ())


def test_a_section_that_is_not_there(folder: Path) -> None:
    assert complaint(folder, top="* t\n.lib lib.sp typical\n", lib=LIBRARY) == (
        "top.sp:2:13: 'lib.sp' has no section 'typical'; "
        "it has slow, FAST, common (missing-section)\n"
        "    .lib lib.sp typical\n"
        "                ^^^^^^^"
    )


def test_a_cycle(folder: Path) -> None:
    files = {"top": "* t\n.include a.sp\n", "a": ".include b.sp\n", "b": "\n.include 'a.sp'\n"}
    assert complaint(folder, **files) == (
        "b.sp:2:10: this file is being read already: a.sp -> b.sp -> a.sp (include-cycle)\n"
        "    .include 'a.sp'\n"
        "             ^^^^^^"
    )


def test_a_section_that_includes_itself(folder: Path) -> None:
    text = complaint(folder, top="* t\n.lib a.sp x\n", a=".lib x\n.lib a.sp x\n.endl\n")
    assert text.startswith(
        "a.sp:2:6: this file is being read already: a.sp -> a.sp (include-cycle)"
    )


def test_a_missing_file_is_told_where_it_is_wanted(folder: Path) -> None:
    assert complaint(folder, top="* t\n.include lib/a.sp\n", lib__a="* x\n.include b.sp\n") == (
        "lib/a.sp:2:10: there is no file 'lib/b.sp' to include (missing-file)\n"
        "    .include b.sp\n"
        "             ^^^^"
    )


def test_a_folder_is_no_file(folder: Path) -> None:
    text = complaint(folder, top="* t\n.include sub\n", sub__a="")
    assert text.startswith("top.sp:2:10: cannot read 'sub': is a directory (unreadable-file)")


def test_a_mistake_in_an_included_file_is_shown_there(folder: Path) -> None:
    text = complaint(folder, top="* t\n.include a.sp\n", a="* x\nm1 a b\n")
    assert text.startswith("a.sp:2:1: 'm1' needs four nets")


@pytest.mark.parametrize(
    ("top", "inner", "code"),
    [
        ("* t\n.subckt t a\n.include a.sp\n", ".ends\n", "unmatched-ends"),
        ("* t\n.include a.sp\n.ends\n", ".subckt t a\n", "unmatched-subckt"),
        ("* t\n.include a.sp\n", "\0", "not-text"),
    ],
)
def test_definitions_do_not_reach_across_files(
    folder: Path, top: str, inner: str, code: str
) -> None:
    assert f"({code})" in complaint(folder, top=top, a=inner)


def test_links_stand_for_one_file_that_is_read_once(folder: Path) -> None:
    (folder / "lib").mkdir()
    (folder / "lib" / "real.sp").write_text(LEAF)
    (folder / "soft.sp").symlink_to(folder / "lib" / "real.sp")
    (folder / "hard.sp").hardlink_to(folder / "lib" / "real.sp")
    netlist = written(
        folder,
        top="* t\n.inc soft.sp\n.inc hard.sp\n.inc lib/real.sp\nx1 a b v g inv\n",
    )
    assert [source.label for source in netlist.sources] == ["top.sp", "soft.sp"]
    names = [name.relative_to(folder) for name in netlist.names[netlist.sources[1].path]]
    assert list(map(str, names)) == ["soft.sp", "hard.sp", "lib/real.sp"]
    assert len(elaborate(netlist)) == 1


def test_beside_a_link_comes_before_beside_what_it_stands_for(folder: Path) -> None:
    (folder / "store").mkdir()
    (folder / "store" / "all.sp").write_text(".inc inv.sp\n.inc other.sp\n")
    (folder / "store" / "inv.sp").write_text(LEAF.replace("1u", "9u"))
    (folder / "store" / "other.sp").write_text(LEAF.replace("inv", "other"))
    (folder / "all.sp").symlink_to("store/all.sp")
    netlist = written(folder, top="* t\n.inc all.sp\nx1 a b v g inv\n", inv=LEAF)
    assert [source.path.parent.name for source in netlist.sources[2:]] == [folder.name, "store"]
    assert elaborate(netlist).width.tolist() == [1e-6]


def test_a_cycle_through_a_link(folder: Path) -> None:
    (folder / "again.sp").symlink_to("top.sp")
    assert "this file is being read already" in complaint(folder, top="* t\n.inc again.sp\n")


def test_what_is_no_file_is_refused(folder: Path) -> None:
    os.mkfifo(folder / "pipe.sp")
    assert complaint(folder, top="* t\n.inc pipe.sp\n") == (
        "top.sp:2:6: cannot read 'pipe.sp': not a regular file (unreadable-file)\n"
        "    .inc pipe.sp\n         ^^^^^^^"
    )


def test_a_file_that_must_not_be_read(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(path: Path) -> bytes:
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES), path)

    (folder / "inv.sp").write_text(LEAF)
    monkeypatch.setattr(includes, "read_file", refuse)
    text = complaint(folder, top="* t\n.inc inv.sp\n")
    assert text.startswith("top.sp:2:6: cannot read 'inv.sp': permission denied (unreadable-file)")
