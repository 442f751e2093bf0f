"""Files written all together or not at all."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from evenstage.errors import OutputError
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.output import (
    lost_includes,
    output_files,
    output_paths,
    write_files,
)

CELL = ".subckt inv a y vdd vss\nm1 y a vss vss nch w=1u l=60n\n.ends\n"


@pytest.fixture
def design(tmp_path: Path) -> Path:
    """Return the main file of a design with includes inside and outside its folder."""
    folder = tmp_path / "design"
    (folder / "cells").mkdir(parents=True)
    (tmp_path / "models").mkdir()
    (folder / "cells" / "inv.sp").write_text(CELL)
    (folder / "cells" / "models.sp").write_text(".model nch nmos\n")
    (tmp_path / "models" / "pch.sp").write_text(".model pch pmos\n")
    (folder / "main.sp").write_text(
        "title\n.include cells/inv.sp\n.include 'cells/models.sp'\n.include ../models/pch.sp\n"
        "x1 a y vdd vss inv\n"
    )
    return folder / "main.sp"


def files_below(folder: Path) -> dict[str, bytes]:
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


class TestOutputPaths:
    def test_keeps_included_files_in_their_place_beside_the_main_one(self, design: Path) -> None:
        out = design.parents[1] / "out"
        assert output_paths(read(design), out / "new.sp") == {
            design: (out / "new.sp",),
            design.parent / "cells" / "inv.sp": (out / "cells" / "inv.sp",),
            design.parent / "cells" / "models.sp": (out / "cells" / "models.sp",),
        }

    def test_a_file_is_written_under_each_of_its_names(self, design: Path) -> None:
        folder, out = design.parent, design.parents[1] / "out"
        (folder / "soft.sp").symlink_to("cells/inv.sp")
        (folder / "outer.sp").symlink_to(design.parents[1] / "models" / "pch.sp")
        design.write_text("title\n.inc soft.sp\n.inc cells/inv.sp\n.inc outer.sp\n")
        assert output_paths(read(design), out / "new.sp") == {
            design: (out / "new.sp",),
            folder / "cells" / "inv.sp": (out / "soft.sp", out / "cells" / "inv.sp"),
            design.parents[1] / "models" / "pch.sp": (out / "outer.sp",),
        }

    def test_names_that_lead_to_one_file_are_one_place(self, design: Path) -> None:
        folder = design.parent
        (folder / "soft.sp").symlink_to("cells/inv.sp")
        design.write_text("title\n.inc soft.sp\n.inc cells/inv.sp\n")
        (places,) = list(output_paths(read(design), folder / "new.sp").values())[1:]
        assert len(places) == 1

    def test_a_link_to_the_main_file_has_its_includes_beside_it(self, design: Path) -> None:
        linked = design.parents[1] / "project" / "main.sp"
        linked.parent.mkdir()
        linked.symlink_to(design)
        out = design.parents[1] / "out"
        places = output_paths(read(linked), out / "new.sp")
        assert [p for some in places.values() for p in some][1:] == [
            out / "cells" / "inv.sp",
            out / "cells" / "models.sp",
        ]


class TestOutputFiles:
    def test_in_the_same_folder_only_changed_files_are_written(self, design: Path) -> None:
        cell = design.parent / "cells" / "inv.sp"
        files = output_files(read(design), {cell: b"new"}, design.with_name("new.sp"))
        assert files == {design.with_name("new.sp"): design.read_bytes(), cell: b"new"}

    def test_in_another_folder_the_output_can_be_read(self, design: Path) -> None:
        out = design.parents[1] / "out" / "new.sp"
        out.parent.mkdir()
        netlist = read(design)
        cell = design.parent / "cells" / "inv.sp"
        write_files(output_files(netlist, {cell: CELL.encode() * 1}, out), force=False)
        again = read(out)
        assert set(again.subcircuits) == set(netlist.subcircuits)
        assert [s.data for s in again.sources] == [s.data for s in netlist.sources]

    def test_files_already_there_are_not_written_again(self, design: Path) -> None:
        out = design.parents[1] / "out" / "new.sp"
        out.parent.mkdir()
        write_files(output_files(read(design), {}, out), force=False)
        assert output_files(read(design), {}, out) == {out: design.read_bytes()}


class TestLostIncludes:
    def test_a_relative_include_that_leads_elsewhere_is_noticed(self, design: Path) -> None:
        out = design.parents[1] / "out" / "deeper" / "new.sp"
        (notice,) = lost_includes(read(design), out)
        assert notice.code == "include-lost"
        assert notice.names == (str(design.parent.parent / "models" / "pch.sp"),)

    def test_a_sibling_folder_finds_the_same_files(self, design: Path) -> None:
        assert lost_includes(read(design), design.parents[1] / "out" / "new.sp") == ()

    def test_an_include_from_the_root_is_found_from_anywhere(self, design: Path) -> None:
        model = design.parents[1] / "models" / "pch.sp"
        design.write_text(f"title\n.include {model}\n")
        assert lost_includes(read(design), design.parents[1] / "a" / "b" / "new.sp") == ()


class TestWriteFiles:
    def test_writes_all_and_leaves_nothing_else(self, tmp_path: Path) -> None:
        write_files({tmp_path / "a.sp": b"1\r\n", tmp_path / "d" / "b.sp": b"2"}, force=False)
        assert files_below(tmp_path) == {"a.sp": b"1\r\n", "d/b.sp": b"2"}

    def test_refuses_to_overwrite_and_touches_nothing(self, tmp_path: Path) -> None:
        (tmp_path / "b.sp").write_bytes(b"old")
        with pytest.raises(OutputError, match=r"b\.sp' exists; .*--force") as caught:
            write_files({tmp_path / "a.sp": b"1", tmp_path / "b.sp": b"2"}, force=False)
        assert caught.value.code == "output-exists"
        assert files_below(tmp_path) == {"b.sp": b"old"}

    def test_overwrites_when_told_and_keeps_the_mode(self, tmp_path: Path) -> None:
        path = tmp_path / "a.sp"
        path.write_bytes(b"old")
        path.chmod(0o640)
        write_files({path: b"new"}, force=True)
        assert files_below(tmp_path) == {"a.sp": b"new"}
        assert path.stat().st_mode & 0o777 == 0o640

    def test_writes_through_a_link(self, tmp_path: Path) -> None:
        (tmp_path / "real.sp").write_bytes(b"old")
        (tmp_path / "link.sp").symlink_to("real.sp")
        write_files({tmp_path / "link.sp": b"new"}, force=True)
        assert (tmp_path / "link.sp").is_symlink()
        assert (tmp_path / "real.sp").read_bytes() == b"new"

    def test_refuses_a_folder_even_when_forced(self, tmp_path: Path) -> None:
        (tmp_path / "a.sp").mkdir()
        with pytest.raises(OutputError, match="is not a file"):
            write_files({tmp_path / "a.sp": b"1"}, force=True)

    def test_a_missing_folder_is_not_guessed(self, tmp_path: Path) -> None:
        with pytest.raises(OutputError, match="there is no folder") as caught:
            write_files({tmp_path / "typo" / "a.sp": b"1"}, force=False)
        assert caught.value.code == "no-folder"
        assert not (tmp_path / "typo").exists()


class TestWriteFilesInTrouble:
    """A full disk or an interrupt, at every step at which it can come."""

    @pytest.fixture(params=[OSError(28, "No space left on device"), KeyboardInterrupt()])
    def trouble(self, request: pytest.FixtureRequest) -> BaseException:
        trouble: BaseException = request.param
        return trouble

    @pytest.mark.parametrize("step", ["fsync", "replace", "mkstemp"])
    @pytest.mark.parametrize("after", [0, 1, 2])
    def test_every_file_is_as_before(
        self,
        tmp_path: Path,
        monkeypatch: pytest.MonkeyPatch,
        trouble: BaseException,
        step: str,
        after: int,
    ) -> None:
        (tmp_path / "a.sp").write_bytes(b"old a")
        (tmp_path / "b.sp").write_bytes(b"old b")
        before = files_below(tmp_path)
        targets = [tmp_path / "a.sp", tmp_path / "b.sp", tmp_path / "new" / "c.sp"]
        self._fail(monkeypatch, step, after, trouble)
        expected = OutputError if isinstance(trouble, OSError) else KeyboardInterrupt
        with pytest.raises(expected):
            write_files(dict.fromkeys(targets, b"new"), force=True)
        monkeypatch.undo()
        assert files_below(tmp_path) == before
        assert not (tmp_path / "new").exists()

    @staticmethod
    def _fail(
        monkeypatch: pytest.MonkeyPatch, step: str, after: int, trouble: BaseException
    ) -> None:
        """Let a step succeed some times, then fail once."""
        owner, name = {
            "fsync": (os, "fsync"),
            "replace": (Path, "replace"),
            "mkstemp": (__import__("tempfile"), "mkstemp"),
        }[step]
        real = getattr(owner, name)
        calls = iter(range(100))

        def failing(*args: object, **kwargs: object) -> object:
            if next(calls) == after:
                raise trouble
            return real(*args, **kwargs)

        monkeypatch.setattr(owner, name, failing)

    def test_says_which_file_and_that_nothing_changed(
        self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        self._fail(monkeypatch, "fsync", 0, OSError(28, "No space left on device"))
        with pytest.raises(OutputError) as caught:
            write_files({tmp_path / "a.sp": b"1"}, force=False)
        assert str(caught.value) == (
            f"cannot write '{tmp_path / 'a.sp'}': no space left on device; nothing was changed "
            "(cannot-write)"
        )
