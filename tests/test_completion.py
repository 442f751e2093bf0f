"""Completion: what the shells themselves make of it."""

from __future__ import annotations

import shutil
import subprocess
from typing import TYPE_CHECKING

import pytest

from evenstage.cli import main

if TYPE_CHECKING:
    from pathlib import Path


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a working folder with two files, one with a blank in its name."""
    monkeypatch.chdir(tmp_path)
    for name in ("decoder.sp", "de coder.sp"):
        (tmp_path / name).touch()
    return tmp_path


def script(shell: str, capsys: pytest.CaptureFixture[str]) -> str:
    assert main(["--completion", shell]) == 0
    return capsys.readouterr().out


def run(shell: str, text: str, folder: Path) -> list[str]:
    if shutil.which(shell) is None:
        pytest.skip(f"no {shell} here")
    plain = {"bash": ["--norc"], "zsh": ["-f"], "fish": ["--no-config"]}[shell]
    done = subprocess.run(
        [shell, *plain, "-c", text], cwd=folder, capture_output=True, text=True, check=True
    )
    assert done.stderr == ""
    return done.stdout.splitlines()


class TestBash:
    @pytest.mark.parametrize(
        ("words", "offered"),
        [
            ("resi", ["resize"]),
            ("--vers", ["--version"]),
            ("--completion ''", ["bash", "fish", "zsh"]),
            ("resize --s", ["--scope", "--spend"]),
            ("resize --scope ''", ["path", "block"]),
            ("resize --scope b", ["block"]),
            ("analyse --scope ''", ["de coder.sp", "decoder.sp"]),
            ("analyse de", ["de coder.sp", "decoder.sp"]),
            ("analyse --json d", ["de coder.sp", "decoder.sp"]),
            ("analyse --top ''", []),
            ("analyse --reclaim", []),
        ],
    )
    def test_offers(
        self, folder: Path, capsys: pytest.CaptureFixture[str], words: str, offered: list[str]
    ) -> None:
        text = (
            f"{script('bash', capsys)}\nCOMP_WORDS=(evenstage {words})\n"
            "COMP_CWORD=$((${#COMP_WORDS[@]} - 1))\n_evenstage\n"
            'for one in "${COMPREPLY[@]}"; do echo "$one"; done\n'
        )
        assert sorted(run("bash", text, folder)) == sorted(offered)


class TestFish:
    @pytest.mark.parametrize(
        ("line", "offered"),
        [
            ("evenstage resi", ["resize"]),
            ("evenstage resize --sc", ["--scope"]),
            ("evenstage resize --scope ", ["block", "path"]),
            ("evenstage analyse dec", ["decoder.sp"]),
            ("evenstage analyse --json dec", ["decoder.sp"]),
        ],
    )
    def test_offers(
        self, folder: Path, capsys: pytest.CaptureFixture[str], line: str, offered: list[str]
    ) -> None:
        text = f"{script('fish', capsys)}\ncomplete -C '{line}'\n"
        assert [told.split("\t")[0] for told in run("fish", text, folder)] == offered


class TestZsh:
    def test_is_read_and_registered(self, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
        text = (
            "autoload -U compinit && compinit -u -D\n"
            f"{script('zsh', capsys)}\necho ${{_comps[evenstage]}}\n"
        )
        assert run("zsh", text, folder) == ["_evenstage"]


def test_other_shell_is_refused(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--completion", "cmd"]) == 2
    assert "invalid choice: 'cmd'" in capsys.readouterr().err
