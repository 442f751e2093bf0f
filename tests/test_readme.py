"""The README is true: its commands run, and show what it says they show.

A fenced block of kind ``console`` holds a command after ``$`` and all that it prints; the blocks
run in their order, in one folder that begins with a copy of ``sample_netlists``. A block of kind
``pycon`` is a session of the Python prompt. When an output is meant to change, write it anew with

    python tests/test_readme.py

and the picture of the page that the tour makes, where Chromium is installed, with

    python tests/test_readme.py --picture
"""

from __future__ import annotations

import base64
import doctest
import os
import re
import shlex
import shutil
import subprocess
import sys
import tempfile
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

from evenstage.brief import BRIEF_KEYS
from evenstage.process.read import PROCESS_KEYS
from evenstage.settings import Table, Tables
from support.browser import Browser

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.schema import Entry

ROOT: Final = Path(__file__).parents[1]
README: Final = ROOT / "README.md"
PROMPT: Final = re.compile(r"\$ (?P<command>(?:.*\\\n)*.*)\n")
PICTURE: Final = ROOT / "sample_netlists" / "pad_predriver" / "page.png"
#: Pixels across the picture.
WIDTH: Final = 1020
FENCED: Final = re.compile(r"^```(?P<kind>\w*)\n(?P<text>.*?)^```$", re.MULTILINE | re.DOTALL)


@dataclass(frozen=True, slots=True)
class Block:
    """A fenced block: its kind and its text, without the fences."""

    kind: str
    text: str


def blocks(kind: str = "") -> list[Block]:
    """Return the README's fenced blocks, all or those of one kind."""
    found = [Block(m["kind"], m["text"]) for m in FENCED.finditer(README.read_text("utf-8"))]
    return [block for block in found if not kind or block.kind == kind]


def shown(command: str, folder: Path) -> str:
    """Return what a command prints at a terminal of 100 columns, messages included.

    Behind a bar may stand one that shows a part of it.
    """
    first, _, part = command.replace("\\\n", " ").partition(" | ")
    program, *arguments = shlex.split(first)
    assert Path(program).name == "evenstage"
    done = subprocess.run(
        [sys.executable, "-m", "evenstage", *arguments],
        cwd=folder,
        env=os.environ | {"COLUMNS": "100", "LC_ALL": "C.UTF-8"},
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        check=False,
        timeout=120,
    )
    assert done.returncode in {0, 1}, done.stdout.decode()
    if not part:
        return done.stdout.decode()
    return subprocess.check_output(shlex.split(part), input=done.stdout).decode()


def rerun(folder: Path) -> list[Block]:
    """Run all console blocks in a folder and return them with what they print now."""
    shutil.copytree(ROOT / "sample_netlists", folder / "sample_netlists")
    return [_again(block, folder) for block in blocks("console")]


def _again(block: Block, folder: Path) -> Block:
    prompt = PROMPT.match(block.text)
    assert prompt is not None, f"no command after $ in:\n{block.text}"
    return Block("console", prompt[0] + shown(prompt["command"], folder))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("readme")


@pytest.fixture(scope="module")
def today(folder: Path) -> list[Block]:
    return rerun(folder)


class TestCommands:
    @pytest.mark.parametrize("block", blocks()[:2])
    def test_first_two_stand_on_their_own(self, block: Block) -> None:
        assert block.text.startswith("python3 -m venv .venv &&\n")

    def test_first_ends_with_the_main_job(self) -> None:
        last = blocks()[0].text.split("&&\n")[-1]
        assert "stage" in shown(last, ROOT)

    def test_second_runs_every_test(self) -> None:
        assert blocks()[1].text.endswith("&&\n.venv/bin/pytest --quiet -n auto\n")


class TestOutputs:
    @pytest.mark.parametrize("index", range(len(blocks("console"))))
    def test_are_what_the_program_prints(self, today: list[Block], index: int) -> None:
        assert today[index].text == blocks("console")[index].text

    def test_python_sessions_are_true(
        self, folder: Path, today: list[Block], monkeypatch: pytest.MonkeyPatch
    ) -> None:
        assert today
        monkeypatch.chdir(folder)
        runner = doctest.DocTestRunner()
        text = "\n".join(block.text for block in blocks("pycon"))
        session = doctest.DocTestParser().get_doctest(text, {}, "README", str(README), 0)
        assert session.examples
        assert runner.run(session).failed == 0


def documented(command: str) -> set[str]:
    """Return the options that the README's table gives a command."""
    rows = re.findall(r"^\| (`--.*?) \| (.*?) \|", README.read_text("utf-8"), re.MULTILINE)
    return {
        option
        for options, owners in rows
        if owners == "all" or f"`{command}`" in owners
        for option in re.findall(r"--[a-z-]+", options)
    }


class TestOptions:
    @pytest.mark.parametrize(
        "command", ["analyse", "resize", "diff", "recognise", "simulate", "fit", "report"]
    )
    def test_are_those_of_the_program(self, command: str, tmp_path: Path) -> None:
        offered = set(re.findall(r"--[a-z-]+", shown(f"evenstage {command} --help", tmp_path)))
        assert documented(command) == offered - {"--help"}


def promised(heading: str) -> dict[str, str]:
    """Return the keys of a section's table, each with the default that is promised for it."""
    section = README.read_text("utf-8").split(f"\n## {heading}\n")[1].split("\n## ")[0]
    found: dict[str, str] = {}
    for cells in re.findall(r"^\| (`.*?) \| .* \| (.*?) \|$", section, re.MULTILINE):
        keys = [key for key in re.findall(r"`(.*?)`", cells[0]) if not key.startswith("[[")]
        defaults = cells[1].split(", ")
        defaults += defaults[-1:] * (len(keys) - len(defaults))
        found |= dict(zip(keys, defaults, strict=True))
    return found


def known(keys: Mapping[str, Entry], within: str = "") -> dict[str, Entry]:
    """Return all keys of a schema; those of a table after its name and a dot."""
    found: dict[str, Entry] = {}
    for key, entry in keys.items():
        if isinstance(entry, Table):
            found |= known(entry.keys, f"{key}.")
        elif isinstance(entry, Tables):
            found |= known(entry.keys)
        else:
            found[within + key] = entry
    return found


def wording(entry: Entry) -> re.Pattern[str]:
    """Return what the README may say of a default."""
    if entry.required:
        return re.compile("required")
    word = getattr(entry, "word", None)
    if word is not None:
        return re.compile(f'`"?{word}"?`')
    if isinstance(entry.default, str):
        return re.compile(f"`{entry.default}`")
    if isinstance(entry.default, int | float):
        return re.compile(f"{entry.default:g}")
    return re.compile(r"(?!required)[^\d]+")


class TestKeys:
    @pytest.mark.parametrize(
        ("heading", "schema"), [("The process file", PROCESS_KEYS), ("The brief", BRIEF_KEYS)]
    )
    def test_are_those_of_the_program(self, heading: str, schema: Mapping[str, Entry]) -> None:
        told, entries = promised(heading), known(schema)
        assert sorted(told) == sorted(entries)
        wrong = [key for key, entry in entries.items() if not wording(entry).fullmatch(told[key])]
        assert wrong == []


class TestPicture:
    def test_is_shown_and_said_in_words(self) -> None:
        (shown_as,) = re.findall(
            r"^!\[([^]]+)\]\((\S+)\)$", README.read_text("utf-8"), re.MULTILINE
        )
        said, path = shown_as
        assert (ROOT / path) == PICTURE
        assert len(said) > 100

    def test_is_small_enough_to_travel(self) -> None:
        picture = PICTURE.read_bytes()
        assert picture.startswith(b"\x89PNG")
        assert len(picture) <= 200_000


class TestFiles:
    @pytest.mark.parametrize("document", ["README.md", "DEVELOPERS.md"])
    def test_those_mentioned_exist(self, document: str) -> None:
        named = r"(?<![\w./])(?:src|tests|grammar|sample_netlists|\.ci)/[\w./-]*[\w/]"
        # A name shortened in a report names no file.
        text = re.sub(r"\S*…\S*", "", (ROOT / document).read_text("utf-8"))
        mentioned = re.findall(named, text)
        assert [path for path in mentioned if not (ROOT / path).exists()] == []

    @pytest.mark.parametrize("block", blocks("toml"))
    def test_settings_are_toml(self, block: Block) -> None:
        assert tomllib.loads(block.text)


def rewrite() -> None:
    """Write the README anew with what its commands print now."""
    with tempfile.TemporaryDirectory() as folder:
        fresh = iter(rerun(Path(folder)))
    text = FENCED.sub(
        lambda m: f"```console\n{next(fresh).text}```" if m["kind"] == "console" else m[0],
        README.read_text("utf-8"),
    )
    README.write_text(text, "utf-8")


def take_picture() -> None:
    """Take the picture of the path, drawn and on its time axis, of the page that the tour makes."""
    with tempfile.TemporaryDirectory() as folder, Browser() as browser:
        rerun(Path(folder))
        browser.open(Path(folder) / "faster.html", WIDTH)
        section = "document.querySelector('section[aria-labelledby=path]')"
        top, height = browser.run(f"[{section}.offsetTop, {section}.offsetHeight]")
        clip = {"x": 0, "y": top - 20, "width": WIDTH, "height": height + 40, "scale": 1}
        taken = browser.call(
            "Page.captureScreenshot", format="png", captureBeyondViewport=True, clip=clip
        )
    PICTURE.write_bytes(base64.b64decode(taken["data"]))


if __name__ == "__main__":
    if "--picture" in sys.argv:
        take_picture()
    else:
        rewrite()
