"""The command line: what is printed where, and with which status it ends."""

from __future__ import annotations

import json
import shlex
import subprocess
import sys
from pathlib import Path
from typing import IO, Final

import pytest

from evenstage import flow
from evenstage.arguments import parsed
from evenstage.cli import main
from evenstage.errors import Notice

#: Two inverters; the second one is too small for its load, and nothing else is odd.
NETLIST: Final = """* two inverters
.subckt pair a y vdd vss
mn1 b a vss vss nmos w=1u l=0.13u
mp1 b a vdd vdd pmos w=2u l=0.13u
mn2 y b vss vss nmos w=1u l=0.13u
mp2 y b vdd vdd pmos w=2u l=0.13u
cl y vss 100f
.ends
"""

Done = subprocess.CompletedProcess[bytes]

#: What the built-in process makes every run say.
NOTICE: Final = "absolute times are rough"


@pytest.fixture
def netlist(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return the name of a netlist in the working folder."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "pair.sp").write_bytes(NETLIST.encode())
    return Path("pair.sp")


def python(*arguments: str, stdout: IO[bytes] | int = subprocess.PIPE) -> Done:
    """Run Python in a process of its own."""
    return subprocess.run(
        [sys.executable, *arguments], stdout=stdout, stderr=subprocess.PIPE, check=False
    )


def bash(text: str) -> Done:
    """Run some words of a shell; ``evenstage`` in them is the program."""
    text = text.replace("evenstage", f"{sys.executable} -m evenstage")
    return subprocess.run(["bash", "-o", "pipefail", "-c", text], capture_output=True, check=False)


def names(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


class TestStatus:
    def test_done(self, netlist: Path) -> None:
        assert main(["analyse", str(netlist)]) == 0

    @pytest.mark.parametrize(
        "arguments",
        [
            ["analyse", "none.sp"],
            ["analyse", "pair.sp", "--top", "none"],
            ["analyse", "pair.sp", "--process", "none.toml"],
            ["analyse", "pair.sp", "--from", "none"],
            ["resize", "pair.sp", "--delay", "1f"],
            ["resize", "pair.sp", "--output", "pair.sp"],
            ["resize", "pair.sp", "--output", "none/out.sp"],
            ["analyse", "pair.sp", "--json", "none/out.json"],
            ["recognise", "pair.sp", "--graph", "none/out.graphml"],
            ["recognise", "pair.sp", "--graph", "pair.sp"],
            ["recognise", "pair.sp", "--graph", "out", "--json", "out"],
            ["analyse", "pair.sp", "--json", "."],
            ["simulate", "pair.sp", "--after", "none.sp"],
            ["simulate", "pair.sp", "--from", "none"],
            ["simulate", "pair.sp", "--waveforms", "pair.sp"],
            ["simulate", "pair.sp", "--waveforms", "none/out.csv"],
            ["simulate", "pair.sp", "--waveforms", "out", "--json", "out"],
        ],
    )
    def test_input_is_wrong(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], arguments: list[str]
    ) -> None:
        assert main(arguments) == 1
        shown = capsys.readouterr()
        assert shown.out == ""
        assert shown.err.endswith(")\n")
        assert "Traceback" not in shown.err
        assert names(Path()) == {netlist.name}

    @pytest.mark.parametrize(
        "arguments",
        [
            [],
            ["unknown"],
            ["analyse"],
            ["analyse", "pair.sp", "more"],
            ["recognise", "pair.sp", "--from", "a"],
            ["analyse", "pair.sp", "--proc", "p.toml"],
            ["analyse", "pair.sp", "--count", "0"],
            ["analyse", "pair.sp", "--count", "²"],
            ["analyse", ""],
            ["analyse", "pair.sp", "--process", ""],
            ["analyse", "pair.sp", "--json", ""],
            ["resize", "pair.sp", "--margin", "-1"],
            ["resize", "pair.sp", "--margin", "nan"],
            ["resize", "pair.sp", "--margin", "1e9"],
            ["resize", "pair.sp", "--delay", "0"],
            ["resize", "pair.sp", "--delay", "-5p"],
            ["resize", "pair.sp", "--delay", "nan"],
            ["resize", "pair.sp", "--delay", "450"],
            ["resize", "pair.sp", "--width", "inf"],
            ["resize", "pair.sp", "--width", "0"],
            ["resize", "pair.sp", "--delay", "450p", "--width", "1"],
            ["resize", "pair.sp", "--scope", "all"],
            ["resize", "pair.sp", "--output", "-"],
            ["diff", "pair.sp"],
            ["simulate", "pair.sp", "--side-branches", "some"],
            ["simulate", "pair.sp", "--count", "0"],
            ["fit"],
            ["fit", "some.csv"],
            ["fit", "--netlist", "pair.sp"],
            ["fit", "--simulated", "pair.sp", "--netlist", "pair.sp"],
            ["fit", "some.csv", "--netlist", "pair.sp", "--simulated", "pair.sp"],
        ],
    )
    def test_command_line_is_wrong(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], arguments: list[str]
    ) -> None:
        assert main(arguments) == 2
        shown = capsys.readouterr()
        assert shown.out == ""
        assert shown.err.startswith("usage: evenstage")
        assert names(Path()) == {netlist.name}

    @pytest.mark.parametrize("arguments", [["--help"], ["--version"], ["resize", "--help"]])
    def test_help_is_no_mistake(
        self, capsys: pytest.CaptureFixture[str], arguments: list[str]
    ) -> None:
        assert main(arguments) == 0
        assert "evenstage" in capsys.readouterr().out

    @pytest.mark.parametrize(
        "command", ["analyse", "resize", "diff", "simulate", "recognise", "fit"]
    )
    def test_help_shows_examples_that_work_and_keeps_to_the_columns(
        self,
        capsys: pytest.CaptureFixture[str],
        monkeypatch: pytest.MonkeyPatch,
        command: str,
    ) -> None:
        monkeypatch.setenv("COLUMNS", "80")
        main([command, "--help"])
        shown = capsys.readouterr().out
        examples = [line for line in shown.splitlines() if line.startswith("  evenstage ")]
        assert examples
        for example in examples:
            asked = parsed(shlex.split(example)[1:])
            assert asked.command == command
        assert max(map(len, shown.splitlines())) <= 80

    def test_schema_is_printed(self, capsys: pytest.CaptureFixture[str]) -> None:
        assert main(["--json-schema"]) == 0
        assert json.loads(capsys.readouterr().out)["$defs"]["analysis"]["type"] == "object"

    def test_fault_of_ours(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.setattr(flow, "analyse", lambda *_: 1 / 0)
        assert main(["analyse", str(netlist)]) == 3
        shown = capsys.readouterr()
        assert "ZeroDivisionError" in shown.err
        assert shown.err.endswith("please report the lines above\n")

    def test_interrupted(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
    ) -> None:
        def interrupt(*_: object) -> None:
            raise KeyboardInterrupt

        monkeypatch.setattr(flow, "analyse", interrupt)
        assert main(["analyse", str(netlist)]) == 130
        assert capsys.readouterr().err == "interrupted; no file is left half-written\n"


class TestSimulate:
    def test_writes_report_json_and_waveforms(
        self, netlist: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        files = ["--json", "out.json", "--waveforms", "out.csv"]
        assert main(["simulate", str(netlist), "--after", str(netlist), *files]) == 0
        assert "1.000 times as fast simulated" in " ".join(capsys.readouterr().out.split())
        assert json.loads(Path("out.json").read_bytes())["kind"] == "simulation"
        table = Path("out.csv").read_text("ascii").splitlines()
        assert table[0] == "netlist,path,net,time_s,voltage_v"
        assert {line.split(",")[2] for line in table[1:]} == {"a", "b", "y"}


class TestNotices:
    """Each is told once: in the report, or beside JSON on standard output."""

    def test_report_holds_them(self, netlist: Path, capsys: pytest.CaptureFixture[str]) -> None:
        assert main(["analyse", str(netlist)]) == 0
        shown = capsys.readouterr()
        assert " ".join(shown.out.split()).count(NOTICE) == 1
        assert shown.err == ""

    def test_json_on_screen_leaves_them_to_standard_error(
        self, netlist: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        assert main(["analyse", str(netlist), "--json", "-"]) == 0
        shown = capsys.readouterr()
        assert json.loads(shown.out)["kind"] == "analysis"
        assert shown.err.startswith("notice: ")
        assert shown.err.count(NOTICE) == 1

    @pytest.mark.parametrize("more", [[], ["--json", "-"]])
    def test_quiet_leaves_them_out(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], more: list[str]
    ) -> None:
        assert main(["analyse", str(netlist), "--quiet", *more]) == 0
        shown = capsys.readouterr()
        assert "Notices" not in shown.out
        assert shown.err == ""

    def test_of_a_fresh_output_are_told_too(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
    ) -> None:
        notice = Notice("include-lost", "a file cannot be found from there")
        monkeypatch.setattr(flow.sizing, "lost_includes", lambda *_: (notice,))
        assert main(["resize", str(netlist), "--output", "out.sp"]) == 0
        assert notice.message in capsys.readouterr().out


class TestJson:
    def test_file_and_report_both_appear(
        self, netlist: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        assert main(["resize", str(netlist), "--json", "out.json", "--output", "out.sp"]) == 0
        assert json.loads(Path("out.json").read_bytes())["kind"] == "sizing"
        assert "The slowest path falls" in capsys.readouterr().out
        assert Path("out.sp").read_bytes() != netlist.read_bytes()

    def test_file_is_written_anew(self, netlist: Path) -> None:
        Path("out.json").write_bytes(b"old")
        assert main(["analyse", str(netlist), "--json", "out.json"]) == 0
        assert json.loads(Path("out.json").read_bytes())["format"] == 1

    @pytest.mark.parametrize("place", ["pair.sp", "./pair.sp", "out.sp"])
    def test_never_takes_the_place_of_a_netlist(
        self, netlist: Path, capsys: pytest.CaptureFixture[str], place: str
    ) -> None:
        assert main(["resize", str(netlist), "--output", "out.sp", "--json", place]) == 1
        assert "choose another name for what is to be written" in capsys.readouterr().err
        assert netlist.read_bytes() == NETLIST.encode()
        assert names(Path()) == {netlist.name}

    def test_place_is_looked_at_before_anything_is_written(self, netlist: Path) -> None:
        assert main(["resize", str(netlist), "--output", "out.sp", "--json", "none/x"]) == 1
        assert names(Path()) == {netlist.name}


class TestOutput:
    def test_exists(self, netlist: Path, capsys: pytest.CaptureFixture[str]) -> None:
        Path("out.sp").write_bytes(b"mine")
        assert main(["resize", str(netlist), "--output", "out.sp"]) == 1
        assert "say --force to overwrite it (output-exists)" in capsys.readouterr().err
        assert Path("out.sp").read_bytes() == b"mine"

    def test_may_be_forced(self, netlist: Path) -> None:
        Path("out.sp").write_bytes(b"mine")
        assert main(["resize", str(netlist), "--output", "out.sp", "--force"]) == 0
        assert b"evenstage record" in Path("out.sp").read_bytes()

    def test_without_it_the_reader_is_told(
        self, netlist: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        told = "no netlist was written: name one with --output FILE\n"
        main(["resize", str(netlist)])
        assert capsys.readouterr().err == told
        main(["resize", str(netlist), "--quiet"])
        main(["resize", str(netlist), "--output", "out.sp"])
        assert capsys.readouterr().err == ""

    def test_without_it_nothing_is_written(self, netlist: Path) -> None:
        assert main(["resize", str(netlist)]) == 0
        assert names(Path()) == {netlist.name}

    def test_second_run_changes_nothing(
        self, netlist: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        assert main(["resize", str(netlist), "--output", "one.sp"]) == 0
        assert main(["resize", "one.sp", "--output", "two.sp"]) == 0
        assert Path("two.sp").read_bytes() == Path("one.sp").read_bytes()
        assert "Nothing changes" in capsys.readouterr().out


class TestSurroundings:
    """Widths, locales, pipes and disks, in processes of their own."""

    @pytest.mark.parametrize(("columns", "widest"), [("20", 80), ("80", 80), ("999", 160)])
    def test_report_keeps_to_the_columns(
        self,
        netlist: Path,
        capsys: pytest.CaptureFixture[str],
        monkeypatch: pytest.MonkeyPatch,
        columns: str,
        widest: int,
    ) -> None:
        monkeypatch.setenv("COLUMNS", columns)
        assert main(["analyse", str(netlist)]) == 0
        longest = max(map(len, capsys.readouterr().out.splitlines()))
        assert widest - 20 < longest <= widest

    @pytest.mark.parametrize(
        ("locale", "ascii_only"),
        [
            ({"LANG": "C"}, True),
            ({"LANG": "C.UTF-8", "LC_ALL": "POSIX"}, True),
            ({"LANG": "C.UTF-8"}, False),
            ({"LANG": "C", "LC_ALL": "C.UTF-8"}, False),
            ({}, False),
        ],
    )
    def test_plain_locale_gets_plain_text(
        self,
        netlist: Path,
        capsys: pytest.CaptureFixture[str],
        monkeypatch: pytest.MonkeyPatch,
        locale: dict[str, str],
        *,
        ascii_only: bool,
    ) -> None:
        for name in ("LANG", "LC_ALL"):
            monkeypatch.delenv(name, raising=False)
        for name, value in locale.items():
            monkeypatch.setenv(name, value)
        assert main(["analyse", str(netlist)]) == 0
        assert capsys.readouterr().out.isascii() == ascii_only

    def test_reader_may_leave_early(self, netlist: Path) -> None:
        done = bash(f"evenstage analyse {netlist} --json - --quiet | head -c 1")
        assert (done.returncode, done.stdout, done.stderr) == (0, b"{", b"")

    @pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")
    @pytest.mark.parametrize("more", [[], ["--json", "-"]])
    def test_full_disk_behind_standard_output(self, netlist: Path, more: list[str]) -> None:
        with Path("/dev/full").open("wb") as full:
            done = python("-m", "evenstage", "analyse", str(netlist), *more, stdout=full)
        assert done.returncode == 1
        assert done.stderr.endswith(b"cannot print: no space left on device (cannot-write)\n")
        assert b"Traceback" not in done.stderr

    @pytest.mark.parametrize(("closed", "status"), [(">&-", 1), ("2>&-", 0)])
    def test_closed_streams(self, netlist: Path, closed: str, status: int) -> None:
        done = bash(f"evenstage analyse {netlist} {closed}")
        assert done.returncode == status
        assert b"Traceback" not in done.stderr

    def test_full_disk_leaves_no_output(self, netlist: Path) -> None:
        long = NETLIST + "* a long tail\n" * 1000
        netlist.write_bytes(long.encode())
        done = bash(f"ulimit -f 1; evenstage resize {netlist} --output out.sp")
        assert done.returncode == 1
        assert b"cannot write 'out.sp': file too large; nothing was changed" in done.stderr
        assert names(Path()) == {netlist.name}

    @pytest.mark.parametrize(
        ("place", "stage"),
        [("evenstage.flow.sizing.find_widths", "timing"), ("os.fsync", "writing")],
    )
    def test_interrupt_leaves_no_output(self, netlist: Path, place: str, stage: str) -> None:
        """The program interrupts itself at a chosen moment, as Ctrl-C would."""
        module, _, name = place.rpartition(".")
        script = (
            "import os, signal, sys, importlib\n"
            f"module = importlib.import_module({module!r})\n"
            f"old = module.{name}\n"
            "def interrupted(*given, **more):\n"
            "    os.kill(os.getpid(), signal.SIGINT)\n"
            "    return old(*given, **more)\n"
            f"module.{name} = interrupted\n"
            "from evenstage.cli import main\n"
            f"sys.exit(main(['resize', {str(netlist)!r}, '--output', 'out.sp']))\n"
        )
        done = python("-c", script)
        assert (done.returncode, done.stdout) == (130, b""), done.stderr
        told = f"interrupted while {stage}; no file is left half-written\n"
        assert done.stderr.decode() == told
        assert names(Path()) == {netlist.name}

    def test_help_comes_before_anything_heavy_is_imported(self) -> None:
        script = (
            "import sys; from evenstage.cli import main; main(['--help']);"
            "sys.exit('numpy' in sys.modules)"
        )
        assert python("-c", script).returncode == 0


class TestModule:
    def test_names_are_found_when_asked_for(self) -> None:
        import evenstage  # noqa: PLC0415 - the module itself is under test

        assert all(hasattr(evenstage, name) for name in evenstage.__all__)
        assert set(dir(evenstage)) >= set(evenstage.__all__)
        with pytest.raises(AttributeError, match="no attribute 'nothing'"):
            _ = evenstage.nothing  # type: ignore[attr-defined]  # it must not be there
