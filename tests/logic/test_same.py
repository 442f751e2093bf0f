"""One structure up to widths: what counts, and what does not."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from evenstage import flow
from evenstage.logic.same import compare_structure
from support.blocks import devices_of, plain_process

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.netlist.devices import Devices

TEXT = """* a block
.global vdd vss
.subckt inv a y
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=2u l=0.1u
.ends
.subckt top a b y
x1 a k inv
x2 k y inv
mt b k y vss nx w=1u l=0.1u m=2
cw k vss 5f
rw b b2 10
mu b2 a k vss nx w=1u l=0.1u
.ends
"""


def devices(text: str) -> Devices:
    return devices_of(text, plain_process())


class TestCompareStructure:
    @pytest.mark.parametrize(
        ("old", "new"),
        [
            ("w=2u", "w=3u"),
            ("w=1u", "w=4u nf=2"),
            ("w=1u", "w=1u ad=1p"),
            ("mn y a vss vss nx w=1u", "mn y a vss vss nx w=1.25u"),
        ],
    )
    def test_widths_are_free(self, old: str, new: str) -> None:
        check = compare_structure(devices(TEXT), devices(TEXT.replace(old, new)))
        assert (check.same, check.reason, check.transistors) == (True, "", 6)

    def test_a_copy_of_a_definition_is_the_definition(self) -> None:
        start, end = TEXT.index(".subckt inv"), TEXT.index(".subckt top")
        copied = TEXT[start:end].replace(" inv ", " inv_s1 ").replace("w=2u", "w=5u")
        text = TEXT[:end] + copied + TEXT[end:].replace("k y inv", "k y inv_s1")
        assert compare_structure(devices(TEXT), devices(text)).same

    @pytest.mark.parametrize(
        ("old", "new", "reason"),
        [
            ("mt b k y", "mt y k b", "transistor 'mt' has its drain on another net"),
            ("mt b k y", "mt b a y", "transistor 'mt' has its gate on another net"),
            ("mt b k y", "mt b k k", "transistor 'mt' has its source on another net"),
            ("vdd vdd px", "vdd y px", "transistor 'x1.mp' has its bulk on another net"),
            ("mt b k y vss nx", "mt b k y vss px", "transistor 'mt' has another model"),
            ("m=2", "m=3", "transistor 'mt' has another number of copies"),
            ("vdd px w=2u l=0.1u", "vdd px w=2u l=0.2u", "transistor 'x1.mp' has another length"),
            ("mt b k", "mz b k", "card 'mt' has another name"),
            ("x2 k y", "x3 k y", "instance 'x2' has another name"),
            ("cw k vss 5f\n", "", "1 capacitors before, 0 after"),
            ("mu b2 a k vss nx w=1u l=0.1u\n", "", "6 transistors before, 5 after"),
            ("5f", "6f", "capacitors have other values"),
            ("cw k", "cw y", "capacitors lie between other nets"),
            ("rw b b2 10", "rw b b2 20", "wires differ"),
            ("top a b y", "top b a y", "the ports are others, or in another order"),
        ],
    )
    def test_everything_else_is_a_difference(self, old: str, new: str, reason: str) -> None:
        changed = TEXT.replace(old, new)
        assert changed != TEXT
        check = compare_structure(devices(TEXT), devices(changed))
        assert (check.same, check.reason) == (False, reason)


class TestReadBack:
    """What `resize` writes is read and compared by itself."""

    @staticmethod
    def netlist(folder: Path) -> Path:
        cards = "".join(f"x{k} n{k} n{k + 1} inv\n" for k in range(5))
        text = (
            TEXT[: TEXT.index(".subckt top")] + f".subckt top n0 n5\n{cards}cl n5 vss 90f\n.ends\n"
        )
        path = folder / "chain.sp"
        path.write_text(text.replace("nx", "nmos").replace("px", "pmos"))
        return path

    def test_copies_of_leaves_pass(self, tmp_path: Path) -> None:
        output = tmp_path / "new.sp"
        sizing = flow.resize(self.netlist(tmp_path), flow.Question(), output=output)
        assert sizing.structure is not None
        assert sizing.structure.same
        assert "inv_s1" in output.read_text()
        assert "unchanged: the written netlist was read back, and its 10" in flow.text(sizing)

    def test_nothing_is_said_where_nothing_is_written(self, tmp_path: Path) -> None:
        sizing = flow.resize(self.netlist(tmp_path), flow.Question())
        assert sizing.structure is None
        assert "read back" not in flow.text(sizing)

    def test_a_netlist_that_cannot_be_read_there_is_said_to_be_unread(self, tmp_path: Path) -> None:
        (tmp_path / "lib").mkdir()
        (tmp_path / "design").mkdir()
        path = self.netlist(tmp_path)
        main = path.read_text().split(".subckt top")
        (tmp_path / "lib" / "leaf.sp").write_text(main[0])
        design = tmp_path / "design" / "main.sp"
        top = main[1]
        for k in (2, 3, 4):
            n, p = (
                f"m{kind}{k} n{k + 1} n{k} {rail} {rail} {kind}mos w={width}u l=0.1u"
                for kind, rail, width in (("n", "vss", 1), ("p", "vdd", 2))
            )
            top = top.replace(f"x{k} n{k} n{k + 1} inv", f"{n}\n{p}")
        design.write_text(f"* a design\n.include ../lib/leaf.sp\n.subckt top{top}")
        (tmp_path / "a" / "b").mkdir(parents=True)
        sizing = flow.resize(design, flow.Question(), output=tmp_path / "a" / "b" / "new.sp")
        assert sizing.structure is not None
        assert sizing.structure.same is None
        assert "was not read back: it includes files" in flow.text(sizing)

    @pytest.mark.parametrize(
        ("old", "new", "reason"),
        [(b"mn y a", b"mn a y", "drain on another net"), (b".ends", b".end", "closes")],
    )
    def test_another_function_is_a_fault(
        self,
        tmp_path: Path,
        monkeypatch: pytest.MonkeyPatch,
        old: bytes,
        new: bytes,
        reason: str,
    ) -> None:
        monkeypatch.setattr(
            "evenstage.flow.sizing.write_files",
            lambda texts, **_: [
                path.write_bytes(text.replace(old, new)) for path, text in texts.items()
            ],
        )
        with pytest.raises(RuntimeError, match=rf"(?s)do not use '.*new\.sp'.*{reason}"):
            flow.resize(self.netlist(tmp_path), flow.Question(), output=tmp_path / "new.sp")
